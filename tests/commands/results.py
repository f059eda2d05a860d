# SPDX-License-Identifier: Apache-2.0
"""The demo campaign's results by the contract: names, schema, layers, record, page; and what was put in is found.

  results.py RILLSTRAND DEMO TESTS_FOLDER
"""
import csv
import hashlib
import json
import math
import pathlib
import re
import subprocess
import sys
import tempfile

import jsonschema
from osgeo import ogr

PROGRAM, DEMO, TESTS = sys.argv[1], sys.argv[2], pathlib.Path(sys.argv[3])
ogr.UseExceptions()
failures = []


def check(truth, what):
    if not truth:
        failures.append(what)


# The attributes that the contract fixes (its names are the project's own).
WANTED = {
    "channels": "fibre_m position_sd_m stretch setting mean_c sd_c min_c max_c p05_c p50_c p95_c daily_range_c "
                "diurnal_amplitude_c diurnal_phase_h noise_c flag x y lon lat",
    "cable": "stretch from_m to_m slack fibre_m",
    "tie_points": "fibre_m label sd_m residual_m slack used reason x y lon lat",
    "inflows": "fibre_m position_sd_m kind fibre_from_m fibre_to_m fraction fraction_sd temperature_c temperature_sd_c "
               "discharge_m3s discharge_sd_m3s contrast_c score x y lon lat",
    "stream_channels": "fibre_m position_sd_m background_c anomaly_c detection_limit_fraction sevendadm_c x y lon lat",
}
GEOMETRY = {"channels": ogr.wkbPoint25D, "cable": ogr.wkbLineString25D, "tie_points": ogr.wkbPoint25D,
            "inflows": ogr.wkbPoint, "stream_channels": ogr.wkbPoint}

