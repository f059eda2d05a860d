# SPDX-License-Identifier: Apache-2.0
"""Positions along random lines against GEOS (through Shapely): a cable of slack 1 on a route, tie points on it.

  along_line_against_geos.py RILLSTRAND TESTS_FOLDER
"""
import csv
import json
import pathlib
import sys
import tempfile

import numpy as np
import pyproj
from shapely.geometry import LineString, Point

sys.path.insert(0, str(pathlib.Path(sys.argv[2]) / "commands"))
import campaign_folder as good  # noqa: E402

failures = []
for seed in range(6):
    chance = np.random.default_rng(seed)
    # In a local transverse Mercator, so that plane lengths are ground lengths.
    plane = "+proj=tmerc +lat_0=47.65 +lon_0=9.16 +k=1 +datum=WGS84 +units=m +type=crs"
    heading = np.cumsum(chance.normal(0, 0.5, 40))
    xy = np.cumsum(np.column_stack([np.cos(heading), np.sin(heading)]) * chance.uniform(5, 20, (40, 1)), axis=0)
    line = LineString(xy)
    lonlat = [pyproj.Transformer.from_crs(plane, "EPSG:4326", always_xy=True).transform(*p) for p in xy]
    ties = "fibre_m,x,y,sd_m\n"
    for measure in np.linspace(1, line.length - 1, 9):
        p = line.interpolate(measure)
        ties += f"{measure + 10:.6f},{p.x:.6f},{p.y:.6f},0.01\n"
    with tempfile.TemporaryDirectory() as place:
        channels = int(line.length) + 5
        folder = good.make(
            place, f'[record]\nfiles = ["record.csv"]\n[placement]\ncrs = "{plane}"\ntie_points = "tie_points.csv"\n'
            'route = "route.geojson"\n', record__csv=good.record(channels=channels, traces=4), tie_points__csv=ties,
            route__geojson=json.dumps({"type": "Feature", "properties": {}, "geometry":
                                       {"type": "LineString", "coordinates": lonlat}}))
        done = good.run(sys.argv[1], "-q", "place", folder / "campaign.toml")
        if done.returncode != 0:
            failures.append(f"seed {seed}: {done.stderr}")
            continue
        rows = list(csv.DictReader((folder / "out/tables/channels.csv").open()))
    worst = 0.0
    for row in rows:
        measure = float(row["fibre_m"]) - 10
        if row["x"] == "" or not 1 <= measure <= line.length - 1:
            continue
        there = Point(float(row["x"]), float(row["y"]))
        worst = max(worst, there.distance(line.interpolate(measure)))
        if line.distance(there) > 0.01:
            failures.append(f"seed {seed}: {row['fibre_m']} m lies {line.distance(there):.3f} m off the line")
    if worst > 0.15:  # the slack's walk between tie points 40 m apart
        failures.append(f"seed {seed}: a channel lies {worst:.2f} m from where GEOS puts its measure")
print("\n".join(failures) if failures else "positions along the line agree with GEOS")
sys.exit(1 if failures else 0)
