#!/usr/bin/env python3
"""Compares weighting, sensor correction, smoothing and resampling with SciPy and NumPy, over whole records.

Complex responses: one period of the explicit extension, its FFT times the response, cut out again. Smoothing: the dense
normal equations. Resampling: the series of the basis written out at the new positions, scipy.signal.resample for periodic
records, scipy.fft.dct cut or padded for even ones. Low-pass: scipy.signal.sosfiltfilt on an explicit extension.

Usage: scripts/differential/stages.py PROGRAM      (run by scripts/differential/run)
"""

import json
import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np
import scipy.fft
import scipy.interpolate
import scipy.linalg
import scipy.signal

from condition import EXTENSIONS, one_period, positions, series_functions

RATE = 200.0
SEATS = ("half-sample", "whole-sample")


class Tally:
    def __init__(self):
        self.passed, self.failures, self.worst = 0, [], {}

    def check(self, group, what, error, tolerance):
        self.worst[group] = max(self.worst.get(group, 0.0), float(error))
        if error <= tolerance:
            self.passed += 1
        else:
            self.failures.append(f"{group}: {what}: {error:.2e} > {tolerance:.0e}")


def run(program, folder, x, options, rate=RATE):
    source, target = folder / "in.csv", folder / "out.csv"
    rows = [f"{n / rate!r},{float(v)!r}" if np.isfinite(v) else f"{n / rate!r}," for n, v in enumerate(x)]
    source.write_text("t [s],ax [m/s2]\n" + "\n".join(rows) + "\n")
    done = subprocess.run(
        [program, "condition", str(source), "-o", str(target), "--force", "--quiet", *options], capture_output=True, text=True
    )
    if done.returncode != 0:
        raise AssertionError(f"{options}: exit {done.returncode}: {done.stderr}")
    out = np.loadtxt(target, delimiter=",", skiprows=1, ndmin=2)
    return out[:, 0], out[:, 1], json.loads((folder / "out.csv.json").read_text())["channels"][0]


def record(rng, n):
    t = np.arange(n) / RATE
    tones = sum(np.sin(2 * np.pi * f * t + p) for f, p in zip(rng.uniform(0.3, 70, 5), rng.uniform(0, 6, 5)))
    return tones + rng.normal(0, 0.3, n) + 2 * t


# --- complex responses ----------------------------------------------------------------------------------------------

# ISO 2631-1:1997, Table A.1; ISO 2631-2:2003: f1, f2, f3, f4, Q4, f5, Q5, f6, Q6.
WEIGHTINGS = {
    "Wk": (0.4, 100.0, 12.5, 12.5, 0.63, 2.37, 0.91, 3.35, 0.91),
    "Wd": (0.4, 100.0, 2.0, 2.0, 0.63, None, None, None, None),
    "Wf": (0.08, 0.63, np.inf, 0.25, 0.86, 0.0625, 0.8, 0.1, 0.8),
    "Wm": (10**-0.1, 100.0, 1 / (0.028 * 2 * np.pi), 1 / (0.028 * 2 * np.pi), 0.5, None, None, None, None),
}


def polynomials(name):
    """Numerator and denominator in s (rad/s), highest power first."""
    f1, f2, f3, f4, q4, f5, q5, f6, q6 = WEIGHTINGS[name]
    w = lambda f: 2 * np.pi * f
    num, den = np.poly1d([1.0, 0, 0]), np.poly1d([1, np.sqrt(2) * w(f1), w(f1) ** 2])
    num, den = num * w(f2) ** 2, den * np.poly1d([1, np.sqrt(2) * w(f2), w(f2) ** 2])
    num, den = num * np.poly1d([0 if np.isinf(f3) else 1 / w(f3), 1]), den * np.poly1d([1 / w(f4) ** 2, 1 / (q4 * w(f4)), 1])
    if f5:
        num = num * np.poly1d([1 / w(f5) ** 2, 1 / (q5 * w(f5)), 1]) * (f5 / f6) ** 2
        den = den * np.poly1d([1 / w(f6) ** 2, 1 / (q6 * w(f6)), 1])
    return num, den


def carried(b, num, den, step):
    """H(d/dx) b: the Taylor series of num/den in s, applied to a polynomial in steps."""
    n, d = num.coeffs[::-1], den.coeffs[::-1]
    h, out = [], np.polynomial.Polynomial([0.0])
    for k in range(6):
        taken = sum(h[j] * (d[k - j] if k - j < len(d) else 0.0) for j in range(k))
        h.append(((n[k] if k < len(n) else 0.0) - taken) / d[0])
        out = out + h[k] / step**k * (b.deriv(k) if k else b)
    return out


def with_response(x, ext, seat, response):
    period = one_period(x, ext, seat)
    f = np.fft.rfftfreq(len(period), 1 / RATE)
    return np.fft.irfft(np.fft.rfft(period) * response(f), len(period))[: len(x)]


