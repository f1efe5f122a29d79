#!/usr/bin/python3
"""Kriging, variograms and drifts against an independent implementation.

Usage: kriging.py DUMP_REACH
Written anew with numpy and scipy: the ordinary kriging system with its Lagrange multiplier (Isaaks & Srivastava 1989,
ch. 12) through LU instead of Cholesky, distances from arctan2 of cross and dot products, the system of each cell with
more than 500 stations, clipping and tapering, the variogram by scipy's bounded minimiser with scipy's non-negative
least squares, drifts by whitening and least squares. Stations and values are invented, seeds pinned. Bounds: 1e-9 for
weights, shares and variances (in sills) and slopes. Of the fitted variogram: its misfit no more than 1e-9 above the one
scipy finds (a minimum's place shows only to the root of rounding, so the ranges may differ by more), and at its range
nugget and sill within 1e-6 of scipy's.
"""
import subprocess
import sys

import numpy as np
from scipy import linalg, optimize

RADIUS = 6371007.1809
SMALLEST = 1e-6
BOUND, PARAMETER_BOUND = 1e-9, 1e-6


def vectors(points):
    lon, lat = np.radians(np.asarray(points)).T
    return np.stack([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)], axis=-1)


def arcs(a, b):
    a, b = a[:, None, :], b[None, :, :]
    return RADIUS * np.arctan2(np.linalg.norm(np.cross(a, b), axis=-1), (a * b).sum(axis=-1))


def rho(model, distance, reach):
    if model == "gaussian":
        chord = 2 * RADIUS * np.sin(distance / (2 * RADIUS))
        return np.exp(-3 * (chord / reach) ** 2)
    h = distance / reach
    return np.exp(-3 * h) if model == "exponential" else np.where(h < 1, 1 - 1.5 * h + 0.5 * h**3, 0.0)


def taper(t):
    return np.where(t < 1, (1 - np.minimum(t, 1) ** 2) ** 2, 0)


def ordinary(matrix, right):
    """Weights from the bordered system."""
    n = len(matrix)
    border = np.ones((n + 1, n + 1))
    border[:n, :n] = matrix
    border[n, n] = 0
    return linalg.solve(border, np.append(right, 1))[:n]


def shares(case, near, matrix, c0, nearest):
    """Shares of one cell after clipping, and how many weights were clipped."""
    if not nearest.min() < case["radius"]:
        return np.zeros(len(c0)), 0
    n = len(c0)
    if n <= 500:
        w, t = ordinary(matrix, c0), taper(nearest / case["radius"])
    else:
        order = [j for j in np.argsort(nearest, kind="stable") if nearest[j] <= case["radius"]]
        cut = case["radius"] if len(order) <= case["neighbours"] else nearest[order[case["neighbours"]]]
        used = np.sort(order[: case["neighbours"]])
        part = matrix[np.ix_(used, used)] + np.diag(case["sill"] * (1 / taper(nearest[used] / cut) - 1))
        w, t = np.zeros(n), np.zeros(n)
        w[used], t[used] = ordinary(part, c0[used]), 1
    clipped = int(((w < -SMALLEST) & (t > 0)).sum())
    w = np.maximum(w, 0) * t
    w /= w.sum()
    w[w < SMALLEST] = 0
    return w / w.sum(), clipped


