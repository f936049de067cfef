"""Archives of the program against a second decoder written from docs/container.md (scripts/unpack.py), in every mode.

Integers, predicted and lattice samples must be the same bits; cosine samples within 1e-9 of the bound.
"""

import pathlib
import subprocess
import sys
import tempfile

import numpy as np

sys.path.insert(0, str(pathlib.Path(__file__).resolve().parents[1]))
import unpack  # noqa: E402


def records():
    random = np.random.default_rng(20)
    t = np.arange(1200)
    smooth = np.sin(0.004 * t) + 0.3 * np.cos(0.0113 * t + 1.0)
    hits = np.zeros(1200)
    for at in (100, 420, 900):
        hits[at:] += np.exp(-np.arange(1200 - at) / 40.0) * np.sin(0.9 * np.arange(1200 - at))
    yield "smooth", smooth + 1e-4 * random.normal(size=1200)
    yield "hits", hits + 1e-4 * random.normal(size=1200)
    yield "tones", np.sin(0.3 * t) + 0.5 * np.sin(0.9 * t + 1.0) + 0.01 * random.normal(size=1200)
    yield "decimals", np.round(np.cumsum(random.normal(size=1200)), 2)
    yield "short", random.normal(size=5)
    yield "doubles", np.exp(10.0 * random.normal(size=200))


def main(program):
    modes = set()
    with tempfile.TemporaryDirectory() as folder:
        for name, x in records():
            table = pathlib.Path(folder) / "x.csv"
            rows = [f"{n / 100:.2f},{v!r}" for n, v in enumerate(x.tolist())]
            table.write_text("t [s],x [g]\n" + "\n".join(rows) + "\n")
            bounds = ["--lossless"] + [f"--{norm}-error={size}" for norm in ("max", "rms") for size in ("0.1%", "5%", "1x")]
            for bound in bounds + ["--keep=20"]:
                for effort in "2" if name in ("short", "doubles") else "23":
                    archive, back = f"{folder}/a.grain", f"{folder}/back.csv"
                    asked = bound.split("=")
                    subprocess.run(
                        [program, "compress", table, *asked, "--effort", effort, "-o", archive, "--force", "-q"], check=True
                    )
                    subprocess.run([program, "restore", archive, "-o", back, "--force", "-q"], check=True)
                    header, streams, used = unpack.unpack(pathlib.Path(archive).read_bytes())
                    modes |= used
                    theirs = np.array([float(line.split(",")[1]) for line in open(back).read().splitlines()[1:]])
                    ours, where = streams[0], f"{name} {bound} effort {effort}"
                    limit = header[2][0].get(65)
                    if used == {1}:
                        assert np.array_equal(ours, theirs), where
                    else:
                        room = 1e-9 * (limit or np.ptp(x))
                        assert np.abs(ours - theirs).max() <= room, (where, np.abs(ours - theirs).max())
                    off = ours - x
                    if bound == "--lossless":
                        assert np.array_equal(ours, x), where
                    elif "max" in bound:
                        assert np.abs(off).max() <= limit * (1 + 1e-12), where
                    elif "rms" in bound:
                        assert np.sqrt(np.mean(off**2)) <= limit * (1 + 1e-12), where
    assert modes == {1, 2, 3, 4}, f"not every mode was used: {modes}"
    print("archives: every mode decodes alike")


main(sys.argv[1])
