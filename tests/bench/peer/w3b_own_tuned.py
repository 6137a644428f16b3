"""Amplitudes of 20 lines in 1000 records, every record with its own lines:
sines by a table and anchors, normal equations."""
import numpy as np
import scipy.linalg

from turns import serve

N, RECORDS = 16384, 1000
near, far = np.arange(128), np.arange(0, N, 128)
f = 0.0217 * np.arange(1, 21)
x = np.random.default_rng(1).standard_normal((RECORDS, N))
d = np.ones((41, N))


def work():
    for i, y in enumerate(x):
        w = 2j * np.pi * f * (1 + 1e-6 * i)
        a, b = np.exp(np.outer(w, far)), np.exp(np.outer(w, near))
        z = (a[:, :, None] * b[:, None, :]).reshape(20, N)
        d[:20], d[20:40] = z.real, z.imag
        v = d @ y
        p = scipy.linalg.cho_solve(scipy.linalg.cho_factor(d @ d.T), v)
        np.hypot(p[:20], p[20:40]), np.sqrt((y @ y - v @ p) / N)


serve(work)
