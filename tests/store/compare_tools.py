#!/usr/bin/env python3
# SPDX-License-Identifier: Apache-2.0
"""compare_tools.py RECORD.nc VALUES.f32: do netCDF4, xarray and GDAL give the values written?"""
import sys

import netCDF4
import numpy as np
import xarray
from osgeo import gdal

path, raw = sys.argv[1:]
gdal.UseExceptions()
with netCDF4.Dataset(path) as nc:
    shape = nc["temperature"].shape
    expected = np.fromfile(raw, np.float32).reshape(shape)
    got = np.ma.filled(nc["temperature"][:].astype(np.float32), np.nan)
    assert np.array_equal(got, expected, equal_nan=True), "netCDF4's values"
    assert nc["temperature"].chunking() == [288, 256]
    assert nc["temperature"].filters()["complevel"] == 4 and nc["temperature"].filters()["shuffle"]
    assert nc.dimensions["time"].isunlimited() and nc.dimensions["nv"].size == 2
    assert nc["crs"].grid_mapping_name == "transverse_mercator"
    assert nc["crs"].longitude_of_central_meridian == 9.0
    assert nc["crs"].scale_factor_at_central_meridian == 0.9996
    assert nc["crs"].false_easting == 500000.0
    assert abs(nc["crs"].inverse_flattening - 298.257222101) < 1e-9
    assert nc.creator_name == "A. Müller"
    assert nc.Conventions == "CF-1.11, ACDD-1.3"
    assert nc.time_coverage_resolution == "PT300S" or nc.time_coverage_resolution == "PT5M"
    assert nc.geospatial_lat_min == 47.0 and nc.geospatial_lat_max == 47.02
    assert np.ma.is_masked(nc["lon"][3])
with xarray.open_dataset(path) as ds:
    assert str(ds["time"].values[0]) == "2031-04-05T10:00:00.000000000", ds["time"].values[0]
    assert str(ds["time"].values[1] - ds["time"].values[0]) == "300000000000 nanoseconds"
    assert np.isnan(ds["lon"].values[3]) and ds["lon"].values[0] == 8.0
    # xarray unpacks int16 in float32 arithmetic: within one unit in the last place.
    assert np.allclose(ds["temperature"].values, expected, rtol=2.4e-7, atol=1e-9, equal_nan=True)
    assert str(ds.attrs["time_coverage_start"]) == "2031-04-05T09:57:30Z"
array = gdal.OpenEx(path, gdal.OF_MULTIDIM_RASTER, allowed_drivers=["netCDF"]).GetRootGroup().OpenMDArray("temperature")
got = array.GetUnscaled().ReadAsArray().astype(np.float32)
assert np.array_equal(np.isnan(expected), ~np.isfinite(got) | (got < -300)), "GDAL's missing values"
there = np.isfinite(expected)
assert np.array_equal(got[there], expected[there]), "GDAL's values"
del array  # GDAL lets go of the file
# Opened for changes by netCDF-C: what it writes stands beside what was there.
with netCDF4.Dataset(path, "a") as nc:
    nc.comment = "looked at"
with netCDF4.Dataset(path) as nc:
    assert nc.comment == "looked at"
    assert np.array_equal(np.ma.filled(nc["temperature"][:].astype(np.float32), np.nan), expected, equal_nan=True)
