#!/usr/bin/env python3
"""Fits a coil's circuit to a sweep with SciPy's least_squares on ln(Z_model/Z), derivatives by differences.

Arguments: file with f, Re Z, Im Z a line; relative error; f_ref; start values: R L C, G, R_skin.
Prints chi-square, the parameters, and their standard deviations (natural).
"""
import sys

import numpy as np
from scipy.optimize import least_squares


def main():
    table = np.loadtxt(sys.argv[1])
    f, z = table[:, 0], table[:, 1] + 1j * table[:, 2]
    relative, f_ref = float(sys.argv[2]), float(sys.argv[3])
    start = np.array([float(v) for v in sys.argv[4:9]])
    s = 2j * np.pi * f

    def residuals(scaled):
        r, l, c, g, skin = scaled * start
        model = 1 / (1 / (r + s * l + (1 + 1j) * skin * np.sqrt(f / f_ref)) + s * c + g)
        off = np.log(model / z) / relative
        return np.concatenate([off.real, off.imag])

    found = least_squares(residuals, np.ones(5), jac="3-point", xtol=1e-14, ftol=1e-14, gtol=1e-14, max_nfev=500)
    u = np.sqrt(np.diag(np.linalg.inv(found.jac.T @ found.jac)))
    print(" ".join("%.15g" % v for v in [2 * found.cost, *(found.x * start), *(u * start)]))


if __name__ == "__main__":
    main()
