"""Amplitudes of the same 20 lines in 1000 records: normal equations, factored
once; the residual by energies; one matrix product over the records."""
import numpy as np
import scipy.linalg

from turns import serve

N, RECORDS = 16384, 1000
t = np.arange(N)
f = 0.0217 * np.arange(1, 21)
x = np.random.default_rng(1).standard_normal((RECORDS, N))


def work():
    q = 2 * np.pi * np.outer(t, f)
    d = np.hstack([np.cos(q), np.sin(q), np.ones((N, 1))])
    b = x @ d
    p = scipy.linalg.cho_solve(scipy.linalg.cho_factor(d.T @ d), b.T)
    squares = np.einsum("ij,ij->i", x, x) - np.einsum("ij,ji->i", b, p)
    np.hypot(p[:20], p[20:40]), np.sqrt(squares / N)


serve(work)
