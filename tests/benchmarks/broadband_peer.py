#!/usr/bin/env python3
"""What a practitioner writes for an impedance from two channels of noise: SciPy's welch and csd.

Arguments: file of float64, current first, then voltage; length of the segments. Prints seconds by the clock and of the
processor, and the modulus of the ratio in the bin at a tenth of the sample rate.
"""
import sys
import time

import numpy as np
from scipy import signal


def main():
    both = np.fromfile(sys.argv[1])
    i, v = both[:len(both) // 2], both[len(both) // 2:]
    n = int(sys.argv[2])
    began, busy = time.perf_counter(), time.process_time()
    _, sii = signal.welch(i, nperseg=n)
    _, svv = signal.welch(v, nperseg=n)
    _, siv = signal.csd(i, v, nperseg=n)
    z = siv / sii
    g = np.abs(siv) ** 2 / (sii * svv)
    averages = 0.947 * (2 * len(i) / n - 1)
    error = np.sqrt((1 - g) / (2 * g * averages))
    print("%.9g %.9g %.17g %.9g" % (time.perf_counter() - began, time.process_time() - busy, abs(z[n // 10]), error[n // 10]))


if __name__ == "__main__":
    main()
