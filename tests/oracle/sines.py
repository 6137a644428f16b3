"""Sine fits by scipy and numpy: FILE F0 [LINE ...] with frequencies in cycles
per sample. Prints for the four-parameter fit from F0 (scipy.optimize.curve_fit)
f, amplitude, offset, u_f, u_amplitude, u_offset; then for the joint fit of the
LINEs (numpy.linalg.lstsq) offset and, of each line, amplitude, phase at the
centre, u_amplitude, u_phase."""
import sys

import numpy as np
from scipy.optimize import curve_fit

x = np.fromfile(sys.argv[1])
f0, *lines = [float(a) for a in sys.argv[2:]]
n = len(x)
t = np.arange(n) - (n - 1) / 2


def sine(t, v, a, p, c):
    return a * np.cos(2 * np.pi * (f0 + v / n) * t + p) + c


def slopes(t, v, a, p, c):
    q = 2 * np.pi * (f0 + v / n) * t + p
    return np.stack([-a * np.sin(q) * 2 * np.pi * t / n, np.cos(q),
                     -a * np.sin(q), np.ones(n)], axis=1)


z = 2 * np.sum(x * np.exp(-2j * np.pi * f0 * t)) / n
best, cov = curve_fit(sine, t, x, p0=[0, abs(z), np.angle(z), x.mean()],
                      jac=slopes, xtol=1e-15, ftol=1e-15, gtol=1e-15)
u = np.sqrt(np.diag(cov))
print(repr(f0 + best[0] / n), repr(best[1]), repr(best[3]), repr(u[0] / n),
      repr(u[1]), repr(u[3]))
if lines:
    columns = [np.ones(n)]
    for f in lines:
        columns += [np.cos(2 * np.pi * f * t), np.sin(2 * np.pi * f * t)]
    a = np.stack(columns, axis=1)
    b, squares, rank, _ = np.linalg.lstsq(a, x, rcond=None)
    assert rank == a.shape[1]
    c = np.linalg.inv(a.T @ a) * squares[0] / (n - rank)
    print(repr(b[0]))
    for i in range(1, len(b), 2):
        p, q = b[i], -b[i + 1]
        r = np.hypot(p, q)
        v = c[i:i + 2, i:i + 2] * np.array([[1, -1], [-1, 1]])
        da, dp = np.array([p, q]) / r, np.array([-q, p]) / r ** 2
        print(repr(r), repr(np.arctan2(q, p)), repr(np.sqrt(da @ v @ da)),
              repr(np.sqrt(dp @ v @ dp)))
