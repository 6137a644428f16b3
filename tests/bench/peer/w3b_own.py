"""Amplitudes of 20 lines in 1000 records, every record with its own lines."""
import numpy as np

from turns import serve

N, RECORDS = 16384, 1000
t = np.arange(N)
f = 0.0217 * np.arange(1, 21)
x = np.random.default_rng(1).standard_normal((RECORDS, N))


def work():
    for i, y in enumerate(x):
        q = 2 * np.pi * np.outer(t, f * (1 + 1e-6 * i))
        d = np.hstack([np.cos(q), np.sin(q), np.ones((N, 1))])
        p, _, _, _ = np.linalg.lstsq(d, y, rcond=None)
        r = y - d @ p
        np.hypot(p[:20], p[20:40]), np.sqrt(np.mean(r * r))


serve(work)
