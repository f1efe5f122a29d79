#!/usr/bin/python3
"""Rules of regridding against an independent numpy loop: missing values in space and time, min_cover, land fractions,
min_land, fill, totals, water fluxes.

  regrid_rules.py WINDROW

Overlaps of latitude-longitude cells are Delta-lambda * Delta-sin-phi, worked out here cell by cell in double precision. All
input is invented. Values agree to float32 rounding (2e-7 relative), cover to 1e-6, and one mesh cell is checked by hand.
"""
import json
import os
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np

LON, LAT = np.arange(0, 12.1, 2.0), np.arange(40, 50.1, 2.5)        # source edges
MESH_LON, MESH_LAT = np.arange(0, 12.1, 1.5), np.arange(40, 50.1, 1.0)
STEPS = 17


def overlap_shares():
    """[mesh cell, source cell] overlap areas, and both areas."""
    def lengths(a, b):
        return np.clip(np.minimum(a[1:, None], b[None, 1:]) - np.maximum(a[:-1, None], b[None, :-1]), 0, None)
    x = lengths(np.radians(MESH_LON), np.radians(LON))
    y = lengths(np.sin(np.radians(MESH_LAT)), np.sin(np.radians(LAT)))
    area = np.einsum("ab,cd->acbd", y, x).reshape((MESH_LAT.size - 1) * (MESH_LON.size - 1), -1)
    mesh = np.outer(np.diff(np.sin(np.radians(MESH_LAT))), np.diff(np.radians(MESH_LON))).ravel()
    source = np.outer(np.diff(np.sin(np.radians(LAT))), np.diff(np.radians(LON))).ravel()
    return area, mesh, source


def write(path, name, values, units, standard_name, time=True):
    with netCDF4.Dataset(path, "w") as file:
        for axis, edges, long_units, std in (("lat", LAT, "degrees_north", "latitude"), ("lon", LON, "degrees_east", "longitude")):
            file.createDimension(axis, edges.size - 1)
            variable = file.createVariable(axis, "f8", (axis,))
            variable[:] = (edges[1:] + edges[:-1]) / 2
            variable.units, variable.standard_name, variable.bounds = long_units, std, axis + "_bnds"
        file.createDimension("two", 2)
        for axis, edges in (("lat", LAT), ("lon", LON)):
            file.createVariable(axis + "_bnds", "f8", (axis, "two"))[:] = np.stack([edges[:-1], edges[1:]], 1)
        dims = ("lat", "lon")
        if time:
            file.createDimension("time", None)
            axis = file.createVariable("time", "f8", ("time",))
            axis.units, axis.calendar = "days since 2001-01-01", "standard"
            axis[:] = np.arange(STEPS) + 0.5
            dims = ("time",) + dims
        data = file.createVariable(name, "f8", dims, fill_value=-999.0)
        data.units, data.standard_name = units, standard_name
        data[:] = np.where(np.isnan(values), -999.0, values)


def expected(values, area, mesh, source, land, rules):
    """[step, cell] values (NaN missing) and cover."""
    total = rules.get("quantity") == "total"
    shares = area / (source[None, :] if total else mesh[:, None])
    weights = shares if land is None else shares * land[None, :]
    fraction = np.where(shares.sum(1) > 0, weights.sum(1) / shares.sum(1), 0)
    weights = np.where((weights.sum(1) == 0)[:, None], shares, weights)
    out, cover = np.full((STEPS, mesh.size), np.nan), np.zeros((STEPS, mesh.size))
    centre = lambda edges: (edges[1:] + edges[:-1]) / 2
    source_at = np.stack(np.meshgrid(np.radians(centre(LAT)), np.radians(centre(LON)), indexing="ij"), -1).reshape(-1, 2)
    mesh_at = np.stack(np.meshgrid(np.radians(centre(MESH_LAT)), np.radians(centre(MESH_LON)), indexing="ij"), -1).reshape(-1, 2)
    for t in range(STEPS):
        v = values[t].ravel()
        has = ~np.isnan(v)
        cover[t] = (area / mesh[:, None])[:, has].sum(1)
        for i in range(mesh.size):
            w = weights[i, has]
            if fraction[i] < rules.get("min_land", 0):
                continue
            if w.sum() > 0 and cover[t, i] >= rules.get("min_cover", 0.5) - 1e-9:
                out[t, i] = (w * v[has]).sum() / (1 if total else w.sum())
            elif rules.get("fill") == "nearest":
                p, q = mesh_at[i], source_at
                h = np.sin((q[:, 0] - p[0]) / 2) ** 2 + np.cos(p[0]) * np.cos(q[:, 0]) * np.sin((q[:, 1] - p[1]) / 2) ** 2
                for j in np.argsort(h, kind="stable")[:4]:
                    if has[j]:
                        out[t, i] = v[j]
                        break
    return out, cover


