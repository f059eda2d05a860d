# SPDX-License-Identifier: Apache-2.0
"""The plan command's whole output, worked out again in Python, and what it refuses.

  plan.py RILLSTRAND
"""
import csv
import io
import math
import subprocess
import sys

PROGRAM = sys.argv[1]
failures = []


def check(truth, what):
    if not truth:
        failures.append(what)


def plan(*words):
    return subprocess.run([PROGRAM, "--quiet", "plan", *words], capture_output=True, text=True)


# 0.1 K in 30 s, floor 0.01 K, 20 m of 1 m response a side, an hour, 5 K of contrast: by bisection.
def smallest(side, contrast):
    low, high = 0.0, 1.0
    for _ in range(200):
        f = 0.5 * (low + high)
        low, high = (low, f) if f > 3 * side / contrast * math.sqrt(1 + (1 - f) ** 2) else (f, high)
    return low


COMMON = ["--noise-c", "0.1", "--contrast-c", "5", "--discharge-m3s", "0.2", "--length-m", "1500",
          "--spot-m", "0.5", "--winding-diameter-m", "0.1", "--winding-pitch-m", "0.002"]
side = math.sqrt(0.1 ** 2 / 20 / 120 + 0.01 ** 2)
wanted_side = 0.05 * 5 / 3 / math.sqrt(1 + 0.95 ** 2)
bath = math.sqrt(0.02 ** 2 + 0.1 ** 2 / 4 / 120 + 0.01 ** 2)
slope = 0.002 / math.sqrt((math.pi * 0.1) ** 2 + 0.002 ** 2)
f = smallest(side, 5.0)
EXPECTED = [
    ("noise of the mean over the averaging time", math.sqrt(0.1 ** 2 / 120 + 0.01 ** 2), "K"),
    ("averaging time beyond which little is gained", 3000.0, "s"),
    ("smallest inflow share that can be found", f, "1"),
    ("smallest inflow that can be found", 0.2 * f / (1 - f), "m3 s-1"),
    ("averaging time that finds a share of 0.05", max(30.0, 0.1 ** 2 * 30 / 20 / (wanted_side ** 2 - 0.01 ** 2)), "s"),
    ("contrast that shows that share in the averaging time", 3 * side * math.sqrt(1 + 0.95 ** 2) / 0.05, "K"),
    ("fibre in each bath, at least", 3 + 4, "m"),
    ("distance between the first and the last bath, at least", 1500 / (0.5 + 0.5 * math.sqrt(2 * (0.05 / bath) ** 2 - 1)), "m"),
    ("baths a single-ended adjustment from powers needs, at least", 3, "1"),
    ("error of a splice of 0.01 dB left unmended, at 20 degC", 293.15 ** 2 / 482 * 0.01 * math.log(10) / 10, "K"),
    ("length error of a refractive index 0.001 off", 1 / 1.468, "m km-1"),
    ("highest pulse rate", 299792458 / 2 / 1.468 / 1500, "Hz"),
    ("sampling against the response", 2, "1"),
    ("share of a patch's contrast that is seen", math.erf(0.5 / (2 * math.sqrt(2) / 2.5631031)), "1"),
    ("height of a winding between samples", 500 * slope, "mm"),
    ("height of a winding in one response", 1000 * slope, "mm"),
    ("fibre for one metre of height", 1 / slope, "m"),
]
done = plan(*COMMON, "--csv")
check(done.returncode == 0 and done.stderr == "", f"csv: exit {done.returncode}: {done.stderr}")
rows = list(csv.DictReader(io.StringIO(done.stdout)))
check([r["quantity"] for r in rows] == [e[0] for e in EXPECTED], f"lines: {[r['quantity'] for r in rows]}")
for row, (name, value, unit) in zip(rows, EXPECTED):
    check(row["unit"] == unit and math.isclose(float(row["value"]), value, rel_tol=1e-6), f"{name}: {row}, expected {value} {unit}")
    check(row["formula"] and row["source"], f"{name}: no formula or source")

# For people: every line, then every formula.
done = plan(*COMMON)
lines = done.stdout.splitlines()
check(len(lines) == 2 * len(EXPECTED) + 2 and lines[len(EXPECTED)] == "" and lines[len(EXPECTED) + 1] == "Formulas and sources",
      f"for people: {done.stdout}")
for line, (name, value, unit) in zip(lines, EXPECTED):
    rest = line[len(name):].split()
    check(line.startswith(name) and math.isclose(float(rest[0]), value, rel_tol=6e-3), f"for people: {line}, expected {value}")

# What cannot be had says why.
for words, remark in [(["--contrast-c", "0.01"], "the noise is larger than the contrast"),
                      (["--contrast-c", "0.1"], "no averaging finds it"),
                      (["--floor-c", "0"], "no floor is said"),
                      (["--length-m", "1000", "--target-sd-c", "0.005"], "no distance is enough"),
                      (["--response-m", "0.5"], "a sharp change may fall between samples")]:
    done = plan("--noise-c", "0.1", *words)
    check(done.returncode == 0 and remark in done.stdout, f"{words}: {done.stdout}")

for words, told in [([], "--noise-c is required"),
                    (["--noise-c", "0"], "--noise-c is 0; say a number above zero"),
                    (["--noise-c", "nan"], "--noise-c is nan; say a number above zero"),
                    (["--noise-c", "0.1", "--contrast-c", "0"], "without a contrast no inflow shows"),
                    (["--noise-c", "0.1", "--share", "1"], "--share is 1; say a share between 0 and 1"),
                    (["--noise-c", "0.1", "--winding-pitch-m", "0.1"], "a winding needs both"),
                    (["--noise-c", "0.1", "--length-m", "-5"], "--length-m is -5; say a number above zero")]:
    done = plan(*words)
    check(done.returncode == 2 and told in done.stderr and done.stdout == "", f"{words}: exit {done.returncode}: {done.stderr}")

print("\n".join(failures) if failures else f"{len(EXPECTED)} lines of a plan are as worked out again")
sys.exit(1 if failures else 0)
