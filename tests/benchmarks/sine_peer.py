#!/usr/bin/env python3
"""What a practitioner writes for two channels of one sine: FFT start, then SciPy's curve_fit on all samples.

Argument: file of float64, first channel then second. Prints seconds by the clock and of the processor, frequency in rad
per sample, modulus and argument of the ratio of the phasors.
"""
import sys
import time

import numpy as np
from scipy.optimize import curve_fit


def main():
    both = np.fromfile(sys.argv[1])
    v, i = both[:len(both) // 2], both[len(both) // 2:]
    began, began_busy = time.perf_counter(), time.process_time()
    count = len(v)
    n = np.arange(count) - (count - 1) / 2
    window = np.hanning(count)
    lines = np.abs(np.fft.rfft((v - v.mean()) * window))
    k = int(np.argmax(lines[1:-1])) + 1
    left, middle, right = np.log(lines[k - 1:k + 2] + 1e-300)
    omega = 2 * np.pi * (k + 0.5 * (left - right) / (left - 2 * middle + right)) / count
    basis = np.stack([np.cos(omega * n), -np.sin(omega * n), np.ones(count)], axis=1)
    x = [np.linalg.lstsq(basis, y, rcond=None)[0] for y in (v, i)]
    sigma = np.concatenate([np.full(count, np.std(y - basis @ p)) for y, p in zip((v, i), x)])
    del basis

    def model(_, w, va, vb, vc, ia, ib, ic):
        c, s = np.cos(w * n), np.sin(w * n)
        return np.concatenate([va * c - vb * s + vc, ia * c - ib * s + ic])

    best, _ = curve_fit(model, n, np.concatenate([v, i]), p0=[omega, *x[0], *x[1]], sigma=sigma)
    ratio = (best[1] + 1j * best[2]) / (best[4] + 1j * best[5])
    print("%.9g %.9g %.17g %.17g %.17g" % (time.perf_counter() - began, time.process_time() - began_busy, best[0],
                                           abs(ratio), np.angle(ratio)))


if __name__ == "__main__":
    main()
