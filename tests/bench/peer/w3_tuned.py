"""Four-parameter sine fits of many records, tuned: sines as outer products of
two tables, sums of cosines in closed form, no columns in memory."""
import math

import numpy as np
import scipy.fft

from turns import serve

N, RECORDS = 4096, 10000
t = np.arange(N) - (N - 1) / 2
u = t / N
near, far = np.arange(64), t[::64]
x = np.random.default_rng(1).standard_normal((RECORDS, N)) * 0.01
x += np.cos(2 * np.pi * 0.0771 * np.arange(N) + 0.3)


def closed(w):
    """sum cos w t, sum u sin w t, sum u^2 cos w t."""
    h, s, c = w / 2, math.sin(w * N / 2), math.cos(w * N / 2)
    q = math.sin(h)
    d, k = s / q, math.cos(h) / q / N
    first = c / q - d * k
    second = -d - 2 * k * first + d / N ** 2
    return d, -first / 2, -second / 4


def start(y):
    h = scipy.fft.rfft(y)
    m = np.abs(h[1:-1] - 0.5 * (h[:-2] + h[2:]))
    k = 2 + int(np.argmax(m[2:-2]))
    d = 2 * (m[k + 1] - m[k - 1]) / (m[k - 1] + 2 * m[k] + m[k + 1])
    return 2 * np.pi * (k + 1 + d) / N


def fit(y):
    w, a, b, total, tilted = start(y), 0.0, 0.0, y.sum(), u * y
    q0 = (N * N - 1) / (12 * N)
    for turn in range(3):
        e = np.outer(np.exp(-1j * w * far), np.exp(-1j * w * near)).ravel()
        z, v = y @ e, tilted @ e
        (d1, r1, _), (d2, r2, q2) = closed(w), closed(2 * w)
        g = np.array([[(N + d2) / 2, 0, d1, -a * r2 / 2],
                      [0, (N - d2) / 2, 0, b * r2 / 2],
                      [d1, 0, N, -a * r1],
                      [-a * r2 / 2, b * r2 / 2, -a * r1,
                       (a * a * (q0 - q2) + b * b * (q0 + q2)) / 2]])
        s = [z.real, -z.imag, total, a * v.imag + b * v.real]
        if turn:
            a, b, c, step = np.linalg.solve(g, s)
            w += step / N
        else:
            a, b, c = np.linalg.solve(g[:3, :3], s[:3])
    r = y - (a * e.real - b * e.imag + c)
    return math.hypot(a, b), w, c, math.sqrt(r @ r / N)


def work():
    for y in x:
        fit(y)


serve(work)
