"""Independent reference of conservative shares, in the equal-area cylindrical plane (lambda, sin phi).

There a latitude-longitude cell is a rectangle and areas are true, so planar polygon clipping (shapely) gives exact
shares between latitude-longitude grids. Cells of a projected mesh are densified: n points an edge, straight in mesh
coordinates, taken to the globe by PROJ. Chords miss the bend of an edge by a term in (1/n)^2: windrow's difference from
the densified shares must fall by 4 when n doubles. Extrapolating that term away leaves a term of third order (cells cut
at source borders); how good the extrapolated reference is, is told by itself, from n, 2 n and 4 n, without windrow.

Usage: shares.py PATH_OF_windrow_dump_shares
"""
import csv
import subprocess
import sys

import numpy as np
import pyproj
from shapely.geometry import Polygon, box

RADIUS_M = 6371007.1809


def latlon_edges(west, south, dlon, dlat, ny, nx):
    return west + dlon * np.arange(nx + 1), south + dlat * np.arange(ny + 1)


def gaussian_edges(n, west):
    _, weight = np.polynomial.legendre.leggauss(n)
    sine = np.concatenate([[-1], -1 + np.cumsum(weight)])
    return west + 180.0 / n * np.arange(2 * n + 1), np.degrees(np.arcsin(np.clip(sine, -1, 1)))


def windrow_shares(tool, source, target):
    text = subprocess.run([tool, *map(str, source), *map(str, target)], check=True, capture_output=True, text=True).stdout
    rows = csv.reader(text.splitlines()[1:])
    return {(int(r), int(c)): float(s) for r, c, s in rows}


def near(edges, low, high):
    """Indices of intervals that meet [low, high]."""
    first = max(np.searchsorted(edges, low, side="right") - 1, 0)
    last = min(np.searchsorted(edges, high, side="left"), len(edges) - 1)
    return range(first, last)


