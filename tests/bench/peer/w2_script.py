"""64 tones and Gaussian noise as they are usually written down."""
import numpy as np

from turns import serve

N = 10_000_000
t = np.arange(N)
rng = np.random.default_rng(1)


def work():
    x = 0.1 * rng.standard_normal(N)
    for k in range(1, 65):
        x += np.cos(2 * np.pi * 0.0077 * (k + 0.385) * t + k) / k
    return x


def go():
    work()


serve(go)
