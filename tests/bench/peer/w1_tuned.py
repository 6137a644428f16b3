"""The same as w1_script.py by chunks, two threads and pocketfft, second call
timed: the best script that we could write."""
import sys
from concurrent.futures import ThreadPoolExecutor

import numpy as np
from scipy import fft, signal

from turns import serve

segment = int(sys.argv[1]) if len(sys.argv) > 1 else 8192
x = np.random.default_rng(1).standard_normal(2 ** 26)
w = signal.get_window("hann", segment)
view = np.lib.stride_tricks.sliding_window_view(x, segment)[::segment // 2]
rows = max(1, 2 ** 17 // segment)


def part(first):
    block = view[first:first + rows]
    block = (block - block.mean(axis=1, keepdims=True)) * w
    z = fft.rfft(block, axis=1, overwrite_x=True)
    return (z.real ** 2 + z.imag ** 2).sum(axis=0)


def work():
    with ThreadPoolExecutor(2) as pool:
        sum(pool.map(part, range(0, len(view), rows))) / len(view)


serve(work)
