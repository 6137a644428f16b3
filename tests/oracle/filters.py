"""Gains of analog low-pass filters by SciPy, for comparison.

Reads rows  shape order ripple_db stop_db f...  (corner 1) and prints one row
of |H(f)| and one of the angle per input row.
"""
import sys

import numpy as np
from scipy import signal


def design(shape, order, ripple, stop):
    if shape == "butterworth":
        return signal.butter(order, 1, analog=True, output="zpk")
    if shape == "chebyshev":
        return signal.cheby1(order, ripple, 1, analog=True, output="zpk")
    if shape == "bessel":
        return signal.bessel(order, 1, analog=True, output="zpk", norm="mag")
    return signal.ellip(order, ripple, stop, 1, analog=True, output="zpk")


for line in open(sys.argv[1]):
    words = line.split()
    zpk = design(words[0], int(words[1]), float(words[2]), float(words[3]))
    at = np.array([float(w) for w in words[4:]])
    response = signal.freqs_zpk(*zpk, worN=at)[1]
    print(" ".join("%.17g" % v for v in response.real))
    print(" ".join("%.17g" % v for v in response.imag))
