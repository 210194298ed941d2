#!/usr/bin/python3
"""What a user would otherwise write: reads a recording with pandas (WAV: SciPy), fits one decaying cosine from the release on
with scipy.optimize.curve_fit, prints frequency and damping ratio. No choice of the window by noise, no interval that holds in
coloured noise, one method. `scipy_fit.py --read FILE` only reads and prints the seconds that took, imports not counted;
`--numpy` reads with numpy.loadtxt."""
import sys
import time

import numpy as np


def read(path, with_numpy):
    if path.endswith(".wav"):
        from scipy.io import wavfile

        rate, samples = wavfile.read(path)
        return np.arange(samples.size) / rate, samples.astype(float)
    if with_numpy:
        table = np.loadtxt(path, delimiter=",", skiprows=1)
        return table[:, 0], table[:, 1]
    import pandas

    table = pandas.read_csv(path)
    return table.iloc[:, 0].to_numpy(), table.iloc[:, 1].to_numpy()


def fit(t, y):
    from scipy.optimize import curve_fit

    release = len(y) - 1 - np.argmax(y[::-1] > 0.98 * y.max())  # the last sample that is still held
    t, y = t[release:] - t[release], y[release:]
    crossings = np.flatnonzero(np.diff(np.signbit(y[: len(y) // 4])))
    # Crossings of noise cluster; half a period apart at the least are those of the decay.
    spacing = np.median(np.diff(crossings[np.diff(crossings, prepend=-10**9) > 0.01 * len(y) / 100]))
    omega = np.pi / (spacing * (t[1] - t[0]))
    spectrum = np.abs(np.fft.rfft(y))
    spectrum[0] = 0.0
    omega = 2 * np.pi * np.argmax(spectrum) / (len(y) * (t[1] - t[0])) if not np.isfinite(omega) else omega

    def decay(t, a, b, s, w, offset):
        return np.exp(-s * t) * (a * np.cos(w * t) + b * np.sin(w * t)) + offset

    values, _ = curve_fit(decay, t, y, p0=[y[0], 0.0, 0.05 * omega, omega, 0.0])
    natural = np.hypot(values[2], values[3])
    return natural / (2 * np.pi), values[2] / natural


if __name__ == "__main__":
    flags, path = sys.argv[1:-1], sys.argv[-1]
    if "--read" in flags:
        import pandas  # noqa: F401  not counted

        begun = time.perf_counter()
        t, y = read(path, "--numpy" in flags)
        print(y.size, f"{time.perf_counter() - begun:.6f}")
    else:
        print(*fit(*read(path, "--numpy" in flags)))
