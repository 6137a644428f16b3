"""Effective value of 64 samples."""
import numpy as np

from turns import serve

x = np.random.default_rng(1).standard_normal(64)
serve(lambda: float(np.sqrt(np.mean(x * x))) and None)
