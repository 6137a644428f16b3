"""What every peer script shares: do the work when told, answer with seconds."""
import sys
import time


def serve(work):
    """Each line "go N" on stdin: N times work(), mean seconds to stdout.

    If work returns a number, that is the time it took.
    """
    for line in sys.stdin:
        times = int(line.split()[1])
        started = time.perf_counter()
        told = None
        for _ in range(times):
            told = work()
        taken = time.perf_counter() - started
        if isinstance(told, float):
            taken = told * times
        print(repr(taken / times), flush=True)
