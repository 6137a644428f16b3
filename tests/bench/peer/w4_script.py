"""One windowed amplitude spectrum of N samples: numpy.fft.rfft."""
import sys

import numpy as np
from scipy import signal

from turns import serve

n = int(sys.argv[1]) if len(sys.argv) > 1 else 50000
x = np.random.default_rng(1).standard_normal(n)
w = signal.get_window("hann", n)
serve(lambda: np.fft.rfft(x * w) is None and None)
