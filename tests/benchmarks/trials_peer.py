"""Propagation of distributions (JCGM 101) as a practitioner writes it with NumPy: draw all, evaluate all, sort.

usage: trials_peer.py TRIALS    one line: seconds, processor seconds, then mean, u, low, high of L, R, Q
"""
import sys
import time

import numpy as np


def summary(x):
    s = np.sort(x)
    n = len(s)
    inside = int(0.95 * n + 0.5)
    widths = s[inside:] - s[: n - inside]
    shortest = int(np.argmin(widths))
    low = (n - inside) // 2
    return [x.mean(), x.std(ddof=1), s[low], s[low + inside], s[shortest], s[shortest + inside]]


n = int(sys.argv[1])
began, busy = time.perf_counter(), time.process_time()
rng = np.random.default_rng(1)
z1, z2 = rng.standard_normal(n), rng.standard_normal(n)
a = 6e4 + 45.0 * z1
w = 1.2e6 + 43.0 * (0.1 * z1 + np.sqrt(1 - 0.01) * z2)
c = 1e-9 * (1 + 0.005 * rng.standard_normal(n))
r_c = rng.uniform(0.1, 0.3, n)
square = w * w + a * a
inductance = 1 / (c * square)
resistance = 2 * a * inductance - r_c
q = np.sqrt(square) * inductance / resistance
figures = [v for x in (inductance, resistance, q) for v in summary(x)]
print(time.perf_counter() - began, time.process_time() - busy, *map(repr, map(float, figures)))