def run(windrow, folder, name, field, run_keys=""):
    with open(f"{folder}/job.toml", "w") as file:
        file.write(f'[job]\nworkspace = "work-{name}"\n[[run]]\nname = "{name}"\nfiles = ["in.nc"]\n{run_keys}\n[[field]]\n'
                   f'variable = "v"\n{field}\n[mesh]\nlon = {{ from = 0, to = 12, step = 1.5 }}\n'
                   f'lat = {{ from = 40, to = 50, step = 1 }}\n[output]\nname = "{name}.nc"\n')
    subprocess.run([windrow, "run", "job.toml", "--quiet"], cwd=folder, check=True, stdout=subprocess.DEVNULL)
    return f"{folder}/out/{name}.nc"


def main():
    windrow = os.path.abspath(sys.argv[1])
    random = np.random.default_rng(11)
    area, mesh, source = overlap_shares()
    fixed_holes = 280 + random.uniform(-20, 20, (STEPS, LAT.size - 1, LON.size - 1))
    fixed_holes[:, 1, 2] = np.nan
    fixed_holes[:, 3, 0:2] = np.nan
    moving_holes = fixed_holes.copy()
    moving_holes[random.uniform(size=moving_holes.shape) < 0.3] = np.nan
    moving_holes[5] = np.nan
    land = random.uniform(0, 1, source.size)
    land[random.uniform(size=source.size) < 0.4] = 0
    land[7] = 0.05
    cases = []
    for holes in (fixed_holes, moving_holes):
        for rules in ({}, {"min_cover": 0.0}, {"min_cover": 1.0}, {"fill": "nearest"}, {"quantity": "total"}):
            cases.append((holes, None, rules))
        for rules in ({}, {"min_land": 0.3}, {"min_cover": 0.8, "fill": "nearest"}):
            cases.append((holes, land, rules))
    worst = 0.0
    with tempfile.TemporaryDirectory(prefix="windrow-rules-") as folder:
        write(folder + "/land.nc", "sftlf", 100 * land.reshape(LAT.size - 1, -1), "%", "land_area_fraction", time=False)
        for k, (values, fraction, rules) in enumerate(cases):
            write(folder + "/in.nc", "v", values, "K", "air_temperature")
            keys = "".join(f"{key} = {json.dumps(value)}\n" for key, value in rules.items())
            product = run(windrow, folder, f"case{k}", keys, 'land_fraction = "land.nc"' if fraction is not None else "")
            want, cover = expected(values, area, mesh, source, fraction, rules)
            with netCDF4.Dataset(product) as file:
                got = file["v"][:].filled(np.nan).reshape(STEPS, -1)
                got_cover = np.broadcast_to(file["cover"][:], (STEPS,) + file["cover"].shape[-2:]).reshape(STEPS, -1)
            ledger = json.load(open(product.replace(".nc", ".ledger.json")))
            if not np.array_equal(np.isnan(got), np.isnan(want)):
                sys.exit(f"FAILED: case {k} {rules}: missing values differ at {np.argwhere(np.isnan(got) != np.isnan(want))[:5]}")
            if np.abs(got_cover - cover).max() > 1e-6:
                sys.exit(f"FAILED: case {k} {rules}: cover differs by {np.abs(got_cover - cover).max()}")
            if np.isnan(want).all():
                sys.exit(f"FAILED: case {k} {rules} is empty")
            difference = np.nanmax(np.abs(got / want - 1))
            worst = max(worst, difference)
            residual = ledger["balance"]["all"]["largest_relative_residual"]
            counts = ledger["counts"]
            if difference > 2e-7 or residual > 1e-13 or counts["missing"] != np.isnan(want).sum():
                sys.exit(f"FAILED: case {k} {rules}: {difference} {residual} {counts}")
        # By hand: the mesh cell 1.5-3 E, 42-43 N lies in the source cells 0-2 E and 2-4 E (a third and two thirds in
        # longitude) and 40-42.5 N and 42.5-45 N.
        south = np.sin(np.radians(42.5)) - np.sin(np.radians(42))
        north = np.sin(np.radians(43)) - np.sin(np.radians(42.5))
        values = np.arange(STEPS * 24, dtype=float).reshape(STEPS, 4, 6)
        write(folder + "/in.nc", "v", values, "K", "air_temperature")
        with netCDF4.Dataset(run(windrow, folder, "hand", "")) as file:
            got = float(file["v"][0, 2, 1])
        want = ((0 / 3 + 1 * 2 / 3) * south + (6 / 3 + 7 * 2 / 3) * north) / (south + north)
        if abs(got / want - 1) > 1e-7:
            sys.exit(f"FAILED: hand-worked cell: {got} {want}")
        # A water flux becomes a depth rate with 1000 kg m-3: 86400 mm/day for 1 kg m-2 s-1.
        write(folder + "/in.nc", "v", values * 1e-6, "kg m-2 s-1", "precipitation_flux")
        with netCDF4.Dataset(run(windrow, folder, "water", 'units = "mm/day"')) as file:
            got, name = float(file["v"][0, 2, 1]), file["v"].standard_name
        if abs(got / (want * 1e-6 * 86400) - 1) > 2e-7 or name != "lwe_precipitation_rate":
            sys.exit(f"FAILED: water: {got} {name}")
    print(f"{len(cases)} cases agree, largest relative difference {worst:.1e}; hand-worked cell and water flux agree")


if __name__ == "__main__":
    main()
