# SPDX-License-Identifier: Apache-2.0
"""Loops, coils, marks, jacket marks, local grids, rivers and rasters, each on a cable whose truth is known.

  placement_features.py RILLSTRAND TESTS_FOLDER
"""
import csv
import datetime
import json
import math
import pathlib
import random
import subprocess
import sys
import tempfile

import numpy as np
import pyproj
from osgeo import gdal, osr

sys.path.insert(0, str(pathlib.Path(sys.argv[2]) / "commands"))
import campaign_folder as good  # noqa: E402

gdal.UseExceptions()
PROGRAM = sys.argv[1]
failures = []
TO_LONLAT = pyproj.Transformer.from_crs("EPSG:25832", "EPSG:4326", always_xy=True)
X0, Y0 = 512000.0, 5278000.0


def check(truth, what):
    if not truth:
        failures.append(what)


def bend(s):
    """Place of ground metre s on a gently bent line of unit speed (a circle of 400 m)."""
    return X0 + 0.9996 * 400 * math.sin(s / 400), Y0 + 0.9996 * 400 * (1 - math.cos(s / 400))


def plain_record(channels, spacing=1.0, traces=4):
    head = "time," + ",".join(f"{spacing * j:g}" for j in range(channels)) + "\n"
    return head + "".join(good.stamp(i) + ",12.0" * channels + "\n" for i in range(traces))


def route_json(lines):
    return json.dumps({"type": "FeatureCollection", "features": [
        {"type": "Feature", "properties": {}, "geometry": {"type": "LineString", "coordinates": [list(TO_LONLAT.transform(*p)) for p in line]}}
        for line in lines]})


def place(name, toml, expect=0, **files):
    with tempfile.TemporaryDirectory() as where:
        folder = good.make(where, toml, **files)
        done = good.run(PROGRAM, "-q", "run", folder / "campaign.toml")
        if done.returncode != expect:
            failures.append(f"{name}: exit {done.returncode}: {done.stderr}")
            return None, None, done.stderr
        if expect != 0:
            return None, None, done.stderr
        rows = list(csv.DictReader((folder / "out/tables/channels.csv").open()))
        findings = json.loads((folder / "out/findings.json").read_text())
        return rows, findings, done.stderr


def error(row, truth):
    return math.hypot(float(row["x"]) - truth[0], float(row["y"]) - truth[1])


HEAD = '[record]\nfiles = ["record.csv"]\n[placement]\ncrs = "EPSG:25832"\ntie_points = "tie_points.csv"\n'
LINE = [bend(s) for s in range(0, 301, 5)]


def ties_at(pairs, sd=0.2, noise=0.0, seed=1):
    chance = random.Random(seed)
    return "fibre_m,x,y,sd_m,label\n" + "".join(
        f"{f:.2f},{x + chance.gauss(0, noise):.3f},{y + chance.gauss(0, noise):.3f},{sd},p{i}\n" for i, (f, (x, y)) in enumerate(pairs))


# A loop: 300 m out at slack 1.03, the same cable back; tie points on either leg. Route in three parts, one turned round.
fibre = lambda s: 20 + 1.03 * s  # noqa: E731
TURN = fibre(300)
pairs = [(fibre(s), bend(s)) for s in (2, 80, 160, 240)] + [(2 * TURN - fibre(s), bend(s)) for s in (200, 120, 10)]
rows, findings, _ = place("loop", HEAD + f"route = \"route.geojson\"\nturnaround_m = {TURN}\n", record__csv=plain_record(620),
                          tie_points__csv=ties_at(pairs, noise=0.2), route__geojson=route_json([LINE[:20], LINE[40:18:-1], LINE[40:]]))
if rows:
    for row in rows:
        f = float(row["fibre_m"])
        s = ((f if f <= TURN else 2 * TURN - f) - 20) / 1.03
        if not 5 < s < 295:
            continue
        check(int(row["leg"]) == (1 if f <= TURN else 2), f"loop: leg at {f}")
        if row["x"] == "" or error(row, bend(s)) > max(1.0, 3 * float(row["position_sd_m"])):
            failures.append(f"loop: {f} m is off")

# A coil of 40 m at 120 m, a bath of 30 m at its other end, without a route.
COIL = '[[stretch]]\nname = "spare"\nsetting = "coil"\nfrom_m = 120\nto_m = 160\n[[bath]]\nname = "ice"\nfrom_m = 250\nto_m = 280\ntemperature_c = 12\n'
coiled = lambda s: s + (40 if s > 120 else 0) + (30 if s > 210 else 0)  # noqa: E731
rows, findings, _ = place("coil", HEAD + COIL, record__csv=plain_record(360),
                          tie_points__csv=ties_at([(coiled(s) if s != 120 else 120, bend(s / 1.02)) for s in range(2, 290, 26)]))
