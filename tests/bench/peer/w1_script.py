"""Averaged density of 2^26 doubles, segments of SEGMENT: scipy.signal.welch."""
import sys

import numpy as np
from scipy import signal

from turns import serve

segment = int(sys.argv[1]) if len(sys.argv) > 1 else 8192
x = np.random.default_rng(1).standard_normal(2 ** 26)
serve(lambda: signal.welch(x, 48000.0, nperseg=segment) is None and None)
