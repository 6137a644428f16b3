"""Mean one-sided power density (scipy.signal.welch) of doubles in a file over
bands: FILE RATE LOW HIGH [LOW HIGH ...]; a number per band."""
import sys

import numpy as np
from scipy import signal

x = np.fromfile(sys.argv[1])
f, p = signal.welch(x, float(sys.argv[2]), nperseg=1024)
edges = [float(a) for a in sys.argv[3:]]
for low, high in zip(edges[::2], edges[1::2]):
    print(p[(f >= low) & (f <= high)].mean())
