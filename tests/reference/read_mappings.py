#!/usr/bin/python3
"""Reading of CF grid mappings against pyproj's CF reader: points must be projected where pyproj's CRS of the same
attributes projects them, and come back. Usage: read_mappings.py DUMP_MAPPING

pyproj shares PROJ's formulas with windrow; what is independent here is the reading of the CF attributes. Parameters are
invented or those of well-known grids. The tolerance is 1e-9 degree: on the way there in metres on the ground.
"""
import json
import math
import subprocess
import sys
import warnings

import pyproj

warnings.simplefilter("ignore")
SPHERE = {"earth_radius": 6371229.0}
WGS84 = {"semi_major_axis": 6378137.0, "inverse_flattening": 298.257223563}
GRS80 = {"reference_ellipsoid_name": "GRS 1980"}
AXES = {"semi_major_axis": 6377563.396, "semi_minor_axis": 6356256.909}
EUROPE = [(5.0, 50.0), (12.3, 47.1), (15.5, 60.2), (-3.0, 41.0)]
NORTH = [(-45.0, 75.0), (100.0, 66.0), (170.0, 82.0)]
SOUTH = [(70.0, -75.0), (-120.0, -66.0)]
SATELLITE = [(0.5, 10.0), (-40.0, 30.0), (25.0, -35.0)]


def centre(latitude=None, longitude=None, **more):
    out = dict(more)
    if latitude is not None:
        out["latitude_of_projection_origin"] = latitude
    if longitude is not None:
        out["longitude_of_projection_origin"] = longitude
    return out


