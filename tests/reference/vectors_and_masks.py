"""Vectors, masks, land fractions, missing data and totals on grids that are no latitude-longitude blocks, through the
program and against numpy.

- Winds of a solid-body rotation (u = w x r, in closed form) given along a rotated grid's own axes come out as the same
  rotation, eastward and northward, on another mesh and back on the mesh's axes.
- With half of the source missing and a varying pattern, the present part's integral is kept.
- A mask of polygons empties the cells outside; a total keeps its sum.

All fields are invented. Usage: vectors_and_masks.py WINDROW
"""
import json
import os
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np

WINDROW = os.path.abspath(sys.argv[1])
failures = []
POLE = (-162.0, 39.25)


def check(name, good, text=""):
    print(f"{'ok  ' if good else 'FAIL'} {name} {text}")
    if not good:
        failures.append(name)


def to_xyz(lon, lat):
    lon, lat = np.radians(lon), np.radians(lat)
    return np.stack([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)], axis=-1)


def frame():
    """Columns: the rotated frame's axes in geographic components; its meridian 0 runs over the geographic north pole."""
    z = to_xyz(*POLE)
    north = np.array([0, 0, 1.0])
    x = north - np.dot(north, z) * z
    x /= np.linalg.norm(x)
    return np.stack([x, np.cross(z, x), z], axis=1)


def east_north(p):
    """Unit tangents of the frame p's components are given in."""
    e = np.stack([-p[..., 1], p[..., 0], 0 * p[..., 0]], axis=-1)
    e /= np.linalg.norm(e, axis=-1)[..., None]
    return e, np.cross(p, e)


SPIN = 10 * np.array([0.3, -0.4, np.sqrt(0.75)])  # m/s at the equator of the rotation


def wind(p):
    return np.cross(SPIN, p)


def source(path, step=1.0):
    """Winds along the axes of a rotated grid."""
    rlat = np.arange(-24 + step / 2, 24, step)
    rlon = np.arange(-32 + step / 2, 32, step)
    own = to_xyz(*np.meshgrid(rlon, rlat))
    F = frame()
    p = own @ F.T
    v = wind(p) @ F  # in the frame's components
    e, n = east_north(own)
    with netCDF4.Dataset(path, "w") as out:
        for name, length in (("time", None), ("rlat", len(rlat)), ("rlon", len(rlon))):
            out.createDimension(name, length)
        time = out.createVariable("time", "f8", ("time",))
        time.units, time.calendar, time.standard_name = "days since 2001-01-01", "noleap", "time"
        time[:] = [0.5, 1.5]
        for name, values in (("rlat", rlat), ("rlon", rlon)):
            a = out.createVariable(name, "f8", (name,))
            a.standard_name, a.units = "grid_latitude" if name == "rlat" else "grid_longitude", "degrees"
            a[:] = values
        pole = out.createVariable("pole", "i4")
        pole.grid_mapping_name = "rotated_latitude_longitude"
        pole.grid_north_pole_longitude, pole.grid_north_pole_latitude = POLE
        for name, axis, along in (("uas", "x_wind", e), ("vas", "y_wind", n)):
            w = out.createVariable(name, "f8", ("time", "rlat", "rlon"))
            w.standard_name, w.units, w.grid_mapping = axis, "m s-1", "pole"
            w[:] = (v * along).sum(axis=-1)[None]
        # A positive field with holes that move, and a land fraction.
        f = 5 + 3 * p[..., 2] + 2 * p[..., 0]
        holes = np.random.default_rng(20260301).random((2,) + f.shape) < 0.4
        pr = out.createVariable("pr", "f8", ("time", "rlat", "rlon"), fill_value=-999.0)
        pr.units, pr.grid_mapping, pr.standard_name = "kg m-2 s-1", "pole", "precipitation_flux"
        pr[:] = np.ma.array(np.stack([f, f + 1]), mask=holes)
        people = out.createVariable("people", "f8", ("time", "rlat", "rlon"))
        people.units, people.grid_mapping = "1", "pole"
        people[:] = 100 + 50 * np.random.default_rng(7).random((2,) + f.shape)
    edges = lambda c: np.append(c - step / 2, c[-1] + step / 2)
    area = np.diff(np.sin(np.radians(edges(rlat))))[:, None] * np.radians(step) * np.ones(len(rlon))
    return area, f, holes


def run(folder, name, text):
    path = os.path.join(folder, name + ".toml")
    with open(path, "w") as out:
        out.write(f'[job]\nworkspace = "w_{name}"\n[[run]]\nfiles = ["in.nc"]\n{text}\n[output]\ndirectory = "{name}"\n')
    done = subprocess.run([WINDROW, "run", path, "--quiet"], capture_output=True, text=True)
    check(f"{name}: made", done.returncode == 0, done.stderr.strip())
    return lambda field: netCDF4.Dataset(os.path.join(folder, name, f"{field}_run_mesh.nc"))


PAIR = """[[field]]
variable = "uas"
pair = "eastward"
method = "{0}"
{1}
[[field]]
variable = "vas"
pair = "northward"
method = "{0}"
{1}
"""
LATLON = "[mesh]\nlon = { from = 6, to = 28, step = 0.5 }\nlat = { from = 42, to = 58, step = 0.5 }\n"


