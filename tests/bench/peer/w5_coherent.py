"""Every (divider, length) of W5, tried for a share of the dividers.

Answers with the seconds that all dividers would take: the share is spread evenly
over them, and a length is left once one line is off its bin.
"""
import time

import numpy as np

from turns import serve

CLOCK = 12.288e6
SHARE = 2048
DIVIDERS = np.arange(64, 65536)
LENGTHS = np.arange(16, 2**20 + 1, dtype=float)
LINES = [hz * k for hz in (50.0, 24.6) for k in range(1, 7)]
AWAY = [1000.0 + 173.13 * k for k in range(30)]


def settings(divider):
    """How many lengths hold at one divider."""
    rate = CLOCK / divider
    if 2 * max(LINES) >= rate:
        return 0
    found = LENGTHS
    for hz in LINES:
        turns = found * (hz / rate)
        found = found[np.abs(turns - np.rint(turns)) <= 0.01]
    for hz in AWAY:
        shown = abs(hz - rate * round(hz / rate))
        for line in LINES:
            found = found[np.abs(shown - line) * found / rate > 3]
    return len(found)


def work():
    started = time.perf_counter()
    mine = DIVIDERS[SHARE // 2 :: SHARE]
    for divider in mine:
        settings(divider)
    return (time.perf_counter() - started) * len(DIVIDERS) / len(mine)


if __name__ == "__main__":
    serve(work)
