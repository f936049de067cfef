#!/usr/bin/env python3
"""Compares `spectrum` with SciPy: Welch's density under every window and detrending, sine tapers by scipy.fft.dst
vectors, chi-square limits, and the coefficients of every basis.

Usage: scripts/differential/spectrum.py PROGRAM      (run by scripts/differential/run)
"""

import json
import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np
import scipy.fft
import scipy.signal
import scipy.stats

RATE = 128.0
TOLERANCE = 1e-12

# The program's names and SciPy's windows, in their periodic form.
WINDOWS = {
    "hann": "hann",
    "rectangular": "boxcar",
    "hamming": "hamming",
    "blackman": "blackman",
    "blackman-harris": "blackmanharris",
    "nuttall": "nuttall",
    "flat-top-5": "flattop",
    "flat-top": ("general_cosine", [1.0, 1.933, 1.286, 0.388, 0.0322]),
    "flat-top-hft70": ("general_cosine", [1.0, 1.90796, 1.07349, 0.18199]),
    "flat-top-hft90d": ("general_cosine", [1.0, 1.942604, 1.340318, 0.440811, 0.043097]),
    "flat-top-hft95": ("general_cosine", [1.0, 1.9383379, 1.3045202, 0.4028270, 0.0350665]),
}

program = sys.argv[1]
passed = 0
worst = 0.0  # of what is held to TOLERANCE


def check(what, found, expected, tolerance=TOLERANCE):
    """Largest difference over the largest expected value."""
    global passed, worst
    found, expected = np.asarray(found, float), np.asarray(expected, float)
    assert found.shape == expected.shape, f"{what}: {found.shape} against {expected.shape}"
    error = np.abs(found - expected).max() / np.abs(expected).max()
    if tolerance == TOLERANCE:
        worst = max(worst, error)
    if not error <= tolerance:
        sys.exit(f"spectrum.py: {what}: {error:.2e}")
    passed += 1


def run(path, *options):
    done = subprocess.run([program, "spectrum", path, "--json", "--rate", f"{RATE}Hz", *options],
                          capture_output=True, text=True)
    if done.returncode != 0:
        sys.exit(f"spectrum.py: {options}: {done.stderr}")
    return json.loads(done.stdout)["channels"][0]["traces"][0]


def write(folder, x):
    path = Path(folder) / "record.csv"
    path.write_text("x\n" + "".join(f"{v!r}\n" for v in x.tolist()))
    return str(path)


def welch(path, x, name, segment, overlap, detrend):
    trace = run(path, "--window", name, "--segment", str(segment), "--overlap", str(overlap), "--detrend", detrend)
    density = trace["density"]
    series = density["series"]
    centred = {"mean": x - x.mean(), "none": x, "segment-mean": x, "segment-line": x,
               "line": scipy.signal.detrend(x, type="linear")}[detrend]
    inside = {"segment-mean": "constant", "segment-line": "linear"}.get(detrend, False)
    window = WINDOWS[name]
    samples = (scipy.signal.windows.general_cosine(segment, window[1], sym=False)
               if isinstance(window, tuple) else scipy.signal.get_window(window, segment))
    shared = int(np.floor(overlap * segment))
    f, p = scipy.signal.welch(centred, RATE, window=samples, nperseg=segment, noverlap=shared, detrend=inside)
    what = f"welch {name} {segment} {overlap} {detrend}"
    check(what + " frequencies", series["frequency"], f)
    check(what, series["density"], p)
    # Degrees of freedom as Welch 1967 states them, and limits by SciPy's chi-square.
    hop, count = segment - shared, density["segments"]["count"]
    total = 1.0
    for j in range(1, count):
        if j * hop >= segment:
            break
        rho = (samples[: segment - j * hop] @ samples[j * hop:]) / (samples @ samples)
        total += 2 * (1 - j / count) * rho**2
    nu = 2 * count / total
    middle = len(p) // 2
    check(what + " freedom", [series["freedom"][middle]], [nu], 1e-9)
    check(what + " bandwidth", [density["noise_bandwidth"][0]],
          [RATE * (samples @ samples) / samples.sum() ** 2])
    check(what + " limits", [series["lower"][middle], series["upper"][middle]],
          [nu * p[middle] / scipy.stats.chi2.ppf(0.975, nu), nu * p[middle] / scipy.stats.chi2.ppf(0.025, nu)], 1e-7)


def sine(path, x, tapers):
    series = run(path, "--method", f"sine:{tapers}", "--detrend", "mean")["density"]["series"]
    n = len(x)
    centred = x - x.mean()
    tapers_by_row = scipy.fft.idst(np.eye(n)[:tapers], type=1, norm="ortho")  # the DST-I vectors
    lines = np.arange((n + 1) // 2 + 1)
    kernel = np.exp(-2j * np.pi * np.outer(lines, np.arange(1, n + 1)) / (n + 1))
    p = (np.abs(kernel @ (tapers_by_row * centred).T) ** 2).mean(axis=1) * 2 / RATE
    p[0] /= 2
    if (n + 1) % 2 == 0:
        p[-1] /= 2
    check(f"sine {tapers} {n}", series["density"], p)


def basis(path, x, extension, seat, forward):
    series = run(path, "--method", "basis", "--extension", extension, "--baseline", "none", "--seat", seat)
    check(f"basis {extension} {seat}", series["coefficients"]["series"]["value"], forward(x))


def main():
    random = np.random.default_rng(20240607)
    with tempfile.TemporaryDirectory() as folder:
        for n in (997, 4096):
            x = np.cumsum(random.standard_normal(n)) * 0.1 + random.standard_normal(n) + 3
            path = write(folder, x)
            for name in WINDOWS:
                welch(path, x, name, 128, 0.5, "mean")
            for segment, overlap, detrend in [(127, 0.66, "segment-mean"), (256, 0.0, "segment-line"), (n, 0.5, "none"),
                                              (60, 0.75, "line")]:
                welch(path, x, "hann", segment, overlap, detrend)
            for tapers in (1, 6, 25):
                if n < 2000:
                    sine(path, x, tapers)
        x = random.standard_normal(512)
        path = write(folder, x)
        basis(path, x, "even", "half-sample", lambda v: scipy.fft.dct(v, 2, norm="ortho"))
        basis(path, x, "odd", "half-sample", lambda v: scipy.fft.dst(v, 2, norm="ortho"))
        basis(path, x, "even-odd", "half-sample", lambda v: scipy.fft.dct(v, 4, norm="ortho"))
        basis(path, x, "odd-even", "half-sample", lambda v: scipy.fft.dst(v, 4, norm="ortho"))
        basis(path, x, "odd", "whole-sample", lambda v: scipy.fft.dst(v, 1, norm="ortho"))
    print(f"spectrum.py: {passed} passed, worst {worst:.1e}")


main()
