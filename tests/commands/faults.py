# SPDX-License-Identifier: Apache-2.0
"""Faults of the machine and odd but legal records: the earlier output is whole, or the new one is.

  faults.py RILLSTRAND
"""
import json
import os
import random
import shutil
import signal
import subprocess
import sys
import tempfile
import time
import pathlib

import campaign_folder as good

PROGRAM = sys.argv[1]
failures = []


def check(truth, what):
    if not truth:
        failures.append(what)


def contents(folder):
    return {str(p.relative_to(folder)): p.read_bytes() for p in sorted(folder.rglob("*")) if p.is_file()}


def legal(name, warnings, toml=good.TOML, **files):
    with tempfile.TemporaryDirectory() as place:
        folder = good.make(place, toml, **files)
        done = good.run(PROGRAM, "--quiet", "run", folder / "campaign.toml")
        told = [line for line in done.stderr.splitlines() if line]
        check(done.returncode == 0 and told == warnings, f"{name}: exit {done.returncode}, told {told}")
        if done.returncode == 0:
            json.loads((folder / "out" / "findings.json").read_text())


NO_STREAM = good.TOML.replace('[[stream]]\nstretch = "reach"\n', "")
lines = good.RECORD.splitlines(keepends=True)
legal("a good campaign", [])
legal("time running backwards", ["warning: time runs backwards 1 time inside a file; the traces were sorted by time"],
      record__csv="".join(lines[:40] + [lines[41], lines[40]] + lines[42:]))
legal("one trace only", ["warning: the record is one trace; nothing that needs change in time can be told from it"],
      toml=NO_STREAM, record__csv="".join(lines[:2]))
legal("one channel only", ["warning: the record has one channel; nothing that needs its neighbours can be told from it"],
      toml='[record]\nfiles = ["record.csv"]\n', record__csv=good.record(channels=1))
legal("no placement", [], toml=good.TOML.replace('[placement]\ncrs = "EPSG:25832"\ntie_points = "tie_points.csv"\n', ""))

# Truncated NetCDF: the record that a run wrote, cut in half, as the next campaign's record.
with tempfile.TemporaryDirectory() as place:
    folder = good.make(place)
    good.run(PROGRAM, "-q", "run", folder / "campaign.toml")
    whole = (folder / "out" / "record.nc").read_bytes()
    for share in (0.1, 0.5, 0.95):
        (folder / "cut.nc").write_bytes(whole[:int(len(whole) * share)])
        (folder / "grid.toml").write_text(good.TOML.replace("record.csv", "cut.nc"))
        done = good.run(PROGRAM, "-q", "run", folder / "grid.toml")
        check(done.returncode == 1 and "cut.nc: " in done.stderr and "copy" in done.stderr,
              f"truncated NetCDF at {share}: exit {done.returncode}, told {done.stderr!r}")
    (folder / "whole.nc").write_bytes(whole)
    (folder / "grid.toml").write_text(good.TOML.replace("record.csv", "whole.nc"))
    done = good.run(PROGRAM, "-q", "run", folder / "grid.toml")
    check(done.returncode == 0, f"its own record read again: exit {done.returncode}, told {done.stderr!r}")

# Killed at random moments: every file is the old one or the new one, and the next run is whole.
with tempfile.TemporaryDirectory() as place:
    folder = good.make(place)
    campaign = folder / "campaign.toml"
    start = time.monotonic()
    good.run(PROGRAM, "-q", "run", campaign)
    took = time.monotonic() - start
    earlier = contents(folder / "out")
    (folder / "record.csv").write_text(good.record(traces=good.TRACES - 1))
    chance = random.Random(11)
    for k in range(25):
        process = subprocess.Popen([PROGRAM, "-q", "run", campaign], stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        time.sleep(chance.uniform(0.0, 1.1) * took)
        process.send_signal(signal.SIGKILL)
        process.wait()
        now = {name: data for name, data in contents(folder / "out").items() if not name.startswith(".rillstrand-")}
        check(set(now) >= set(earlier), f"kill {k}: files are missing: {set(earlier) - set(now)}")
        for name in ("findings.json",):
            check(isinstance(json.loads(now[name]), dict), f"kill {k}: {name} is not whole")
        check(now["report.html"].rstrip().endswith(b"</html>"), f"kill {k}: report.html is not whole")
    done = good.run(PROGRAM, "-q", "run", campaign)
    check(done.returncode == 0, f"after the kills: exit {done.returncode}, told {done.stderr!r}")
    left = [p.name for p in (folder / "out").iterdir() if p.name.startswith(".")]
    check(left == [], f"after the kills: left over {left}")

    # Interrupted: a clean stop with status 130.
    process = subprocess.Popen([PROGRAM, "-q", "run", campaign], stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, text=True)
    time.sleep(0.05)
    process.send_signal(signal.SIGINT)
    told = process.communicate()[1]
    check(process.returncode in (130, -signal.SIGINT, 0), f"interrupt: exit {process.returncode}, told {told!r}")

    # Output removed during the run.
    process = subprocess.Popen([PROGRAM, "-q", "run", campaign], stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, text=True)
    while not any((folder / "out").glob(".rillstrand-staging-*")):
        time.sleep(0.002)
        if process.poll() is not None:
            break
    shutil.rmtree(folder / "out", ignore_errors=True)
    told = process.communicate()[1]
    check(process.returncode == 3 and told.strip() != "", f"output removed: exit {process.returncode}, told {told!r}")

    # Standard output closed.
    done = subprocess.run(["sh", "-c", f'"{PROGRAM}" -q run "{campaign}" >&-'], capture_output=True, text=True)
    check(done.returncode == 3 and "standard output" in done.stderr, f"closed output: exit {done.returncode}, told {done.stderr!r}")

# Disk full: a small tmpfs where mounting is allowed.
with tempfile.TemporaryDirectory() as place:
    folder = good.make(place)
    out = folder / "out"
    out.mkdir()
    if os.geteuid() == 0 and subprocess.run(["mount", "-t", "tmpfs", "-o", "size=200k", "tmpfs", out], capture_output=True).returncode == 0:
        try:
            (out / "findings.json").write_text("earlier")
            done = good.run(PROGRAM, "-q", "run", folder / "campaign.toml")
            check(done.returncode == 3 and done.stderr.strip() != "", f"disk full: exit {done.returncode}, told {done.stderr!r}")
            check((out / "findings.json").read_text() == "earlier", "disk full: the earlier output was changed")
            check([p.name for p in out.iterdir()] == ["findings.json"], f"disk full: left over {[p.name for p in out.iterdir()]}")
        finally:
            subprocess.run(["umount", out], check=False)
    else:
        print("disk full: not tried, mounting needs root")

print("\n".join(failures) if failures else "every fault left whole output")
sys.exit(1 if failures else 0)
