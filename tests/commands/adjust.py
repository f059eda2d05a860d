# SPDX-License-Identifier: Apache-2.0
"""Whole runs with [adjust] over an invented cable in three baths: adjust.py PROGRAM. Powers give temperatures back."""
import csv
import json
import math
import pathlib
import random
import subprocess
import sys
import tempfile

CHANNELS, TRACES = 300, 100
BATHS = [("ice bath", 10, 35, 0.5), ("warm bath", 45, 70, 22.0), ("far bath", 265, 290, 9.0)]

TOML = """[record]
files = ["record.csv"]
layout = "tall"
[record.text]
stokes_column = "strong"
antistokes_column = "weak"
[adjust]
method = "METHOD"
"""


def water(x, hour):
    for _, first, last, temperature in BATHS:
        if first <= x <= last:
            return temperature
    return 12.0 + 3.0 * math.sin(2 * math.pi * hour / 24.0) + 0.5 * math.sin(x / 60.0)


def write(folder, method, baths=BATHS):
    chance = random.Random(8)
    with open(folder / "record.csv", "w", encoding="utf-8") as file:
        print("time,distance,temperature,strong,weak", file=file)
        for i in range(TRACES):
            c = 1.4 + 0.003 * math.sin(i / 9.0)
            for x in range(CHANNELS):
                t = water(x, 0.5 * i)
                ratio = math.exp(482.0 / (t + 273.15) - c + 9e-5 * x + (0.012 if x > 160 else 0.0))
                strong = 6e6 * math.exp(-4e-4 * x)
                weak = strong / ratio
                strong += math.sqrt(strong) * chance.gauss(0, 1)
                weak += math.sqrt(weak) * chance.gauss(0, 1)
                seen = t + 0.4 + 2e-3 * x + chance.gauss(0, 0.1)
                print(f"2031-06-{1 + i // 48:02d}T{i // 2 % 24:02d}:{30 * (i % 2):02d}:00Z,{x},{seen:.2f},"
                      f"{strong:.0f},{weak:.0f}", file=file)
    text = TOML.replace("METHOD", method)
    for name, first, last, temperature in baths:
        text += (f'[[bath]]\nname = "{name}"\nfrom_m = {first}\nto_m = {last}\ntemperature_c = {temperature}\n'
                 "temperature_sd_c = 0.02\n")
    (folder / "campaign.toml").write_text(text)


failures = []


def check(truth, what):
    if not truth:
        failures.append(what)


def run(folder):
    return subprocess.run([sys.argv[1], "--quiet", "run", folder / "campaign.toml"], capture_output=True, text=True)


with tempfile.TemporaryDirectory() as place:
    folder = pathlib.Path(place)
    for method in ("raman", "offset", "offset-and-slope"):
        write(folder, method)
        done = run(folder)
        check(done.returncode == 0, f"{method}: exit {done.returncode}, {done.stderr}")
        findings = json.loads((folder / "out" / "findings.json").read_text())
        how = findings["quality"]["adjustment"]
        check(how["method"] == method, f"{method}: findings say {how['method']}")
        rows = list(csv.DictReader((folder / "out" / "tables" / "channels.csv").open()))
        times = [0.5 * i for i in range(TRACES)]
        tolerance = {"raman": 0.12, "offset": 0.5, "offset-and-slope": 0.12}[method]
        for x in (100, 130, 200, 240):
            true = sum(water(x, hour) for hour in times) / TRACES
            off = float(rows[x]["mean_c"]) - true
            check(abs(off) < tolerance, f"{method}: {off:.3f} K off at {x} m")
            check(float(rows[x]["adjust_sd_c"]) > 0.005, f"{method}: no doubt is left at {x} m")
        if method == "raman":
            check(abs(how["gamma_k"] - 482.0) < 4.0 * how["gamma_sd_k"] + 1.0, f"gamma {how['gamma_k']}")
            check(len(how["steps"]) == 1 and abs(how["steps"][0]["fibre_m"] - 160.5) < 1.6, f"steps {how['steps']}")
    write(folder, "raman", BATHS[:2])
    done = run(folder)
    check(done.returncode == 1 and "cannot be had" in done.stderr, f"two baths: exit {done.returncode}, {done.stderr}")
for failure in failures:
    print(failure)
sys.exit(1 if failures else 0)
