#!/usr/bin/env python3
"""Fits one damped sine to every sample of a window with SciPy's curve_fit.

Arguments: file of one number a line, sample interval in s, starts for decay rate (1/s) and angular frequency (rad/s).
Prints decay rate and angular frequency with their standard deviations, in SI.
"""
import sys

import numpy as np
from scipy.optimize import curve_fit


def main():
    y = np.loadtxt(sys.argv[1])
    step, alpha, omega = (float(v) for v in sys.argv[2:5])
    n = np.arange(len(y))

    def model(n, a, w, x, z, c):
        return np.exp(-a * n) * (x * np.cos(w * n) + z * np.sin(w * n)) + c

    start = [alpha * step, omega * step, y[0], 0.0, 0.0]
    basis = np.stack([np.exp(-start[0] * n) * np.cos(start[1] * n), np.exp(-start[0] * n) * np.sin(start[1] * n),
                      np.ones(len(y))], axis=1)
    start[2:] = np.linalg.lstsq(basis, y, rcond=None)[0]
    best, covariance = curve_fit(model, n, y, p0=start, xtol=1e-12, ftol=1e-14)
    u = np.sqrt(np.diag(covariance))
    print("%.17g %.17g %.17g %.17g" % (best[0] / step, best[1] / step, u[0] / step, u[1] / step))


if __name__ == "__main__":
    main()
