"""A chirp by scipy.signal.chirp as text: RATE SAMPLES FROM TO DURATION LAW, a number per line."""
import sys

import numpy as np
from scipy import signal

rate, n, f0, f1, t1 = float(sys.argv[1]), int(sys.argv[2]), *map(float, sys.argv[3:6])
law = {"linear": "linear", "exponential": "logarithmic"}[sys.argv[6]]
for value in signal.chirp(np.arange(n) / rate, f0, t1, f1, method=law):
    print(repr(float(value)))
