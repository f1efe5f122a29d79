#!/usr/bin/python3
"""The real global example: T63 to 1 degree, regridding only.

  global_mean.py WINDROW CONFIG OPENER

The area- and month-length-weighted global mean of the product must agree with that of the input, 287.5637 K, to 5e-4 K: the
input's mean is computed here anew from the file's own latitude bounds, the product's from its cell_area. The ledger's balance
must hold to 1e-13 (double, before rounding). OPENER (product_opens.py) then opens the product with xarray, netCDF4 and GDAL.
"""
import json
import os
import re
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np

STATED_K = 287.5637


def mean(values, area, months):
    step = (values.astype("f8") * area).sum(axis=(1, 2)) / area.sum()
    return (step * months).sum() / months.sum()


def main():
    windrow, config, opener = (os.path.abspath(a) for a in sys.argv[1:4])
    root = os.path.dirname(config)
    with netCDF4.Dataset(root + "/../testdata/gcm/tas_2005_t63.nc") as file:
        tas, months = file["tas"][:], np.diff(file["time_bnds"][:], axis=1)[:, 0]
        band = np.abs(np.diff(np.sin(np.radians(file["lat_bnds"][:])), axis=1))
        source = mean(tas, band * np.ones((1, tas.shape[2])), months)
    with tempfile.TemporaryDirectory(prefix="windrow-global-") as folder:
        job = open(config).read()
        job = re.sub(r'directory += ".*"', f'directory = "{folder}/out"', job)
        job = re.sub(r'workspace += ".*"', f'workspace = "{folder}/work"', job)
        job = re.sub(r'"\.\./', f'"{root}/../', job)
        with open(folder + "/job.toml", "w") as file:
            file.write(job)
        subprocess.run([windrow, "run", folder + "/job.toml", "--quiet"], check=True)
        product = folder + "/out/" + [n for n in os.listdir(folder + "/out") if n.endswith(".nc")][0]
        with netCDF4.Dataset(product) as file:
            made = mean(file["tas"][:], file["cell_area"][:], np.diff(file["time_bnds"][:], axis=1)[:, 0])
        ledger = json.load(open(product.replace(".nc", ".ledger.json")))
        residual = ledger["balance"]["all"]["largest_relative_residual"]
        print(f"input {source:.6f} K, product {made:.6f} K, difference {made - source:.1e} K; balance {residual:.1e}")
        good = abs(source - STATED_K) < 5e-5 and abs(made - source) < 5e-4 and residual <= 1e-13
        opened = subprocess.run(["/usr/bin/python3", opener, product])
        vouched = subprocess.run([windrow, "vouch", product], stdout=subprocess.DEVNULL)
    if not good or opened.returncode != 0 or vouched.returncode != 0:
        sys.exit("FAILED")


if __name__ == "__main__":
    main()
