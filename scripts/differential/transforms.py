#!/usr/bin/env python3
"""Compares the transforms with FFTW's output and with SciPy; exits non-zero on any difference.

Type:
    scripts/python_environment
    .venv/bin/python scripts/differential/transforms.py

It builds examples/transforms.rs and speaks with it over pipes. Needs cargo.
"""

import hashlib
import pathlib
import subprocess
import sys

import numpy as np
import scipy
import scipy.fft

ROOT = pathlib.Path(__file__).resolve().parents[2]

# FFTW manual, section 4.8: the ends that make each transform, as (ends, seat).
ENDS = {
    ("dct", 1): ("even", "whole"),
    ("dct", 2): ("even", "half"),
    ("dct", 3): ("even-odd", "whole"),
    ("dct", 4): ("even-odd", "half"),
    ("dst", 1): ("odd", "whole"),
    ("dst", 2): ("odd", "half"),
    ("dst", 3): ("odd-even", "whole"),
    ("dst", 4): ("odd-even", "half"),
}
# FFTW's output for x = 0..n-1, carried by SciPy.
FFTW_SHA256_START = "a60c6494"
FFTW_ARRAYS = 112
FFTW_LENGTHS = (2, 3, 4, 8, 12, 15, 16, 17, 32, 64, 128, 256, 512, 1024)
FFTW_TOLERANCE = 1e-13
# Primes, powers, odd composites and the shortest lengths; further ones are drawn at random.
LENGTHS = (1, 2, 3, 4, 5, 7, 13, 97, 127, 255, 1009, 4096, 9973, 65536, 65537, 99991)
RANDOM_LENGTHS = 40


class Transforms:
    """The compiled example, asked line by line."""

    def __init__(self):
        build = ["cargo", "build", "--quiet", "--example", "transforms"]
        subprocess.run(build, cwd=ROOT, check=True)
        command = ["cargo", "run", "--quiet", "--example", "transforms"]
        self.process = subprocess.Popen(
            command, cwd=ROOT, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
        )

    def ask(self, operation, ends, seat, values):
        numbers = " ".join(repr(float(v)) for v in values)
        self.process.stdin.write(f"{operation} {ends} {seat} {numbers}\n")
        self.process.stdin.flush()
        answer = self.process.stdout.readline()
        if not answer:
            raise RuntimeError(f"no answer to {operation} {ends} {seat}, {len(values)} numbers")
        return np.array([float(word) for word in answer.split()])

    def close(self):
        self.process.stdin.close()
        return self.process.wait()


class Tally:
    """Counts comparisons and keeps the worst of each kind."""

    def __init__(self):
        self.passed = 0
        self.failed = 0
        self.worst = {}

    def compare(self, kind, what, found, expected, tolerance):
        found, expected = np.asarray(found), np.asarray(expected)
        if found.shape != expected.shape:
            error = np.inf
        else:
            scale = np.linalg.norm(expected)
            error = np.linalg.norm(found - expected) / (scale if scale > 0 else 1.0)
        self.worst[kind] = max(self.worst.get(kind, 0.0), error)
        if error <= tolerance:
            self.passed += 1
        else:
            self.failed += 1
            print(f"FAILED {kind} {what}: relative difference {error:.3e}, allowed {tolerance:.1e}")


def rounding(n):
    """Two libraries, each with an error of a few roundings in each of log2(n) stages (primes: twice as many)."""
    return 4.0 * np.finfo(float).eps * (3.0 + np.log2(n))


def amplitude(family, kind, n):
    """The factor that makes the basis functions of a transform orthonormal."""
    length = {("dct", 1): n - 1, ("dst", 1): n + 1}.get((family, kind), n)
    factor = np.full(n, np.sqrt(2.0 / length))
    if (family, kind) == ("dct", 1):
        factor[[0, -1]] = np.sqrt(1.0 / length)
    elif (family, kind) == ("dct", 2):
        factor[0] = np.sqrt(1.0 / length)
    elif (family, kind) == ("dst", 2):
        factor[-1] = np.sqrt(1.0 / length)
    return factor


