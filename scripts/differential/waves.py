#!/usr/bin/env python3
"""Reads the WAV files that SciPy's wheel and the crate `hound` carry for their own tests.

SciPy's files: samples equal to scipy.io.wavfile.read, integers divided by full scale, bit for bit; what SciPy's own tests
want refused is refused, and a file that ends early needs --allow-truncated. One file that SciPy refuses for its block align
alone is read with a note, equal to the sound file beside it, and refused by --strict. hound's files: samples equal to the numbers
written out in hound's tests (src/read.rs of version 3.5.1); its crash and out-of-memory files end with an error code, in
little memory.

Usage: scripts/differential/waves.py PROGRAM      (run by scripts/differential/run)
"""

import json
import resource
import subprocess
import sys
import tempfile
import warnings
from pathlib import Path

import numpy as np
import scipy.io.tests
import scipy.io.wavfile

PROGRAM = Path(sys.argv[1]).resolve()
MEMORY = 2 << 30  # address space of one run
PASSED = 0


def run(*arguments):
    return subprocess.run([PROGRAM, *map(str, arguments)], capture_output=True, text=True, timeout=60,
                          preexec_fn=lambda: resource.setrlimit(resource.RLIMIT_AS, (MEMORY, MEMORY)))


def read(path, *options):
    """Samples (frames x channels) as the program reads them, through a WAV file of 64-bit floats; or its refusal."""
    with tempfile.TemporaryDirectory() as folder:
        out = Path(folder) / "out.wav"
        done = run("condition", path, "-o", out, "--encoding", "float64", "--quiet", *options)
        if done.returncode != 0:
            return done
        rate, data = scipy.io.wavfile.read(out)
        notes = json.loads(Path(f"{out}.json").read_text())["notes"]
        return rate, data.reshape(len(data), -1), [note["code"] for note in notes]


def check(condition, what):
    global PASSED
    if not condition:
        sys.exit(f"FAILED: {what}")
    PASSED += 1


def scaled(data):
    """Integers as parts of full scale; SciPy left-aligns them in their type."""
    data = data.reshape(len(data), -1)
    if data.dtype == np.uint8:
        return (data.astype(float) - 128) / 128
    if data.dtype.kind == "i":
        return data.astype(float) / 2.0 ** (8 * data.dtype.itemsize - 1)
    return data.astype(float)


def scipy_files():
    folder = Path(scipy.io.tests.__file__).parent / "data"
    files = sorted(folder.glob("*.wav"))
    check(len(files) == 22, f"22 files in {folder}, not {len(files)}")
    refused = {"early-eof-no-data", "incomplete-chunk", "1byte-ulaw"}
    for path in files:
        found = read(path)
        if any(word in path.name for word in refused):
            check(not isinstance(found, tuple) and found.returncode == 3, f"{path.name} must be refused: {found}")
            continue
        sound = path
        if "inconsistent" in path.name:
            strict = read(path, "--strict")
            check(not isinstance(strict, tuple) and strict.returncode == 3, f"{path.name} with --strict: {strict}")
            check(found[2] == ["block_align"], f"{path.name}: {found[2]}")
            sound = path.with_name(path.name.replace("-inconsistent", ""))
        if "early-eof" in path.name:
            check(not isinstance(found, tuple) and "--allow-truncated" in found.stderr, f"{path.name}: {found}")
            found = read(path, "--allow-truncated")
        check(isinstance(found, tuple), f"{path.name}: {found}")
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            rate, data = scipy.io.wavfile.read(sound)
        check(found[0] == rate, f"{path.name}: {found[0]} Hz, not {rate}")
        check(np.array_equal(found[1], scaled(data)), f"{path.name}: other samples")


# The numbers of hound's tests, full scale, channels.
HOUND = {
    "pcmwaveformat-16bit-44100Hz-mono": ([2, -3, 5, -7], 2**15, 1),
    "waveformatex-16bit-44100Hz-mono": ([2, -3, 5, -7], 2**15, 1),
    "waveformatex-16bit-44100Hz-stereo": ([2, -3, 5, -7, 11, -13, 17, -19], 2**15, 2),
    "pcmwaveformat-8bit-44100Hz-mono": ([19, -53, 89, -127], 2**7, 1),
    "waveformatex-8bit-11025Hz-mono": ([-128, -128, -128, -128], 2**7, 1),
    "waveformatex-ieeefloat-44100Hz-mono": ([2.0, 3.0, -16411.0, 1019.0], 1, 1),
    "waveformatextensible-ieeefloat-44100Hz-mono": ([2.0, 3.0, -16411.0, 1019.0], 1, 1),
    "waveformatextensible-24bit-192kHz-mono": ([-17, 4_194_319, -6_291_437, 8_355_817], 2**23, 1),
    "waveformatextensible-32bit-48kHz-stereo": ([19, -229_373, 33_587_161, -2_147_483_497], 2**31, 2),
    "nonstandard-02": ([19, -229_373, 33_587_161, -2_147_483_497], 2**31, 2),
    "pcmwaveformat-24bit-4byte-48kHz-stereo": ([-96, 23_052, 8_388_607, -8_360_672], 2**23, 2),
    "waveformatextensible-24bit-4byte-48kHz-stereo": ([-96, 23_052, 8_388_607, -8_360_672], 2**23, 2),
}


def hound_files():
    metadata = subprocess.run(["cargo", "metadata", "--format-version", "1"], capture_output=True, check=True)
    packages = json.loads(metadata.stdout)["packages"]
    hound = next(Path(p["manifest_path"]).parent for p in packages if p["name"] == "hound" and p["version"] == "3.5.1")
    folder = hound / "testsamples"
    files = sorted(folder.glob("*.wav"))
    check(len(files) == 16, f"16 files in {folder}")
    for path in files:
        found = read(path)
        check(isinstance(found, tuple), f"{path.name}: {found}")
        if path.stem in HOUND:
            numbers, full, channels = HOUND[path.stem]
            expected = np.array(numbers, float).reshape(-1, channels) / full
            head = found[1][: len(expected)]
            check(np.array_equal(head, expected), f"{path.name}: {found[1].tolist()} {found[2]}")
        elif path.stem.endswith("-extra"):
            check(found[1][0, 0] == 2 / 2**15, f"{path.name}: {found[1][0]}")
    bad = sorted((folder / "fuzz").glob("*.wav"))
    check(len(bad) == 6, "6 bad files")
    for path in bad:
        done = run("audit", path)
        check(done.returncode in (0, 3), f"{path.name}: {done.returncode} {done.stderr}")
        check(done.returncode == 3 or "note:" in done.stdout, f"{path.name} read without a word: {done.stdout}")


scipy_files()
hound_files()
print(f"WAV files of others: {PASSED} checks passed")
