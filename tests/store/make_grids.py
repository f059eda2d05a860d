#!/usr/bin/env python3
# SPDX-License-Identifier: Apache-2.0
"""make_grids.py FOLDER: one small record in many forms of grid, and its values as float32."""
import os
import shutil
import sys

import netCDF4
import numpy as np
import xarray
import zarr

folder = sys.argv[1]
rng = np.random.default_rng(20310405)
NT, NX = 150, 70
seconds = 1933149600.0 + 600.0 * np.arange(NT)
distance = 10.0 + 0.5 * np.arange(NX)
values = (np.round(rng.normal(11.0, 6.0, (NT, NX)) * 100) / 100).astype(np.float32)
values[rng.random((NT, NX)) < 0.03] = np.nan
values[:, 5] = np.nan
values.tofile(f"{folder}/values.f32")
KELVIN = (np.nan_to_num(values.astype(float), nan=np.nan) + 273.15)


def nc(name, data=values, dtype="f4", order=("time", "distance"), fmt="NETCDF4", units="degC", fill=None,
       pack=None, time_units="seconds since 1970-01-01T00:00:00Z", times=seconds, time_type="f8",
       calendar="standard", distances=distance, distance_units="m", distance_name="distance",
       variable="temperature", **storage):
    with netCDF4.Dataset(f"{folder}/{name}.nc", "w", format=fmt) as f:
        f.createDimension("time", len(times))
        f.createDimension("distance", len(distances))
        t = f.createVariable("time", time_type, ("time",))
        t.units = time_units
        if calendar:
            t.calendar = calendar
        t[:] = times
        x = f.createVariable(distance_name, "f8", ("distance",))
        if distance_units:
            x.units = distance_units
        x[:] = distances
        v = f.createVariable(variable, dtype, order, fill_value=fill, **storage)
        if units:
            v.units = units
        if pack:
            v.scale_factor, v.add_offset = pack
        out = data if order[0] == "time" else data.T
        v[:] = np.ma.masked_invalid(out) if fill is not None and not np.isnan(fill) else out


deflate = dict(zlib=True, complevel=4, chunksizes=(48, 32))
turned = dict(zlib=True, complevel=4, chunksizes=(32, 48))
nc("deflate", **deflate)
nc("deflate_turned", order=("distance", "time"), **turned)
nc("no_shuffle", zlib=True, shuffle=False, chunksizes=(48, 32))
nc("chunked_plain", chunksizes=(40, 70))
nc("contiguous", contiguous=True)
nc("contiguous_turned", order=("distance", "time"), contiguous=True)
nc("checksummed", fletcher32=True, **deflate)
nc("double", dtype="f8", **deflate)
nc("big_endian", endian="big", **deflate)
nc("packed", dtype="i2", fill=-32768, pack=(np.float64(0.01), np.float64(0.0)), **deflate)
nc("packed_float_scale", dtype="i2", fill=-32768, pack=(np.float32(0.01), np.float32(0.0)), **deflate)
nc("packed_offset", dtype="i4", fill=-999999, pack=(0.005, 20.0), order=("distance", "time"), **turned)
nc("fill", fill=np.float32(-9999.0), **deflate)
nc("kelvin", data=KELVIN, dtype="f8", units="K", **deflate)
nc("fahrenheit", data=values.astype(float) * 9 / 5 + 32, dtype="f8", units="degF", **deflate)
nc("classic", fmt="NETCDF3_CLASSIC")
nc("classic64_turned", fmt="NETCDF3_64BIT_OFFSET", order=("distance", "time"))
nc("falling", data=values[:, ::-1], distances=distance[::-1], **deflate)
nc("falling_turned", data=values[:, ::-1], distances=distance[::-1], order=("distance", "time"), **turned)
nc("kilometres", distances=distance / 1000.0, distance_units="km", **deflate)
nc("days", times=seconds / 86400.0, time_units="days since 1970-01-01", calendar="proleptic_gregorian", **deflate)
nc("minutes", times=((seconds - seconds[0]) / 60).astype(int), time_type="i4",
   time_units="minutes since 2031-04-05 12:00:00 +02:00", calendar="gregorian", **deflate)
nc("other_names", distance_name="cable", variable="tmpw", **deflate)
nc("late", data=values[90:], times=seconds[90:], **deflate)
nc("early", data=values[:100], times=seconds[:100], order=("distance", "time"), **turned)
other = values.copy()
other[95, 3] = 99.0
nc("contradicts", data=other[90:], times=seconds[90:], **deflate)
nc("shifted", data=values[100:], times=seconds[100:], distances=distance + 0.1, **deflate)
nc("unsorted", data=values[::-1], times=seconds[::-1], **deflate)
nc("no_leap", calendar="noleap", **deflate)
nc("months", time_units="months since 2031-01-01", times=np.arange(NT), **deflate)
nc("odd_unit", units="furlong", **deflate)
nc("celsius_named_k", units="K", **deflate)
twice = distance.copy()
twice[8] = twice[7]
nc("twice", distances=twice, **deflate)
gap = np.ma.masked_array(seconds, mask=np.arange(NT) == 4)
nc("missing_time", times=gap, **deflate)
with netCDF4.Dataset(f"{folder}/bomb.nc", "w") as f:
    for name, n in (("time", 1_000_000), ("distance", 1_000_000)):
        f.createDimension(name, n)
    f.createVariable("temperature", "f4", ("time", "distance"), zlib=True, chunksizes=(288, 256))
    f.createVariable("time", "f8", ("time",), zlib=True).units = "seconds since 1970-01-01"
    f.createVariable("distance", "f8", ("distance",), zlib=True).units = "m"
for source in ("classic", "deflate"):
    whole = open(f"{folder}/{source}.nc", "rb").read()
    for share in (3, 50, 90):
        open(f"{folder}/cut_{source}_{share}.nc", "wb").write(whole[: len(whole) * share // 100])

ds = xarray.Dataset(
    {"temperature": (("time", "distance"), values, {"units": "degC"})},
    coords={"time": ("time", seconds, {"units": "seconds since 1970-01-01", "calendar": "standard"}),
            "distance": ("distance", distance, {"units": "m"})})
ds.to_zarr(f"{folder}/blosc.zarr", mode="w", encoding={
    "temperature": {"chunks": (48, 32), "compressor": zarr.Blosc(cname="zstd", clevel=3, shuffle=1)}})
ds.transpose("distance", "time").to_zarr(f"{folder}/turned.zarr", mode="w", encoding={
    "temperature": {"chunks": (32, 48), "compressor": zarr.Zlib(4)}})
shutil.copytree(f"{folder}/blosc.zarr", f"{folder}/no_array.zarr")
os.remove(f"{folder}/no_array.zarr/temperature/.zarray")
shutil.rmtree(f"{folder}/no_array.zarr/.zmetadata", ignore_errors=True)
if os.path.exists(f"{folder}/no_array.zarr/.zmetadata"):
    os.remove(f"{folder}/no_array.zarr/.zmetadata")
os.makedirs(f"{folder}/empty.zarr")
