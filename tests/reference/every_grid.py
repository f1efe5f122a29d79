"""Every kind of source grid onto one mesh, and one grid onto every kind of mesh with every method, through the program.

The field is known in closed form, f = 280 + 20 z + 7 x - 5 y on the unit sphere (invented), so that each product is
compared with what it must be, computed here with numpy alone: a cell's value can differ from f at its centre by no more
than the extent of a source cell allows. Global means of global grids are compared exactly: the mean of f over the
sphere is 280. Products are opened with netCDF4 and xarray.

Usage: every_grid.py WINDROW
"""
import csv
import os
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np
import xarray

WINDROW = os.path.abspath(sys.argv[1])
R = 6371007.1809
failures = []


def check(name, good, text=""):
    print(f"{'ok  ' if good else 'FAIL'} {name} {text}")
    if not good:
        failures.append(name)


def field(lon, lat):
    lon, lat = np.radians(lon), np.radians(lat)
    return 280 + 20 * np.sin(lat) + 7 * np.cos(lat) * np.cos(lon) - 5 * np.cos(lat) * np.sin(lon)


STEEPEST = np.sqrt(20**2 + 7**2 + 5**2)  # largest gradient of f, K per radian


def new(path, dims, time=True):
    out = netCDF4.Dataset(path, "w")
    out.Conventions = "CF-1.13"
    for name, length in dims.items():
        out.createDimension(name, length)
    if time:
        out.createDimension("time", None)
        v = out.createVariable("time", "f8", ("time",))
        v.units, v.calendar, v.standard_name = "days since 2001-01-01", "proleptic_gregorian", "time"
        v[:] = [0.5, 1.5]
    return out


def put(out, name, dims, values, kind="f8", **attributes):
    v = out.createVariable(name, kind, dims)
    for key, value in attributes.items():
        v.setncattr(key, value)
    v[...] = values
    return v


LAT = dict(standard_name="latitude", units="degrees_north")
LON = dict(standard_name="longitude", units="degrees_east")


def tas(out, dims, values, **attributes):
    """Two days, the second one kelvin warmer; time stands where `dims` says."""
    v = out.createVariable("tas", "f4", dims)
    v.standard_name, v.units, v.cell_methods = "air_temperature", "K", "time: mean"
    for key, value in attributes.items():
        v.setncattr(key, value)
    at = dims.index("time")
    v[...] = np.stack([values, values + 1], axis=at)


def even(a, b, n):
    edges = np.linspace(a, b, n + 1)
    return edges, (edges[1:] + edges[:-1]) / 2


def rotated_to_geo(rlon, rlat, pole_lon, pole_lat):
    """CF's rotated pole by rotation matrices: the frame's meridian 0 runs from its pole over the geographic one."""
    rlon, rlat = np.radians(rlon), np.radians(rlat)
    tilt = np.radians(90 - pole_lat)
    x, y, z = -np.cos(rlat) * np.cos(rlon), -np.cos(rlat) * np.sin(rlon), np.sin(rlat)
    x, z = np.cos(tilt) * x + np.sin(tilt) * z, -np.sin(tilt) * x + np.cos(tilt) * z
    turn = np.radians(pole_lon)
    x, y = np.cos(turn) * x - np.sin(turn) * y, np.sin(turn) * x + np.cos(turn) * y
    return np.degrees(np.arctan2(y, x)), np.degrees(np.arcsin(np.clip(z, -1, 1)))


# --- sources: each writes a file and returns (largest extent of a cell in degrees, is it global) -------------------------

def regular(path):
    (_, lat), (_, lon) = even(-90, 90, 60), even(0, 360, 120)
    with new(path, dict(lat=60, lon=120)) as out:
        put(out, "lat", ("lat",), lat, **LAT)
        put(out, "lon", ("lon",), lon, **LON)
        tas(out, ("time", "lat", "lon"), field(lon[None, :], lat[:, None]))
    return 3, True


