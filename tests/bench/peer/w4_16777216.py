"""W4 with 16777216 samples."""
import sys

sys.argv[1:] = ["16777216"]
import w4_script  # noqa: E402,F401
