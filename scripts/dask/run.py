#!/usr/bin/env python3
"""Runs a batch on the workers of a Dask cluster, then merges: one task for about a hundred records.

Usage: run.py SCHEDULER OUT LIST [options of `endgrain batch`]
Example: run.py tcp://127.0.0.1:8786 cleaned list.txt --recipe clean.toml

Folders must be the same on all workers. A worker that dies costs nothing: its shards run again elsewhere, and what is whole
is not done again. ENDGRAIN names the program. The exit code is that of the merge.
"""

import os
import subprocess
import sys

from distributed import Client, as_completed

A_TASK = 100
AGAIN = 75  # interrupted: run it again


def shard(command):
    code = subprocess.run(command).returncode
    if code == AGAIN or code < 0:
        raise RuntimeError(f"shard ended early with {code}")  # Dask tries it again
    return code


def main():
    scheduler, into, names, *options = sys.argv[1:]
    program = os.environ.get("ENDGRAIN", "endgrain")
    into, names, folder = os.path.abspath(into), os.path.abspath(names), os.getcwd()
    with open(names, "rb") as lines:
        count = max(1, -(-sum(1 for _ in lines) // A_TASK))
    client = Client(scheduler)
    begin = ["env", "-C", folder, program, "batch", "--quiet", "--die-with-parent", "--jobs", "1"]
    tasks = [
        client.submit(shard, [*begin, "--shard", f"{k}/{count}", "--files-from", names, "--into", into, *options],
                      retries=3, pure=False)
        for k in range(count)
    ]
    for done, task in enumerate(as_completed(tasks), 1):
        if task.status == "error" or task.result() not in (0, 1, 5):
            print(f"shard failed: {task.exception() or task.result()}", file=sys.stderr)
        print(f"{done} of {count} shards", file=sys.stderr)
    sys.exit(subprocess.run([program, "merge", into]).returncode)


if __name__ == "__main__":
    main()
