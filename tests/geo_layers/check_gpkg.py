#!/usr/bin/python3
# SPDX-License-Identifier: Apache-2.0
"""Checks a GeoPackage against requirements of OGC 12-128 by SQL, and with GDAL's own validator.

    check_gpkg.py FILE.gpkg
"""
import datetime
import re
import sqlite3
import struct
import sys

PLAIN = {"BOOLEAN", "TINYINT", "SMALLINT", "MEDIUMINT", "INT", "INTEGER", "FLOAT", "DOUBLE", "REAL", "TEXT",
         "BLOB", "DATE", "DATETIME"}
GEOMETRY = {"GEOMETRY", "POINT", "LINESTRING", "POLYGON", "MULTIPOINT", "MULTILINESTRING", "MULTIPOLYGON",
            "GEOMETRYCOLLECTION"}
STAMP = re.compile(r"^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d{3})?Z$")
WKB = {1: "POINT", 1001: "POINT", 2: "LINESTRING", 1002: "LINESTRING"}


def quoted(name):
    return '"' + name.replace('"', '""') + '"'


def header(path):
    raw = open(path, "rb").read(100)
    if not raw.startswith(b"SQLite format 3\0"):
        yield "Req 1: no SQLite file"
    if not path.endswith(".gpkg"):
        yield "Req 3: name does not end in .gpkg"
    if struct.unpack(">I", raw[68:72])[0] != 0x47504B47:
        yield "Req 2: application_id is not GPKG"
    if struct.unpack(">I", raw[60:64])[0] < 10200:
        yield "Req 2: user_version is no version of the standard"


def whole(db):
    if db.execute("PRAGMA integrity_check").fetchall() != [("ok",)]:
        yield "Req 6: integrity_check"
    if db.execute("PRAGMA foreign_key_check").fetchall():
        yield "Req 7: foreign_key_check"
    systems = set(db.execute("SELECT srs_id, upper(organization), organization_coordsys_id FROM gpkg_spatial_ref_sys"))
    for row in ((4326, "EPSG", 4326), (-1, "NONE", -1), (0, "NONE", 0)):
        if row not in systems:
            yield f"Req 11: spatial reference system {row} is not listed"


def contents(db):
    known = {row[0] for row in db.execute("SELECT srs_id FROM gpkg_spatial_ref_sys")}
    names = {row[0] for row in db.execute("SELECT name FROM sqlite_master WHERE type IN ('table', 'view')")}
    rows = db.execute("SELECT table_name, data_type, last_change, srs_id FROM gpkg_contents").fetchall()
    if not rows:
        yield "Req 13: gpkg_contents is empty"
    for table, kind, changed, srs in rows:
        if table not in names:
            yield f"Req 14: {table} is not there"
            continue
        if not STAMP.match(changed):
            yield f"Req 15: {table}: last_change {changed}"
        if kind == "features" and srs not in known:
            yield f"Req 16: {table}: srs_id {srs} is not listed"
        yield from columns(db, table, kind)
        if kind == "features":
            yield from features(db, table, srs)


def is_view(db, table):
    return db.execute("SELECT type FROM sqlite_master WHERE name = ?", (table,)).fetchone()[0] == "view"


def columns(db, table, kind):
    info = db.execute(f"PRAGMA table_info({quoted(table)})").fetchall()
    allowed = PLAIN | (GEOMETRY if kind == "features" else set())
    for _, name, declared, _, _, _ in info:
        if re.sub(r"\(\d+\)$", "", declared.upper()) not in allowed:
            yield f"Req 5: {table}.{name}: type {declared}"
        if declared.upper() in ("DATE", "DATETIME"):
            yield from stamps(db, table, name, declared.upper())
        if declared.upper() in ("REAL", "DOUBLE", "FLOAT"):
            bad = db.execute(f"SELECT count(*) FROM {quoted(table)} WHERE {quoted(name)} NOT NULL AND "
                             f"typeof({quoted(name)}) NOT IN ('real', 'integer')").fetchone()[0]
            if bad:
                yield f"{table}.{name}: {bad} cells that are no numbers"
    if not is_view(db, table) and [c for c in info if c[5]] != [c for c in info if c[5] and c[2].upper() == "INTEGER"] \
            or not is_view(db, table) and sum(1 for c in info if c[5]) != 1:
        yield f"Req 29, 119: {table}: no INTEGER primary key"