def shuffled(path):
    """Longitudes 21 to 379, latitudes from the north, the array stored [lon, time, lat]."""
    (_, lat), (_, lon) = even(-90, 90, 60), even(19.5, 379.5, 120)
    lat = lat[::-1]
    with new(path, dict(lat=60, lon=120)) as out:
        put(out, "lat", ("lat",), lat, **LAT)
        put(out, "lon", ("lon",), lon, **LON)
        tas(out, ("lon", "time", "lat"), field(lon[:, None], lat[None, :]))
    return 3, True


def wrapped(path):
    """Longitudes that jump from 358.5 to 1.5 inside the array, and the first column once more at the end."""
    (_, lat), (_, lon) = even(-90, 90, 60), even(-180, 180, 120)
    lon = np.append(lon % 360, lon[0] % 360)
    with new(path, dict(lat=60, lon=121)) as out:
        put(out, "lat", ("lat",), lat, **LAT)
        put(out, "lon", ("lon",), lon, **LON)
        tas(out, ("time", "lat", "lon"), field(lon[None, :], lat[:, None]))
    return 3, True


def rotated(path, coordinates=False):
    (_, rlat), (_, rlon) = even(-30, 30, 60), even(-40, 40, 80)
    lon, lat = rotated_to_geo(rlon[None, :], rlat[:, None], -162.0, 39.25)
    with new(path, dict(rlat=60, rlon=80)) as out:
        put(out, "rlat", ("rlat",), rlat, standard_name="grid_latitude", units="degrees")
        put(out, "rlon", ("rlon",), rlon, standard_name="grid_longitude", units="degrees")
        put(out, "pole", (), 0, "i4", grid_mapping_name="rotated_latitude_longitude",
            grid_north_pole_latitude=39.25, grid_north_pole_longitude=-162.0)
        extra = {}
        if coordinates:
            put(out, "lat", ("rlat", "rlon"), lat, **LAT)
            put(out, "lon", ("rlat", "rlon"), lon, **LON)
            extra["coordinates"] = "lat lon"
        tas(out, ("time", "rlat", "rlon"), field(lon, lat), grid_mapping="pole", **extra)
    return 1.5, False


def projected(path):
    """Lambert azimuthal equal-area on a sphere, axes in km (Snyder 1987, PP 1395, eqs 20-14, 20-15, 24-16)."""
    (_, x), (_, y) = even(-3000, 3000, 60), even(-2400, 2400, 48)
    X, Y = np.meshgrid(x * 1000, y * 1000)
    phi1, lam0 = np.radians(48), np.radians(10)
    rho = np.hypot(X, Y)
    c = 2 * np.arcsin(rho / (2 * R))
    lat = np.degrees(np.arcsin(np.cos(c) * np.sin(phi1) + Y * np.sin(c) * np.cos(phi1) / rho))
    lon = np.degrees(lam0 + np.arctan2(X * np.sin(c), rho * np.cos(phi1) * np.cos(c) - Y * np.sin(phi1) * np.sin(c)))
    with new(path, dict(y=48, x=60)) as out:
        put(out, "y", ("y",), y, standard_name="projection_y_coordinate", units="km")
        put(out, "x", ("x",), x, standard_name="projection_x_coordinate", units="km")
        put(out, "laea", (), 0, "i4", grid_mapping_name="lambert_azimuthal_equal_area", earth_radius=R,
            latitude_of_projection_origin=48.0, longitude_of_projection_origin=10.0, false_easting=0.0,
            false_northing=0.0)
        tas(out, ("time", "y", "x"), field(lon, lat), grid_mapping="laea")
    return 1.5, False


