"""Averaged spectra by scipy.signal: SEGMENT STEP POINTS DETREND FILE FILE (of
doubles). Four lines: density of the first, line spectrum of the second, real
and imaginary parts of the cross density; at 48000 samples a second."""
import sys

import numpy as np
from scipy import signal

segment, step, points = (int(a) for a in sys.argv[1:4])
detrend = False if sys.argv[4] == "False" else sys.argv[4]
x, y = (np.fromfile(a) for a in sys.argv[5:7])
how = dict(fs=48000.0, window="hann" if segment > 2 else "boxcar", nperseg=segment,
           noverlap=segment - step, nfft=points, detrend=detrend)
density = signal.welch(x, **how)[1]
lines = signal.welch(y, scaling="spectrum", **how)[1]
cross = signal.csd(x, y, **how)[1]
for values in (density, lines, cross.real, cross.imag):
    print(*(repr(float(v)) for v in values))
