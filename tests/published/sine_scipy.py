#!/usr/bin/env python3
"""Fits one common sine to two channels with SciPy's curve_fit, every sample weighted by its channel's noise.

Arguments: file with two numbers a line, start for the angular frequency in rad per sample, noise of both channels.
Prints frequency (rad per sample), modulus and argument of the ratio of the phasors, and their standard deviations.
"""
import sys

import numpy as np
from scipy.optimize import curve_fit


def main():
    y = np.loadtxt(sys.argv[1])
    omega, noise_v, noise_i = (float(v) for v in sys.argv[2:5])
    count = len(y)
    n = np.arange(count) - (count - 1) / 2

    def model(_, w, va, vb, vc, ia, ib, ic):
        c, s = np.cos(w * n), np.sin(w * n)
        return np.concatenate([va * c - vb * s + vc, ia * c - ib * s + ic])

    basis = np.stack([np.cos(omega * n), -np.sin(omega * n), np.ones(count)], axis=1)
    start = [omega, *np.linalg.lstsq(basis, y[:, 0], rcond=None)[0], *np.linalg.lstsq(basis, y[:, 1], rcond=None)[0]]
    sigma = np.concatenate([np.full(count, noise_v), np.full(count, noise_i)])
    best, covariance = curve_fit(model, n, y.T.ravel(), p0=start, sigma=sigma, absolute_sigma=True, xtol=1e-13, ftol=1e-14)
    v, i = best[1] + 1j * best[2], best[4] + 1j * best[5]
    z = v / i
    log_slope = np.zeros((2, 7))
    log_slope[:, 1] = [(1 / v).real, (1 / v).imag]
    log_slope[:, 2] = [(1j / v).real, (1j / v).imag]
    log_slope[:, 4] = [-(1 / i).real, -(1 / i).imag]
    log_slope[:, 5] = [-(1j / i).real, -(1j / i).imag]
    u = np.sqrt(np.diag(log_slope @ covariance @ log_slope.T))
    print("%.17g %.17g %.17g %.17g %.17g %.17g"
          % (best[0], abs(z), np.angle(z), np.sqrt(covariance[0, 0]), abs(z) * u[0], u[1]))


if __name__ == "__main__":
    main()
