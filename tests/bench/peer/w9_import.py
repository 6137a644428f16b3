"""A fresh interpreter imports the numerical libraries a script needs."""
import subprocess
import sys

from turns import serve

CODE = """import time
started = time.process_time()
import numpy, scipy.signal
print(time.process_time() - started)
"""


def work():
    child = subprocess.run([sys.executable, "-c", CODE], check=True,
                           capture_output=True, text=True)
    return float(child.stdout)


serve(work)
