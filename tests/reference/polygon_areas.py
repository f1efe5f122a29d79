"""Independent reference of polygon areas on WGS84: the figures that tests/unit/mesh/counties_test.cpp holds.

The outlines' straight lines in longitude and latitude are densified, n points a side, and taken to PROJ's ellipsoidal
Lambert azimuthal equal-area projection, where shapely measures the plane. Chords of the plane miss the bend of a line
by a term in (1/n)^2, which is extrapolated away; that n and 2 n agree on the result is checked here.

Usage: polygon_areas.py PATH_OF_three_counties.csv PATH_OF_counties_test.cpp
"""
import csv
import re
import sys

import numpy as np
import pyproj
from shapely.geometry import Polygon


def outlines(path):
    rings = {}
    with open(path, newline="") as file:
        for row in csv.DictReader(file):
            rings.setdefault(row["county"], []).append((float(row["lon"]), float(row["lat"])))
    return rings


def area(ring, n):
    project = pyproj.Transformer.from_crs("EPSG:4326", "+proj=laea +lat_0=40.4 +lon_0=-106.5 +ellps=WGS84", always_xy=True)
    a = np.array(ring)
    f = np.arange(n)[:, None, None] / n
    points = (a + f * (np.roll(a, -1, axis=0) - a)).transpose(1, 0, 2).reshape(-1, 2)
    return Polygon(np.column_stack(project.transform(points[:, 0], points[:, 1]))).area


def extrapolated(ring, n):
    return (4 * area(ring, 2 * n) - area(ring, n)) / 3


def main():
    with open(sys.argv[2]) as file:
        held = {name: float(value) for name, value in re.findall(r'\{"(\w+)", ([\d.]+)\}', file.read())}
    rings = outlines(sys.argv[1])
    if held.keys() != rings.keys():
        sys.exit(f"the test holds {sorted(held)}, the file {sorted(rings)}")
    for name, ring in rings.items():
        once, twice = extrapolated(ring, 50), extrapolated(ring, 100)
        print(f"{name} {twice:.2f} m2, chords alone {area(ring, 1):.2f} m2")
        if abs(once / twice - 1) > 1e-11:
            sys.exit(f"{name}: the reference itself is off by {once / twice - 1:.1e}")
        if abs(held[name] / twice - 1) > 1e-11:
            sys.exit(f"{name}: the test holds {held[name]} m2")


if __name__ == "__main__":
    main()
