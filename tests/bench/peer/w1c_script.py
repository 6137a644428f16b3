"""Averaged density of a WAV file of 2^27 samples of 16 bits: read with numpy,
scipy.signal.welch."""
import numpy as np
from scipy import signal

from turns import serve
from wav_file import opened

file = opened()


def work():
    file.seek(44)
    x = np.fromfile(file, dtype="<i2")
    signal.welch(x, 48000.0, nperseg=8192)


serve(work)
