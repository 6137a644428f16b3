"""Brute force over every (divider, length): an independent check of the planner.

Reads a JSON list of small problems on standard input and writes, for each, the
feasible combinations as the error bound of the planning theory has them:
suprema by dense sampling (so never above the true ones), kernels by summing
geometric series, no shortcut of any kind.  NumPy only; shares no code with the
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
POINTS = 9


def series(x, n):
    """Sum over 0 <= m < n of exp(2 pi i x m / n)."""
    theta = 2 * np.pi * x / n
    near = np.abs(np.sin(theta / 2)) < 1e-12
    safe = np.where(near, 0.5, theta)
    value = (1 - np.exp(1j * safe * n)) / (1 - np.exp(1j * safe))
    return np.where(near, n, value)


def gain(window, x, n):
    a = COSINES[window]
    total = a[0] * series(x, n)
    for k in range(1, len(a)):
        total = total + (-1) ** k * a[k] / 2 * (series(x + k, n) + series(x - k, n))
    return np.abs(total) / (a[0] * n)


def noise_bandwidth(window):
    a = COSINES[window]
    return (a[0] ** 2 + sum(c * c for c in a[1:]) / 2) / a[0] ** 2


def peak(window):
    if window != "hft70":
        return 1.0
    return np.max(gain(window, np.linspace(0, 1.5, 3001), 4096))


def butterworth(hz, corner, order):
    return 1 / np.sqrt(1 + (hz / corner) ** (2 * order))


def ratio(problem, divider, n, window, reading):
    """Worst error over tolerance of all lines, for an array n of lengths."""
    rate = problem["clock"] / divider
    t = n / rate
    worst = np.zeros(len(n))
    corner = problem["corner"] * rate

    def amplify(hz):
        return butterworth(hz, corner, problem["order"]) if problem["order"] else 1.0

    sources = problem["sources"]
    for line in sources[: problem["lines"]]:
        own = np.zeros(len(n))
        nominal = amplify(line["hz"])
        drift = line["hz"] * line["drift"]
        droop = 0.0
        for e in (-1, 1):
            droop = max(droop, abs(amplify(line["hz"] + e * drift) / nominal - 1))
        places = np.linspace(-1, 1, POINTS if drift else 1)
        most = np.zeros(len(n))
        for e in places:
            true = line["hz"] + e * drift
            read = np.rint(line["hz"] * t) / t if reading == "bin" else true
            image = gain(window, (true + read) * t, n)
            others = np.zeros(len(n))
            for other in sources:
                if other is line:
                    continue
                spread = other["hz"] * other["drift"]
                size = other["most"] / nominal
                size *= max(amplify(other["hz"] + s * spread) for s in (-1, 1))
                sup = np.zeros(len(n))
                mirrored = np.zeros(len(n))
                for d in np.linspace(-1, 1, POINTS if spread else 1):
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
            folded += sum(
                amplify(k * rate + side * line["hz"]) ** 2
                for k in range(1, 9) for side in (-1, 1)
            )
        sigma = problem["noise"] * np.sqrt(folded * noise_bandwidth(window) / t) / nominal
        error = (own + droop) * line["least"] + most + 3 * sigma
        worst = np.maximum(worst, error / (line["tolerance"] * line["least"]))
    return worst


def solve(problem):
    lengths = np.arange(problem["samples"][0], problem["samples"][1] + 1)
    lengths = lengths[lengths % problem["block"] == 0].astype(float)
    top = max(s["hz"] * (1 + s["drift"]) for s in problem["sources"][: problem["lines"]])
    rows = []
    for divider in range(problem["dividers"][0], problem["dividers"][1] + 1):
        if problem["clock"] / divider <= 2 * top:
            continue
        for window in problem["windows"]:
            least = 4 * (len(COSINES[window]) + 1)
            n = lengths[lengths >= max(16, least)]
            for reading in problem["readings"]:
                if len(n) == 0:
                    continue
                worst = ratio(problem, divider, n, window, reading)
                for k in np.flatnonzero(worst <= 1.02):
                    rows.append([divider, int(n[k]), window, reading, float(worst[k])])
    return rows


if __name__ == "__main__":
    json.dump([solve(p) for p in json.load(sys.stdin)], sys.stdout)
