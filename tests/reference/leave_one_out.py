#!/usr/bin/python3
"""Skill of the Colorado example at stations left out one at a time, and a check of windrow against numpy there.

  leave_one_out.py WINDROW CONFIG [--stations N]   (0: all)

For each station: the job runs without it, and the product's cell that holds the station is compared with its normals,
brought from the cell's height to the station's with the job's lapse rate. Raw is the model's cell value, "height alone" the
same brought to the station's elevation. Mean absolute error over stations and the 12 months, in K.

The independent check: without the station, target = model reduced to height 0 + correction of each station, so the adjusted
value at a cell is the inverse-distance mean of the other stations' reduced normals plus lapse * height. windrow tapers its
weights; the same published taper is written down here anew (see reach.h) and must agree to 1e-5 K (float32 storage of
values near 20 degC is good to 2e-6 K).
"""
import csv
import os
import re
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np
import pyproj

LAPSE = -0.0065
RADIUS_M = 200e3
EARTH_M = 6371007.1809


def distances(lon, lat, lons, lats):
    p, q = np.radians(lat), np.radians(lats)
    d = np.radians(lons - lon)
    h = np.sin((q - p) / 2) ** 2 + np.cos(p) * np.cos(q) * np.sin(d / 2) ** 2
    return 2 * EARTH_M * np.arctan2(np.sqrt(h), np.sqrt(1 - h))


def main():
    windrow, config = os.path.abspath(sys.argv[1]), os.path.abspath(sys.argv[2])
    count = int(sys.argv[sys.argv.index("--stations") + 1]) if "--stations" in sys.argv else 0
    root = os.path.dirname(config)
    data = os.path.join(root, "..", "testdata", "colorado")
    sites = list(csv.DictReader(open(data + "/sites.csv")))
    normals = {}
    for row in csv.DictReader(open(data + "/normals.csv")):
        normals.setdefault(row["station"], np.zeros(12))[int(row["month"]) - 1] = float(row["tas [degC]"])
    text = open(config).read()
    text = re.sub(r'"\.\./', f'"{root}/../', text)
    project = pyproj.Proj(re.search(r'crs += "(.*)"', text).group(1))
    with netCDF4.Dataset(root + "/../testdata/gcm/tas_2005_t63.nc") as file:
        tas, lat_b, lon_b = file["tas"][:] - 273.15, file["lat_bnds"][:], file["lon_bnds"][:]
    with netCDF4.Dataset(root + "/../testdata/gcm/orog_t63.nc") as file:
        orog = file["orog"][:]

    def model_at(site):
        lon, lat = float(site["longitude"]) % 360, float(site["latitude"])
        j = np.flatnonzero((lat_b.min(1) <= lat) & (lat < lat_b.max(1)))[0]
        i = np.flatnonzero((lon_b.min(1) <= lon) & (lon < lon_b.max(1)))[0]
        return tas[:, j, i].filled(np.nan), float(orog[j, i])

    half_x, half_y = 320000, 232000
    inside = []
    for site in sites:
        x, y = project(float(site["longitude"]), float(site["latitude"]))
        if abs(x) < half_x and abs(y) < half_y:
            inside.append((site, int((x + half_x) // 4000), int((y + half_y) // 4000)))
    chosen = inside if count == 0 else inside[:: max(1, len(inside) // count)][:count]
    errors = {"raw": [], "height alone": [], "adjusted": []}
    worst = 0.0
    with tempfile.TemporaryDirectory(prefix="windrow-loo-") as folder:
        for site, i, j in chosen:
            with open(folder + "/sites.csv", "w", newline="") as file:
                table = csv.DictWriter(file, sites[0].keys())
                table.writeheader()
                table.writerows(s for s in sites if s is not site)
            with open(folder + "/normals.csv", "w") as file:
                file.write("station,month,tas [degC]\n")
                for s in sites:
                    if s is not site:
                        file.writelines(f"{s['station']},{m + 1},{normals[s['station']][m]:.2f}\n" for m in range(12))
            job = re.sub(r'sites += ".*"', f'sites = "{folder}/sites.csv"', text)
            job = re.sub(r'normals += ".*"', f'normals = "{folder}/normals.csv"', job)
            job = re.sub(r'directory += ".*"', f'directory = "{folder}/out"', job)
            job = re.sub(r'workspace += ".*"', f'workspace = "{folder}/work"', job)
            with open(folder + "/job.toml", "w") as file:
                file.write(job)
            subprocess.run([windrow, "run", folder + "/job.toml", "--quiet"], check=True, stdout=subprocess.DEVNULL,
                           stderr=subprocess.DEVNULL)
            name = [n for n in os.listdir(folder + "/out") if n.endswith(".nc")][0]
            with netCDF4.Dataset(f"{folder}/out/{name}") as file:
                value = file["tas"][:, j, i].filled(np.nan).astype(float)
                height = float(file["height"][j, i])
                lon, lat = float(file["lon"][j, i]), float(file["lat"][j, i])
            elevation, observed = float(site["elevation"]), normals[site["station"]]
            model, model_height = model_at(site)
            errors["raw"].append(np.abs(model - observed).mean())
            errors["height alone"].append(np.abs(model + LAPSE * (elevation - model_height) - observed).mean())
            errors["adjusted"].append(np.abs(value + LAPSE * (elevation - height) - observed).mean())
            others = [s for s, _, _ in inside if s is not site]
            d = distances(lon, lat, np.array([float(s["longitude"]) for s in others]),
                          np.array([float(s["latitude"]) for s in others]))
            x = np.clip(d / RADIUS_M, 0, 1)
            weight = d**-2.0 * (1 - x**2) ** 2
            reduced = np.array([normals[s["station"]] - LAPSE * float(s["elevation"]) for s in others])
            expected = (weight[:, None] * reduced).sum(0) / weight.sum() + LAPSE * height
            if d.min() < RADIUS_M / 2:  # farther out the target fades to the mean correction
                worst = max(worst, np.abs(value - expected).max())
    print(f"{len(chosen)} of {len(inside)} stations left out one at a time; mean absolute error over 12 months, K:")
    for name, list_ in errors.items():
        print(f"  {name:13} {np.mean(list_):.2f}")
    print(f"largest difference from the independent inverse-distance estimate: {worst:.1e} K")
    mean = {name: np.mean(list_) for name, list_ in errors.items()}
    if not (worst < 1e-5 and mean["adjusted"] < mean["height alone"] < mean["raw"]):
        sys.exit("FAILED")


if __name__ == "__main__":
    main()