# name, attributes, points, units of the axes and metres of one
M, KM, FEET = ("m", 1.0), ("km", 1000.0), ("US_survey_foot", 1200 / 3937)
CASES = [
    ("albers_conical_equal_area", {"standard_parallel": [43.0, 62.0], "latitude_of_projection_origin": 30.0,
                                   "longitude_of_central_meridian": 10.0, **WGS84}, EUROPE, M),
    ("albers_conical_equal_area", {"standard_parallel": 50.0, "latitude_of_projection_origin": 30.0,
                                   "longitude_of_central_meridian": 10.0, "false_easting": 100.0, **SPHERE}, EUROPE, KM),
    ("azimuthal_equidistant", centre(50.0, 5.0, false_easting=20000.0, **GRS80), EUROPE, M),
    ("azimuthal_equidistant", centre(50.0, 5.0, **SPHERE), EUROPE, KM),
    ("geostationary", centre(0.0, 0.0, perspective_point_height=35785831.0, sweep_angle_axis="y", **WGS84), SATELLITE, M),
    ("geostationary", centre(0.0, -5.0, perspective_point_height=35786023.0, sweep_angle_axis="x", **WGS84), SATELLITE,
     ("rad", 35786023.0)),
    ("geostationary", centre(0.0, 3.0, perspective_point_height=35785831.0, fixed_angle_axis="x", **WGS84), SATELLITE,
     ("microradian", 35.785831)),
    ("geostationary", centre(0.0, 3.0, perspective_point_height=35785831.0, fixed_angle_axis="y", **WGS84), SATELLITE,
     ("degree", 35785831.0 * math.pi / 180)),
    ("lambert_azimuthal_equal_area", centre(52.0, 10.0, false_easting=4321000.0, false_northing=3210000.0, **GRS80),
     EUROPE, M),
    ("lambert_azimuthal_equal_area", centre(54.9, -2.5, **SPHERE), EUROPE, KM),
    ("lambert_conformal_conic", {"standard_parallel": [30.0, 60.0], "latitude_of_projection_origin": 48.0,
                                 "longitude_of_central_meridian": 9.0, **SPHERE}, EUROPE, M),
    ("lambert_conformal_conic", {"standard_parallel": 63.3, "latitude_of_projection_origin": 63.3,
                                 "longitude_of_central_meridian": 15.0, **SPHERE}, EUROPE, M),
    ("lambert_conformal_conic", {"standard_parallel": [28 + 23 / 60, 30 + 17 / 60],
                                 "latitude_of_projection_origin": 27 + 50 / 60, "longitude_of_central_meridian": -99.0,
                                 "false_easting": 2000000.0, "semi_major_axis": 6378206.4,
                                 "semi_minor_axis": 6356583.8}, [(-96.0, 28.5), (-99.0, 31.0)], FEET),
    ("lambert_cylindrical_equal_area", {"standard_parallel": 30.0, "longitude_of_central_meridian": 5.0, **WGS84},
     EUROPE, M),
    ("lambert_cylindrical_equal_area", {"standard_parallel": -20.0, "longitude_of_central_meridian": 5.0, **SPHERE},
     EUROPE, KM),
    ("latitude_longitude", dict(WGS84), EUROPE, ("degrees_east", 1.0)),
    ("latitude_longitude", {"longitude_of_prime_meridian": 2.33722917, **AXES}, EUROPE, ("degree", 1.0)),
    ("mercator", centre(None, 10.0, standard_parallel=30.0, **WGS84), EUROPE, M),
    ("mercator", centre(None, 110.0, scale_factor_at_projection_origin=0.997, false_easting=3900000.0,
                        false_northing=900000.0, semi_major_axis=6377397.155, inverse_flattening=299.1528128),
     [(120.0, -3.0), (140.0, 5.0)], M),
    ("oblique_mercator", centre(46.9, 7.4, azimuth_of_central_line=30.0, scale_factor_at_projection_origin=0.9999,
                                false_easting=600000.0, false_northing=200000.0, **GRS80), EUROPE, M),
    ("orthographic", centre(45.0, 5.0, **SPHERE), EUROPE, M),
    ("orthographic", centre(45.0, 5.0, **WGS84), EUROPE, KM),
    ("polar_stereographic", centre(90.0, -45.0, standard_parallel=70.0, **WGS84), NORTH, M),
    ("polar_stereographic", centre(-90.0, 0.0, standard_parallel=-71.0, **WGS84), SOUTH, KM),
    ("polar_stereographic", centre(90.0, 0.0, scale_factor_at_projection_origin=0.994, false_easting=2000000.0,
                                   false_northing=2000000.0, **WGS84), NORTH, M),
    ("polar_stereographic", centre(-90.0, 20.0, scale_factor_at_projection_origin=0.97, **SPHERE), SOUTH, M),
    ("polar_stereographic", centre(90.0, straight_vertical_longitude_from_pole=-45.0, standard_parallel=60.0, **SPHERE),
     NORTH, KM),
    ("rotated_latitude_longitude", {"grid_north_pole_latitude": 39.25, "grid_north_pole_longitude": -162.0, **SPHERE},
     EUROPE, ("degrees", 1.0)),
    ("rotated_latitude_longitude", {"grid_north_pole_latitude": 65.0, "grid_north_pole_longitude": 20.0,
                                    "north_pole_grid_longitude": 30.0, **WGS84}, EUROPE, ("degrees", 1.0)),
    ("sinusoidal", centre(None, 10.0, earth_radius=6371007.181), EUROPE, M),
    ("sinusoidal", centre(None, 10.0, **WGS84), EUROPE, KM),
    ("stereographic", centre(52.0, 8.0, scale_factor_at_projection_origin=0.9999, **WGS84), EUROPE, M),
    ("stereographic", centre(-30.0, 8.0, scale_factor_at_projection_origin=1.0, **SPHERE), [(10.0, -35.0)], KM),
    ("transverse_mercator", {"scale_factor_at_central_meridian": 0.9996012717, "longitude_of_central_meridian": -2.0,
                             "latitude_of_projection_origin": 49.0, "false_easting": 400000.0,
                             "false_northing": -100000.0, **AXES}, [(-2.0, 53.0), (-5.5, 50.1)], M),
    ("transverse_mercator", {"scale_factor_at_central_meridian": 0.9996, "longitude_of_central_meridian": 9.0,
                             "latitude_of_projection_origin": 0.0, "false_easting": 500.0, **WGS84}, EUROPE, KM),
    ("vertical_perspective", centre(40.0, 10.0, perspective_point_height=3000000.0, false_easting=1000.0, **SPHERE),
     EUROPE, M),
    ("vertical_perspective", centre(40.0, 10.0, perspective_point_height=35785831.0, **SPHERE), EUROPE, KM),
]
TOLERANCE_DEG = 1e-9
TOLERANCE_M = TOLERANCE_DEG * 111195
# PROJ 9.1 cuts the inverse series of the authalic latitude short, smoothly, at 5e-9 degrees on an ellipsoid: a place that
# does not come back to 1e-9 must come back where pyproj's does, and within this.
SERIES_DEG = 1e-8
FALSE_ORIGIN = ("false_easting", "false_northing")