if rows:
    spots = {(row["x"], row["y"]) for row in rows if 120 <= float(row["fibre_m"]) <= 160}
    check(len(spots) == 1, f"coil: its channels lie at {len(spots)} places")
    for row in rows:
        f = float(row["fibre_m"])
        s = f if f <= 120 else 120 if f <= 160 else f - 40 if f <= 250 else 210 if f <= 280 else f - 70
        if 3 < s < 285:
            check(row["x"] != "" and error(row, bend(s / 1.02)) < 2.0, f"coil: {f} m is off")

# Marks in the record: a cold spot for a while at two surveyed places replaces tie points there.
chance = random.Random(3)
moment = datetime.datetime(2031, 7, 3)
lines = ["time," + ",".join(f"{0.5 * j:g}" for j in range(400))]
for i in range(60):
    cells = []
    for j in range(400):
        f = 0.5 * j
        v = 14 + chance.gauss(0, 0.05)
        for at, first in ((61.3, 10), (150.8, 30)):
            if first <= i < first + 6:
                v -= 3.0 * math.exp(-0.5 * ((f - at) / 0.5) ** 2)
        cells.append(f"{v:.2f}")
    lines.append((moment + datetime.timedelta(minutes=5 * i)).isoformat() + "Z," + ",".join(cells))


def mark(label, first, at, s):
    x, y = bend(s)
    begin, end = (moment + datetime.timedelta(minutes=5 * k - 2) for k in (first, first + 6))
    return (f'[[mark]]\nlabel = "{label}"\nkind = "cold"\nbegin = {begin.isoformat()}Z\nend = {end.isoformat()}Z\nnear_m = {at + 4}\n'
            f"within_m = 25\nx = {x}\ny = {y}\nsd_m = 0.2\n")


MARKS = mark("gravel bar", 10, 61.3, 60) + mark("ford", 30, 150.8, 148)
rows, findings, _ = place("marks", HEAD + MARKS, record__csv="\n".join(lines) + "\n",
                          tie_points__csv=ties_at([(2, bend(2)), (110, bend(108)), (195, bend(191))]))
if findings:
    found = {t["label"]: t["fibre_m"] for t in findings["placement"]["tie_points"]}
    check(abs(found.get("gravel bar", 0) - 61.3) < 0.2 and abs(found.get("ford", 0) - 150.8) < 0.2, f"marks: found at {found}")
_, _, told = place("mark without a spot", HEAD + mark("nothing", 45, 61.3, 60), expect=1, record__csv="\n".join(lines) + "\n",
                   tie_points__csv=ties_at([(2, bend(2)), (195, bend(191))]))
check("mark 'nothing': no cold spot stands out" in told, f"mark without a spot: {told}")

# Metre marks of the jacket that run backwards.
rows, findings, _ = place("jacket", HEAD + 'cable_marks = "marks.csv"\n', record__csv=plain_record(260),
                          marks__csv="cable_m,fibre_m\n1000,20\n900,120.5\n800,221\n",
                          tie_points__csv="cable_m,x,y,sd_m\n" + "".join(
                              f"{1000 - (1.03 * s) / 1.005:.2f},{bend(s)[0]:.3f},{bend(s)[1]:.3f},0.1\n" for s in range(2, 220, 30)))
if rows:
    for row in rows:
        s = (float(row["fibre_m"]) - 20) / 1.03
        if 5 < s < 180:
            check(error(row, bend(s)) < 1.5, f"jacket: {row['fibre_m']} m is off by {error(row, bend(s)):.2f} m")

# A local grid turned by 30 degrees, with a blundered control point among five.
turn = math.radians(30)
local = lambda p: (math.cos(turn) * (p[0] - X0) + math.sin(turn) * (p[1] - Y0) + 100,  # noqa: E731
                   -math.sin(turn) * (p[0] - X0) + math.cos(turn) * (p[1] - Y0) + 500)
control = "local_x,local_y,x,y,sd_m,label\n"
for i, p in enumerate([(X0, Y0), (X0 + 300, Y0), (X0 + 300, Y0 + 200), (X0, Y0 + 200), (X0 + 150, Y0 + 50)]):
    l = local(p)
    control += f"{l[0]:.3f},{l[1]:.3f},{p[0] + (7 if i == 2 else 0):.3f},{p[1]:.3f},0.02,c{i}\n"
