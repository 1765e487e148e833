#!/usr/bin/env python3
"""What a practitioner writes for a coil's sweep: SciPy's least_squares on relative complex residuals over log parameters.

Arguments: file of float64 (all f, all Re Z, all Im Z), relative error, elements (3: R L C, 4: parallel conductance too, 5: skin
resistance too), rounds. Start: L from the median of Im Z/w where the phase is inductive, R from the first point, C from the largest |Z|.
Prints the best seconds of the rounds by the clock and of the processor, chi-square, and the parameters.
"""
import sys
import time

import numpy as np
from scipy.optimize import least_squares


def impedance(log_p, f, f_ref):
    p, w = np.exp(log_p), 2 * np.pi * f
    series = p[0] + 1j * w * p[1]
    if len(p) > 4:
        series = series + (1 + 1j) * p[4] * np.sqrt(f / f_ref)
    y = 1 / series + 1j * w * p[2]
    return 1 / (y + p[3]) if len(p) > 3 else 1 / y


def begin(f, z, elements):
    w = 2 * np.pi * f
    inductive = np.angle(z) > 0.35
    inductance = np.median(z.imag[inductive] / w[inductive]) if inductive.any() else abs(z[0]) / w[-1]
    top = int(np.argmax(np.abs(z)))
    resonance = w[top] if 0 < top < len(f) - 1 else 3 * w[-1]
    resistance = max(z[0].real, 1e-3 * abs(z[0]))
    return np.log([resistance, inductance, 1 / (inductance * resonance ** 2), 0.1 / np.abs(z).max(), resistance][:elements])


def main():
    data = np.fromfile(sys.argv[1]).reshape(3, -1)
    f, z = data[0], data[1] + 1j * data[2]
    relative, elements, rounds = float(sys.argv[2]), int(sys.argv[3]), int(sys.argv[4])
    f_ref = np.sqrt(f[0] * f[-1])

    def residuals(log_p):
        r = (impedance(log_p, f, f_ref) - z) / (relative * np.abs(z))
        return np.concatenate([r.real, r.imag])

    clock = busy = np.inf
    for _ in range(rounds):
        began, began_busy = time.perf_counter(), time.process_time()
        found = least_squares(residuals, begin(f, z, elements), method="lm", max_nfev=2000)
        clock = min(clock, time.perf_counter() - began)
        busy = min(busy, time.process_time() - began_busy)
    values = list(np.exp(found.x)) + [0.0] * (5 - elements)
    print("%.9g %.9g %.12g " % (clock, busy, 2 * found.cost) + " ".join("%.15g" % v for v in values))


if __name__ == "__main__":
    main()