def stamps(db, table, name, declared):
    pattern = STAMP if declared == "DATETIME" else re.compile(r"^\d{4}-\d\d-\d\d$")
    for (value,) in db.execute(f"SELECT DISTINCT {quoted(name)} FROM {quoted(table)} WHERE {quoted(name)} NOT NULL"):
        if not pattern.match(value):
            yield f"Req 5: {table}.{name}: {value} is no {declared}"
        else:
            datetime.date.fromisoformat(value[:10])


def features(db, table, srs):
    rows = db.execute("SELECT column_name, geometry_type_name, srs_id, z, m FROM gpkg_geometry_columns "
                      "WHERE table_name = ?", (table,)).fetchall()
    if len(rows) != 1:
        yield f"Req 22: {table}: {len(rows)} rows in gpkg_geometry_columns"
        return
    column, kind, own_srs, z, m = rows[0]
    if kind not in GEOMETRY:
        yield f"Req 25: {table}: geometry type {kind}"
    if own_srs != srs:
        yield f"Req 146: {table}: srs_id {own_srs} in geometry columns, {srs} in contents"
    if z not in (0, 1, 2) or m not in (0, 1, 2):
        yield f"Req 27, 28: {table}: z {z}, m {m}"
    for (blob,) in db.execute(f"SELECT {quoted(column)} FROM {quoted(table)} WHERE {quoted(column)} NOT NULL"):
        problem = geometry(blob, kind, srs, z)
        if problem:
            yield f"Req 19, 32, 33: {table}: {problem}"
            return
    if not is_view(db, table):
        yield from index(db, table, column)


def geometry(blob, kind, srs, z):
    if blob[:2] != b"GP" or blob[2] != 0:
        return "no GeoPackageBinary header"
    flags = blob[3]
    order = "<" if flags & 1 else ">"
    if struct.unpack(order + "i", blob[4:8])[0] != srs:
        return "srs_id of the header differs"
    envelope = {0: 0, 1: 32, 2: 48, 3: 48, 4: 64}[(flags >> 1) & 7]
    if flags & 16 and envelope:
        return "an empty geometry has an envelope"
    body = blob[8 + envelope:]
    code = struct.unpack(("<" if body[0] else ">") + "I", body[1:5])[0]
    if kind != "GEOMETRY" and WKB.get(code) != kind:
        return f"geometry of type {code} where {kind} is declared"
    if z == 1 and code < 1000 or z == 0 and code >= 1000:
        return f"geometry of type {code} where z is {z}"
    return None


def index(db, table, column):
    if not db.execute("SELECT 1 FROM gpkg_extensions WHERE table_name = ? AND column_name = ? AND "
                      "extension_name = 'gpkg_rtree_index'", (table, column)).fetchone():
        yield f"{table}: no spatial index"
        return
    tree = quoted(f"rtree_{table}_{column}")
    placed = db.execute(f"SELECT count(*) FROM {quoted(table)} WHERE {quoted(column)} NOT NULL").fetchone()[0]
    if db.execute(f"SELECT count(*) FROM {tree}").fetchone()[0] != placed:
        yield f"{table}: the spatial index holds other rows than the table"
    if db.execute(f"SELECT rtreecheck('rtree_{table}_{column}')").fetchone()[0] != "ok":
        yield f"{table}: rtreecheck"


def validator(path):
    from osgeo_utils.samples import validate_gpkg
    for requirement, message in validate_gpkg.check(path, abort_at_first_error=False, extra_checks=True) or []:
        yield f"validator: Req {requirement}: {message}"


def main():
    if len(sys.argv) != 2:
        print(__doc__)
        return 1
    path = sys.argv[1]
    db = sqlite3.connect(path)
    problems = [*header(path), *whole(db), *contents(db), *validator(path)]
    print("\n".join(problems) if problems else f"{path} follows OGC 12-128")
    return 1 if problems else 0


if __name__ == "__main__":
    sys.exit(main())
