# SPDX-License-Identifier: Apache-2.0
"""Every bad input ends with its whole message, its exit status, and the earlier output whole.

  bad_input.py RILLSTRAND
"""
import gzip
import os
import sys
import tempfile

import pyproj

import campaign_folder as good

PROGRAM = sys.argv[1]
LINES = good.RECORD.splitlines(keepends=True)
failures = []


def lines_with(index, text):
    lines = list(LINES)
    lines[index] = text
    return "".join(lines)


def case(name, expected, status=1, command="run", toml=good.TOML, prepare=None, **files):
    """Spoils the good campaign and compares all of standard error with what is expected."""
    with tempfile.TemporaryDirectory() as place:
        folder = good.make(place, toml, **files)
        out = folder / "out"
        if prepare is not None:
            prepare(folder)
        else:
            out.mkdir()
            (out / "findings.json").write_text("earlier")
        done = good.run(PROGRAM, "--quiet", command, folder / "campaign.toml")
        told = done.stderr.replace(str(folder) + "/", "").replace(str(folder), "FOLDER").rstrip("\n")
        if done.returncode != status or told != expected:
            failures.append(f"{name}: exit {done.returncode}, expected {status}\n  told:     {told}\n"
                            f"  expected: {expected}")
        if prepare is None:
            if (out / "findings.json").read_text() != "earlier":
                failures.append(f"{name}: the earlier output was changed")
            if [p for p in out.iterdir() if p.name != "findings.json"]:
                failures.append(f"{name}: something was left in the output folder")


# --- The campaign file and the files it names
case("missing file", "record.files: 'nothing.csv' matches no file in FOLDER; correct the pattern or put the files there",
     toml=good.TOML.replace("record.csv", "nothing.csv"))
case("missing tie points", "campaign.toml:5:1: placement.tie_points: there is no file 'tie_points.csv' in FOLDER; "
     "correct the name or put the file there", tie_points__csv=None)
case("unknown key", "campaign.toml:1:1: 'record.files' is missing; say the record's files, e.g. files = [\"traces/*.csv\"]\n"
     "campaign.toml:2:1: unknown key 'record.file'; the nearest known key is 'files'",
     toml=good.TOML.replace("files =", "file ="))
case("wrong zone name", "record.time_zone: there is no zone 'Europe/Berln'; did you mean 'Europe/Berlin'?",
     toml=good.TOML.replace("[placement]", "time_zone = \"Europe/Berln\"\n[placement]"))
case("stretch outside the record", "campaign.toml:6:1: stretch 'reach' from 200 to 300 m holds no channel of the record, "
     "which reaches from 0 to 79 m; correct from_m and to_m",
     toml=good.TOML.replace("10.0", "200.0").replace("70.0", "300.0"))
case("stretches that overlap", "campaign.toml:13:1: stretch 'pool' overlaps stretch 'reach' (line 6) from 60 to 70 m; "
     "part them, only a coil or bath may lie wholly inside another stretch",
     toml=good.TOML + "[[stretch]]\nname = \"pool\"\nsetting = \"water\"\nfrom_m = 60\nto_m = 75\n")

# --- The record
case("empty file", "record.csv: is empty; it holds no row of numbers", record__csv="")
case("binary junk", "record.csv: holds zero bytes, so it is not text in UTF-8; give a text file, or record.layout = "
     "\"grid\" for NetCDF", record__csv=bytes(range(256)) * 20)
case("header without numbers", "record.csv:1: holds a header and no row of numbers; give a file with data",
     record__csv=LINES[0])
case("ragged row", "record.csv:4: has 2 cells where the header has 81; complete or remove the line",
     record__csv=lines_with(3, good.stamp(2) + ",12.0\n"))
case("letters in a number", "record.csv:4: column 3: '12.O' is no temperature; correct it, or add the text to record.missing",
     record__csv=lines_with(3, good.stamp(2) + ",12.0,12.O" + ",12.0" * 78 + "\n"))
case("two traces at one time", "record.csv:4: a trace of 2031-07-03T00:30:00Z stands here and in record.csv:3 with other "
     "values; take one out, or say record.duplicates = \"first\" or \"mean\"",
     record__csv=lines_with(3, good.stamp(1) + ",12.0" * 80 + "\n"))
case("all missing", "record: no trace holds a single temperature; see record.missing, record.valid_range_c and the columns' names",
     record__csv=LINES[0] + good.stamp(0) + "," * 80 + "\n" + good.stamp(1) + "," * 80 + "\n")
case("distances not increasing", "record.csv:1: distance 1 m comes after 2 m; the distances of a header must increase, each once",
     record__csv=lines_with(0, LINES[0].replace("time,0,1,2,", "time,0,2,1,")))
case("unit that contradicts values", "record: 7680 of 7680 temperatures lie outside -80 to 120 degC (their mean is 15.0 as "
     "written); they look like degrees Celsius: set record.temperature_unit = \"degC\"",
     toml=good.TOML.replace("[placement]", "temperature_unit = \"K\"\n[placement]"),
     record__csv=LINES[0] + "".join(good.stamp(i) + ",15.00" * 80 + "\n" for i in range(96)))
