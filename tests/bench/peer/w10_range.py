"""A 16-bit WAV in reused blocks: range and samples at the rails."""
import numpy as np

from turns import serve
from wav_file import BLOCK, FRAMES, opened

file = opened()
codes = np.empty(BLOCK, "<i2")
values = np.empty(BLOCK)


def work():
    file.seek(44)
    for _ in range(FRAMES // BLOCK):
        file.readinto(codes)
        np.copyto(values, codes)
        values.min(), values.max()
        np.count_nonzero(values >= 32767), np.count_nonzero(values <= -32768)


serve(work)