def reference(name, attributes, points, units):
    """x, y of the points in the units of the axes, and the way back, by pyproj."""
    label, metres = units
    linear = name not in ("latitude_longitude", "rotated_latitude_longitude")
    given = {"grid_mapping_name": name, **attributes}
    if name == "albers_conical_equal_area" and not isinstance(given["standard_parallel"], list):
        given["standard_parallel"] = [given["standard_parallel"]] * 2  # CF: a single line of contact; pyproj adds the equator
    for key in FALSE_ORIGIN:  # pyproj's reader takes them for metres
        if key in given:
            given[key] *= metres
    if name == "polar_stereographic":  # this release asks for the older name, and for the pole's sign by the parallel
        given.setdefault("straight_vertical_longitude_from_pole", given.pop("longitude_of_projection_origin", None))
    crs = pyproj.CRS.from_cf(given)
    meridian = given.get("longitude_of_prime_meridian", 0.0)
    if name == "rotated_latitude_longitude":
        # the derived CRS itself: from its base, whose longitudes are Greenwich's
        forward = pyproj.Transformer.from_crs(crs.source_crs or crs.geodetic_crs, crs, always_xy=True)
    elif linear:
        forward = pyproj.Transformer.from_crs(crs.geodetic_crs, crs, always_xy=True)
    else:
        return [(lon - meridian, lat) for lon, lat in points], list(points)
    there, back = [], []
    for lon, lat in points:
        x, y = forward.transform(lon - meridian, lat)
        back.append(forward.transform(x, y, direction="INVERSE"))
        if name == "oblique_mercator":  # pyproj leaves the axes along the central line: turned here to east and north
            fx, fy = given.get("false_easting", 0.0), given.get("false_northing", 0.0)
            turn = math.radians(attributes["azimuth_of_central_line"])
            across, along = x - fx, y - fy
            x = fx + across * math.cos(turn) + along * math.sin(turn)
            y = fy + along * math.cos(turn) - across * math.sin(turn)
        there.append((x / metres, y / metres) if linear else (x, y))
    return there, back


def own(tool, name, attributes, points, units):
    lines = [f"name {name}", f"units {units[0]}"]
    for key, value in attributes.items():
        if isinstance(value, str):
            lines.append(f"text {key} {value}")
        else:
            numbers = value if isinstance(value, list) else [value]
            lines.append(f"number {key} " + " ".join(repr(v) for v in numbers))
    lines += [f"point {lon!r} {lat!r}" for lon, lat in points]
    return subprocess.run([tool], input="\n".join(lines) + "\n", capture_output=True, text=True)


def check(tool, name, attributes, points, units):
    ran = own(tool, name, attributes, points, units)
    if ran.returncode:
        print(f"{name}: {ran.stderr.strip()}")
        return False
    got = json.loads(ran.stdout)
    there, back = reference(name, attributes, points, units)
    linear = name not in ("latitude_longitude", "rotated_latitude_longitude")
    scale = units[1] if linear else 1.0
    apart = max(math.hypot(x - a, y - b) * scale for (x, y), (a, b) in zip(got["projected"], there))
    come_back, good = 0.0, apart <= (TOLERANCE_M if linear else TOLERANCE_DEG)
    for (lon, lat), given, theirs in zip(got["back"], points, back):
        direct = max(abs(lon - given[0]), abs(lat - given[1]))
        like_theirs = max(abs(lon - theirs[0]), abs(lat - theirs[1]))
        good = good and (direct <= TOLERANCE_DEG or (direct <= SERIES_DEG and like_theirs <= TOLERANCE_DEG))
        come_back = max(come_back, direct)
    print(f"{name} in {units[0]}: {'ok' if good else 'DIFFERS'}, {apart:.1e} {'m' if linear else 'degrees'} there, "
          f"{come_back:.1e} degrees back")
    return good


def main():
    results = [check(sys.argv[1], *case) for case in CASES]
    print(f"{sum(results)} of {len(results)} agree, {len({case[0] for case in CASES})} mappings")
    return 0 if all(results) else 1


if __name__ == "__main__":
    sys.exit(main())
