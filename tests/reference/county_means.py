"""Areal means of real outlines (64 counties of Colorado) from a real model grid (T63 Gaussian) against an independent
computation: shapely in an equal-area projection of PROJ on the same sphere, sides cut into short pieces (straight in
longitude and latitude, as both the outlines and the grid's cells are meant).

Usage: county_means.py WINDROW TESTDATA
"""
import csv
import json
import os
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np
import pyproj
from shapely.geometry import Polygon
from shapely.ops import transform, unary_union

WINDROW, DATA = os.path.abspath(sys.argv[1]), os.path.abspath(sys.argv[2])
R = 6371007.1809
STEP = 0.0005  # degrees between points of a side: planar chords are then off by 2e-9 of the smallest county


def fine(ring):
    points = []
    for (x0, y0), (x1, y1) in zip(ring, ring[1:]):
        n = max(1, int(np.ceil(max(abs(x1 - x0), abs(y1 - y0)) / STEP)))
        f = np.arange(n) / n
        points.extend(zip(x0 + f * (x1 - x0), y0 + f * (y1 - y0)))
    return points


def polygon(part):
    rings = [r for r in part if len({tuple(p) for p in r}) > 2]
    return Polygon(fine(rings[0]), [fine(r) for r in rings[1:]]) if rings and rings[0] is part[0] else None


def main():
    project = pyproj.Transformer.from_crs(f"+proj=longlat +R={R}", f"+proj=laea +lat_0=39 +lon_0=-105.5 +R={R}",
                                          always_xy=True).transform
    with tempfile.TemporaryDirectory() as folder:
        job = os.path.join(folder, "job.toml")
        with open(job, "w") as out:
            out.write(f"""[[run]]
files = ["{DATA}/gcm/tas_2005_t63.nc"]
[[field]]
variable = "tas"
[mesh]
kind = "catchments"
polygons = "{DATA}/colorado/counties.geojson"
id = "name"
[output]
also = ["csv"]
""")
        done = subprocess.run([WINDROW, "run", job], capture_output=True, text=True)
        if done.returncode or "9 rings of fewer than three different points left out" not in done.stderr:
            print("FAIL run:", done.returncode, done.stderr)
            return 1
        with netCDF4.Dataset(os.path.join(folder, "out/tas_run_mesh.nc")) as data:
            ids = [b"".join(row).decode().rstrip("\0") for row in data["id"][:].filled(b"\0")]
            values, areas = data["tas"][:].astype(float), data["cell_area"][:]
        with open(os.path.join(folder, "out/tas_run_mesh.csv"), newline="") as table:
            rows = list(csv.reader(table))
    with netCDF4.Dataset(f"{DATA}/gcm/tas_2005_t63.nc") as model:
        lat_b, lon_b, tas = model["lat_bnds"][:], model["lon_bnds"][:], model["tas"][:].astype(float)
    cells = []
    for j, (s, n) in enumerate(np.sort(lat_b, axis=1)):
        for i, (w, e) in enumerate(lon_b):
            if s < 42 and n > 36 and w - 360 < -101 and e - 360 > -110:
                ring = [(w - 360, s), (e - 360, s), (e - 360, n), (w - 360, n), (w - 360, s)]
                cells.append((j, i, transform(project, Polygon(fine(ring)))))
    worst_area = worst_value = 0
    with open(f"{DATA}/colorado/counties.geojson") as file:
        features = json.load(file)["features"]
    for k, feature in enumerate(features):
        assert ids[k] == feature["properties"]["name"]
        geometry = feature["geometry"]
        parts = geometry["coordinates"] if geometry["type"] == "MultiPolygon" else [geometry["coordinates"]]
        county = unary_union([transform(project, p) for p in map(polygon, parts) if p is not None])
        shares = [(j, i, county.intersection(c).area) for j, i, c in cells if county.intersects(c)]
        mean = sum(a * tas[:, j, i] for j, i, a in shares) / sum(a for _, _, a in shares)
        worst_area = max(worst_area, abs(areas[k] / county.area - 1))
        worst_value = max(worst_value, float(np.abs(values[:, k] - mean).max()))
    table_good = rows[0][0] == "date" and len(rows) == 13 and np.allclose(
        [[float(x) for x in row[1:]] for row in rows[1:]], values, rtol=1e-6)
    good = worst_area < 5e-9 and worst_value < 3e-5 and table_good
    print(f"{'ok' if good else 'FAIL'}: {len(features)} counties, areas within {worst_area:.1e}, monthly means within "
          f"{worst_value:.1e} K (float32 at 280 K: 1.5e-5), table {'agrees' if table_good else 'differs'}")
    return 0 if good else 1


sys.exit(main())
