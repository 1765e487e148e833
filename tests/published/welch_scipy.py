#!/usr/bin/env python3
"""scipy.signal.welch, csd and coherence of two channels.

Arguments: file of float64 (first channel, then second), length of the segments. Prints one line per bin: frequency in
cycles per sample, power of x, power of y, real and imaginary part of the cross power, coherence.
"""
import sys

import numpy as np
from scipy import signal

both = np.fromfile(sys.argv[1])
x, y = both[:len(both) // 2], both[len(both) // 2:]
n = int(sys.argv[2])
f, xx = signal.welch(x, nperseg=n)
_, yy = signal.welch(y, nperseg=n)
_, xy = signal.csd(x, y, nperseg=n)
_, g = signal.coherence(x, y, nperseg=n)
for row in zip(f, xx, yy, xy.real, xy.imag, g):
    print(" ".join("%.17g" % v for v in row))
