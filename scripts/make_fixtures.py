#!/usr/bin/env python3
"""Makes the demo records in fixtures/. Invented data: no real machine, person, brand or place.

The scenario. A goods hoist in a mill lifts sacks of grain. A battery logger with a three-axis accelerometer is strapped to
its gearbox and is switched on by hand when the lift is already moving and off before it stops, so the record starts and
stops at arbitrary places. The stick between hoist and guide rail rocks the frame at 1.7 Hz, the output shaft turns at
4.2 Hz, the teeth mesh at 37.8 Hz, and the sensor has an offset, a slow thermal drift and noise.

The profile. A planed floor plank from the same mill, measured with a stylus over 400 mm: a tilt from the fixture, a bow,
planer waves of 2.6 mm and roughness.

The calibration. The logger's pickup on a shaker: coupled through 0.01 Hz, rolling off as a second-order system at 90 Hz.

Usage: scripts/make_fixtures.py [FOLDER]   (default: fixtures beside this script's folder)
"""

import math
import random
import struct
import sys
from pathlib import Path

RATE_HZ = 200
SECONDS = 12
G = 9.80665


def hoist():
    """Rows t, ax, ay, az in s and g, 200 Hz."""
    noise = random.Random(1703)
    rows = []
    for n in range(RATE_HZ * SECONDS):
        t = n / RATE_HZ
        rock = math.sin(2 * math.pi * 1.7 * t + 0.9)
        shaft = math.sin(2 * math.pi * 4.2 * t + 2.1)
        mesh = (1 + 0.3 * shaft) * math.sin(2 * math.pi * 37.8 * t + 0.4)
        drift = 0.004 * t / SECONDS + 0.003 * (t / SECONDS) ** 2
        ax = 0.012 + drift + 0.060 * rock + 0.021 * shaft + 0.034 * mesh + noise.gauss(0, 0.004)
        ay = -0.007 + 0.5 * drift + 0.018 * rock - 0.026 * shaft + 0.049 * mesh + noise.gauss(0, 0.004)
        az = 1.003 - drift + 0.031 * math.sin(2 * math.pi * 3.4 * t + 1.8) + 0.044 * mesh + noise.gauss(0, 0.004)
        rows.append((t, ax, ay, az))
    return rows


def plank():
    """Rows x, z in mm and um, step 0.5 mm."""
    noise = random.Random(89)
    rows = []
    rough = 0.0
    for n in range(800):
        x = n * 0.5
        rough = 0.6 * rough + noise.gauss(0, 1.1)
        wave = 6.5 * abs(math.sin(math.pi * x / 2.6 + 0.3)) + 2.0 * math.sin(2 * math.pi * x / 47 + 1.1)
        rows.append((x, 35 + 0.11 * x - 2.1e-4 * (x - 200) ** 2 + wave + rough))
    return rows


def pickup():
    """Rows frequency, gain, phase in Hz, 1 and degrees, ten a decade."""
    rows = []
    for n in range(21):
        hz = 10 ** (n / 10)
        r = hz / 90
        response = 1 / complex(1 - r * r, 1.4 * r) * complex(0, hz / 0.01) / complex(1, hz / 0.01)
        rows.append((hz, abs(response), math.degrees(math.atan2(response.imag, response.real))))
    return rows


def write_wav(path, rate_hz, samples):
    """One channel of 16-bit integers."""
    data = struct.pack(f"<{len(samples)}h", *(round(s * 32767) for s in samples))
    header = struct.pack("<4sI4s4sIHHIIHH4sI", b"RIFF", 36 + len(data), b"WAVE", b"fmt ", 16, 1, 1, rate_hz, rate_hz * 2, 2, 16, b"data", len(data))
    path.write_bytes(header + data)


def main():
    folder = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).resolve().parent.parent / "fixtures"
    folder.mkdir(parents=True, exist_ok=True)
    rows = hoist()
    lines = ["# logger: strapped to the gearbox of the grain hoist, switched on and off by hand", "t [s],ax [g],ay [g],az [g]"]
    lines += [f"{t:.3f},{ax:.5f},{ay:.5f},{az:.5f}" for t, ax, ay, az in rows]
    (folder / "hoist.csv").write_text("\n".join(lines) + "\n", newline="\n")
    lines = ["x [mm];z [um]"] + [f"{x:.1f};{z:.3f}".replace(".", ",") for x, z in plank()]
    (folder / "plank.csv").write_text("\n".join(lines) + "\n", newline="\n")
    lines = ["frequency [Hz],gain,phase [deg]"] + [f"{f:.4g},{g:.4f},{p:.2f}" for f, g, p in pickup()]
    (folder / "pickup.csv").write_text("\n".join(lines) + "\n", newline="\n")
    write_wav(folder / "hoist.wav", RATE_HZ, [0.8 * ax / 0.2 for _, ax, _, _ in rows[:1000]])


if __name__ == "__main__":
    main()
