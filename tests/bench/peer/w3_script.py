"""Four-parameter sine fits of many records: a start from each record's
transform, then the usual iteration with numpy's least squares."""
import numpy as np

from turns import serve

N, RECORDS = 4096, 10000
t = np.arange(N)
x = np.random.default_rng(1).standard_normal((RECORDS, N)) * 0.01
x += np.cos(2 * np.pi * 0.0771 * t + 0.3)


def fit(y):
    k = 1 + np.argmax(np.abs(np.fft.rfft(y - y.mean())[1:]))
    w, a, b = 2 * np.pi * k / N, 0.0, 0.0
    for i in range(5):
        c, s = np.cos(w * t), np.sin(w * t)
        columns = [c, s, np.ones(N)]
        if i:
            columns.append(t * (b * c - a * s))
        d = np.stack(columns, axis=1)
        p = np.linalg.solve(d.T @ d, d.T @ y)
        a, b = p[0], p[1]
        if i:
            w += p[3]
    r = y - d @ p
    return np.hypot(a, b), w, p[2], np.sqrt(np.mean(r * r))


def work():
    for y in x:
        fit(y)


serve(work)
