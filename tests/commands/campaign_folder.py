# SPDX-License-Identifier: Apache-2.0
"""A small good campaign to spoil: an invented reach of 60 m, 1 m channels, two days of 30 min."""
import math
import pathlib
import random
import subprocess

CHANNELS = 80
TRACES = 96

TOML = """[record]
files = ["record.csv"]
[placement]
crs = "EPSG:25832"
tie_points = "tie_points.csv"
[[stretch]]
name = "reach"
setting = "streambed"
from_m = 10.0
to_m = 70.0
[[stream]]
stretch = "reach"
"""

TIES = """fibre_m,x,y,sd_m,label
2,512000,5278000,0.5,a
30,512027,5278003,0.5,b
55,512051,5278006,0.5,c
78,512073,5278009,0.5,d
"""


def stamp(trace):
    minutes = 30 * trace
    return f"2031-07-{3 + minutes // 1440:02d}T{minutes // 60 % 24:02d}:{minutes % 60:02d}:00Z"


def record(channels=CHANNELS, traces=TRACES):
    """The day's wave of a stream with noise, and an inflow of one tenth at 40 m."""
    chance = random.Random(5)
    lines = ["time," + ",".join(str(j) for j in range(channels))]
    for i in range(traces):
        water = 15.0 + 3.0 * math.cos(2.0 * math.pi * (i / 48.0 - 0.66))
        below = water + 0.1 * (9.0 - water)
        lines.append(stamp(i) + "," + ",".join(
            f"{(below if j >= 40 else water) + chance.gauss(0.0, 0.05):.2f}" for j in range(channels)))
    return "\n".join(lines) + "\n"


RECORD = record()


def make(folder, toml=TOML, **files):
    """Writes the campaign; a file given by name (with _ for .) replaces the good one, None leaves it out."""
    folder = pathlib.Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    content = {"campaign.toml": toml, "record.csv": RECORD, "tie_points.csv": TIES}
    content.update({name.replace("__", "."): text for name, text in files.items()})
    for name, text in content.items():
        if text is None:
            continue
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return folder


def run(program, *words, **options):
    return subprocess.run([program, *map(str, words)], capture_output=True, text=True, timeout=120,
                          errors="replace", **options)
