"""Ten columns of a CSV file of 10^7 numbers into doubles, by NumPy's reader."""
import os
import tempfile

import numpy as np

from turns import serve

ROWS, COLUMNS = 1000000, 10
number, path = tempfile.mkstemp()
i = np.arange(1, 10001)
block = (i * 7919 % 199999 - 100000) / 1000
text = "".join(",".join(["%.6g" % x] * COLUMNS) + "\n" for x in block)
with os.fdopen(number, "w") as file:
    file.write("a,b,c,d,e,f,g,h,i,j\n")
    for _ in range(ROWS // 10000):
        file.write(text)


def work():
    np.loadtxt(path, delimiter=",", skiprows=1)


try:
    serve(work)
finally:
    os.remove(path)
