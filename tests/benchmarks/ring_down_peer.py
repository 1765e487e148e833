#!/usr/bin/python3
"""What a practitioner writes with general-purpose libraries: the peer of ring_down_benchmark.

v(t) = A exp(-a t) cos(w t + p) + c. The largest FFT line and a log-envelope slope give the start, scipy's curve_fit
(Levenberg-Marquardt on every sample) does the rest. Reads float64 samples from a file; prints seconds, seconds of
processor time, a and w (per sample). Reading the file is not timed.

usage: ring_down_peer.py FILE
"""
import sys
import time

import numpy as np
from scipy.optimize import curve_fit


def model(t, A, a, w, p, c):
    return A * np.exp(-a * t) * np.cos(w * t + p) + c


def start(t, v):
    n = len(v)
    dt = t[1] - t[0]
    c = v[-max(1, n // 10):].mean()
    y = v - c
    spectrum = np.abs(np.fft.rfft(y))
    k = 1 + int(np.argmax(spectrum[1:]))
    w = 2 * np.pi * k / (n * dt)
    # Log-envelope slope from the r.m.s. of 40 chunks that stand above the tail.
    m = n // 40
    rms = np.sqrt((y[:40 * m].reshape(40, m) ** 2).mean(axis=1))
    tc = (np.arange(40) + 0.5) * m * dt
    keep = rms > 3 * rms[-4:].mean()
    if keep.sum() < 3:
        keep = np.arange(40) < 3
    slope, _ = np.polyfit(tc[keep], np.log(rms[keep]), 1)
    a = max(-slope, 0.1 / (n * dt))
    envelope = np.exp(-a * t)
    basis = np.stack([envelope * np.cos(w * t), -envelope * np.sin(w * t)], axis=1)
    stride = max(1, n // 20000)
    x, *_ = np.linalg.lstsq(basis[::stride], y[::stride], rcond=None)
    return [np.hypot(*x), a, w, np.arctan2(x[1], x[0]), c]


def main():
    v = np.fromfile(sys.argv[1])
    dt = 1e-8
    t = np.arange(len(v)) * dt
    began, busy = time.perf_counter(), time.process_time()
    p, _ = curve_fit(model, t, v, p0=start(t, v))
    seconds, busy = time.perf_counter() - began, time.process_time() - busy
    print(f"{seconds:.9g} {busy:.9g} {p[1] * dt:.17g} {p[2] * dt:.17g}")


if __name__ == "__main__":
    main()
