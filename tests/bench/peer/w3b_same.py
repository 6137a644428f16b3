"""Amplitudes of the same 20 lines in 1000 records, one least squares call."""
import numpy as np

from turns import serve

N, RECORDS = 16384, 1000
t = np.arange(N)
f = 0.0217 * np.arange(1, 21)
x = np.random.default_rng(1).standard_normal((RECORDS, N))


def work():
    q = 2 * np.pi * np.outer(t, f)
    d = np.hstack([np.cos(q), np.sin(q), np.ones((N, 1))])
    p, _, _, _ = np.linalg.lstsq(d, x.T, rcond=None)
    r = x.T - d @ p
    np.hypot(p[:20], p[20:40]), np.sqrt(np.mean(r * r, axis=0))


serve(work)
