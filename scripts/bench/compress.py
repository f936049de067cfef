"""Archives against general-purpose libraries, each tuned to just meet the same bound on the same records.

usage: compress.py PROGRAM [RECORD...]

Prints bits a sample of the program (whole bare file) and of the best peer, cell by cell, then geometric means and medians.
The list of records was fixed before any tuning; those of HELD_OUT were never tuned on.
"""

import lzma
import pathlib
import subprocess
import sys
import tempfile
import time

import lerc
import numpy as np
import pcodec.standalone as pco
import soundfile
import zfpy
import zstandard

FIXTURES = pathlib.Path(__file__).resolve().parents[2] / "fixtures"


def noise(seed, count):
    return np.random.default_rng(seed).normal(size=count)


def road(seed, count=20000, step_m=0.05, roughness=16e-6):
    """ISO 8608: density roughness (f / 0.1)^-2 in m^3 from 0.01 to 10 cycles a metre, random phases and amplitudes."""
    f = np.fft.rfftfreq(2 * count, step_m)
    density = np.where((f >= 0.01) & (f <= 10), roughness * (np.maximum(f, 0.01) / 0.1) ** -2.0, 0.0)
    random = np.random.default_rng(seed)
    c = np.sqrt(density) * (random.normal(size=len(f)) + 1j * random.normal(size=len(f)))
    return np.fft.irfft(c, 2 * count)[:count] * np.sqrt(count / step_m / 2)


def smooth(seed, count, sigma):
    t = np.linspace(0, 1, count)
    return np.sin(6 * t) + 0.4 * np.cos(17 * t + 1) * np.exp(-t) + sigma * noise(seed, count)


def hits(seed, count=20000, sigma=1e-3):
    random, x, n = np.random.default_rng(seed), np.zeros(count), np.arange(1500)
    for at in np.sort(random.integers(0, count - 1500, 10)):
        x[at : at + 1500] += (1 + random.random()) * np.exp(-n / 150) * np.sin(0.7 * n + random.random())
    return x + sigma * random.normal(size=count)


def tones(seed, count=16384):
    t, random = np.arange(count), np.random.default_rng(seed)
    x = sum(a * np.sin(w * t + random.random()) for a, w in ((1, 0.3), (0.5, 0.9001), (0.2, 1.7003)))
    return x + 0.02 * random.normal(size=count)


def machine(seed, count=16384):
    e, x = noise(seed, count), np.zeros(count)
    for n in range(2, count):
        x[n] = 1.7 * x[n - 1] - 0.9 * x[n - 2] + e[n]
    return x


def fixture(name, column, delimiter):
    """Invented demo records of this repository, and the yearly sunspot numbers beside them (source in SOURCES.md)."""
    lines = (FIXTURES / name).read_text().splitlines()
    rows = [line.split(delimiter) for line in lines]
    values = [row[column].replace(",", ".") for row in rows if len(row) > abs(column) - (column < 0)]
    out = []
    for value in values:
        try:
            out.append(float(value))
        except ValueError:
            continue
    return np.array(out)


RECORDS = {
    "road A": lambda: road(1),
    "smooth": lambda: smooth(1, 10000, 1e-4),
    "hits": lambda: hits(1),
    "tones": lambda: tones(1),
    "machine": lambda: machine(1),
    "plank": lambda: fixture("plank.csv", 1, ";"),
    "sunspots": lambda: fixture("open/sunspots_yearly.csv", -1, ","),
}
HELD_OUT = {
    "road D": lambda: road(2, roughness=1024e-6),
    "smooth short": lambda: smooth(2, 1000, 1e-3),
    "hits far": lambda: hits(2, sigma=1e-5),
    "tones long": lambda: tones(2, 32768),
    "machine 2": lambda: machine(2),
    "hoist ax": lambda: fixture("hoist.csv", 1, ","),
    "hoist az": lambda: fixture("hoist.csv", 3, ","),
}


def integers(x, step):
    return np.round((x - x[0]) / step).astype(np.int64)


def deltas(q, order):
    return np.diff(q, n=order, prepend=np.zeros(order, q.dtype)) if order else q


def shuffled(q):
    return q.astype("<i4").view(np.uint8).reshape(-1, 4).T.tobytes()


def packed(q):
    """Bytes of whole numbers by each general packer, at its best of three differences."""
    sizes = {"pco": len(pco.simple_compress(q, pcodec_config()))}
    forms = [form for order in range(3) for d in [deltas(q, order)] for form in (d.astype("<i4").tobytes(), shuffled(d))]
    sizes["zstd"] = min(len(zstandard.compress(form, 19)) for form in forms)
    sizes["xz"] = min(len(lzma.compress(form, preset=9 | lzma.PRESET_EXTREME)) for form in forms)
    if np.abs(q).max() < 1 << 23:
        sizes["FLAC"] = flac(q)
    return sizes


def pcodec_config():
    from pcodec import ChunkConfig

    return ChunkConfig(compression_level=12)


