#!/usr/bin/env python3
"""Makes a folder of invented three-axis logs for trials of `batch`: scripts/make_logs.py FOLDER COUNT [ROWS]."""

import math
import os
import random
import sys

folder, count = sys.argv[1], int(sys.argv[2])
rows = int(sys.argv[3]) if len(sys.argv) > 3 else 1000
os.makedirs(folder, exist_ok=True)
for n in range(count):
    rng = random.Random(n)
    tones = [(0.05 * rng.random(), 2 * math.pi * (1 + 30 * rng.random()) / 200, rng.random()) for _ in range(3)]
    lines = ["t [s],ax [g],ay [g],az [g]"]
    for row in range(rows):
        wave = [a * math.sin(w * row + p) for a, w, p in tones]
        ax, ay, az = (wave[(k + 1) % 3] + 0.5 * wave[k] + rng.gauss(0, 0.01) for k in range(3))
        lines.append(f"{row / 200:.3f},{ax:.5f},{ay:.5f},{az + 1:.5f}")
    with open(os.path.join(folder, f"log_{n:06}.csv"), "w") as out:
        out.write("\n".join(lines) + "\n")
