# SPDX-License-Identifier: Apache-2.0
"""A whole run over an invented slope: snow.py PROGRAM. What comes out is consistent and right."""
import csv
import datetime
import json
import math
import pathlib
import random
import sqlite3
import subprocess
import sys
import tempfile

DAYS, CHANNELS = 40, 24
FIRST = datetime.datetime(2031, 4, 1)
MELTS = [8 + (7 * j) % 25 for j in range(CHANNELS)]  # first bare day of each channel

TOML = """[campaign]
name = "An invented slope"
[record]
files = ["record.csv"]
[placement]
crs = "EPSG:25832"
tie_points = "tie_points.csv"
[[stretch]]
name = "slope"
setting = "ground"
from_m = 0.0
to_m = 115.0
[[snow]]
stretch = "slope"
utc_offset_h = 1.0
swing_below_c = 1.0
mean_below_c = 1.5
minimum_days = 2
[layers]
formats = ["gpkg", "csv"]
corridor_m = 4.0
"""


def write_campaign(folder):
    chance = random.Random(3)
    cloud = [chance.choice([1.0, 1.0, 0.7, 0.3]) for _ in range(DAYS + 1)]
    with open(folder / "record.csv", "w", encoding="utf-8") as file:
        print("time", *(5 * j for j in range(CHANNELS)), sep=",", file=file)
        for hour in range(24 * DAYS):
            local = hour + 1.5  # middle of the hour, an hour ahead of UTC
            day = local / 24.0
            row = []
            for j in range(CHANNELS):
                sun = (6.0 - 0.1 * (j % 5)) * cloud[int(day)]
                bare = 5.0 + sun * math.cos((local % 24 - 14.0) * math.pi / 12.0)
                row.append((0.0 if day < MELTS[j] else bare) + chance.gauss(0.0, 0.08))
            stamp = FIRST + datetime.timedelta(hours=hour + 0.5)
            print(stamp.isoformat() + "Z", *(f"{v:.2f}" for v in row), sep=",", file=file)
    ties = "fibre_m,x,y,z,sd_m\n0,512000,5278000,1200,0.4\n60,512058,5278004,1215,0.4\n"
    (folder / "tie_points.csv").write_text(ties + "115,512111,5278000,1230,0.4\n")
    (folder / "campaign.toml").write_text(TOML)


def rows(path):
    with open(path, encoding="utf-8") as file:
        return list(csv.DictReader(file))


def main():
    with tempfile.TemporaryDirectory() as name:
        folder = pathlib.Path(name)
        write_campaign(folder)
        run = subprocess.run([sys.argv[1], "--quiet", "run", folder / "campaign.toml"],
                             capture_output=True, text=True, check=False)
        assert run.returncode == 0, run.stderr
        assert "snow 'slope'" in run.stdout, run.stdout
        out = folder / "out"
        channels = rows(out / "tables/snow_channels.csv")
        daily = rows(out / "tables/snow_daily.csv")
        cover = rows(out / "tables/snow_cover.csv")
        assert len(channels) == CHANNELS and len(daily) == CHANNELS * len(cover)
        for j, row in enumerate(channels):
            melt = (FIRST + datetime.timedelta(days=MELTS[j])).date()
            found = datetime.date.fromisoformat(row["melt_out"])
            assert abs((found - melt).days) <= 1, (j, melt, row)
            assert row["cover_onset"] == "2031-04-01" and float(row["melt_out_sd_d"]) > 0.0
            assert float(row["x"]) > 511990.0
        right = 0
        for k, row in enumerate(daily):
            day, j = divmod(k, CHANNELS)
            assert row["state"] in ("bare", "snow", "unknown") and row["rule_state"]
            assert 0.0 <= float(row["probability"]) <= 1.0
            right += (float(row["probability"]) > 0.5) == (day < MELTS[j])
        assert right >= 0.985 * len(daily), right / len(daily)
        inside, seen = 0, 0
        for day, row in enumerate(cover):
            if not row["covered_fraction"]:  # the record's last hour is a day of its own
                continue
            seen += 1
            truth = sum(day < m for m in MELTS) / CHANNELS
            off = float(row["covered_fraction"]) - truth
            inside += abs(off) <= 2.0 * float(row["covered_fraction_sd"])
        assert seen >= DAYS and inside >= 0.9 * seen, (seen, inside)
        findings = json.loads((out / "findings.json").read_text(encoding="utf-8"))
        snow = findings["snow"][0]
        assert len(snow["channels"]) == CHANNELS and len(snow["cover"]) == len(cover)
        assert snow["cover"][3]["date"] == cover[3]["date"]
        assert any("avalanche" in text.lower() for text in findings["cautions"])
        with sqlite3.connect(out / "layers.gpkg") as base:
            count = base.execute("SELECT count(*) FROM snow_daily_map WHERE probability > 0.5")
            assert count.fetchone()[0] > 0
        for raster in ("snow_probability.tif", "snow_melt_out.tif"):
            assert (out / "layers" / raster).stat().st_size > 100
        assert "h-coverpicture" in (out / "report.html").read_text(encoding="utf-8")


if __name__ == "__main__":
    main()
