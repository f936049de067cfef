"""Invented records for the benchmarks: three axes of tones and noise, as text and as WAV."""

import pathlib

ROWS = 4_948_099  # 13 x 380 623: about 200 MB, and an awkward length
PRIME_ROWS = 4_948_109
RATE = 4000.0


def axes(rows):
    """Columns of t, ax, ay, az."""
    import numpy

    random = numpy.random.default_rng(1)
    t = numpy.arange(rows) / RATE
    columns = [t]
    for axis in range(3):
        tones = 0.4 * numpy.sin(2 * numpy.pi * (7.3 + 3 * axis) * t + axis)
        tones += 0.2 * numpy.sin(2 * numpy.pi * (93.7 + 11 * axis) * t)
        columns.append(tones + 0.05 * random.standard_normal(rows) + (axis == 2))
    return columns


def text(folder, rows):
    """A CSV file of that many rows, made once."""
    import numpy

    path = pathlib.Path(folder) / f"axes-{rows}.csv"
    if not path.exists():
        columns = axes(rows)
        with open(path, "w", encoding="ascii") as file:
            file.write("t [s],ax [g],ay [g],az [g]\n")
            for start in range(0, rows, 200_000):
                block = numpy.column_stack([column[start : start + 200_000] for column in columns])
                file.write("".join("%.5f,%.7f,%.7f,%.7f\n" % tuple(row) for row in block.tolist()))
    return path


def wave(folder, subtype, frames=6_000_000):
    """A WAV file of three channels, made once by libsndfile."""
    import numpy
    import soundfile

    path = pathlib.Path(folder) / f"axes-{subtype.lower()}.wav"
    if not path.exists():
        block = numpy.column_stack(axes(frames)[1:]) / 2.0
        soundfile.write(path, block, 48_000, subtype=subtype)
    return path
