"""The Python environment of the benchmarks, and how two programs are timed in turn."""

import os
import pathlib
import statistics
import subprocess
import sys

ROOT = pathlib.Path(__file__).resolve().parents[2]
VENV = ROOT / "target" / "bench-env"
PYTHON = VENV / "bin" / "python"
REQUIREMENTS = pathlib.Path(__file__).with_name("requirements.txt")
THREADS = "2"


def enter():
    """Starts the running script again inside the environment under target/, which is made where it is missing."""
    if pathlib.Path(sys.prefix).resolve() == VENV.resolve():
        return
    installed = VENV / "requirements.txt"
    if not installed.exists() or installed.read_bytes() != REQUIREMENTS.read_bytes():
        subprocess.run([sys.executable, "-m", "venv", str(VENV)], check=True)
        subprocess.run([str(PYTHON), "-m", "pip", "install", "--quiet", "-r", str(REQUIREMENTS)], check=True)
        installed.write_bytes(REQUIREMENTS.read_bytes())
    os.execv(PYTHON, [str(PYTHON), *sys.argv])


def built(name):
    """Path of a release build of the program (`endgrain`) or of an example."""
    if name == "endgrain":
        subprocess.run(["cargo", "build", "--quiet", "--release"], cwd=ROOT, check=True)
        return ROOT / "target" / "release" / name
    subprocess.run(["cargo", "build", "--quiet", "--release", "--example", name], cwd=ROOT, check=True)
    return ROOT / "target" / "release" / "examples" / name


class Worker:
    """A program that does its task once a line and answers with wall and processor seconds."""

    def __init__(self, command):
        environment = {**os.environ, "RAYON_NUM_THREADS": THREADS, "POLARS_MAX_THREADS": THREADS}
        pipes = {"stdin": subprocess.PIPE, "stdout": subprocess.PIPE, "text": True}
        self.process = subprocess.Popen(list(map(str, command)), env=environment, **pipes)

    def run(self):
        self.process.stdin.write("\n")
        self.process.stdin.flush()
        answer = self.process.stdout.readline().split()
        if len(answer) != 2:
            sys.exit(f"{self.process.args}: no answer")
        return tuple(map(float, answer))

    def close(self):
        """Peak memory in MB."""
        self.process.stdin.close()
        _, status, usage = os.wait4(self.process.pid, 0)
        self.process.returncode = os.waitstatus_to_exitcode(status)
        return usage.ru_maxrss / 1024


def once(command):
    """Runs a program to its end: wall seconds, processor seconds, peak memory in MB, what it printed."""
    import time

    environment = {**os.environ, "RAYON_NUM_THREADS": THREADS, "POLARS_MAX_THREADS": THREADS}
    start = time.perf_counter()
    process = subprocess.Popen(list(map(str, command)), env=environment, stdout=subprocess.PIPE, text=True)
    told = process.stdout.read()
    _, status, usage = os.wait4(process.pid, 0)
    wall = time.perf_counter() - start
    process.returncode = os.waitstatus_to_exitcode(status)
    if process.returncode != 0:
        sys.exit(f"{command}: ended with {process.returncode}")
    return wall, usage.ru_utime + usage.ru_stime, usage.ru_maxrss / 1024, told


def spread(values):
    """Interquartile range over the median."""
    if len(values) < 3:
        return max(values) / min(values) - 1
    low, middle, high = statistics.quantiles(values, n=4)
    return (high - low) / middle


def row(work, times, memory, bars):
    """One result from {name: [(wall, processor), ...]}, ours under "ours"."""
    median = lambda name, which: statistics.median(pair[which] for pair in times[name])
    ours = [median("ours", which) for which in (0, 1)]
    result = {"work": work, "ours": {"wall": ours[0], "processor": ours[1], "spread": spread([t[0] for t in times["ours"]])}}
    result["ours"]["memory_mb"] = memory.get("ours")
    result["peers"] = []
    for name in times:
        if name == "ours":
            continue
        wall, processor = median(name, 0), median(name, 1)
        peer = {"name": name, "wall": wall, "processor": processor, "spread": spread([t[0] for t in times[name]])}
        peer |= {"memory_mb": memory.get(name), "ratio": ours[0] / wall, "processor_ratio": ours[1] / processor}
        result["peers"].append(peer | {"bar": bars.get(name)})
    return result


HEADER = (
    "| work | peer | ours s | peer s | ratio | bar | spread ours, peer | ours CPU s | peer CPU s | CPU ratio | ours MB | peer MB |\n"
    "|-|-|-|-|-|-|-|-|-|-|-|-|"
)


def lines(result):
    """Rows of a table for people."""
    ours = result["ours"]
    number = lambda value: "-" if value is None else f"{value:.3g}"
    for peer in result["peers"]:
        yield (
            f"| {result['work']} | {peer['name']} | {ours['wall']:.3g} | {peer['wall']:.3g} | {peer['ratio']:.2f} "
            f"| {number(peer['bar'])} | {ours['spread']:.0%}, {peer['spread']:.0%} | {ours['processor']:.3g} "
            f"| {peer['processor']:.3g} | {peer['processor_ratio']:.2f} | {number(ours['memory_mb'])} "
            f"| {number(peer['memory_mb'])} |"
        )
