"""One windowed transform of 64 samples."""
import numpy as np
from scipy import signal

from turns import serve

x = np.random.default_rng(1).standard_normal(64)
w = signal.get_window("hann", 64)
serve(lambda: np.fft.rfft(x * w) is None and None)
