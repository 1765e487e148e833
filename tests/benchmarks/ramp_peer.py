#!/usr/bin/env python3
"""Saturation the usual way: a gradient of smoothed flux and current. Reads rows "v i" from a file; prints, for the smoothing window (share of the
record) given, I_sat at 10, 20 and 30 % and the seconds of one evaluation."""
import sys
import time

import numpy as np
from scipy.integrate import cumulative_trapezoid
from scipy.signal import savgol_filter


def evaluate(v, i, dt, ohm, share):
    flux = cumulative_trapezoid(v - ohm * i, dx=dt, initial=0)
    window = int(len(flux) * share) | 1
    flux, current = savgol_filter(flux, window, 3), savgol_filter(i, window, 3)
    inductance = np.gradient(flux) / np.gradient(current)
    base = np.median(inductance[(current > 0.05 * current.max()) & (current < 0.25 * current.max())])
    out = []
    for drop in (0.1, 0.2, 0.3):
        above = np.nonzero(inductance >= (1 - drop) * base)[0]
        out.append(float(current[min(above[-1] + 1, len(current) - 1)]))
    return out


def main():
    rows = np.loadtxt(sys.argv[1])
    dt, ohm, share = float(sys.argv[2]), float(sys.argv[3]), float(sys.argv[4])
    v, i = rows[:, 0].copy(), rows[:, 1].copy()
    result = evaluate(v, i, dt, ohm, share)
    times = []
    for _ in range(7):
        start = time.perf_counter()
        evaluate(v, i, dt, ohm, share)
        times.append(time.perf_counter() - start)
    print(*result, min(times))


if __name__ == "__main__":
    main()
