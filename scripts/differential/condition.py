#!/usr/bin/env python3
"""Compares `condition` with the same chain written in NumPy on the explicit extension, over whole records.

Every extension, baseline and shape, both seats, on random three-axis CSV records of awkward lengths; derivatives and
integrals included. The reference shares no code and no transform with the program: it lays out one whole period of the
extension sample by sample, multiplies its FFT by the gain, and cuts the record out again. The zero-phase Butterworth
gain is checked against scipy.signal as well (analogue response of scipy.signal.butter).

Usage: scripts/differential/condition.py PROGRAM      (run by scripts/differential/run)
"""

import json
import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np
import scipy.signal

EXTENSIONS = ["periodic", "even", "odd", "even-odd", "odd-even"]
BASELINES = ["none", "mean", "level:left", "level:right", "line", "slopes", "trend:0", "trend:1", "trend:2", "trend:3"]
RATE = 200.0
TOLERANCE = 1e-9  # of the record's RMS


# --- the extension, written out -------------------------------------------------------------------------------------

def positions(ext, seat, n):
    """First sample position and distance between the mirrors, in steps."""
    left_even = ext in ("even", "even-odd")
    right_even = ext in ("even", "odd-even")
    if ext == "periodic" or seat == "half-sample":
        return 0.5, float(n)
    first = 0.0 if left_even else 1.0
    return first, n - 1 + (0 if left_even else 1) + (0 if right_even else 1)


def one_period(x, ext, seat):
    """One period of the extension, starting with the record, and the sample positions' offset."""
    n = len(x)
    if ext == "periodic":
        return x.copy()
    left = 1 if ext in ("even", "even-odd") else -1
    right = 1 if ext in ("even", "odd-even") else -1
    if seat == "half-sample":
        once = np.concatenate([x, right * x[::-1]])
    else:
        tail = x[-2::-1] if right == 1 else np.concatenate([[0.0], -x[::-1]])
        once = np.concatenate([x, tail])
        if left == 1:
            once = once[:-1]            # the sample on the left mirror starts the next lap
        else:
            once = np.concatenate([once, [0.0]])
    if left == right:
        if left == -1 and seat == "whole-sample":
            return once
        return once
    return np.concatenate([once, -once])    # mixed ends: four laps


# --- the baseline, estimated again ----------------------------------------------------------------------------------

