#!/usr/bin/python3
"""The demo job gives the invented island its invented climate back, from models that are 1.5 K too warm and 2 K too cold.

Usage: demo_truth.py WINDROW DEMO_INPUTS. Expected values come from tools/demo_inputs/invented.h. Runs configs/kelder.toml
on cells of 20 km in a folder of its own.
"""
import os
import re
import shutil
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np

TOP = os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "..")
HEADER = open(os.path.join(TOP, "tools", "demo_inputs", "invented.h")).read()
C = {name: float(value) for name, value in re.findall(r"\b(k\w+) = (-?[\d.]+)[;,]", HEADER)}
CELL_KM = 20


def relief(folder):
    """Elevations on the 2-minute grid, south first, and the degrees of its cells."""
    lines = open(os.path.join(folder, "relief.asc")).read().splitlines()
    head = dict(line.split() for line in lines[:6])
    values = np.array([line.split() for line in lines[6:]], dtype=float)[::-1]
    step = float(head["cellsize"])
    lon = float(head["xllcorner"]) + (np.arange(values.shape[1]) + 0.5) * step
    lat = float(head["yllcorner"]) + (np.arange(values.shape[0]) + 0.5) * step
    return values, lon, lat


def cell_heights(folder, product):
    """Mean elevation of the relief's points in each mesh cell; the points' projection is written out here (Lambert
    azimuthal equal-area on a sphere, Snyder 1987, PP 1395, eqs 22-4 and 24-2)."""
    values, lon, lat = relief(folder)
    lam, phi = np.radians(lon[None, :] - C["kCentreLon"]), np.radians(lat[:, None])
    phi0 = np.radians(C["kCentreLat"])
    cos_c = np.sin(phi0) * np.sin(phi) + np.cos(phi0) * np.cos(phi) * np.cos(lam)
    k = 6371000 * np.sqrt(2 / (1 + cos_c))
    x = k * np.cos(phi) * np.sin(lam)
    y = k * (np.cos(phi0) * np.sin(phi) - np.sin(phi0) * np.cos(phi) * np.cos(lam))
    edges = [np.append(product[b][:, 0], product[b][-1, 1]) for b in ("y_bnds", "x_bnds")]
    weight = np.broadcast_to(np.cos(phi), values.shape)
    total, _, _ = np.histogram2d(y.ravel(), x.ravel(), edges, weights=(values * weight).ravel())
    count, _, _ = np.histogram2d(y.ravel(), x.ravel(), edges, weights=weight.ravel())
    return total / count


def main(windrow, maker):
    with tempfile.TemporaryDirectory() as folder:
        inputs, out = (os.path.join(folder, "build", "kelder", name) for name in ("in", "out"))
        os.mkdir(os.path.join(folder, "configs"))
        job = shutil.copy(os.path.join(TOP, "configs", "kelder.toml"), os.path.join(folder, "configs"))
        subprocess.run([maker, inputs], check=True)
        size = [f"--set=mesh.{axis}.step={CELL_KM * 1000}" for axis in "xy"]
        subprocess.run([windrow, "run", job, "--quiet", *size], check=True)
        assert len([f for f in os.listdir(out) if f.endswith(".nc")]) == 8, os.listdir(out)

        for model in ("heron", "plover"):
            product = netCDF4.Dataset(os.path.join(out, f"tas_{model}-all_kelder5.nc"))
            assert not np.ma.is_masked(product["tas"][:])
            mean = product["tas"][:].astype("f8").mean(axis=0)
            height = cell_heights(inputs, product)
            truth = C["kMeanTemperature"] + 1.5 * C["kForcedTrend"] + C["kLapse"] * height
            truth += C["kTemperaturePerDegree"] * (product["lat"][:] - C["kCentreLat"])
            error = (mean - truth)[height > 0]
            print(f"{model}: mean error over land {error.mean():+.3f} K, spread {error.std():.3f} K")
            # Three standard errors of 30 years' true weather, which is what the stations saw (demo_inputs.py).
            assert abs(error.mean()) < 0.21
            # The climate's gradient of 0.45 K per degree of latitude over the half degree between stations.
            assert error.std() < 0.225


if __name__ == "__main__":
    main(*sys.argv[1:])
