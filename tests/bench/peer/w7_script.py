"""A zoom of 2^20 samples into 4096 points over 0.1 % of the band."""
import numpy as np
from scipy import signal

from turns import serve

x = np.random.default_rng(1).standard_normal(2 ** 20)
first, width = 0.1234567, 0.0005
serve(lambda: signal.zoom_fft(x, [first, first + width], m=4096, fs=1.0) is None and None)