def noise_sigma(x):
    if len(x) < 4:
        return 0.0
    d = np.sort(np.abs(np.diff(x, 3)))
    return d[len(d) // 2] / (0.6745 * np.sqrt(20))


def end_estimates(x, first, lam, zone, sigma):
    n = len(x)
    t = first + np.arange(n)
    half = lam / 2
    low, high, value = -np.inf, np.inf, None
    w = 2
    while True:
        slope, at0 = np.polyfit(t[:w], x[:w], 1)
        tm = t[:w].mean()
        se = sigma * np.sqrt(1 / w + tm**2 / ((t[:w] - tm) ** 2).sum())
        low, high = max(low, at0 - 2 * se), min(high, at0 + 2 * se)
        if low > high and w > 2:
            break
        value = at0
        w *= 2
        if w > n or w > half:
            break
    ws = int(np.clip(min(round_half_away(half), zone), 2, max(n, 2)))
    slope = np.polyfit(t[:ws], x[:ws], 1)[0]
    wl = int(np.clip(round_half_away(lam / 8), 1, n))
    return value, slope, x[:wl].mean()


def round_half_away(v):
    return int(np.floor(v + 0.5))


def baseline(kind, x, ext, seat, lam, zone):
    """The polynomial in x steps from the left mirror."""
    n = len(x)
    first, length = positions(ext, seat, n)
    sigma = noise_sigma(x)
    left = end_estimates(x, first, lam, zone, sigma)
    right = end_estimates(x[::-1], length - (first + n - 1), lam, zone, sigma)
    P = np.polynomial.Polynomial
    if kind == "level":
        kind = {"even-odd": "level:right", "odd-even": "level:left"}[ext]
    if kind == "none":
        return P([0.0])
    if kind == "mean":
        return P([x.mean()])
    if kind == "level:left":
        return P([left[2]])
    if kind == "level:right":
        return P([right[2]])
    if kind == "line":
        return P([left[0], (right[0] - left[0]) / length])
    if kind == "slopes":
        s0, s1 = left[1], -right[1]
        return P([0.0, s0, (s1 - s0) / (2 * length)])
    degree = int(kind.split(":")[1])
    return P.fit(first + np.arange(n), x, degree).convert()


# --- the gains, from their published formulas -----------------------------------------------------------------------

def lowpass(shape, f, fc):
    name, _, par = shape.partition(":")
    with np.errstate(over="ignore"):
        if name == "butterworth":       # Butterworth 1930: |H|^2 = 1/(1 + (f/fc)^(2N))
            return 1 / (1 + (f / fc) ** (2 * int(par)))
        if name == "gaussian":          # ISO 16610-21: 50 % at the corner
            return 2.0 ** (-((f / fc) ** 2))
    if name == "cosine":                # raised cosine of full width par about the corner
        w = float(par.removesuffix("Hz"))
        u = np.clip((f - (fc - w / 2)) / w, 0, 1)
        return 0.5 * (1 + np.cos(np.pi * u))
    if name == "brickwall":
        return np.where(f < fc, 1.0, np.where(f > fc, 0.0, 0.5))
    raise ValueError(shape)


def gain(op, shape, f):
    kind, arg = op
    hz = [float(v.removesuffix("Hz")) for v in arg.replace("..", ":").split(":")]
    if kind == "lowpass":
        return lowpass(shape, f, hz[0])
    if kind == "highpass":
        return 1 - lowpass(shape, f, hz[0])
    if kind == "bandpass":
        return (1 - lowpass(shape, f, hz[0])) * lowpass(shape, f, hz[1])
    if kind == "bandstop":
        return 1 - (1 - lowpass(shape, f, hz[0])) * lowpass(shape, f, hz[1])
    if kind == "notch":
        f0, bw = hz
        name = shape.partition(":")[0]
        if name == "butterworth":
            a = (f**2 - f0**2) ** 2
            return a / (a + (f * bw) ** 2)
        if name == "gaussian":
            g = lambda d: 2.0 ** (-((2 * d / bw) ** 2))
            return 1 - (g(f - f0) + g(f + f0))
        return 1 - (1 - lowpass(shape, f, f0 - bw / 2)) * lowpass(shape, f, f0 + bw / 2)
    raise ValueError(op)


def series_at_zero(op, shape):
    """s0, s2, s4 of G ~ s0 + s2 w^2 + s4 w^4, w in rad a sample, by a fit to the gain near zero (independent)."""
    kind, arg = op
    hz = [float(v.removesuffix("Hz")) for v in arg.replace("..", ":").split(":")]
    scale = min(hz) / 40
    f = scale * np.cos(np.pi * (np.arange(12) + 0.5) / 24)      # Chebyshev nodes in (0, scale)
    u = (f / scale) ** 2
    p = np.zeros(5)
    coefficients = np.polynomial.Polynomial.fit(u, gain(op, shape, f), 4, domain=[0, 1]).convert().coef
    p[: len(coefficients)] = coefficients  # trailing zeros are dropped by NumPy
    to_w = (RATE / (2 * np.pi * scale)) ** 2
    return p[0], p[1] * to_w, p[2] * to_w**2


def reference(x, ext, seat, kind, ops, shape, lam, zone):
    n = len(x)
    first, length = positions(ext, seat, n)
    b = baseline(kind, x, ext, seat, lam, zone)
    t = first + np.arange(n)
    period = one_period(x - b(t), ext, seat)
    f = np.fft.rfftfreq(len(period), 1 / RATE)
    g = np.ones_like(f)
    for op in ops:
        g = g * gain(op, shape, f)
        s0, s2, s4 = series_at_zero(op, shape)
        b = s0 * b - s2 * b.deriv(2) + s4 * b.deriv(4)
    return np.fft.irfft(np.fft.rfft(period) * g, len(period))[:n] + b(t)


# --- derivatives and integrals, from the series written out ----------------------------------------------------------

def series_functions(ext, seat, n):
    """(angular frequency per step, phase) of every basis function as cos(w x + phase), with the weights of the samples."""
    first, length = positions(ext, seat, n)
    w = np.ones(n)
    if ext == "periodic":
        k = np.repeat(np.arange(1, (n - 1) // 2 + 1), 2)
        omega = np.concatenate([[0.0], 2 * np.pi * k / n, [np.pi] if n % 2 == 0 else []])
        phase = np.concatenate([[0.0], np.tile([0.0, -np.pi / 2], len(k) // 2), [0.0] if n % 2 == 0 else []])
        return omega, phase - omega * 0.5, w      # phases count from sample 0, half a step inside
    left = ext in ("even", "even-odd")
    right = ext in ("even", "odd-even")
    if seat == "whole-sample":
        w[0] = 0.5 if left else 1.0
        w[-1] = 0.5 if right else w[-1]
    k = np.arange(n) + (0.0 if left and right else 1.0 if not left and not right else 0.5)
    return np.pi * k / length, np.full(n, 0.0 if left else -np.pi / 2), w


def turned_reference(x, ext, seat, kind, turns, op, lam, zone):
    """turns > 0: derivatives; < 0: integrals from rest at x = 0; low-passed by `op` first."""
    n = len(x)
    first, length = positions(ext, seat, n)
    t = first + np.arange(n)
    b = baseline(kind, x, ext, seat, lam, zone)
    omega, phase, w = series_functions(ext, seat, n)
    values = np.cos(np.outer(t, omega) + phase)
    norm = (w[:, None] * values**2).sum(axis=0)
    c = (w * (x - b(t))) @ values / norm
    if turns < 0:
        b = b + c[0] if omega[0] == 0 else b
        c = np.where(omega == 0, 0.0, c)
    s0, s2, s4 = series_at_zero(op, "butterworth:4")
    b = s0 * b - s2 * b.deriv(2) + s4 * b.deriv(4)
    c = c * gain(op, "butterworth:4", omega * RATE / (2 * np.pi))

    def at(x_, order):
        """order-fold derivative (negative: antiderivative without constants) of the series."""
        with np.errstate(divide="ignore", invalid="ignore"):
            amplitude = np.where(omega == 0, 0.0 if order else 1.0, c * 1.0 * omega**order) if order else c
            if order:
                amplitude = np.where(omega == 0, 0.0, amplitude)
        return np.cos(np.outer(np.atleast_1d(x_), omega) + phase + order * np.pi / 2) @ amplitude

    if turns > 0:
        return at(t, turns) + b.deriv(turns)(t)
    poly = b.integ(-turns)
    if turns == -1:
        return at(t, -1) - at(0.0, -1) + poly(t)
    return at(t, -2) - at(0.0, -2) - at(0.0, -1) * t + poly(t)


# --- running the program --------------------------------------------------------------------------------------------

def run(program, folder, table, options):
    source, target = folder / "in.csv", folder / "out.csv"
    rows = [",".join(repr(float(v)) for v in row) for row in table]
    source.write_text("t [s],ax [g],ay [g],az [g]\n" + "\n".join(rows) + "\n")
    done = subprocess.run([program, "condition", str(source), "-o", str(target), "--force", *options], capture_output=True, text=True)
    if done.returncode != 0:
        raise AssertionError(f"{options}: exit {done.returncode}: {done.stderr}")
    out = np.loadtxt(target, delimiter=",", skiprows=1, ndmin=2)
    return out, json.loads((folder / "out.csv.json").read_text())


def main():
    program = sys.argv[1]
    rng = np.random.default_rng(20)
    passed, worst, worst_turned = 0, 0.0, 0.0
    failures = []
    shapes = ["butterworth:1", "butterworth:2", "butterworth:4", "butterworth:8", "gaussian", "cosine:3Hz", "brickwall"]
    op_sets = [
        [("lowpass", "20Hz")],
        [("highpass", "5Hz")],
        [("bandpass", "4Hz..30Hz")],
        [("bandstop", "12Hz..25Hz")],
        [("notch", "50Hz:4Hz")],
        [("notch", "50Hz:4Hz"), ("lowpass", "70Hz"), ("highpass", "3Hz")],
    ]
    cases = []
    for seat in ("half-sample", "whole-sample"):
        for ext in EXTENSIONS:
            for kind in BASELINES:
                cases.append((seat, ext, kind, op_sets[0], shapes[len(cases) % len(shapes)]))
            for shape in shapes:
                for ops in op_sets:
                    cases.append((seat, ext, BASELINES[len(cases) % len(BASELINES)], ops, shape))
    with tempfile.TemporaryDirectory() as tmp:
        folder = Path(tmp)
        for index, (seat, ext, kind, ops, shape) in enumerate(cases):
            n = int(rng.choice([97, 128, 211, 300, 501]))
            t = np.arange(n) / RATE
            axes = [
                rng.normal(0, 0.3, n) + rng.normal() * t + np.cumsum(rng.normal(0, 0.2, n)) + 2 * np.sin(2 * np.pi * rng.uniform(1, 40) * t + rng.uniform(0, 6))
                for _ in range(3)
            ]
            table = np.column_stack([t, *axes])
            options = ["--extension", ext, "--seat", seat, "--baseline", kind, "--shape", shape]
            for name, arg in ops:
                options += [f"--{name}", arg]
            out, sidecar = run(program, folder, table, options)
            lam, zone = fit_widths(sidecar, ops, n)
            for j in range(3):
                x = axes[j]
                want = reference(x, ext, seat, kind, ops, shape, lam, zone)
                scale = np.sqrt((x**2).mean())
                error = np.abs(out[:, j + 1] - want).max() / scale
                worst = max(worst, error)
                if error <= TOLERANCE:
                    passed += 1
                else:
                    failures.append(f"{ext} {seat} {kind} {shape} {ops} n={n} axis {j}: {error:.2e} of the RMS")
    with tempfile.TemporaryDirectory() as tmp:
      folder = Path(tmp)
      for seat in ("half-sample", "whole-sample"):
        for ext in EXTENSIONS:
            for kind in ("none", "slopes", "line", "trend:3", "mean"):
                for turns in (1, 2, -1, -2):
                    n = int(rng.choice([64, 97, 150]))
                    t = np.arange(n) / RATE
                    axes = [rng.normal(0, 0.3, n) + 2 * np.sin(2 * np.pi * rng.uniform(1, 20) * t + 1) + 3 * t for _ in range(3)]
                    option = ["--differentiate", str(turns)] if turns > 0 else ["--integrate", str(-turns), "--conditions", "start-rest", "--insist"]
                    op = ("lowpass", "30Hz")
                    out, sidecar = run(program, folder, np.column_stack([t, *axes]), ["--extension", ext, "--seat", seat, "--baseline", kind, "--lowpass", "30Hz", *option])
                    lam, zone = fit_widths(sidecar, [op], n)
                    for j in range(3):
                        # g per step^turns to m/s^(2+turns); g^... : 9.80665 m/s^2 (CGPM 1901)
                        want = turned_reference(axes[j], ext, seat, kind, turns, op, lam, zone) * RATE**turns * 9.80665
                        error = np.abs(out[:, j + 1] - want).max() / np.sqrt((want**2).mean())
                        worst_turned = max(worst_turned, error)
                        if error <= TOLERANCE:
                            passed += 1
                        else:
                            failures.append(f"{ext} {seat} {kind} turns {turns} n={n} axis {j}: {error:.2e} of the output's RMS")
    # The published gain itself: squared magnitude of SciPy's analogue Butterworth low-pass.
    for order in (1, 2, 4, 8):
        b, a = scipy.signal.butter(order, 2 * np.pi * 20.0, analog=True)
        f = np.linspace(0.1, 90, 200)
        _, h = scipy.signal.freqs(b, a, 2 * np.pi * f)
        if np.allclose(np.abs(h) ** 2, lowpass(f"butterworth:{order}", f, 20.0), rtol=1e-9):
            passed += 1
        else:
            failures.append(f"Butterworth order {order} differs from scipy.signal.butter")
    for line in failures[:20]:
        print("FAILED", line)
    print(f"condition against NumPy on the explicit extension: worst difference {worst:.2e} of the RMS")
    print(f"derivatives and integrals against the series written out: worst difference {worst_turned:.2e} of the output's RMS")
    print(f"{passed} passed, {len(failures)} failed")
    return 1 if failures else 0


def fit_widths(sidecar, ops, n):
    """Shortest corner wavelength from the options; the edge zone from the reach that the sidecar reports."""
    hz = [float(v.removesuffix("Hz")) for _, arg in ops for v in arg.replace("..", ":").split(":")]
    corners = [max(hz)] if not any(k == "notch" for k, _ in ops) else None
    widths = []
    for k, arg in ops:
        values = [float(v.removesuffix("Hz")) for v in arg.replace("..", ":").split(":")]
        widths.append(values[0] + values[1] / 2 if k == "notch" else max(values))
    lam = RATE / max(widths)
    reach = sidecar["channels"][0]["reach"]["samples"]
    zone = max(4, min(n if reach is None else int(np.ceil(reach)), n // 4))
    return lam, zone


if __name__ == "__main__":
    sys.exit(main())
