#!/usr/bin/env python3
"""Times the transforms beside FFTW, SciPy and ducc0: one thread, processor time, all of them in turn, same numbers.

Usage: scripts/bench/transforms.py [--kinds dct2,dct3] [--lengths 65536,1000000] [--runs 15] [--json FILE]

Makes its own environment under target/. FFTW 3 is taken from the system (Debian: libfftw3-dev) and left out where
it is missing. A ratio below 1 means that ours is faster. "spread" is the interquartile range of our times over
their median. FFTW plans with MEASURE, at most --plan-seconds each; the one-shot column is planning and one
transform, ours against FFTW's ESTIMATE.
"""

import argparse
import ctypes
import ctypes.util
import json
import pathlib
import statistics
import subprocess
import sys
import tempfile
import time

import environment

KINDS = ("dct2", "dct3", "dct4", "dst2", "dst3", "dst4", "dct1", "dst1")
LENGTHS = (65_536, 1_000_000, 1 << 20, 1 << 22, 1_234_567, 999_983)
MEASURE, ESTIMATE = 0, 1 << 6
# enum fftw_r2r_kind in fftw3.h of FFTW 3.3.10.
FFTW = {"dct1": 3, "dct3": 4, "dct2": 5, "dct4": 6, "dst1": 7, "dst3": 8, "dst2": 9, "dst4": 10}


class Ours:
    def __init__(self, binary, kind, x, folder):
        self.output = folder / "out"
        (folder / "in").write_bytes(x.tobytes())
        command = [str(binary), kind, str(folder / "in"), str(self.output)]
        self.process = subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
        plan, first, scratch = self.process.stdout.readline().split()
        self.plan, self.first, self.scratch = float(plan), float(first), int(scratch)

    def run(self):
        self.process.stdin.write("\n")
        self.process.stdin.flush()
        return float(self.process.stdout.readline())

    def close(self):
        self.process.stdin.close()
        self.process.wait()


def timed(work):
    start = time.thread_time()
    work()
    return time.thread_time() - start


def fftw_library():
    name = ctypes.util.find_library("fftw3")
    if name is None:
        return None
    library = ctypes.CDLL(name)
    library.fftw_plan_r2r_1d.restype = ctypes.c_void_p
    pointer = ctypes.c_void_p
    library.fftw_plan_r2r_1d.argtypes = [ctypes.c_int, pointer, pointer, ctypes.c_int, ctypes.c_uint]
    library.fftw_execute.argtypes = [pointer]
    library.fftw_destroy_plan.argtypes = [pointer]
    library.fftw_set_timelimit.argtypes = [ctypes.c_double]
    return library


def measure(binary, library, kind, length, runs, plan_seconds):
    import ducc0
    import numpy
    import scipy.fft

    x = numpy.random.default_rng(length).standard_normal(length)
    y = numpy.empty_like(x)
    family, type_ = kind[:3], int(kind[3])
    peers, plan, one_shot = {}, None, None
    if library is not None:
        # Planning may write over both arrays.
        a, b = numpy.empty_like(x), numpy.empty_like(x)
        library.fftw_forget_wisdom()

        def once():
            estimate = library.fftw_plan_r2r_1d(length, a.ctypes.data, b.ctypes.data, FFTW[kind], ESTIMATE)
            library.fftw_execute(estimate)
            library.fftw_destroy_plan(estimate)

        a[:] = x
        one_shot = timed(once)
        library.fftw_set_timelimit(plan_seconds)
        plan = library.fftw_plan_r2r_1d(length, a.ctypes.data, b.ctypes.data, FFTW[kind], MEASURE)
        a[:] = x
        peers["fftw"] = lambda: library.fftw_execute(plan)
    peers["scipy"] = lambda: getattr(scipy.fft, family)(x, type_, norm="ortho", workers=1)
    peers["ducc0"] = lambda: getattr(ducc0.fft, family)(x, type_, out=y, inorm=1, nthreads=1)

    with tempfile.TemporaryDirectory() as folder:
        given = x.copy()
        if kind == "dct1":
            # Ours weighs the samples on the mirrors by 1/2 in the inner product; SciPy's matrix is orthonormal in itself.
            given[[0, -1]] *= 2**0.5
        ours = Ours(binary, kind, given, pathlib.Path(folder))
        expected = getattr(scipy.fft, family)(x, type_, norm="ortho")
        ours.run()
        got = numpy.fromfile(ours.output)
        error = float(numpy.linalg.norm(got - expected) / numpy.linalg.norm(expected))
        times = {"ours": [], **{name: [] for name in peers}}
        for run in range(runs + 1):
            row = {"ours": ours.run(), **{name: timed(work) for name, work in peers.items()}}
            if run > 0:
                for name, value in row.items():
                    times[name].append(value)
        ours.close()
    if plan:
        library.fftw_destroy_plan(plan)

    medians = {name: statistics.median(values) for name, values in times.items()}
    low, _, high = statistics.quantiles(times["ours"], n=4)
    best = min((value, name) for name, value in medians.items() if name != "ours")
    return {
        "kind": kind,
        "length": length,
        "milliseconds": {name: 1e3 * value for name, value in medians.items()},
        "minima": {name: 1e3 * min(values) for name, values in times.items()},
        "spread": (high - low) / medians["ours"],
        "best_peer": best[1],
        "ratio": medians["ours"] / best[0],
        "plan_milliseconds": 1e3 * ours.plan,
        "one_shot_ratio": None if one_shot is None else ours.first / one_shot,
        "scratch": ours.scratch / length,
        "difference_from_scipy": error,
    }


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--kinds", default=",".join(KINDS[:5]))
    parser.add_argument("--lengths", default=",".join(map(str, LENGTHS)))
    parser.add_argument("--runs", type=int, default=15)
    parser.add_argument("--plan-seconds", type=float, default=10.0)
    parser.add_argument("--json", type=pathlib.Path)
    parser.add_argument("--binary", type=pathlib.Path, help="built already")
    options = parser.parse_args()
    environment.enter()

    results = list(table(options.kinds.split(","), map(int, options.lengths.split(",")), options.runs, options))
    if options.json:
        options.json.write_text(json.dumps(results, indent=1) + "\n")


def table(kinds, lengths, runs, options=None):
    """Measures and prints every kind at every length."""
    binary = (options and options.binary) or environment.built("transform_timing")
    plan_seconds = options.plan_seconds if options else 10.0
    library = fftw_library()
    if library is None:
        print("FFTW 3 not found: left out", file=sys.stderr)
    print("| transform | N | ours ms | spread | FFTW | SciPy | ducc0 | ratio to best | plan ms | one-shot / FFTW ESTIMATE | difference |")
    print("|-|-|-|-|-|-|-|-|-|-|-|")
    for length in lengths:
        for kind in kinds:
            result = measure(binary, library, kind, length, runs, plan_seconds)
            yield result
            times = result["milliseconds"]
            cell = lambda name: f"{times[name]:.3g}" if name in times else "-"
            one_shot = "-" if result["one_shot_ratio"] is None else f"{result['one_shot_ratio']:.2f}"
            print(
                f"| {kind} | {length} | {times['ours']:.3g} | {result['spread']:.0%} | {cell('fftw')} | {cell('scipy')} "
                f"| {cell('ducc0')} | {result['ratio']:.2f} | {result['plan_milliseconds']:.2g} | {one_shot} "
                f"| {result['difference_from_scipy']:.1e} |",
                flush=True,
            )
            if not result["difference_from_scipy"] < 1e-13:
                sys.exit(f"{kind} of {length}: the outputs disagree")


if __name__ == "__main__":
    main()