def curvilinear(path, bounds=True):
    """The rotated grid with nothing but two-dimensional coordinates; corners clockwise."""
    rlat_e, rlat = even(-30, 30, 60)
    rlon_e, rlon = even(-40, 40, 80)
    lon, lat = rotated_to_geo(rlon[None, :], rlat[:, None], -162.0, 39.25)
    corner_lon, corner_lat = rotated_to_geo(rlon_e[None, :], rlat_e[:, None], -162.0, 39.25)
    with new(path, dict(y=60, x=80, corner=4)) as out:
        extra = (dict(bounds="lat_corners"), dict(bounds="lon_corners")) if bounds else ({}, {})
        put(out, "lat", ("x", "y"), lat.T, **LAT, **extra[0])
        put(out, "lon", ("x", "y"), lon.T, **LON, **extra[1])
        if bounds:
            for name, c in (("lat_corners", corner_lat), ("lon_corners", corner_lon)):
                four = np.stack([c[:-1, :-1], c[1:, :-1], c[1:, 1:], c[:-1, 1:]], axis=-1)
                put(out, name, ("x", "y", "corner"), four.transpose(1, 0, 2))
        tas(out, ("time", "y", "x"), field(lon, lat), coordinates="lat lon")
    return 1.5, False


def triangles(path, ugrid=False):
    """An octahedron's faces halved four times: 2048 great-circle triangles."""
    corners = np.array([[1, 0, 0], [0, 1, 0], [-1, 0, 0], [0, -1, 0], [0, 0, 1], [0, 0, -1]], float)
    faces = [(0, 1, 4), (1, 2, 4), (2, 3, 4), (3, 0, 4), (1, 0, 5), (2, 1, 5), (3, 2, 5), (0, 3, 5)]
    nodes, known = [tuple(c) for c in corners], {}

    def middle(a, b):
        key = (min(a, b), max(a, b))
        if key not in known:
            m = np.array(nodes[a]) + np.array(nodes[b])
            nodes.append(tuple(m / np.linalg.norm(m)))
            known[key] = len(nodes) - 1
        return known[key]

    for _ in range(4):
        faces = [t for a, b, c in faces for t in ((a, middle(a, b), middle(a, c)), (middle(a, b), b, middle(b, c)),
                                                  (middle(a, c), middle(b, c), c),
                                                  (middle(a, b), middle(b, c), middle(a, c)))]
    p = np.array(nodes)
    lon, lat = np.degrees(np.arctan2(p[:, 1], p[:, 0])), np.degrees(np.arcsin(p[:, 2]))
    f = np.array(faces)
    centre = p[f].sum(axis=1)
    centre /= np.linalg.norm(centre, axis=1)[:, None]
    clon, clat = np.degrees(np.arctan2(centre[:, 1], centre[:, 0])), np.degrees(np.arcsin(centre[:, 2]))
    if ugrid:
        with new(path, dict(node=len(p), face=len(f), three=3)) as out:
            put(out, "mesh", (), 0, "i4", cf_role="mesh_topology", topology_dimension=2,
                node_coordinates="node_lon node_lat", face_node_connectivity="face_nodes")
            put(out, "node_lon", ("node",), lon, **LON)
            put(out, "node_lat", ("node",), lat, **LAT)
            put(out, "face_nodes", ("face", "three"), f + 1, "i4", cf_role="face_node_connectivity", start_index=1)
            tas(out, ("time", "face"), field(clon, clat), mesh="mesh", location="face")
    else:
        with new(path, dict(cell=len(f), corner=4)) as out:  # one corner of padding
            put(out, "lat", ("cell",), clat, **LAT, bounds="lat_v")
            put(out, "lon", ("cell",), clon, **LON, bounds="lon_v")
            for name, c in (("lat_v", lat), ("lon_v", lon)):
                v = out.createVariable(name, "f8", ("cell", "corner"), fill_value=9.97e36)
                v[:] = np.ma.masked_invalid(np.column_stack([c[f], np.full(len(f), np.nan)]))
            tas(out, ("time", "cell"), field(clon, clat), coordinates="lat lon")
    return 7, True


