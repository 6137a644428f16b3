"""What NumPy and SciPy make of a record, for comparison.

records.py DOUBLES REQUESTS: a file of little-endian doubles and a file of
requests, a line each; prints a line of numbers per request.

  first N                     from here on the record is the first N of all
  trend mean|linear           scipy.signal.detrend
  moments                     var (ddof 1), skew, kurtosis (fisher False)
  percentile P...             numpy.percentile
  cumsum | diff
  causal SHAPE ORDER RIPPLE STOP BAND RATE EDGE...          sosfilt
  gain ...the same...         |sosfreqz| at 64 places up to half the rate
  both KIND PAD SHAPE ...     sosfiltfilt with padtype and padlen
  window BAND TAPS BETA EDGE... (shares of the rate)        firwin
  resample UP DOWN TAPS BETA  resample_poly with window = firwin taps
  kaiser DB WIDTH             kaiserord (width as share of the rate)
"""
import sys

import numpy as np
from scipy import signal, stats

whole = np.fromfile(sys.argv[1])
x = whole
BANDS = {"low": "lowpass", "high": "highpass", "pass": "bandpass",
         "stop": "bandstop"}


def sections(words):
    shape, order, ripple, stop, band, rate = words[:6]
    edges = [float(w) for w in words[6:]]
    edges = edges if len(edges) > 1 else edges[0]
    common = dict(btype=BANDS[band], fs=float(rate), output="sos")
    order = int(order)
    if shape == "butterworth":
        return signal.butter(order, edges, **common)
    if shape == "chebyshev":
        return signal.cheby1(order, float(ripple), edges, **common)
    if shape == "bessel":
        return signal.bessel(order, edges, norm="mag", **common)
    return signal.ellip(order, float(ripple), float(stop), edges, **common)


def window(words):
    edges = [2 * float(w) for w in words[3:]]
    edges = edges if len(edges) > 1 else edges[0]
    return signal.firwin(int(words[1]), edges,
                         window=("kaiser", float(words[2])),
                         pass_zero=BANDS[words[0]])


def resample(words):
    up, down, taps = int(words[0]), int(words[1]), int(words[2])
    h = signal.firwin(taps, 1 / max(up, down),
                      window=("kaiser", float(words[3])))
    return signal.resample_poly(x, up, down, window=h)


def answer(name, words):
    if name == "trend":
        return signal.detrend(
            x, type="constant" if words[0] == "mean" else "linear")
    if name == "moments":
        return [np.var(x, ddof=1), stats.skew(x),
                stats.kurtosis(x, fisher=False)]
    if name == "percentile":
        return np.percentile(x, [float(w) for w in words])
    if name == "cumsum":
        return np.cumsum(x)
    if name == "diff":
        return np.diff(x)
    if name == "causal":
        return signal.sosfilt(sections(words), x)
    if name == "gain":
        places = np.arange(64) / 63 * np.pi
        return np.abs(signal.sosfreqz(sections(words), places)[1])
    if name == "both":
        return signal.sosfiltfilt(sections(words[2:]), x, padtype=words[0],
                                  padlen=int(words[1]))
    if name == "window":
        return window(words)
    if name == "resample":
        return resample(words)
    if name == "kaiser":
        return signal.kaiserord(float(words[0]), 2 * float(words[1]))
    raise ValueError(name)


for line in open(sys.argv[2]):
    words = line.split()
    if words[0] == "first":
        x = whole[:int(words[1])]
        print(len(x))
        continue
    print(" ".join("%.17g" % v for v in answer(words[0], words[1:])))