def plane_shares(polygon, lon, lat):
    """Share of a polygon of the plane (degrees, sin phi) with every source rectangle, on all turns of longitude."""
    shares = {}
    west, south, east, north = polygon.bounds
    sine = np.sin(np.radians(lat))
    sine[np.abs(lat) == 90] = np.sign(lat[np.abs(lat) == 90])
    for turn in range(int((west - lon[-1]) // 360), int((east - lon[0]) // 360) + 2):
        for j in near(sine, south, north):
            for i in near(lon + 360.0 * turn, west, east):
                cell = box(lon[i] + 360 * turn, sine[j], lon[i + 1] + 360 * turn, sine[j + 1])
                overlap = polygon.intersection(cell).area
                if overlap > 0:
                    key = j * (len(lon) - 1) + i
                    shares[key] = shares.get(key, 0) + overlap / polygon.area
    return shares


def latlon_reference(source, target):
    shares = {}
    nx = len(target[0]) - 1
    sine = np.sin(np.radians(target[1]))
    for j in range(len(target[1]) - 1):
        for i in range(nx):
            cell = box(target[0][i], sine[j], target[0][i + 1], sine[j + 1])
            for column, share in plane_shares(cell, *source).items():
                shares[j * nx + i, column] = share
    return shares


def densified(projection, x0, y0, size, n):
    """Outline of a projected cell in the plane, n points an edge; closed over the pole where it goes round it."""
    f = np.arange(n) / n
    x = x0 + size * np.concatenate([f, np.ones(n), 1 - f, np.zeros(n)])
    y = y0 + size * np.concatenate([np.zeros(n), f, np.ones(n), 1 - f])
    lon, lat = projection(x, y, inverse=True)
    lon = np.degrees(np.unwrap(np.radians(np.append(lon, lon[0]))))
    sine = np.sin(np.radians(np.append(lat, lat[0])))
    points = list(zip(lon, sine))
    if abs(lon[-1] - lon[0]) > 180:
        pole = np.sign(sine[0])
        points += [(lon[-1], pole), (lon[0], pole)]
    return Polygon(points)


def azimuthal_reference(source, lambda0, phi1, ny, nx, size, east, north, n):
    projection = pyproj.Proj(proj="laea", lat_0=phi1, lon_0=lambda0, R=RADIUS_M)
    shares = {}
    for j in range(ny):
        for i in range(nx):
            x0, y0 = east + (i - nx / 2) * size, north + (j - ny / 2) * size
            for column, share in plane_shares(densified(projection, x0, y0, size, n), *source).items():
                shares[j * nx + i, column] = share
    return shares


def extrapolated(coarse, fine):
    return {k: (4 * fine.get(k, 0) - coarse.get(k, 0)) / 3 for k in coarse.keys() | fine.keys()}


def difference(a, b):
    return max(abs(a.get(k, 0) - b.get(k, 0)) for k in a.keys() | b.keys())


def check(name, value, limit):
    print(f"{'ok  ' if value <= limit else 'FAIL'} {name}: largest difference {value:.2e}, at most {limit:.2e}")
    return value <= limit


def latlon_cases(tool):
    grids = {
        "5 degrees from 0 E": (("latlon", 0, -90, 5, 5, 36, 72), latlon_edges(0, -90, 5, 5, 36, 72)),
        "7.5 x 4.5 degrees from 180 W": (("latlon", -180, -90, 7.5, 4.5, 40, 48), latlon_edges(-180, -90, 7.5, 4.5, 40, 48)),
        "Gaussian, 32 latitudes": (("gaussian", 32, -2.8125), gaussian_edges(32, -2.8125)),
        "one column": (("latlon", 17, -90, 360, 30, 6, 1), latlon_edges(17, -90, 360, 30, 6, 1)),
        "region over 0 E": (("latlon", -21.3, 31.7, 1.1, 0.9, 25, 30), latlon_edges(-21.3, 31.7, 1.1, 0.9, 25, 30)),
    }
    pairs = [(0, 1), (1, 0), (2, 1), (1, 2), (2, 4), (3, 1), (0, 3), (4, 2)]
    names = list(grids)
    good = True
    for s, t in pairs:
        source, target = grids[names[s]], grids[names[t]]
        found = windrow_shares(tool, source[0], target[0])
        good &= check(f"{names[s]} -> {names[t]}", difference(found, latlon_reference(source[1], target[1])), 1e-10)
    return good


def projected_cases(tool):
    source = ("latlon", 0, -90, 1.25, 1.25, 144, 288)
    edges = latlon_edges(0, -90, 1.25, 1.25, 144, 288)
    meshes = {
        "25 km, 48 N 28 W": (-28, 48, 8, 9, 25000, 0, 0),
        "5 km, over a corner of four sources": (-27.5, 47.5, 8, 8, 5000, 1000, 2000),
        "25 km, date line": (180, -52, 7, 7, 25000, 3000, 0),
        "100 km, pole inside a cell": (12, 89, 5, 5, 100000, 20000, 10000),
        "300 km, split edges": (40, 55, 4, 4, 300000, 0, 0),
    }
    good = True
    for name, mesh in meshes.items():
        found = windrow_shares(tool, source, ("azimuthal", *mesh))
        reference = [azimuthal_reference(edges, *mesh, n) for n in (40, 80, 160)]
        plain = [difference(r, found) for r in reference]
        for coarse, fine in zip(plain, plain[1:]):
            if not 3.7 < coarse / fine < 4.3:
                print(f"FAIL {name}: twice as many points divide the difference by {coarse / fine:.2f}, expected 4")
                good = False
        better, best = (extrapolated(a, b) for a, b in zip(reference, reference[1:]))
        # Errors of the two fall by about 8, so their difference is 7 times the error of the better one; half leaves 3.5.
        limit = max(0.5 * difference(better, best), 1e-10)
        good &= check(f"{name} (densified alone: {plain[-1]:.1e})", difference(best, found), limit)
    return good


if __name__ == "__main__":
    tool = sys.argv[1]
    results = [latlon_cases(tool), projected_cases(tool)]
    sys.exit(0 if all(results) else 1)