def healpix(path, scheme="nested", level=4):
    """Centres from the ring scheme's closed form (Gorski et al. 2005, ApJ 622, eqs 2-9): the ring order needs no more."""
    n = 2**level
    lon, lat = [], []
    for i in range(1, 4 * n):
        if i < n:
            z, count, start = 1 - i * i / (3 * n * n), 4 * i, 0.5
        elif i <= 3 * n:
            z, count, start = 4 / 3 - 2 * i / (3 * n), 4 * n, ((i - n + 1) % 2) / 2
        else:
            k = 4 * n - i
            z, count, start = -(1 - k * k / (3 * n * n)), 4 * k, 0.5
        lon.extend((np.arange(count) + start) * 360 / count)
        lat.extend([np.degrees(np.arcsin(z))] * count)
    lon, lat = np.array(lon), np.array(lat)
    with new(path, dict(cell=len(lon))) as out:
        put(out, "crs", (), 0, "i4", grid_mapping_name="healpix", refinement_level=level, indexing_scheme="ring")
        tas(out, ("time", "cell"), field(lon, lat), grid_mapping="crs")
    return 60 / n * 1.5, True


def reduced(path):
    """Rows with fewer cells towards the poles, centres listed (CF example 5.3 without its full grid's axes)."""
    edges, rows = even(-90, 90, 60)
    lon, lat = [], []
    for phi in rows:
        count = max(8, 4 * int(round(30 * np.cos(np.radians(phi)))))
        lon.extend(np.arange(count) * 360 / count)
        lat.extend([phi] * count)
    lon, lat = np.array(lon), np.array(lat)
    with new(path, dict(rgrid=len(lon), latdim=60, londim=120)) as out:
        put(out, "rgrid", ("rgrid",), np.arange(len(lon)), "i4", compress="latdim londim")
        put(out, "lat", ("rgrid",), lat, **LAT)
        put(out, "lon", ("rgrid",), lon, **LON)
        tas(out, ("time", "rgrid"), field(lon, lat), coordinates="lat lon")
    return 10, True