case("directory as record", "record.csv: is a folder without .zgroup or .zarray, so not a whole Zarr store; copy it again "
     "with its hidden files", record__csv=None, prepare=lambda folder: (folder / "record.csv").mkdir())
case("truncated gzip", "record.csv.gz: the gzip stream is cut short; copy the file again",
     toml=good.TOML.replace("record.csv", "record.csv.gz"),
     record__csv__gz=gzip.compress(good.RECORD.encode(), mtime=0)[:4000])

# --- The placement
case("unknown EPSG code", "placement.crs: 'EPSG:999999' is no known coordinate system; write an EPSG code such as "
     "EPSG:25832, or WKT", toml=good.TOML.replace("25832", "999999"))
case("one tie point", "tie_points.csv: holds 1 tie points; at least two are needed to place a cable",
     tie_points__csv="".join(good.TIES.splitlines(keepends=True)[:2]))
case("distance given twice", "tie_points.csv:3: fibre distance 2 m was given before (tie_points.csv:2); keep one of the two",
     tie_points__csv=good.TIES.replace("30,512027", "2,512027"))
# Longitudes and latitudes by PROJ's own Python binding.
UTM = pyproj.Transformer.from_crs("EPSG:25832", "EPSG:4326", always_xy=True)


def at(x, y):
    lon, lat = UTM.transform(x, y)
    return f" (it would be at longitude {lon:.4f}, latitude {lat:.4f})"


swapped = "fibre_m,x,y,sd_m,label\n" + "".join(
    ",".join([r[0], r[2], r[1], r[3], r[4]]) + "\n" for r in (l.split(",") for l in good.TIES.splitlines()[1:]))
case("swapped axis order", "\n".join(
    f"tie_points.csv:{i + 2}: tie point '{r[4]}' at {r[2]}, {r[1]} lies outside the area of ETRS89 / UTM zone 32N"
    f"{at(float(r[2]), float(r[1]))}; x and y look exchanged: x is easting or longitude" for i, r in
    enumerate(l.split(",") for l in good.TIES.splitlines()[1:])), tie_points__csv=swapped)
case("tie point outside the area", "tie_points.csv:2: tie point 'a' at 9512000, 5278000 lies outside the area of ETRS89 / UTM zone "
     f"32N{at(9512000, 5278000)}; correct placement.crs (zone?) or the coordinates",
     tie_points__csv=good.TIES.replace("2,512000", "2,9512000"))
case("degrees in a projected system", "tie_points.csv:2: tie point 'a' at 9.16, 47.65 lies outside the area of ETRS89 / UTM zone 32N"
     f"{at(9.16, 47.65)}; these look like degrees: set placement.crs to \"EPSG:4326\"",
     tie_points__csv=good.TIES.replace("2,512000,5278000", "2,9.16,47.65"))
# The nearest end of the route, from the third tie point of four, along the ellipsoid.
far = pyproj.Geod(ellps="WGS84").inv(*UTM.transform(512051, 5278006), 9.16, 47.452)[2]
case("route elsewhere", f"placement.route: half of the tie points lie more than {far:.0f} m from the route; check placement.crs, the "
     "order of x and y, and that the route is this cable's",
     toml=good.TOML.replace("[[stretch]]", "route = \"route.geojson\"\n[[stretch]]"),
     route__geojson='{"type":"FeatureCollection","features":[{"type":"Feature","properties":{},"geometry":'
     '{"type":"LineString","coordinates":[[9.16,47.45],[9.16,47.452]]}}]}')

# --- The machine
case("output is a file", "FOLDER/out: is not a folder; name a folder in campaign.output".replace("FOLDER/", ""),
     prepare=lambda folder: (folder / "out").write_text("mine"))
if os.geteuid() != 0:
    case("output not writable", "out: output folder cannot be written: Permission denied; name a folder that you may write in "
         "campaign.output", status=3, prepare=lambda folder: (folder / "out").mkdir(0o500))
else:
    case("output not writable", "/proc/rillstrand: output folder cannot be made: No such file or directory; name a folder that "
         "you may write in campaign.output", status=3, prepare=lambda folder: None,
         toml="[campaign]\noutput = \"/proc/rillstrand\"\n" + good.TOML)

for words, expected in [
        ([], "rillstrand: A subcommand is required; see rillstrand --help"),
        (["runn", "x"], None), (["run"], "rillstrand: campaign is required; see rillstrand --help")]:
    done = good.run(PROGRAM, *words)
    if done.returncode != 2 or (expected is not None and done.stderr.strip() != expected):
        failures.append(f"words {words}: exit {done.returncode}, told {done.stderr!r}")

print("\n".join(failures) if failures else "every bad input was refused in words")
sys.exit(1 if failures else 0)