def vectors(folder):
    errors = {}
    for method in ("conservative-1", "conservative-2", "bilinear"):
        open_product = run(folder, "wind_" + method, PAIR.format(method, "") + LATLON)
        with open_product("uas") as u, open_product("vas") as v:
            p = to_xyz(*np.meshgrid(u["lon"][:], u["lat"][:]))
            e, n = east_north(p)
            truth = wind(p)
            errors[method] = max(np.abs(u["uas"][0] - (truth * e).sum(-1)).max(),
                                 np.abs(v["vas"][0] - (truth * n).sum(-1)).max())
            check(f"{method}: named after the compass", u["uas"].standard_name == "eastward_wind" and
                  v["vas"].standard_name == "northward_wind")
    # Cells of 1 degree: a step of up to 0.7 degrees for the first order, its square for the others.
    first, second = 10 * np.radians(0.75), 10 * np.radians(0.75) ** 2
    check("vectors: solid-body rotation", errors["conservative-1"] < first and errors["conservative-2"] < second and
          errors["bilinear"] < second, f"largest errors {errors} m/s of {first:.3f}, {second:.5f}")
    same = ('[mesh]\nkind = "file"\nfrom = "in.nc"\nvariable = "uas"\n')
    open_product = run(folder, "wind_same", PAIR.format("conservative-1", 'axes = "mesh"') + same)
    with open_product("uas") as u, open_product("vas") as v, netCDF4.Dataset(os.path.join(folder, "in.nc")) as given:
        worst = max(np.abs(u["uas"][:] - given["uas"][:]).max(), np.abs(v["vas"][:] - given["vas"][:]).max())
        check("vectors: onto their own grid and its axes nothing changes", worst < 1e-6,
              f"largest difference {worst:.2e} m/s (float32)")
        check("vectors: named after the grid", u["uas"].standard_name == "x_wind")


def refusals(folder):
    """Components that do not belong together are refused for both fields."""
    for name, attribute, value, told in (
            ("axes", "standard_name", "northward_wind", "runs along the grid's axes, but its partner 'vas' along east and "
             "north, as their standard names say"),
            ("units", "units", "km h-1", "has other units or times than its partner 'vas'")):
        with netCDF4.Dataset(os.path.join(folder, "in.nc"), "a") as data:
            before = data["vas"].getncattr(attribute)
            data["vas"].setncattr(attribute, value)
        path = os.path.join(folder, name + ".toml")
        with open(path, "w") as out:
            out.write(f'[job]\nworkspace = "w_{name}"\n[[run]]\nfiles = ["in.nc"]\n'
                      + PAIR.format("bilinear", "") + LATLON + f'[output]\ndirectory = "{name}"\n')
        done = subprocess.run([WINDROW, "run", path, "--quiet"], capture_output=True, text=True)
        check(f"vectors: other {name} refused", done.returncode == 65 and
              f"windrow: field 'uas', run 'run': {told}\n" in done.stderr and not os.path.exists(
                  os.path.join(folder, name, "uas_run_mesh.nc")), done.stderr.strip().splitlines()[0])
        with netCDF4.Dataset(os.path.join(folder, "in.nc"), "a") as data:
            data["vas"].setncattr(attribute, before)


def integrals(folder, area, f, holes):
    laea = ('[mesh]\nkind = "projected"\ncrs = "+proj=laea +lat_0=50 +lon_0=17 +R=6371007.1809"\n'
            "x = { from = -4500000, to = 4500000, step = 100000 }\ny = { from = -4500000, to = 4500000, step = 100000 }\n")
    rate = '[[field]]\nvariable = "pr"\nmin_cover = 0\nmethod = "conservative-1"\n'
    open_product = run(folder, "holes", rate + laea)
    with open_product("pr") as data:
        values, cover = data["pr"][:], data["cover"][:]
        weight = data["cell_area"][:] / 6371007.1809**2
        for t in range(2):
            kept = float((values[t].astype(float) * cover[t] * weight).sum())
            given = float(((f + t) * area * ~holes[t]).sum())
            check(f"holes: integral of the present part, step {t}", abs(kept / given - 1) < 2e-7,
                  f"relative difference {kept / given - 1:.2e} (float32 values and cover)")
    total = '[[field]]\nvariable = "people"\nquantity = "total"\nmin_cover = 0\n'
    open_product = run(folder, "total", total + laea)
    with open_product("people") as data, netCDF4.Dataset(os.path.join(folder, "in.nc")) as given:
        kept, expected = float(data["people"][0].astype(float).sum()), float(given["people"][0].sum())
        check("total: people are neither born nor lost", abs(kept / expected - 1) < 2e-7,
              f"relative difference {kept / expected - 1:.2e}")
    with open(os.path.join(folder, "land.geojson"), "w") as out:
        json.dump({"type": "FeatureCollection", "features": [{"type": "Feature", "properties": {}, "geometry": {
            "type": "Polygon", "coordinates": [[[10, 44], [20, 44], [20, 54], [10, 54], [10, 44]]]}}]}, out)
    open_product = run(folder, "masked", '[[field]]\nvariable = "people"\nquantity = "total"\n' + LATLON +
                       'mask = "land.geojson"\n')
    with open_product("people") as data:
        lon, lat = np.meshgrid(data["lon"][:], data["lat"][:])
        # The polygon's sides of latitude are straight in longitude and latitude: parallels.
        within = (lon > 10) & (lon < 20) & (lat > 44) & (lat < 54)
        check("mask: cells outside are missing", np.array_equal(~np.ma.getmaskarray(data["people"][0]), within) and
              np.array_equal(data["mask"][:] == 1, within))


def main():
    with tempfile.TemporaryDirectory() as folder:
        area, f, holes = source(os.path.join(folder, "in.nc"))
        vectors(folder)
        refusals(folder)
        integrals(folder, area, f, holes)
    print(f"{len(failures)} failures")
    return 1 if failures else 0


sys.exit(main())
