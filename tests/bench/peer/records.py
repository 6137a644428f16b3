"""Filters, resampling and figures of a record of 2^20 samples by SciPy: the
natural call for each word."""
import sys

import numpy as np
from scipy import signal

from turns import serve

i = np.arange(1, (1 << 20) + 1)
x = np.sin(0.1 * i) + (i * 7919 % 1000) * 1e-3
sos = signal.ellip(8, 0.1, 60, 100, fs=1000, output="sos")
# taps of the single filter that does what the stages do
taps, beta = signal.kaiserord(80, 2 * (1 - 0.8) / 64)
decimating = signal.firwin(taps | 1, 1 / 64, window=("kaiser", beta))
taps, beta = signal.kaiserord(80, 2 * (1 - 0.8) / 160)
resampling = signal.firwin(taps | 1, 1 / 160, window=("kaiser", beta))

works = {
    "sections": lambda: signal.sosfilt(sos, x),
    "both": lambda: signal.sosfiltfilt(sos, x),
    "decimate": lambda: signal.resample_poly(x, 1, 64, window=decimating),
    "resample": lambda: signal.resample_poly(x, 147, 160, window=resampling),
    "percentiles": lambda: np.percentile(x, [1, 50, 99]),
    "detrend": lambda: signal.detrend(x),
}
work = works[sys.argv[1]]


def quiet():
    work()


serve(quiet)