def weightings(program, folder, rng, tally):
    for name in WEIGHTINGS:
        num, den = polynomials(name)
        response = lambda f: num(2j * np.pi * f) / den(2j * np.pi * f)
        for seat in SEATS:
            for ext in EXTENSIONS:
                n = int(rng.choice([97, 128, 211, 300]))
                x = record(rng, n)
                _, y, _ = run(program, folder, x, ["--weighting", name, "--extension", ext, "--seat", seat, "--baseline", "none"])
                error = np.abs(y - with_response(x, ext, seat, response)).max() / np.sqrt((x**2).mean())
                tally.check("weighting on the explicit extension", f"{name} {ext} {seat} n={n}", error, 1e-11)
        n = 300
        x = record(rng, n)
        first, _ = positions("even", "half-sample", n)
        t = first + np.arange(n)
        b = np.polynomial.Polynomial.fit(t, x, 2).convert()
        want = with_response(x - b(t), "even", "half-sample", response) + carried(b, num, den, 1 / RATE)(t)
        _, y, _ = run(program, folder, x, ["--weighting", name, "--extension", "even", "--baseline", "trend:2"])
        tally.check("weighting with a baseline", name, np.abs(y - want).max() / np.sqrt((x**2).mean()), 1e-9)


def sensor(program, folder, rng, tally):
    f = np.logspace(-1, np.log10(150), 60)
    h = 1 / (1 - (f / 120) ** 2 + 1.2j * f / 120) * (1j * f / 0.05) / (1 + 1j * f / 0.05)
    gain_db, phase = 20 * np.log10(np.abs(h)), np.degrees(np.unwrap(np.angle(h)))
    wrapped = (phase + 180) % 360 - 180
    lines = [f"{a!r};{b!r};{c!r}" for a, b, c in zip(f.tolist(), gain_db.tolist(), wrapped.tolist())]
    table = folder / "sensor.csv"
    table.write_text("frequency [Hz];gain [dB];phase [deg]\n" + "\n".join(lines) + "\n")
    size = scipy.interpolate.PchipInterpolator(np.log(f), gain_db * np.log(10) / 20)
    angle = scipy.interpolate.PchipInterpolator(np.log(f), np.radians(phase))

    def inverse(hz):
        at = np.log(np.clip(hz, f[0], f[-1]))
        below = np.minimum(hz / f[0], 1.0)
        return np.minimum(np.exp(-size(at)), 10.0) * np.exp(-1j * angle(at) * below)

    for seat in SEATS:
        for ext in EXTENSIONS:
            n = int(rng.choice([97, 128, 211, 300]))
            x = record(rng, n)
            options = ["--response", str(table), "--extension", ext, "--seat", seat, "--baseline", "none"]
            _, y, _ = run(program, folder, x, options)
            error = np.abs(y - with_response(x, ext, seat, inverse)).max() / np.sqrt((x**2).mean())
            tally.check("sensor table on the explicit extension", f"{ext} {seat} n={n}", error, 1e-11)


# --- smoothing ------------------------------------------------------------------------------------------------------

def differences(n):
    """The second difference between even half-sample mirrors."""
    d = -2 * np.eye(n) + np.eye(n, k=1) + np.eye(n, k=-1)
    d[0, 0] = d[-1, -1] = -1
    return d


def smoothing(program, folder, rng, tally):
    even = ["--extension", "even", "--baseline", "none"]
    for n, s in [(8, 10.0), (97, 0.3), (200, 1e3), (151, 1e5)]:
        x = record(rng, n)
        d = differences(n)
        want = np.linalg.solve(np.eye(n) + s * d.T @ d, x)
        _, y, report = run(program, folder, x, ["--smooth", str(s), *even])
        tally.check("smoothing, dense", f"n={n} s={s}", np.abs(y - want).max() / np.sqrt((x**2).mean()), 1e-11)
        trace = np.trace(np.linalg.inv(np.eye(n) + s * d.T @ d))
        found = report["smoothing"]["degrees_of_freedom"]
        tally.check("degrees of freedom", f"n={n} s={s}", abs(found / trace - 1), 1e-9)
    for n, s in [(150, 20.0), (80, 1e3)]:
        x = record(rng, n)
        w = np.ones(n)  # missing samples: weight zero
        w[30:41] = w[60] = 0
        gaps = x.copy()
        gaps[w == 0] = np.nan
        _, y, _ = run(program, folder, gaps, ["--smooth", str(s), "--gaps", "smooth", *even])
        d = differences(n)
        want = np.linalg.solve(np.diag(w) + s * d.T @ d, w * x)
        tally.check("smoothing across gaps, dense", f"n={n} s={s}", np.abs(y - want).max() / np.sqrt((x**2).mean()), 1e-7)


