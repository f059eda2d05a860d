# SPDX-License-Identifier: Apache-2.0
"""Times the placement of a million channels beside numpy.interp and pyproj on the same machine.

placement.py PROGRAM (rillstrand_place_million, built with RILLSTRAND_BENCH); prints a Markdown table.
An invented winding line of 100 km with 20,000 vertices, a tie point every 500 m, a raster of heights."""
import json
import pathlib
import subprocess
import sys
import tempfile
import time

import numpy as np
import pyproj
from osgeo import gdal, osr

gdal.UseExceptions()


def best(work):
    took = []
    for _ in range(5):
        begin = time.perf_counter()
        work()
        took.append(time.perf_counter() - begin)
    return min(took)


def make(folder):
    s = np.arange(0.0, 98000.0, 4.9)
    heading = 0.4 + 0.8 * np.sin(s / 80.0) + 0.5 * np.sin(s / 33.0)
    x = 500000.0 + np.cumsum(4.9 * np.cos(heading))
    y = 5278000.0 + np.cumsum(4.9 * np.sin(heading))
    lonlat = pyproj.Transformer.from_crs(25832, 4326, always_xy=True)
    lon, lat = lonlat.transform(x, y)
    points = [[round(a, 8), round(b, 8)] for a, b in zip(lon, lat)]
    (folder / "route.geojson").write_text(json.dumps({"type": "FeatureCollection", "features": [
        {"type": "Feature", "properties": {}, "geometry": {"type": "LineString", "coordinates": points}}]}))
    ties = ["fibre_m,x,y,sd_m"]
    for k in [*range(0, len(s), 100), len(s) - 1]:
        ties.append(f"{s[k] * 1.0203:.3f},{x[k]:.3f},{y[k]:.3f},1.0")
    (folder / "ties.csv").write_text("\n".join(ties) + "\n")
    cells = 1500
    raster = gdal.GetDriverByName("GTiff").Create(str(folder / "dem.tif"), cells, cells, 1, gdal.GDT_Float32,
                                                  ["TILED=YES"])
    size = max(x.max() - x.min(), y.max() - y.min()) + 2000.0
    raster.SetGeoTransform([x.min() - 1000.0, size / cells, 0, y.max() + 1000.0, 0, -size / cells])
    system = osr.SpatialReference()
    system.ImportFromEPSG(25832)
    raster.SetProjection(system.ExportToWkt())
    row, column = np.mgrid[0:cells, 0:cells]
    raster.GetRasterBand(1).WriteArray(400.0 + 30.0 * np.sin(row / 40.0) * np.cos(column / 55.0))
    raster = None
    (folder / "campaign.toml").write_text("""[campaign]
name = "a million channels"
[record]
files = ["none.csv"]
[placement]
crs = "EPSG:25832"
tie_points = "ties.csv"
route = "route.geojson"
elevation = "dem.tif"
""")
    return s, x, y


def main():
    with tempfile.TemporaryDirectory() as place:
        folder = pathlib.Path(place)
        s, x, y = make(folder)
        ours = json.loads(subprocess.run([sys.argv[1], folder], check=True, capture_output=True, text=True).stdout)
        measure = np.linspace(0.0, s[-1], 1_000_000)
        interp = best(lambda: (np.interp(measure, s, x), np.interp(measure, s, y)))
        gx, gy = np.interp(measure, s, x), np.interp(measure, s, y)
        to_wgs84 = pyproj.Transformer.from_crs(25832, 4326, always_xy=True)
        transform = best(lambda: to_wgs84.transform(gx, gy))
    print("| a million channels | here | reference | times as fast |\n| --- | --- | --- | --- |")
    print(f"| position along the line | {ours['along_s']:.3f} s | numpy.interp {interp:.3f} s | "
          f"{interp / ours['along_s']:.1f} |")
    print(f"| to WGS 84 | {ours['transform_s']:.3f} s | pyproj {transform:.3f} s | "
          f"{transform / ours['transform_s']:.1f} |")
    print(f"| whole placement with heights, slope and aspect ({ours['placed']} placed) | {ours['place_s']:.3f} s | | |")


main()
