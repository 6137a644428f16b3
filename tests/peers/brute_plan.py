"""Brute force over every (divider, length): an independent check of the planner.

Reads a JSON list of small problems on standard input and writes, for each, the
feasible combinations as the error bound of the planning theory has them:
suprema by dense sampling (so never above the true ones), kernels by summing
geometric series, every pair looked at.  NumPy only; shares no code with the
library.
"""
import json
import sys

import numpy as np

# Coefficients: Harris 1978 (rectangle, Hann), GHS 2002 (HFT70).
COSINES = {
    "rectangular": [1.0],
    "hann": [0.5, 0.5],
    "hft70": [1.0, 1.90796, 1.07349, 0.18199],
}
POINTS = 5


def gain(window, x, n):
    """Kernel x bins off, from the sums over 0 <= m < n of exp(2 pi i (x + k) m / n).

    Geometric series: all k share the numerator, as k makes whole turns.
    """
    a = COSINES[window]
    numerator = 1 - np.exp(2j * np.pi * x)
    step = np.exp(2j * np.pi * x / n)
    total = np.zeros(len(n), complex)
    for k in range(1 - len(a), len(a)):
        denominator = 1 - step * np.exp(2j * np.pi * k / n)
        near = np.abs(denominator) < 1e-12
        series = np.where(near, n, numerator / np.where(near, 1, denominator))
        weight = a[0] if k == 0 else (-1) ** k * a[abs(k)] / 2
        total += weight * series
    return np.abs(total) / (a[0] * n)


def noise_bandwidth(window):
    a = COSINES[window]
    return (a[0] ** 2 + sum(c * c for c in a[1:]) / 2) / a[0] ** 2


def butterworth(hz, corner, order):
    return 1 / np.sqrt(1 + (hz / corner) ** (2 * order))


def line_ratio(problem, line, rate, n, window, reading, points):
    """Error over tolerance of one line, for arrays of rates and lengths."""
    t = n / rate
    corner = problem["corner"] * rate

    def amplify(hz):
        if not problem["order"]:
            return np.ones(len(n))
        return butterworth(hz, corner, problem["order"])

    def places(spread):
        return np.linspace(-1, 1, points) if spread and points > 1 else [0.0]

    nominal = amplify(line["hz"])
    drift = line["hz"] * line["drift"]
    droop = np.zeros(len(n))
    for e in (-1, 1):
        droop = np.maximum(droop, abs(amplify(line["hz"] + e * drift) / nominal - 1))
    own = np.zeros(len(n))
    most = np.zeros(len(n))
    for e in places(drift):
        true = line["hz"] + e * drift
        read = np.rint(line["hz"] * t) / t if reading == "bin" else true
        image = gain(window, (true + read) * t, n)
        others = np.zeros(len(n))
        for other in problem["sources"]:
            if other is line:
                continue
            spread = other["hz"] * other["drift"]
            size = other["most"] / nominal
            size = size * np.maximum(amplify(other["hz"] - spread), amplify(other["hz"] + spread))
            sup = np.zeros(len(n))
            mirrored = np.zeros(len(n))
            for d in places(spread):
                hz = other["hz"] + d * spread
                sup = np.maximum(sup, gain(window, (hz - read) * t, n))
                mirrored = np.maximum(mirrored, gain(window, (hz + read) * t, n))
            others += size * (sup + mirrored)
        if reading == "bin":
            lobe = np.abs(gain(window, (true - read) * t, n) - 1)
            own = np.maximum(own, lobe + image)
        else:
            own = np.maximum(own, image)
        most = np.maximum(most, others)
    folded = amplify(line["hz"]) ** 2
    if problem["order"]:
        for k in range(1, 9):
            for side in (-1, 1):
                folded = folded + amplify(k * rate + side * line["hz"]) ** 2
    sigma = problem["noise"] * np.sqrt(folded * noise_bandwidth(window) / t) / nominal
    error = (own + droop) * line["least"] + most + 3 * sigma
    return error / (line["tolerance"] * line["least"])


def pairs_of(problem, window):
    """All admissible (divider, length), as two arrays."""
    lengths = np.arange(problem["samples"][0], problem["samples"][1] + 1)
    least = max(16, 4 * (len(COSINES[window]) + 1))
    lengths = lengths[(lengths % problem["block"] == 0) & (lengths >= least)].astype(float)
    top = max(s["hz"] * (1 + s["drift"]) for s in problem["sources"][: problem["lines"]])
    dividers = np.arange(problem["dividers"][0], problem["dividers"][1] + 1)
    dividers = dividers[problem["clock"] / dividers > 2 * top].astype(float)
    return np.repeat(dividers, len(lengths)), np.tile(lengths, len(dividers))


def solve(problem):
    """Rows divider, length, window, reading, ratio of all that (nearly) hold.

    A combination is dropped as soon as some of its places already exceed the
    tolerance: more places can only make it worse.
    """
    rows = []
    for window in problem["windows"]:
        divider, n = pairs_of(problem, window)
        for reading in problem["readings"]:
            d, m, worst = divider, n, np.zeros(len(n))
            for points in (1, POINTS):
                for line in problem["sources"][: problem["lines"]]:
                    found = line_ratio(problem, line, problem["clock"] / d, m, window, reading,
                                       points)
                    worst = np.maximum(worst, found)
                    keep = worst <= 1.02
                    d, m, worst = d[keep], m[keep], worst[keep]
            rows += [[int(a), int(b), window, reading, float(c)] for a, b, c in zip(d, m, worst)]
    return rows


if __name__ == "__main__":
    json.dump([solve(p) for p in json.load(sys.stdin)], sys.stdout)