rows, findings, told = place("local", HEAD.replace("EPSG:25832", "local") + '[placement.control]\ncrs = "EPSG:25832"\npoints = "control.csv"\n',
                             record__csv=plain_record(300), control__csv=control,
                             tie_points__csv=ties_at([(1.02 * s, local(bend(s))) for s in range(1, 290, 26)], sd=0.1))
check("control point 'c2' lies 7.0" in told, f"local: the blunder is not named: {told}")
if rows:
    check(abs(findings["placement"]["local_scale_mm_km"]) < 100, "local: scale")
    for row in rows:
        s = float(row["fibre_m"]) / 1.02
        if 3 < s < 280:
            check(row["x"] != "" and error(row, bend(s)) < 1.0, f"local: {row['fibre_m']} m is off")

# River chainage with the cable 3 m to the right, and an elevation plane with slope and aspect.
river = [bend(s) for s in range(-20, 320, 2)]
aside = lambda s: (bend(s)[0] + 3 * math.sin(s / 400), bend(s)[1] - 3 * math.cos(s / 400))  # noqa: E731
with tempfile.TemporaryDirectory() as where:
    tif = pathlib.Path(where) / "dem.tif"
    raster = gdal.GetDriverByName("GTiff").Create(str(tif), 60, 40, 1, gdal.GDT_Float32)
    raster.SetGeoTransform([X0 - 100, 10, 0, Y0 + 300, 0, -10])
    utm = osr.SpatialReference()
    utm.ImportFromEPSG(25832)
    raster.SetProjection(utm.ExportToWkt())
    columns, lines_ = np.meshgrid(np.arange(60), np.arange(40))
    height = lambda x, y: 400 + 0.1 * (x - X0) + 0.05 * (y - Y0)  # noqa: E731
    band = raster.GetRasterBand(1)
    band.WriteArray(height(X0 - 100 + 10 * columns + 5, Y0 + 300 - 10 * lines_ - 5).astype("float32"))
    band.SetNoDataValue(-1)
    raster = None
    rows, findings, _ = place("river", HEAD + 'river = "river.geojson"\nelevation = "dem.tif"\nraster = [{ name = "Canopy height", file = "dem.tif" }]\n',
                              record__csv=plain_record(290), river__geojson=route_json([river]), dem__tif=tif.read_bytes(),
                              tie_points__csv=ties_at([(s, aside(s)) for s in range(1, 290, 26)], sd=0.05))
    if rows:
        for row in rows[5:-20]:
            s = float(row["fibre_m"])
            check(abs(float(row["station_m"]) - (s + 20)) < 1.0, f"river: station at {s} is {row['station_m']}")
            check(abs(float(row["offset_m"]) - 3) < 0.5, f"river: offset at {s} is {row['offset_m']}")
            check(abs(float(row["z"]) - height(float(row["x"]), float(row["y"]))) < 0.01, f"river: z at {s}")
            check(abs(float(row["slope_deg"]) - math.degrees(math.atan(math.hypot(0.1, 0.05)))) < 0.01, "river: slope")
            check(abs(float(row["aspect_deg"]) - (180 + math.degrees(math.atan2(0.1, 0.05)))) < 0.1, f"river: aspect {row['aspect_deg']}")
            check(row["canopy_height"] == row["canopy_height"].strip() != "", "river: the named raster")
        # gdallocationinfo says the same where a channel stands at a cell's middle to within the bilinear step.
        told = subprocess.run(["gdallocationinfo", "-valonly", "-geoloc", str(tif), rows[100]["x"], rows[100]["y"]],
                              capture_output=True, text=True).stdout
        check(abs(float(told) - float(rows[100]["z"])) < 0.1 * 5 + 0.05 * 5, f"gdallocationinfo says {told}, z is {rows[100]['z']}")

# A mast: depth along a winding from the datum, its place as given.
rows, findings, _ = place("mast", HEAD.replace("[placement]", '[[stretch]]\nname = "mast"\nsetting = "water"\nfrom_m = 200\nto_m = 259\n[placement]'),
                          record__csv=plain_record(260), tie_points__csv=ties_at([(s, bend(s)) for s in range(1, 200, 26)]))
check(rows is not None, "mast: stretch alone")
print("\n".join(failures[:40]) if failures else "every way of laying a cable lands on the ground")
sys.exit(1 if failures else 0)
