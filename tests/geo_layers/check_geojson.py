#!/usr/bin/python3
# SPDX-License-Identifier: Apache-2.0
"""Checks GeoJSON files against the rules of RFC 7946; says what is wrong and ends with status 1.

    check_geojson.py FILE...
"""
import json
import math
import sys


def no_constant(text):
    raise ValueError(f"{text} is no JSON (section 3 of RFC 8259)")


def no_repeat(pairs):
    keys = [key for key, _ in pairs]
    if len(set(keys)) != len(keys):
        raise ValueError(f"a member stands twice in {sorted(keys)}")
    return dict(pairs)


def position(p, where):
    if not isinstance(p, list) or not 2 <= len(p) <= 3:
        yield f"{where}: a position has two or three numbers, not {p}"  # 3.1.1
        return
    if not all(isinstance(v, (int, float)) and not isinstance(v, bool) and math.isfinite(v) for v in p):
        yield f"{where}: {p} is not made of finite numbers"
        return
    if not -180 <= p[0] <= 180 or not -90 <= p[1] <= 90:  # section 4
        yield f"{where}: {p} is no longitude and latitude"


def line(points, where):
    if not isinstance(points, list) or len(points) < 2:
        yield f"{where}: a line has two positions at least"  # 3.1.4
        return
    for p in points:
        yield from position(p, where)
    for a, b in zip(points, points[1:]):
        if abs(a[0] - b[0]) > 180:
            yield f"{where}: the line is not cut at the antimeridian"  # 3.1.9


def area(rings):
    return sum(a[0] * b[1] - b[0] * a[1] for a, b in zip(rings, rings[1:]))


def polygon(rings, where):
    for i, ring in enumerate(rings):
        if len(ring) < 4 or ring[0] != ring[-1]:
            yield f"{where}: a ring is closed and has four positions at least"  # 3.1.6
        elif (area(ring) > 0) != (i == 0):
            yield f"{where}: outer rings run counter-clockwise, holes clockwise"


def geometry(g, where):
    if g is None:
        return
    if not isinstance(g, dict) or "type" not in g:
        yield f"{where}: geometry is neither an object with a type nor null"
        return
    kinds = {"Point": lambda c: position(c, where), "LineString": lambda c: line(c, where),
             "MultiPoint": lambda c: (e for p in c for e in position(p, where)),
             "MultiLineString": lambda c: (e for p in c for e in line(p, where)),
             "Polygon": lambda c: polygon(c, where),
             "MultiPolygon": lambda c: (e for p in c for e in polygon(p, where))}
    if g["type"] not in kinds:
        yield f"{where}: no such geometry type: {g['type']}"
    else:
        yield from kinds[g["type"]](g["coordinates"])


def feature(f, where):
    if f.get("type") != "Feature":
        yield f"{where}: type is {f.get('type')}, not Feature"
    if "geometry" not in f or "properties" not in f:
        yield f"{where}: a feature has geometry and properties"  # 3.2
        return
    if f["properties"] is not None and not isinstance(f["properties"], dict):
        yield f"{where}: properties is neither an object nor null"
    if "id" in f and (isinstance(f["id"], bool) or not isinstance(f["id"], (str, int, float))):
        yield f"{where}: id is neither text nor number"
    if any(key in f for key in ("coordinates", "geometries", "features")):
        yield f"{where}: members of other types are in a feature"  # 7.1
    yield from geometry(f["geometry"], where)


def box(b, where):
    if b is not None and (len(b) not in (4, 6) or b[1] > b[len(b) // 2 + 1]):
        yield f"{where}: bbox is all minima, then all maxima"  # section 5


def check(path):
    raw = open(path, "rb").read()
    if raw.startswith(b"\xef\xbb\xbf"):
        yield "begins with a byte-order mark"  # RFC 8259, 8.1
    try:
        document = json.loads(raw.decode("utf-8"), parse_constant=no_constant, object_pairs_hook=no_repeat)
    except (ValueError, UnicodeDecodeError) as error:
        yield str(error)
        return
    if document.get("type") != "FeatureCollection" or not isinstance(document.get("features"), list):
        yield "is no FeatureCollection"
        return
    if "crs" in document:
        yield "has a crs member"  # section 4
    yield from box(document.get("bbox"), "collection")
    for i, f in enumerate(document["features"]):
        yield from feature(f, f"feature {i + 1}")
        yield from box(f.get("bbox"), f"feature {i + 1}")


def main():
    problems = [f"{path}: {problem}" for path in sys.argv[1:] for problem in check(path)]
    print("\n".join(problems) if problems else f"{len(sys.argv) - 1} files follow RFC 7946")
    return 1 if problems or len(sys.argv) < 2 else 0


if __name__ == "__main__":
    sys.exit(main())