def flac(q):
    wide = np.abs(q).max() >= 1 << 15
    with tempfile.NamedTemporaryFile(suffix=".flac") as file:
        data = (q << 8).astype(np.int32) if wide else q.astype(np.int16)
        subtype = "PCM_24" if wide else "PCM_16"
        soundfile.write(file.name, data, 44100, format="FLAC", subtype=subtype, compression_level=1.0)
        return pathlib.Path(file.name).stat().st_size


def error(x, y, norm):
    return np.abs(x - y).max() if norm == "max" else np.sqrt(np.mean((x - y) ** 2))


def tuned(x, norm, bound, pack):
    """The smallest size of a packer whose tolerance is bisected to just meet the bound."""
    low, high, best = bound * 1e-3, bound * 64, None
    for _ in range(18):
        middle = np.sqrt(low * high)
        try:
            size, y = pack(middle)
        except Exception:
            high = middle
            continue
        if error(x, y, norm) <= bound:
            low, best = middle, min(size, best or size)
        else:
            high = middle
    return best


def by_zfp(x):
    def pack(tolerance):
        data = zfpy.compress_numpy(x, tolerance=tolerance)
        return len(data), zfpy.decompress_numpy(data)

    return pack


def by_lerc(x):
    rows = x[: len(x) // 8 * 8].reshape(-1, 8)

    def pack(tolerance):
        result, size = lerc.getLercCompressedSize_4D(rows, 1, False, None, tolerance)[:2]
        result, used, data = lerc.encode_4D(rows, 1, None, tolerance, size)[:3]
        back = lerc.decode_4D(data)[1].reshape(-1)
        return used * len(x) / back.size, np.concatenate([back, x[back.size :]])

    return pack


def by_sz3(x):
    from pysz import sz, szConfig, szErrorBoundMode

    def pack(tolerance):
        config = szConfig()
        config.errorBoundMode, config.absErrorBound = szErrorBoundMode.ABS, tolerance
        data, _ = sz.compress(x, config)
        return data.nbytes, sz.decompress(data, np.float64, x.shape)[0]

    return pack


def peers(x, norm, bound):
    step = 2 * bound * (1 - 1e-9) if norm == "max" else bound * np.sqrt(12)
    while error(x, x[0] + step * integers(x, step), norm) > bound:
        step *= 0.999
    sizes = packed(integers(x, step)) if np.ptp(x) / step < 1 << 30 else {}
    for name, by in (("zfp", by_zfp), ("LERC", by_lerc), ("SZ3", by_sz3)):
        try:
            found = tuned(x, norm, bound, by(x))
        except Exception as fault:
            print(f"  {name}: {fault}", file=sys.stderr)
            continue
        if found:
            sizes[name] = found
    return sizes


def ours(program, x, norm, bound, effort, folder):
    table = pathlib.Path(folder) / "x.csv"
    if not table.exists() or getattr(ours, "last", None) is not x:
        table.write_text("x [g]\n" + "\n".join(map(repr, x.tolist())) + "\n")
        ours.last = x
    archive = pathlib.Path(folder) / "x.grain"
    option = ["--lossless"] if norm == "lossless" else [f"--{norm}-error", repr(float(bound))]
    start = time.perf_counter()
    command = [program, "compress", table, *option, "--effort", effort, "--bare", "--rate", "1", "-o", archive, "--force", "-q"]
    subprocess.run(command, check=True)
    return archive.stat().st_size, time.perf_counter() - start


def main(program, wanted):
    print(f"{'record':14} {'norm':4} {'E/range':>8} {'effort 2':>9} {'effort 3':>9} {'best peer':>16} {'peer/ours':>9}  us/sample at 2")
    ratios = {}
    with tempfile.TemporaryDirectory() as folder:
        for group, records in (("tuned on", RECORDS), ("held out", HELD_OUT)):
            for name, make in records.items():
                if wanted and name not in wanted:
                    continue
                x = make()
                for norm in ("rms", "max"):
                    for share in (1e-2, 1e-3, 1e-4):
                        bound = share * np.ptp(x)
                        two, seconds = ours(program, x, norm, bound, "2", folder)
                        three, _ = ours(program, x, norm, bound, "3", folder)
                        sizes = peers(x, norm, bound)
                        best = min(sizes, key=sizes.get)
                        ratios.setdefault((group, norm), []).append(sizes[best] / three)
                        bits = 8 / len(x)
                        print(
                            f"{name:14} {norm:4} {share:8.0e} {two * bits:9.4f} {three * bits:9.4f} "
                            f"{sizes[best] * bits:9.4f} {best:6} {sizes[best] / three:9.3f}  {seconds / len(x) * 1e6:8.1f}",
                            flush=True,
                        )
    for (group, norm), values in ratios.items():
        mean = np.exp(np.mean(np.log(values)))
        print(f"{group}, {norm}: {len(values)} cells, geometric mean {mean:.3f}, median {np.median(values):.3f}, least {min(values):.3f}")


main(sys.argv[1], sys.argv[2:])