# --- resampling -----------------------------------------------------------------------------------------------------

def series_at(x, ext, seat, at, kept):
    """The basis' own series of x, times kept(f in cycles per sample), at positions in steps from the left mirror."""
    n = len(x)
    first, _ = positions(ext, seat, n)
    omega, phase, w = series_functions(ext, seat, n)
    values = np.cos(np.outer(first + np.arange(n), omega) + phase)
    norm = (w[:, None] * values**2).sum(axis=0)
    c = (w * x) @ values / norm * kept(omega / (2 * np.pi))
    return np.cos(np.outer(at, omega) + phase) @ c


def resampling(program, folder, rng, tally):
    for ratio, option in [(4, ["--decimate", "4"]), (0.5, ["--resample", "400Hz"]), (200 / 147, ["--resample", "147Hz"]), (3, ["--decimate", "3:start"]), (0.625, ["--resample", "320Hz:start"])]:
        nyquist = 0.5 / ratio

        def kept(f):
            return 0.5 * (1 + np.cos(np.pi * np.clip((f - 0.8 * nyquist) / (0.2 * nyquist), 0, 1))) if ratio > 1 else np.ones_like(f)

        for seat in SEATS:
            for ext in EXTENSIONS:
                n = int(rng.choice([96, 97, 128, 211]))
                x = record(rng, n)
                first, _ = positions(ext, seat, n)
                centred = "start" not in option[1]
                shift = (ratio - 1) / 2 if centred else 0.0
                count = int(n / ratio + 1e-9) if centred else int((n - 1) / ratio + 1e-9) + 1
                at = first + shift + ratio * np.arange(count)
                t, y, _ = run(program, folder, x, [*option, "--extension", ext, "--seat", seat, "--baseline", "none"])
                if len(y) != count:
                    tally.check("resampling, series written out", f"{option} {ext} {seat} n={n}: {len(y)} samples for {count}", np.inf, 0)
                    continue
                want = series_at(x, ext, seat, at, kept)
                error = np.abs(y - want).max() / np.sqrt((x**2).mean())
                tally.check("resampling, series written out", f"{option} {ext} {seat} n={n}", error, 1e-11)
                stamps = np.abs(t - (shift + ratio * np.arange(count)) / RATE).max()
                tally.check("stamps", f"{option} {ext} {seat} n={n}", stamps, 1e-12)
    x = record(rng, 120)
    _, y, _ = run(program, folder, x, ["--resample", "600Hz:start", "--extension", "periodic", "--baseline", "none"])
    # Three times as many samples of a periodic record: the last two lie past its last sample.
    tally.check("scipy.signal.resample", "120 to 360", np.abs(y - scipy.signal.resample(x, 360)[: len(y)]).max(), 1e-11)
    c = scipy.fft.dct(x, type=2, norm="ortho")
    padded = scipy.fft.idct(np.concatenate([c, np.zeros(240)]), type=2, norm="ortho") * np.sqrt(3)
    _, y, _ = run(program, folder, x, ["--resample", "600Hz", "--extension", "even", "--baseline", "none"])
    tally.check("scipy.fft.dct padded", "120 to 360", np.abs(y - padded).max(), 1e-11)


def zero_phase(program, folder, rng, tally):
    """sosfiltfilt on an explicit half-sample symmetric extension: the same filter but for the bilinear warp."""
    for order, hz in [(2, 3.0), (4, 5.0), (8, 4.0)]:
        x = record(rng, 600) - 3.0
        padded = np.concatenate([x[::-1], x, x[::-1]])
        sos = scipy.signal.butter(order, hz, fs=RATE, output="sos")
        want = scipy.signal.sosfiltfilt(sos, padded, padlen=0)[600:1200]
        _, y, _ = run(program, folder, x, ["--lowpass", f"{hz}Hz", "--shape", f"butterworth:{order}", "--extension", "even", "--baseline", "none"])
        # Analogue against bilinear at corners of 0.015 to 0.025 of the rate.
        tally.check("sosfiltfilt on the explicit extension", f"order {order} at {hz} Hz", np.abs(y - want).max() / x.std(), 1e-2)


def main():
    program = sys.argv[1]
    rng = np.random.default_rng(61)
    tally = Tally()
    with tempfile.TemporaryDirectory() as tmp:
        folder = Path(tmp)
        for part in (weightings, sensor, smoothing, resampling, zero_phase):
            part(program, folder, rng, tally)
    for line in tally.failures[:30]:
        print("FAILED", line)
    for group, worst in tally.worst.items():
        print(f"{group}: worst difference {worst:.2e}")
    print(f"{tally.passed} passed, {len(tally.failures)} failed")
    return 1 if tally.failures else 0


if __name__ == "__main__":
    sys.exit(main())
