"""Analyses of doubles in a file by numpy and SciPy, a number per line: FILE hilbert | cepstrum |
power_cepstrum | kurtosis SEGMENT | band RATE LOW HIGH [LOW HIGH ...] (mean squares of Butterworth
band-passes of order 6 in the time domain, the first half left out)."""
import sys

import numpy as np

x, mode, rest = np.fromfile(sys.argv[1]), sys.argv[2], sys.argv[3:]
if mode in ("hilbert", "kurtosis", "band"):
    from scipy import signal
if mode == "hilbert":
    out = np.abs(signal.hilbert(x))
elif mode == "cepstrum":
    out = np.fft.ifft(np.log(np.abs(np.fft.fft(x)))).real
elif mode == "power_cepstrum":
    out = np.fft.ifft(np.log(np.abs(np.fft.fft(x)) ** 2)).real ** 2
elif mode == "kurtosis":
    n = int(rest[0])
    _, _, z = signal.stft(x, window="hann", nperseg=n, noverlap=0, boundary=None, padded=False,
                          detrend=False)
    p = np.abs(z) ** 2
    out = np.mean(p ** 2, axis=1) / np.mean(p, axis=1) ** 2 - 2
else:
    rate, *edges = map(float, rest)
    out = []
    for edge in zip(edges[::2], edges[1::2]):
        sos = signal.butter(6, edge, "bandpass", fs=rate, output="sos")
        out.append(np.mean(signal.sosfilt(sos, x)[x.size // 2:] ** 2))
for value in out:
    print(repr(float(value)))
