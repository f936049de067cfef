#!/usr/bin/env python3
"""A task done by the peers: once a line of standard input, or the whole job once. Run by bench_peers."""

import sys
import time

import numpy


def read_polars(path):
    import polars

    return polars.read_csv(path)


def read_pandas(path):
    import pandas

    return pandas.read_csv(path)


def columns(frame):
    return [numpy.asarray(frame[name].to_numpy(), dtype=float) for name in frame.columns]


def smooth_from(least):
    import scipy.fft

    return scipy.fft.next_fast_len(least, real=True)


RATE, CORNER, STANDARD_GRAVITY = 4000.0, 50.0, 9.80665


def zero_phase(x):
    """The filter that the trade reaches for: Butterworth of order 4, forwards and backwards over the odd extension."""
    import scipy.signal

    return scipy.signal.sosfiltfilt(scipy.signal.butter(4, CORNER, fs=RATE, output="sos"), x)


def cosine(x, length):
    """Even reflection by the cosine transform of the record, continued by its reflection to `length`."""
    import scipy.fft

    rows = len(x)
    c = scipy.fft.dct(numpy.pad(x, (0, length - rows), mode="symmetric"), 2, norm="ortho")
    f = numpy.arange(length) * (RATE / (2 * length))
    c *= 1 / (1 + (f / CORNER) ** 8)
    return scipy.fft.idct(c, 2, norm="ortho")[:rows]


def integral(x):
    """Velocity under even reflection: the mean becomes a ramp, every cosine a sine over its angular frequency."""
    import scipy.fft

    rows = len(x)
    c = scipy.fft.dct(x * STANDARD_GRAVITY, 2, norm="ortho")
    mean = c[0] / rows**0.5
    s = numpy.zeros(rows)
    s[:-1] = c[1:] / (numpy.pi * numpy.arange(1, rows) / rows * RATE)
    return scipy.fft.idst(s, 2, norm="ortho") + mean * (numpy.arange(rows) + 0.5) / RATE


JOBS = {
    "zero-phase": zero_phase,
    "dct-padded": lambda x: cosine(x, smooth_from(len(x) + 2000)),
    "dct-exact": lambda x: cosine(x, len(x)),
    "integral": integral,
}


def whole(job, source, target):
    """Read, filter three axes, write: prints wall and processor seconds without those of starting and importing."""
    import polars
    import scipy.fft
    import scipy.signal

    start, busy = time.perf_counter(), time.process_time()
    frame = polars.read_csv(source)
    done = {name: JOBS[job](frame[name].to_numpy()) for name in frame.columns[1:]}
    frame.with_columns(**{name: polars.Series(values) for name, values in done.items()}).write_csv(target)
    print(time.perf_counter() - start, time.process_time() - busy)


def task(name, arguments):
    if name == "polars-read":
        return lambda: read_polars(arguments[0])
    if name == "pandas-read":
        return lambda: read_pandas(arguments[0])
    if name == "polars-write":
        frame = read_polars(arguments[0])
        return lambda: frame.write_csv(arguments[1])
    if name == "soundfile-read":
        import soundfile

        return lambda: soundfile.read(arguments[0], dtype="float64")[0]
    if name == "soundfile-columns":
        import soundfile

        return lambda: numpy.ascontiguousarray(soundfile.read(arguments[0], dtype="float64")[0].T)
    sys.exit(f"no such task: {name}")


def main():
    name, *arguments = sys.argv[1:]
    if name in JOBS:
        return whole(name, *arguments)
    work = task(name, arguments)
    for line in sys.stdin:
        start, busy = time.perf_counter(), time.process_time()
        kept = work()
        print(time.perf_counter() - start, time.process_time() - busy, flush=True)
        if line.strip():
            rows = kept if isinstance(kept, numpy.ndarray) else numpy.array(columns(kept))
            rows.astype("<f8").tofile(line.strip())
        del kept


if __name__ == "__main__":
    main()
