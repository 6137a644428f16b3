"""W4 with 1000003 samples."""
import sys

sys.argv[1:] = ["1000003"]
import w4_script  # noqa: E402,F401
