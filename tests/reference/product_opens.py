#!/usr/bin/python3
"""A product as three independent readers see it: netCDF4-python, xarray and GDAL must open it and agree on every value
they are asked for. Usage: product_opens.py [--sample] PRODUCT...

--sample: the file is the invented one of tests/tools/make_product.cpp, whose values follow a formula known here too.
What is checked of any product: conventions, bounds and grid mapping present where named, one missing value, every data
variable readable through all readers, time decodable and strictly ascending.
"""
import sys

import netCDF4
import numpy as np
import xarray
from osgeo import gdal

gdal.UseExceptions()


def data_variables(dataset):
    """Variables that carry a field over time: not coordinates, bounds, grid mappings or flags without time."""
    named = set()
    for variable in dataset.variables.values():
        for attribute in ("bounds", "climatology", "grid_mapping", "coordinates"):
            named.update(str(getattr(variable, attribute, "")).replace(":", " ").split())
    return [v for name, v in dataset.variables.items()
            if name not in named and name not in dataset.dimensions and v.ndim >= 2 and "time" in v.dimensions[0]]


def references(dataset):
    """Names used by attributes that do not exist in the file."""
    faults = []
    for variable in dataset.variables.values():
        for attribute in ("bounds", "climatology", "grid_mapping", "coordinates", "ancillary_variables"):
            for word in str(getattr(variable, attribute, "")).replace(":", " ").split():
                if word not in dataset.variables:
                    faults.append(f"{variable.name}:{attribute} names '{word}', which is not in the file")
    return faults


def bounds_faults(dataset):
    faults = []
    for variable in dataset.variables.values():
        name = getattr(variable, "bounds", None)
        if name is None or name not in dataset.variables or variable.ndim != 1:
            continue
        values, bounds = variable[:].filled(np.nan), dataset[name][:].filled(np.nan)
        if bounds.shape != (len(values), 2):
            faults.append(f"{name} has shape {bounds.shape}")
        elif not np.all((bounds.min(axis=1) <= values) & (values <= bounds.max(axis=1))):
            faults.append(f"{name} do not contain {variable.name}")
    return faults


def sample_value(name, shape):
    t, y, x = np.meshgrid(*[np.arange(n, dtype=np.float32) for n in shape], indexing="ij")
    if name == "cover":
        return ((y * shape[2] + x) / np.float32(shape[1] * shape[2])).astype(np.float32)
    values = np.float32({"tas": 280, "tasmax": 380}[name]) + t + np.float32(0.5) * y + np.float32(0.25) * x
    values[:, -1, -1] = np.nan
    return values


def through_gdal(path, name, steps, y_ascending):
    """Stored values of a few steps, y as in the file; GDAL presents rows from the north."""
    dataset = gdal.OpenEx(f'NETCDF:"{path}":{name}', gdal.OF_RASTER, allowed_drivers=["netCDF"])
    out = []
    for step in steps:
        values = dataset.GetRasterBand(int(step) + 1).ReadAsArray()
        out.append(values[::-1] if y_ascending else values)
    return np.stack(out)


def check_variable(path, variable, decoded, sample):
    faults = []
    name = variable.name
    variable.set_auto_maskandscale(False)
    stored = variable[:]
    fill = getattr(variable, "_FillValue", None)
    if fill is None or fill.dtype != variable.dtype:
        return [f"{name}: no _FillValue of its own type"]
    values = np.where(stored == fill, np.nan, stored)
    if np.isnan(stored).any():
        faults.append(f"{name}: NaN is stored where _FillValue is meant")
    if np.isnan(values).all():
        faults.append(f"{name}: everything is missing")
    if not np.array_equal(decoded[name].values, values, equal_nan=True):
        faults.append(f"{name}: xarray reads other values")
    if sample and not np.array_equal(sample_value(name, stored.shape), values, equal_nan=True):
        faults.append(f"{name}: values are not the sample's")
    if variable.ndim == 3:
        steps = sorted({0, stored.shape[0] // 2, stored.shape[0] - 1})
        y = variable.group()[variable.dimensions[1]][:]
        got = through_gdal(path, name, steps, y[-1] > y[0])
        if not np.array_equal(got, stored[steps]):
            faults.append(f"{name}: GDAL reads other values")
    return faults


def check(path, sample):
    faults = []
    with netCDF4.Dataset(path) as dataset, xarray.open_dataset(path, decode_times=True) as decoded:
        if "CF-1.13" not in str(getattr(dataset, "Conventions", "")):
            faults.append("Conventions does not say CF-1.13")
        faults += references(dataset) + bounds_faults(dataset)
        time = dataset["time"][:]
        if not np.all(np.diff(time) > 0):
            faults.append("time is not ascending")
        variables = data_variables(dataset)
        if not variables:
            faults.append("no data variable")
        for variable in variables:
            faults += check_variable(path, variable, decoded, sample)
        names = [v.name for v in variables]
    print(f"{path}: {', '.join(names)}: {'; '.join(faults) if faults else 'ok'}")
    return not faults


def main():
    sample = "--sample" in sys.argv
    paths = [a for a in sys.argv[1:] if a != "--sample"]
    if not paths:
        print(__doc__)
        return 64
    results = [check(path, sample) for path in paths]
    return 0 if all(results) else 1


if __name__ == "__main__":
    sys.exit(main())