def gathered(path):
    """Every cell of a regular grid but those south of 60 S, gathered."""
    (_, lat), (_, lon) = even(-90, 90, 60), even(0, 360, 120)
    index = np.arange(60 * 120)[lat.repeat(120) > -60]
    with new(path, dict(lat=60, lon=120, land=len(index))) as out:
        put(out, "lat", ("lat",), lat, **LAT)
        put(out, "lon", ("lon",), lon, **LON)
        put(out, "land", ("land",), index, "i4", compress="lat lon")
        tas(out, ("time", "land"), field(lon[index % 120], lat[index // 120]))
    return 3, False


SOURCES = {
    "regular": regular, "stored in another order": shuffled, "longitudes wrap inside": wrapped, "rotated": rotated,
    "rotated with coordinates": lambda p: rotated(p, True), "projected": projected, "curvilinear": curvilinear,
    "curvilinear without bounds": lambda p: curvilinear(p, False), "listed triangles": triangles,
    "UGRID": lambda p: triangles(p, True), "HEALPix": healpix, "reduced": reduced, "gathered": gathered,
}


def run(folder, name, mesh, method="conservative-1", files="in.nc", extra="", output=""):
    job = os.path.join(folder, name + ".toml")
    with open(job, "w") as out:
        out.write(f"""[job]
workspace = "work_{name}"
[[run]]
files = ["{files}"]
[[field]]
variable = "tas"
method = "{method}"
{extra}
[mesh]
{mesh}
[output]
directory = "out_{name}"
{output}
""")
    done = subprocess.run([WINDROW, "run", job, "--quiet"], capture_output=True, text=True)
    product = os.path.join(folder, "out_" + name, "tas_run_mesh.nc")
    check(f"{name}: made", done.returncode == 0, done.stderr.strip())
    if done.returncode == 0:
        vouch = subprocess.run([WINDROW, "vouch", product], capture_output=True, text=True)
        check(f"{name}: vouched for", vouch.returncode == 0,
              "; ".join(line for line in vouch.stdout.splitlines() if line.startswith("failed")))
    return product if done.returncode == 0 else None


def compare(name, product, extent, tolerance_share=0.75):
    """Values against f at the cells' centres: a source cell's mean is within half its extent of f anywhere in it."""
    with netCDF4.Dataset(product) as data:
        values, lat, lon = data["tas"][:], data["lat"][:], data["lon"][:]
        if data["lat"].dimensions != data["lon"].dimensions:
            lon, lat = np.meshgrid(lon, lat)
        truth = field(lon, lat)
        worst = float(np.ma.abs(values[0] - truth).max())
        warmer = float(np.ma.abs(values[1] - values[0] - 1).max())
        present = float(np.ma.count(values[0]) / values[0].size)
        allowed = tolerance_share * STEEPEST * np.radians(extent)
        check(f"{name}: values", worst <= allowed and warmer < 1e-4,
              f"largest difference {worst:.3f} K of {allowed:.3f} allowed, {100 * present:.0f} % present")
        return values, data["cell_area"][:] if "cell_area" in data.variables else None


def all_sources(folder):
    mesh = "lon = { from = -180, to = 180, step = 2.5 }\nlat = { from = -90, to = 90, step = 2.5 }"
    for number, (name, make) in enumerate(SOURCES.items()):
        extent, is_global = make(os.path.join(folder, f"in{number}.nc"))
        product = run(folder, f"source{number}", mesh, files=f"in{number}.nc")
        if product is None:
            print(f"     ({name})")
            continue
        values, area = compare(name, product, extent + 2.5)
        if is_global:
            mean = float((values[0].astype(float) * area).sum() / area.sum())
            check(f"{name}: complete, mean over the globe", np.ma.count(values[0]) == values[0].size and
                  abs(mean - 280) < 0.02, f"{mean:.5f} K, 280 expected")
            check(f"{name}: area", abs(float(area.sum()) / (4 * np.pi * R * R) - 1) < 1e-12)


def all_meshes(folder):
    regular(os.path.join(folder, "in.nc"))
    (_, rlat) = even(-8, 8, 16)
    for number, name in ((3, "rotated"), (6, "curvilinear"), (9, "UGRID"), (10, "HEALPix"), (8, "listed triangles"),
                         (5, "projected"), (0, "regular")):
        product = run(folder, "mesh_" + name.replace(" ", "_"), f'kind = "file"\nfrom = "in{number}.nc"')
        if product:
            compare("onto " + name, product, 6 if name != "regular" else 3)
            with xarray.open_dataset(product) as data:
                check(f"onto {name}: xarray opens", "tas" in data and data["tas"].sizes["time"] == 2)
    product = run(folder, "mesh_faces", 'kind = "faces"\nfrom = "in9.nc"')
    if product:
        with netCDF4.Dataset(product) as data:
            nodes = data["face_nodes"]
            check("faces: UGRID topology", data["mesh"].cf_role == "mesh_topology" and data["tas"].location == "face" and
                  nodes[:].min() == 0 and nodes[:].max() == len(data["node_lon"]) - 1 and "UGRID-1.0" in data.Conventions)
    with open(os.path.join(folder, "basins.geojson"), "w") as out:
        out.write("""{"type": "FeatureCollection", "features": [
{"type": "Feature", "properties": {"code": "west"}, "geometry": {"type": "Polygon", "coordinates":
 [[[0, 40], [12, 40], [12, 52], [0, 52], [0, 40]], [[4, 44], [4, 46], [6, 46], [6, 44], [4, 44]]]}},
{"type": "Feature", "properties": {"code": "line"}, "geometry": {"type": "MultiPolygon", "coordinates":
 [[[[174, -20], [180, -20], [180, -10], [174, -10], [174, -20]]],
  [[[-180, -20], [-176, -20], [-176, -10], [-180, -10], [-180, -20]]]]}},
{"type": "Feature", "properties": {"code": "over"}, "geometry": {"type": "Polygon", "coordinates":
 [[[6, 40], [18, 40], [18, 52], [6, 52], [6, 40]]]}}]}""")
    product = run(folder, "mesh_catchments", 'kind = "catchments"\npolygons = "basins.geojson"\nid = "code"',
                  output='also = ["csv"]')
    if product:
        values, area = compare("catchments", product, 13)
        boxes = {"west": (0, 12, 40, 52), "line": (174, 184, -20, -10), "over": (6, 18, 40, 52)}
        with netCDF4.Dataset(product) as data:
            ids = [b"".join(row).decode().strip("\0") for row in data["id"][:].filled(b"\0")]
            rings = data["part_node_count"][:]
            check("catchments: geometry", list(data["node_count"][:]) == [8, 8, 4] and list(rings) == [4] * 5 and
                  list(data["interior_ring"][:]) == [0, 1, 0, 0, 0] and data["tas"].geometry == "outline")
        # Sides of the box along parallels: the area is that between them (closed form).
        for k, code in enumerate(ids):
            w, e, s, n = np.radians(boxes[code])
            expected = (e - w) * (np.sin(n) - np.sin(s))
            if code == "west":
                expected -= np.radians(2) * (np.sin(np.radians(46)) - np.sin(np.radians(44)))
            check(f"catchments: area of {code}", abs(float(area[k]) / (R * R) / expected - 1) < 1e-9)
        with open(product[:-3] + ".csv", newline="") as table:
            rows = list(csv.reader(table))
        check("catchments: table", rows[0] == ["date", "west [K]", "line [K]", "over [K]"] and rows[1][0] == "2001-01-01"
              and np.allclose([float(x) for x in rows[1][1:]], np.asarray(values[0]), atol=1e-4))
    with open(os.path.join(folder, "towns.csv"), "w") as out:
        out.write("station,longitude,latitude,elevation,name\na,10.2,50.1,300,Anton\nb,179.9,-17,,\nc,0,90,0,\"Pole, the\"\n")
    product = run(folder, "mesh_towns", 'kind = "towns"\nsites = "towns.csv"', "bilinear", output='also = ["csv"]')
    if product:
        compare("towns", product, 0.2)
        with netCDF4.Dataset(product) as data:
            check("towns: timeSeries", data.featureType == "timeSeries" and data["id"].cf_role == "timeseries_id" and
                  "cell_area" not in data.variables)
    product = run(folder, "mesh_containing", 'kind = "towns"\nsites = "towns.csv"')
    if product:
        compare("towns: the cell's value", product, 3)


def all_methods(folder):
    mesh = ('kind = "projected"\ncrs = "+proj=laea +lat_0=48 +lon_0=10 +R=6371007.1809"\n'
            "x = { from = -1000000, to = 1000000, step = 50000 }\ny = { from = -1000000, to = 1000000, step = 50000 }")
    worst = {}
    for method, allowed in (("conservative-1", 3), ("conservative-2", 0.3), ("conservative-smooth", 1.5),
                            ("bilinear", 0.15), ("nearest", 3), ("majority", 3)):
        product = run(folder, "method_" + method, mesh, method, extra="range = [0, 400]" if "smooth" in method else "")
        if product:
            compare(method, product, allowed)
            with netCDF4.Dataset(product) as data:
                worst[method] = float(np.ma.abs(data["tas"][0] - field(data["lon"][:], data["lat"][:])).max())
                check(f"{method}: said in the history", method in data.history)
    check("methods: second order beats first", worst["conservative-2"] < 0.2 * worst["conservative-1"], str(worst))


def main():
    with tempfile.TemporaryDirectory() as folder:
        all_sources(folder)
        all_meshes(folder)
        all_methods(folder)
    print(f"{len(failures)} failures")
    return 1 if failures else 0


sys.exit(main())