with tempfile.TemporaryDirectory() as place:
    folder = pathlib.Path(place) / "harrowbeck"
    subprocess.run([DEMO, folder], check=True, capture_output=True)
    done = subprocess.run([PROGRAM, "--quiet", "run", folder / "campaign.toml"], capture_output=True, text=True)
    check(done.returncode == 0, f"run: exit {done.returncode}: {done.stderr}")
    out = folder / "out"
    findings = json.loads((out / "findings.json").read_text())
    truth = json.loads((folder / "truth.json").read_text())

    schema = json.loads((TESTS / "commands" / "findings.schema.json").read_text())
    for error in jsonschema.Draft7Validator(schema).iter_errors(findings):
        failures.append(f"findings.json: {'/'.join(map(str, error.path))}: {error.message}")
    campaign_sum = hashlib.sha256((folder / "campaign.toml").read_bytes()).hexdigest()
    check(findings["provenance"]["campaign_sha256"] == campaign_sum, "provenance: the campaign's SHA-256 is another")
    for item in findings["provenance"]["inputs"]:
        check(hashlib.sha256((folder / item["file"]).read_bytes()).hexdigest() == item["sha256"], f"SHA-256 of {item['file']}")

    # Layers and tables hold the same rows under the same names.
    layers = ogr.Open(str(out / "layers.gpkg"))
    for name, wanted in WANTED.items():
        rows = list(csv.DictReader((out / "tables" / f"{name}.csv").open()))
        missing = set(wanted.split()) - set(rows[0])
        check(not missing, f"tables/{name}.csv lacks {missing}")
        layer = layers.GetLayerByName(name)
        definition = layer.GetLayerDefn()
        fields = {definition.GetFieldDefn(i).GetName() for i in range(definition.GetFieldCount())}
        check(set(wanted.split()) <= fields, f"layer {name} lacks {set(wanted.split()) - fields}")
        check(layer.GetFeatureCount() == len(rows), f"layer {name} has {layer.GetFeatureCount()} rows, the table {len(rows)}")
        check(layer.GetGeomType() == GEOMETRY[name], f"layer {name} has geometry {layer.GetGeomType()}")
        if name == "cable":
            continue
        for feature, row in zip(layer, rows):
            geometry = feature.GetGeometryRef()
            if row["x"] == "":
                check(geometry is None, f"{name}: a row without position has a geometry")
            else:
                check(abs(geometry.GetX() - float(row["x"])) < 1e-3, f"{name}: x of layer and table differ")
    same = [[i["fibre_m"], i["fraction"]] for s in findings["stream"] for i in s["inflows"]]
    table = [[float(r["fibre_m"]), float(r["fraction"]) if r["fraction"] else None]
             for r in csv.DictReader((out / "tables" / "inflows.csv").open())]
    check(same == table, "inflows of findings and table differ")

    for script, files in (("geo_layers/check_gpkg.py", [out / "layers.gpkg"]),
                          ("geo_layers/check_geojson.py", sorted((out / "layers").glob("*.geojson"))),
                          ("store/check_cf.py", [out / "record.nc"])):
        done = subprocess.run([sys.executable, TESTS / script, *files], capture_output=True, text=True)
        check(done.returncode == 0, f"{script}: {done.stdout}{done.stderr}")

    # The page asks nobody for anything.
    page = (out / "report.html").read_text()
    check(page.rstrip().endswith("</html>"), "report.html is not whole")
    bare = re.sub(r"<script.*?</script>", "", page, flags=re.S)  # what scripts may ask for: the browser's test
    check(not re.search(r'(src|href)\s*=\s*"(https?:)?//', bare), "report.html names something outside")
    check("Laser" in page and "licensed engineer" in page, "report.html lacks cautions")

    # What was put in is found: each point inflow within 2 m, its share within 3 sd.
    found = [i for s in findings["stream"] for i in s["inflows"]]
    for inflow in truth["inflows"]:
        near = [i for i in found if i["kind"] == "step" and abs(i["fibre_m"] - inflow["fibre_m"]) < 2.0]
        check(len(near) == 1, f"{inflow['label']}: found {len(near)} times")
        for i in near:
            off = abs(i["fraction"] - inflow["fraction"]) / i["fraction_sd"]
            check(off < 3.0, f"{inflow['label']}: its share is off by {off:.1f} sd")
            check(i["known"] == inflow["surface_water"], f"{inflow['label']}: surface water or not")
    for spot in truth["spots"]:
        check(any(i["kind"] == "spot" and abs(i["fibre_m"] - spot["fibre_m"]) < 2.0 for i in found), "the spot is not found")
    for bath, told in zip(truth["baths"], findings["quality"]["baths"]):
        check(abs(told["bias_c"]) < 3.0 * told["bias_sd_c"], f"{bath['name']}: bias {told['bias_c']}")
    channels = list(csv.DictReader((out / "tables" / "channels.csv").open()))
    inside = total = 0
    for position in truth["positions"]:
        row = min(channels, key=lambda r: abs(float(r["fibre_m"]) - position["fibre_m"]))
        error = math.hypot(float(row["x"]) - position["x"], float(row["y"]) - position["y"])
        inside += error < 2.0 * float(row["position_sd_m"]) + 0.25  # half a channel's spacing
        total += 1
    check(inside > 0.8 * total, f"positions: {inside} of {total} inside twice the stated sd")

    # A stage alone writes its own tables only.
    for command, tables in (("place", {"channels.csv", "cable.csv", "tie_points.csv"}), ("assess", {"channels.csv", "baths.csv", "events.csv"})):
        (folder / "one.toml").write_text('[campaign]\noutput = "alone"\n' + (folder / "campaign.toml").read_text().split("\n", 7)[7])
        subprocess.run(["rm", "-rf", folder / "alone"], check=True)
        done = subprocess.run([PROGRAM, "-q", command, folder / "one.toml"], capture_output=True, text=True)
        wrote = {p.name for p in (folder / "alone").rglob("*") if p.is_file()} if done.returncode == 0 else done.stderr
        check(wrote == tables, f"{command} wrote {wrote}")
    done = subprocess.run([PROGRAM, "check", folder / "campaign.toml"], capture_output=True, text=True)
    check(done.returncode == 0 and done.stdout.startswith("campaign.toml: good"), f"check: {done.stdout}{done.stderr}")
    (folder / "campaign.toml").unlink()
    (folder / "one.toml").unlink()
    done = subprocess.run([PROGRAM, "draft", folder], capture_output=True, text=True)
    check(done.returncode == 0 and 'files = ["traces/trace_*.csv"]' in done.stdout.replace("*-*-*T*-*-*", "*")
          and 'tie_points = "tie_points.csv"' in done.stdout, f"draft: {done.stdout}{done.stderr}")
    (folder / "drafted.toml").write_text(done.stdout)
    done = subprocess.run([PROGRAM, "-q", "run", folder / "drafted.toml"], capture_output=True, text=True)
    check(done.returncode == 0, f"the draft as it stands does not run: {done.stderr}")

print("\n".join(failures) if failures else "the demo's results keep the contract")
sys.exit(1 if failures else 0)
