"""W1b: segments of 65536."""
import sys

sys.argv[1:] = ["65536"]
import w1_script  # noqa: E402,F401
