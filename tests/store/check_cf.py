#!/usr/bin/env python3
# SPDX-License-Identifier: Apache-2.0
"""Checks a canonical record against the CF conventions (version 1.11 and its later source text),
sections 2.5, 2.6, 3.1, 3.5, 4.1-4.4, 5.6, 7.1, 7.3 and 9, and opens it with xarray and GDAL.

check_cf.py RECORD.nc     prints what is wrong, one line each; exit status 1 if anything is
"""
import sys

import netCDF4
import numpy as np

problems = []


def check(right, text):
    if not right:
        problems.append(text)


def check_globals(nc):
    check(any(word.strip().startswith("CF-1.") for word in getattr(nc, "Conventions", "").split(",")),
          "Conventions does not name CF-1.x (2.6.1)")
    check(getattr(nc, "featureType", "") == "timeSeries", "featureType is not timeSeries (9)")
    for name in ("title", "source"):
        check(getattr(nc, name, "") != "", f"no global attribute {name} (2.6.2)")


def check_time(nc):
    time = nc["time"]
    check(time.dimensions == ("time",), "time is no coordinate variable")
    check(time.units == "seconds since 1970-01-01T00:00:00Z", "units of time (4.4)")
    check(time.calendar == "standard", "calendar of time (4.4.1)")
    check(time.standard_name == "time", "standard_name of time")
    values = np.asarray(time[:])
    check(not np.ma.is_masked(time[:]) and np.all(np.isfinite(values)), "missing times (2.5.1)")
    check(np.all(np.diff(values) > 0), "time is not strictly increasing (4.4, 5)")
    bounds = np.asarray(nc[time.bounds][:])
    check(bounds.shape == (len(values), 2), "shape of the time bounds (7.1)")
    check(np.all(bounds[:, 0] <= values) and np.all(values <= bounds[:, 1]), "times outside their bounds (7.1)")
    check(not nc[time.bounds].ncattrs(), "bounds with attributes of their own (7.1)")


def check_distance(nc):
    distance = nc["distance"]
    values = np.asarray(distance[:])
    check(distance.units == "m", "units of distance (3.1)")
    check(np.all(np.isfinite(values)) and np.all(np.diff(values) > 0), "distance does not increase")
    bounds = np.asarray(nc[distance.bounds][:])
    check(bounds.shape == (len(values), 2), "shape of the distance bounds (7.1)")
    check(np.all(bounds[1:, 0] == bounds[:-1, 1]), "cells of distance do not join (7.1)")


def check_feature(nc):
    roles = [v for v in nc.variables.values() if getattr(v, "cf_role", "") == "timeseries_id"]
    check(len(roles) == 1, "not exactly one variable with cf_role timeseries_id (9.5)")
    if roles:
        values = roles[0][:]
        check(len(set(values.tolist())) == len(values), "timeseries_id repeats (9.5)")


def check_range(name, variable):
    """actual_range equals the smallest and largest unpacked value (2.5.1)."""
    if not hasattr(variable, "actual_range"):
        check(np.ma.count(variable[:]) == 0, f"{name} has no actual_range (2.5.1)")
        return
    values = np.ma.masked_invalid(variable[:])
    if values.count() == 0:
        check(False, f"{name} has an actual_range and no value")
        return
    low, high = np.asarray(variable.actual_range).tolist()
    check(float(values.min()) == low and float(values.max()) == high,
          f"actual_range of {name} is {low}..{high}, its data {values.min()}..{values.max()} (2.5.1)")


