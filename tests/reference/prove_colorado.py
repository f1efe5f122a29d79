#!/usr/bin/python3
"""`windrow prove` on the Colorado example: its figures against numpy, and what kriging with height is worth there.

Usage: prove_colorado.py WINDROW CONFIG

The independent part, for inverse distance: with a station left out, the target at its place is the tapered
inverse-distance mean of the other stations' normals reduced to height 0; beyond half the radius it fades to the place's
own model value plus the others' mean correction (formulas of include/windrow/reach/reach.h, written down anew). The
differences from the station's normals, and those of the raw model and of the height adjustment alone, must agree with
the CSV to 1e-6 K, and the means over stations with the JSON.

Goals of this project for kriging-height, mean absolute error over 12 months and all stations: at most 0.95 K, half of the
height adjustment alone, and 0.85 of inverse distance without height.
"""
import csv
import json
import os
import re
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np
import pyproj

LAPSE, RADIUS_M, EARTH_M, SAME_SITE_M = -0.0065, 200e3, 6371007.1809, 2e3
HALF_X, HALF_Y = 320000, 232000
MONTHS = ("January February March April May June July August September October November December").split()


def distances(lon, lat):
    """Metres between all pairs (haversine)."""
    p, l = np.radians(lat), np.radians(lon)
    h = np.sin((p[:, None] - p) / 2) ** 2 + np.cos(p[:, None]) * np.cos(p) * np.sin((l[:, None] - l) / 2) ** 2
    return 2 * EARTH_M * np.arctan2(np.sqrt(h), np.sqrt(1 - h))


def inputs(root, config):
    data = os.path.join(root, "..", "testdata")
    project = pyproj.Proj(re.search(r'crs += "(.*)"', open(config).read()).group(1))
    normals = {}
    for row in csv.DictReader(open(f"{data}/colorado/normals.csv")):
        normals.setdefault(row["station"], np.zeros(12))[int(row["month"]) - 1] = float(row["tas [degC]"])
    with netCDF4.Dataset(f"{data}/gcm/tas_2005_t63.nc") as file:
        tas, lat_b, lon_b = file["tas"][:].filled(np.nan).astype(float), file["lat_bnds"][:], file["lon_bnds"][:]
    with netCDF4.Dataset(f"{data}/gcm/orog_t63.nc") as file:
        orog = file["orog"][:].filled(np.nan).astype(float)
    names, lon, lat, height, model, model_height = [], [], [], [], [], []
    for site in csv.DictReader(open(f"{data}/colorado/sites.csv")):
        x, y = project(float(site["longitude"]), float(site["latitude"]))
        if abs(x) >= HALF_X or abs(y) >= HALF_Y:
            continue
        j = np.flatnonzero((lat_b.min(1) <= float(site["latitude"])) & (float(site["latitude"]) < lat_b.max(1)))[0]
        i = np.flatnonzero((lon_b.min(1) <= float(site["longitude"]) % 360)
                           & (float(site["longitude"]) % 360 < lon_b.max(1)))[0]
        names.append(site["station"])
        lon.append(float(site["longitude"]))
        lat.append(float(site["latitude"]))
        height.append(float(site["elevation"]))
        model.append(tas[:, j, i] - 273.15)
        model_height.append(orog[j, i])
    observed = np.array([normals[name] for name in names])
    return names, np.array(lon), np.array(lat), np.array(height), observed, np.array(model), np.array(model_height)


def expected(d, height, observed, model, model_height, lapse):
    """Adjusted values at every station from the others, [station, month]."""
    reduced = observed - lapse * height[:, None]
    own = model - lapse * model_height[:, None]
    out = np.full_like(observed, np.nan)
    for i in range(len(out)):
        others = np.flatnonzero(d[i] > SAME_SITE_M)
        x = np.clip(d[i, others] / RADIUS_M, 0, 1)
        weight = d[i, others] ** -2.0 * (1 - x**2) ** 2
        correction = (reduced - own)[others].mean(0)
        y = np.clip(2 * x.min() - 1, 0, 1)
        fade = (1 - y) ** 2 * (1 + 2 * y)
        target = (weight[:, None] * reduced[others]).sum(0) / weight.sum() if fade > 0 else 0
        out[i] = fade * target + (1 - fade) * (own[i] + correction) + lapse * height[i]
    return out


def prove(windrow, config, folder, *more):
    table = os.path.join(folder, "scores.csv")
    done = subprocess.run([windrow, "prove", config, "--quiet", "--json", "--csv", table, *more], check=True,
                          capture_output=True, text=True)
    rows = {(r["left_out"], r["station"], r["season"]): r for r in csv.DictReader(open(table))
            if r["score"] == "bias of monthly mean"}
    (proof,) = json.loads(done.stdout)["fields"]
    one_out = proof["designs"][0]
    assert one_out["left_out"] == "each station left out", one_out["left_out"]
    versions = {v["version"]: v for v in one_out["means_of_months"]}
    return rows, versions, proof


def main(windrow, config):
    windrow, config = os.path.abspath(windrow), os.path.abspath(config)
    names, lon, lat, height, observed, model, model_height = inputs(os.path.dirname(config), config)
    d = distances(lon, lat)
    own = {"raw": model, "height": model + LAPSE * (height - model_height)[:, None],
           "adjusted": expected(d, height, observed, model, model_height, LAPSE)}
    flat = expected(d, height, observed, model, model_height, 0.0)
    failed = []

    def check(what, difference, most):
        print(f"{what}: largest difference {difference:.1e}, at most {most:.0e}")
        if not difference <= most:
            failed.append(what)

    with tempfile.TemporaryDirectory(prefix="windrow-prove-") as folder:
        rows, versions, proof = prove(windrow, config, folder)
        assert proof["stations"] == len(names), proof["stations"]
        for version, values in own.items():
            told = np.array([[float(rows["each station left out", name, month][version]) for month in MONTHS]
                             for name in names])
            check(f"{version}, station by station, K", np.abs(told - (values - observed)).max(), 1e-6)
        for version, values in (("raw", own["raw"]), ("height alone", own["height"]), ("adjusted", own["adjusted"]),
                                ("inverse distance", flat)):
            error = np.abs(values - observed).mean(0)
            told = np.array([m["mean_absolute_error"] for m in versions[version]["months"]])
            check(f"{version}, mean absolute error by month, K", np.abs(told - error).max(), 1e-6)
            check(f"{version}, in the mean of the months, K",
                  abs(versions[version]["mean_absolute_error"] - error.mean()), 1e-6)
        for method in ("kriging", "kriging-height"):
            _, versions, _ = prove(windrow, config, folder, "--set", f"reach.method={method}")
            error = np.abs(own["adjusted"] - observed).mean(0)
            told = np.array([m["mean_absolute_error"] for m in versions["height, then inverse distance"]["months"]])
            check(f"{method}: height, then inverse distance, by month, K", np.abs(told - error).max(), 1e-6)
            mean = {name: v["mean_absolute_error"] for name, v in versions.items()}
            print(f"{method}: " + ", ".join(f"{name} {value:.3f}" for name, value in mean.items()) + " K")
    goals = {"0.95 K": 0.95, "half of the height adjustment alone": 0.5 * mean["height alone"],
             "0.85 of inverse distance without height": 0.85 * mean["inverse distance"]}
    for goal, most in goals.items():
        print(f"kriging-height {mean['adjusted']:.3f} K, at most {goal}, {most:.3f} K")
        if not mean["adjusted"] <= most:
            failed.append(goal)
    if failed:
        sys.exit("FAILED: " + "; ".join(failed))


if __name__ == "__main__":
    main(*sys.argv[1:])
