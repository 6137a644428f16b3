"""Response and coherence of two channels of 2^24, segments of 4096."""
import numpy as np
from scipy import signal

from turns import serve

r = np.random.default_rng(1)
x = r.standard_normal(2 ** 24)
y = x + r.standard_normal(2 ** 24)


def work():
    how = dict(nperseg=4096)
    pxx = signal.welch(x, **how)[1]
    pyy = signal.welch(y, **how)[1]
    pxy = signal.csd(x, y, **how)[1]
    pxy / pxx, abs(pxy) ** 2 / (pxx * pyy)


serve(work)