def check_data(nc):
    kinds = ("temperature", "stokes", "antistokes", "reverse_stokes", "reverse_antistokes")
    for name in kinds:
        if name not in nc.variables:
            check(name != "temperature", "no variable temperature")
            continue
        v = nc[name]
        check(v.dimensions == ("time", "distance"), f"dimensions of {name}")
        check("_FillValue" in v.ncattrs(), f"{name} has no _FillValue (2.5.1)")
        check(np.isfinite(v._FillValue), f"_FillValue of {name} is not finite")
        check(v.cell_methods == "time: mean", f"cell_methods of {name} (7.3)")
        for word in v.coordinates.split():
            check(word in nc.variables, f"coordinate {word} of {name} is missing (5)")
            check(nc[word].dimensions == ("distance",), f"coordinate {word} has other dimensions (5)")
        check_range(name, v)
        if "scale_factor" in v.ncattrs():
            check(v.dtype in (np.int16, np.int32) and np.asarray(v.scale_factor).dtype == np.float64,
                  f"packing of {name} (8.1)")
        if name == "temperature":
            check(v.units == "degC", "units of temperature (3.1)")
            check(v.units_metadata == "temperature: on_scale", "units_metadata of temperature (3.1.2)")
        for word in getattr(v, "ancillary_variables", "").split():
            check(word in nc.variables, f"ancillary variable {word} is missing (3.4)")


def check_positions(nc):
    if "lat" in nc.variables:
        check(nc["lat"].units == "degrees_north" and nc["lat"].standard_name == "latitude", "lat (4.1)")
        check(nc["lon"].units == "degrees_east" and nc["lon"].standard_name == "longitude", "lon (4.2)")
        for name in ("lat", "lon"):
            check(name in nc["temperature"].coordinates.split(), f"{name} is no coordinate of temperature (5)")
    if "z" in nc.variables:
        check(nc["z"].positive == "up" and nc["z"].units == "m", "z (4.3)")
    mapping = getattr(nc["temperature"], "grid_mapping", "")
    if "x" in nc.variables and getattr(nc["x"], "standard_name", "") == "projection_x_coordinate":
        check(mapping in nc.variables, "x and y without grid_mapping (5.6)")
        check(getattr(nc[mapping], "crs_wkt", "") != "", "grid mapping without crs_wkt (5.6.1)")
    for name in ("lat", "lon", "x", "y", "z", "station_m", "position_sd_m", "noise_c"):
        if name in nc.variables:
            check_range(name, nc[name])
    if "flag" in nc.variables:
        flag = nc["flag"]
        check(len(flag.flag_meanings.split()) == len(np.atleast_1d(flag.flag_values)), "flag_meanings (3.5)")
        check(np.all(np.isin(flag[:], flag.flag_values)), "flag outside flag_values (3.5)")


def check_others(path):
    import xarray
    from osgeo import gdal

    with xarray.open_dataset(path) as ds:
        check(np.issubdtype(ds["time"].dtype, np.datetime64), "xarray does not decode the times")
        check(ds["temperature"].dims == ("time", "distance"), "xarray's dimensions")
        for name in ("time", "distance", "channel"):
            check(name in ds.coords, f"xarray does not take {name} for a coordinate")
        with netCDF4.Dataset(path) as nc:
            for name in ("lat", "lon", "x", "y", "z", "station_m"):
                check((name in nc.variables) == (name in ds.coords), f"xarray's coordinate {name}")
            first = np.ma.filled(nc["temperature"][0].astype(float), np.nan)
        # xarray unpacks in float32: one unit in the last place of 300 degC.
        check(np.allclose(ds["temperature"][0].values, first, atol=4e-5, equal_nan=True), "xarray's values")
    gdal.UseExceptions()
    ds = gdal.OpenEx(path, gdal.OF_MULTIDIM_RASTER, allowed_drivers=["netCDF"])
    array = ds.GetRootGroup().OpenMDArray("temperature")
    check([d.GetName() for d in array.GetDimensions()] == ["time", "distance"], "GDAL's dimensions")
    check(array.GetUnit() == "degC", "GDAL's unit")


def main():
    path = sys.argv[1]
    with netCDF4.Dataset(path) as nc:
        for part in (check_globals, check_time, check_distance, check_feature, check_data, check_positions):
            part(nc)
    check_others(path)
    for problem in problems:
        print(f"{path}: {problem}")
    sys.exit(1 if problems else 0)


main()
