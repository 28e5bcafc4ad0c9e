"""Reads a result folder with libraries that are not ours and prints what they see as one JSON object.

Arguments: folder. Numbers are printed in full; NaN becomes null.
"""
import json
import math
import sys

import h5py
import netCDF4
import numpy

folder = sys.argv[1]


def plain(value):
    if isinstance(value, numpy.ndarray):
        return [plain(each) for each in value.tolist()]
    if isinstance(value, list):
        return [plain(each) for each in value]
    if isinstance(value, float):
        return None if math.isnan(value) else value
    if isinstance(value, numpy.generic):
        return plain(value.item())
    return value


def with_netcdf(name):
    dataset = netCDF4.Dataset(f"{folder}/{name}")
    dataset.set_auto_mask(False)
    variables = {}
    for key, variable in dataset.variables.items():
        variables[key] = {
            "dtype": str(variable.dtype),
            "dimensions": list(variable.dimensions),
            "attributes": {each: plain(variable.getncattr(each)) for each in variable.ncattrs()},
            "values": plain(variable[...]),
        }
    seen = {
        "model": dataset.data_model,
        "dimensions": {key: len(dimension) for key, dimension in dataset.dimensions.items()},
        "unlimited": [key for key, dimension in dataset.dimensions.items() if dimension.isunlimited()],
        "attributes": {each: plain(dataset.getncattr(each)) for each in dataset.ncattrs()},
        "variables": variables,
    }
    dataset.close()
    return seen


def with_h5py(name):
    with h5py.File(f"{folder}/{name}", "r") as file:
        return {
            key: {"chunks": plain(list(item.chunks or [])), "values": plain(item[...])}
            for key, item in file.items()
        }


def writable(name):
    """The NetCDF library opens a file for changing only when it tracks the order of its parts."""
    with netCDF4.Dataset(f"{folder}/{name}", "a") as dataset:
        dataset.setncattr("checked", "yes")
    with netCDF4.Dataset(f"{folder}/{name}") as dataset:
        return dataset.getncattr("checked")


def ragged():
    """Mean x of each pathline, by the contiguous and by the indexed ragged array."""
    with netCDF4.Dataset(f"{folder}/pathlines.nc") as dataset:
        sizes = dataset["row_size"][...]
        ends = numpy.cumsum(sizes)
        x = dataset[dataset["x"].name][...]
        contiguous = [float(x[end - size : end].sum()) for size, end in zip(sizes, ends)]
    with netCDF4.Dataset(f"{folder}/frames.nc") as dataset:
        index = dataset["pathline_index"][...]
        x = dataset["x"][...]
        indexed = [float(x[index == number].sum()) for number in range(len(dataset.dimensions["pathline"]))]
    return {"contiguous": contiguous, "indexed": indexed}


names = ["pathlines.nc", "frames.nc", "grid.nc"]
json.dump(
    {
        "netcdf": {name: with_netcdf(name) for name in names},
        "h5py": {name: with_h5py(name) for name in names},
        "ragged": ragged(),
        "writable": {name: writable(name) for name in names},
    },
    sys.stdout,
)