def fit_departs(case, distance, got):
    """From pooled, binned, standardised squared differences: how far a fit (nugget, sill, range) is from the best."""
    z = case["values"]
    z = (z - z.mean(axis=0)) / z.std(axis=0, ddof=1)
    i, j = np.tril_indices(len(z), -1)
    d = distance[i, j]
    if case["model"] == "gaussian":
        d = 2 * RADIUS * np.sin(d / (2 * RADIUS))
    largest = d.max()
    gamma = ((z[i] - z[j]) ** 2 / 2).mean(axis=1) - (case["noise"][i] + case["noise"][j]) / 2
    noise = (case["noise"][i] + case["noise"][j]) / 2
    keep = np.argsort(d, kind="stable")
    keep = keep[d[keep] <= largest / 2]
    bins = min(max(len(keep) // 30, 4), 100)
    groups = [keep[len(keep) * b // bins:len(keep) * (b + 1) // bins] for b in range(bins)]
    h, y, e = (np.array([x[g].mean() for g in groups]) for x in (d, gamma, noise))
    count = np.array([len(g) for g in groups], float)

    def curve(r):
        x = 3 * h / r if case["model"] == "exponential" else 3 * (h / r) ** 2
        s = np.minimum(h / r, 1)
        return 1.5 * s - 0.5 * s**3 if case["model"] == "spherical" else -np.expm1(-x)

    def at(log_range):
        root = np.sqrt(weight)
        return optimize.nnls(np.stack([root, root * curve(np.exp(log_range))], axis=1), root * y)

    weight = count.copy()
    low, high = np.log(max(h[0], 1e-3 * largest)), np.log(largest)
    for _ in range(5):
        grid = np.linspace(low, high, 60)
        best = int(np.argmin([at(g)[1] for g in grid]))
        found = optimize.minimize_scalar(lambda g: at(g)[1], bounds=(grid[max(best - 1, 0)], grid[min(best + 1, 59)]),
                                         method="bounded", options={"xatol": 1e-11})
        x = found.x if found.fun < at(grid[best])[1] else grid[best]
        (nugget, partial), _ = at(x)
        least, (a, b) = at(x)[1] ** 2, at(np.log(got[2]))[0]
        excess = at(np.log(got[2]))[1] ** 2 / least - 1
        weight = count / np.maximum(nugget + partial * curve(np.exp(x)) + e, 1e-3) ** 2
    return excess, np.abs([got[0] - a, got[1] - a - b]), got[2] / np.exp(x) - 1


def slopes(case, distance):
    """Generalised least squares by whitening."""
    partial = case["sill"] - case["nugget"]
    matrix = partial * rho(case["model"], distance, case["range"])
    matrix[np.diag_indices(len(matrix))] = partial + max(case["nugget"], 0.01 * case["sill"]) + case["noise"]
    root = linalg.cholesky(matrix, lower=True)
    design = linalg.solve_triangular(root, np.stack([np.ones(len(matrix)), case["heights"] - 1000], axis=1), lower=True)
    return np.linalg.lstsq(design, linalg.solve_triangular(root, case["values"], lower=True), rcond=None)[0][1]


def make_case(seed, model, count, nugget, noisy, spread):
    random = np.random.default_rng(seed)
    place = lambda n: np.stack([random.uniform(170, 170 + spread, n), random.uniform(55, 55 + spread / 2, n)], axis=1)
    case = {"model": model, "nugget": nugget, "sill": 1.7, "range": 250e3, "radius": 310e3, "neighbours": 20,
            "stations": place(count), "cells": place(60)}
    case["noise"] = random.uniform(0, 0.2, count) if noisy else np.zeros(count)
    at = vectors(case["stations"])
    c = rho("exponential", arcs(at, at), 400e3) + np.eye(count) * (0.1 + case["noise"].mean())
    case["values"] = linalg.cholesky(c, lower=True) @ random.normal(size=(count, 5)) * [1, 2, 3, 0.5, 7]
    case["heights"] = random.uniform(0, 2500, count)
    return case


def dump(program, case):
    text = "".join(f"{k} {case[k]!r}\n".replace("'", "") for k in
                   ("model", "nugget", "sill", "range", "radius", "neighbours"))
    rows = lambda name, a: f"{name} {len(a)}\n" + "\n".join(" ".join(repr(float(x)) for x in np.atleast_1d(r))
                                                           for r in a) + "\n"
    text += "".join(rows(k, case[k]) for k in ("stations", "cells", "noise"))
    text += rows("values", case["values"].ravel()) + rows("heights", case["heights"])
    out = subprocess.run([program], input=text, capture_output=True, text=True, check=True).stdout
    lines = [line.split() for line in out.splitlines()]
    return {k: [[float(x) for x in line[1:]] for line in lines if line[0] == k] for k in {l[0] for l in lines}}


def compare(program, case):
    """Largest differences: plain weights and variance, shares, variance of the shares, fit, slopes."""
    got = dump(program, case)
    stations, cells = vectors(case["stations"]), vectors(case["cells"])
    distance, to_cell = arcs(stations, stations), arcs(cells, stations)
    partial = case["sill"] - case["nugget"]
    matrix = partial * rho(case["model"], distance, case["range"])
    np.fill_diagonal(matrix, case["sill"] + case["noise"])
    worst = dict.fromkeys(("plain", "plain variance", "shares", "variance", "misfit", "nugget and sill", "slopes",
                           "range"), 0.0)

    def note(name, difference):
        worst[name] = max(worst[name], float(np.max(np.abs(difference))))

    clipped = cells_clipped = empty = 0
    if got["jitter"] != [[0.0]]:
        raise SystemExit(f"jitter {got['jitter']}")
    for k in range(len(cells)):
        c0 = partial * rho(case["model"], to_cell[k], case["range"])
        variance = lambda w: (w @ matrix @ w - 2 * w @ c0 + case["sill"]) / case["sill"]
        w = ordinary(matrix, c0)
        note("plain", w - got["plain"][k][1:])
        # The multiplier's shorter formula: sill - w'c0 - mu.
        mu = c0[0] - matrix[0] @ w
        note("plain variance", 1 - (w @ c0 + mu) / case["sill"] - got["plain"][k][0] / case["sill"])
        expected, number = shares(case, None, matrix, c0, to_cell[k])
        clipped += number
        cells_clipped += number > 0
        row = got["row"][k]
        dense = np.zeros(len(stations))
        dense[np.array(row[2::2], int)] = row[3::2]
        note("shares", dense - expected)
        if expected.any():
            note("variance", variance(expected) - row[0] / case["sill"])
        else:
            empty += 1
            if not np.isnan(row[0]):
                raise SystemExit("a variance where there is no station")
    if got["clipped"] != [[clipped, cells_clipped]]:
        raise SystemExit(f"clipped {got['clipped']}, expected {clipped} in {cells_clipped} cells")
    for name, departure in zip(("misfit", "nugget and sill", "range"), fit_departs(case, distance, got["fit"][0])):
        note(name, departure)
    expected = slopes(case, distance)
    note("slopes", (np.array(got["slope"][0]) - expected) / np.abs(expected).max())
    return worst, clipped, empty


def main():
    failed = False
    for number, (model, count, nugget, noisy, spread) in enumerate([
            ("exponential", 60, 0.3, True, 12), ("exponential", 60, 0.0, False, 12), ("spherical", 80, 0.2, True, 12),
            ("spherical", 35, 0.0, True, 20), ("gaussian", 50, 0.1, False, 12), ("exponential", 640, 0.2, True, 24)]):
        worst, clipped, empty = compare(sys.argv[1], make_case(number, model, count, nugget, noisy, spread))
        print(f"{model}, {count} stations, nugget {nugget}: clipped {clipped}, out of reach {empty}, "
              + ", ".join(f"{k} {v:.1e}" for k, v in worst.items()))
        failed |= not all(v < (PARAMETER_BOUND if k == "nugget and sill" else BOUND)
                          for k, v in worst.items() if k != "range")
    if failed:
        raise SystemExit(f"kriging differs by more than {BOUND} (nugget and sill: {PARAMETER_BOUND})")


if __name__ == "__main__":
    main()