def root_weights(family, kind, n):
    """The square roots of the weights: 1/2 on samples that an even mirror passes through."""
    root = np.ones(n)
    if (family, kind) == ("dct", 1):
        root[[0, -1]] = np.sqrt(0.5)
    elif (family, kind) == ("dct", 3):
        root[0] = np.sqrt(0.5)
    elif (family, kind) == ("dst", 3):
        root[-1] = np.sqrt(0.5)
    return root


def against_fftw(transforms, tally):
    path = pathlib.Path(scipy.__file__).parent / "fftpack" / "tests" / "fftw_double_ref.npz"
    sha256 = hashlib.sha256(path.read_bytes()).hexdigest()
    if not sha256.startswith(FFTW_SHA256_START):
        sys.exit(f"{path}: sha256 {sha256} does not begin with {FFTW_SHA256_START}: not the known vectors")
    with np.load(path) as archive:
        keys = [key for key in archive.files if key.startswith(("dct_", "dst_"))]
        if len(keys) != FFTW_ARRAYS:
            sys.exit(f"{path}: {len(keys)} arrays, expected {FFTW_ARRAYS}")
        for (family, kind), (ends, seat) in ENDS.items():
            for n in FFTW_LENGTHS:
                c = transforms.ask("forward", ends, seat, np.arange(n))
                tally.compare(
                    "FFTW",
                    f"{family} {kind} n={n}",
                    2.0 * c / amplitude(family, kind, n),
                    archive[f"{family}_{kind}_{n}"],
                    FFTW_TOLERANCE,
                )


def against_scipy(transforms, tally, generator):
    lengths = LENGTHS + tuple(int(n) for n in np.exp(generator.uniform(0, np.log(20000), RANDOM_LENGTHS)))
    for n in lengths:
        x = generator.standard_normal(n)
        for (family, kind), (ends, seat) in ENDS.items():
            if (family, kind) == ("dct", 1) and n < 2:
                continue  # the other library has no DCT-I of one sample
            transform = getattr(scipy.fft, family)
            root = root_weights(family, kind, n)
            expected = transform(root * x, type=kind, norm="ortho")
            what = f"{family} {kind} n={n}"
            tally.compare("SciPy", what, transforms.ask("forward", ends, seat, x), expected, rounding(n))
            inverse = getattr(scipy.fft, "i" + family)(x, type=kind, norm="ortho") / root
            tally.compare("SciPy inverse", what, transforms.ask("inverse", ends, seat, x), inverse, rounding(n))
        expected = packed(scipy.fft.rfft(x, norm="ortho"), n)
        found = transforms.ask("forward", "periodic", "half", x)
        tally.compare("SciPy", f"rfft n={n}", found, expected, rounding(n))
        back = transforms.ask("inverse", "periodic", "half", expected)
        tally.compare("SciPy inverse", f"rfft n={n}", back, x, rounding(n))


def packed(spectrum, n):
    """Constant, cosine and sine of each harmonic, Nyquist."""
    c = np.empty(n)
    c[0] = spectrum[0].real
    harmonics = spectrum[1 : (n + 1) // 2]
    c[1 : 2 * len(harmonics) : 2] = np.sqrt(2.0) * harmonics.real
    c[2 : 2 * len(harmonics) + 1 : 2] = -np.sqrt(2.0) * harmonics.imag
    if n % 2 == 0:
        c[-1] = spectrum[-1].real
    return c


def main():
    generator = np.random.default_rng(20240229)
    tally = Tally()
    transforms = Transforms()
    against_fftw(transforms, tally)
    against_scipy(transforms, tally, generator)
    if transforms.close() != 0:
        sys.exit("the transforms ended with an error")
    for kind, worst in tally.worst.items():
        print(f"{kind}: largest relative difference {worst:.2e}")
    print(f"{tally.passed} passed, {tally.failed} failed")
    return 1 if tally.failed or not tally.passed else 0


if __name__ == "__main__":
    sys.exit(main())
