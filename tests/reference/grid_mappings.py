#!/usr/bin/python3
"""Grid-mapping attributes against pyproj's CF reader: the CRS it builds from the attributes alone must project every
sample point where the original CRS does, and the WKT must be the same CRS. Usage: grid_mappings.py DUMP_CRS

pyproj shares PROJ's formulas with windrow; what is independent here is the reading of the CF attributes.
"""
import json
import math
import subprocess
import sys

import pyproj

# definition, sample points (longitude, latitude from Greenwich), CF name expected (None: CF has none)
EUROPE = [(5.0, 50.0), (12.3, 47.1), (15.5, 60.2), (-3.0, 41.0)]
CASES = [
    ("EPSG:3035", EUROPE, "lambert_azimuthal_equal_area"),
    ("+proj=laea +lat_0=48 +lon_0=9 +R=6371229", EUROPE, "lambert_azimuthal_equal_area"),
    ("EPSG:3034", EUROPE, "lambert_conformal_conic"),
    ("EPSG:2154", EUROPE, "lambert_conformal_conic"),
    ("+proj=lcc +lat_1=50 +lat_0=50 +lon_0=5 +ellps=GRS80", EUROPE, "lambert_conformal_conic"),
    ("+proj=lcc +lat_1=50 +lat_0=50 +lon_0=5 +k_0=0.999 +x_0=1000 +y_0=500000 +R=6371200", EUROPE,
     "lambert_conformal_conic"),
    ("+proj=lcc +lat_1=49 +lat_0=41 +lon_0=5 +ellps=GRS80", EUROPE, "lambert_conformal_conic"),
    ("EPSG:3174", [(-78.75, 42.75), (-90.0, 45.0)], "albers_conical_equal_area"),
    ("EPSG:32632", EUROPE, "transverse_mercator"),
    ("EPSG:27700", EUROPE, "transverse_mercator"),
    ("EPSG:32733", [(15.0, -20.0), (17.5, -33.0)], "transverse_mercator"),
    ("EPSG:3031", [(70.0, -75.0), (-120.0, -66.0)], "polar_stereographic"),
    ("EPSG:3032", [(120.0, -75.0), (10.0, -80.0)], "polar_stereographic"),
    ("EPSG:3413", [(-45.0, 75.0), (100.0, 66.0)], "polar_stereographic"),
    ("EPSG:32661", [(44.0, 73.0), (-100.0, 80.0)], "polar_stereographic"),
    ("+proj=stere +lat_0=52 +lon_0=8 +k_0=0.9999 +ellps=WGS84", EUROPE, "stereographic"),
    ("+proj=merc +lat_ts=30 +lon_0=10 +ellps=GRS80", EUROPE, "mercator"),
    ("EPSG:3395", EUROPE, "mercator"),
    ("EPSG:3832", [(160.0, 10.0), (-170.0, -20.0)], "mercator"),
    ("EPSG:6933", EUROPE, "lambert_cylindrical_equal_area"),
    ("+proj=cea +lat_ts=30 +lon_0=5 +R=6371000", EUROPE, "lambert_cylindrical_equal_area"),
    ("+proj=ortho +lat_0=45 +lon_0=5 +ellps=WGS84", EUROPE, "orthographic"),
    ("+proj=sinu +lon_0=10 +R=6371007.181", EUROPE, "sinusoidal"),
    ("+proj=aeqd +lat_0=50 +lon_0=5 +x_0=20000 +ellps=GRS80", EUROPE, "azimuthal_equidistant"),
    ("EPSG:27572", EUROPE, "lambert_conformal_conic"),
    ("+proj=geos +lon_0=0 +h=35785831 +sweep=x +ellps=WGS84", EUROPE, "geostationary"),
    ("+proj=geos +lon_0=0 +h=35785831 +sweep=y +ellps=WGS84", EUROPE, "geostationary"),
    ("+proj=nsper +lat_0=40 +lon_0=10 +h=3000000 +x_0=1000 +R=6371000", EUROPE, "vertical_perspective"),
    ("+proj=omerc +lat_0=46.9 +lonc=7.4 +alpha=0 +k_0=0.9999 +x_0=600000 +ellps=GRS80", EUROPE, "oblique_mercator"),
    ("+proj=omerc +lat_0=46.9 +lonc=7.4 +alpha=30 +gamma=20 +ellps=GRS80", EUROPE, None),
    ("EPSG:4326", EUROPE, "latitude_longitude"),
    ("EPSG:4258", EUROPE, "latitude_longitude"),
    ("+proj=longlat +R=6371229", EUROPE, "latitude_longitude"),
    ("EPSG:28992", EUROPE, None),
    ("EPSG:3857", EUROPE, None),
]
TOLERANCE_M = 1e-6  # attributes are doubles: what is lost must be rounding only


def from_attributes(attributes):
    """pyproj's reader, given the older attribute name this release of it asks for."""
    attributes = dict(attributes)
    if attributes["grid_mapping_name"] == "polar_stereographic":
        attributes["straight_vertical_longitude_from_pole"] = attributes.pop("longitude_of_projection_origin")
    return pyproj.CRS.from_cf(attributes)


def project(crs, points):
    """x, y of points whose longitudes count from Greenwich, with the CRS's own conversion (no datum shift)."""
    base = crs.geodetic_crs
    meridian = base.prime_meridian
    east = meridian.longitude * meridian.unit_conversion_factor * 180 / math.pi
    unit = base.axis_info[0].unit_conversion_factor * 180 / math.pi
    if not crs.is_projected:
        return points
    transformer = pyproj.Transformer.from_crs(base, crs, always_xy=True)
    return [transformer.transform((lon - east) / unit, lat / unit) for lon, lat in points]


def check(tool, definition, points, expected):
    out = subprocess.run([tool, definition] + [f"{lon!r},{lat!r}" for lon, lat in points], check=True,
                         capture_output=True, text=True).stdout
    got = json.loads(out)
    faults = []
    name = got["grid_mapping_name"]
    if name != (expected or ""):
        faults.append(f"grid mapping '{name}', expected '{expected}'")
    own = got.pop("points")
    wkt = got.pop("wkt")
    got.pop("units")
    truth = pyproj.CRS.from_wkt(wkt)
    whole = definition if definition.startswith("EPSG") else definition + " +type=crs"
    if "+lat_1=49 +lat_0=41" in definition:
        whole += " +lat_2=49"  # PROJ's CRS reader would take lat_2 = 0
    if truth != pyproj.CRS(whole):
        faults.append("WKT is not the system that was asked for")
    worst = 0.0
    for (x, y), (a, b) in zip(own, project(truth, points)):
        worst = max(worst, math.hypot(x - a, y - b))
    if expected:
        mapped = from_attributes(got)
        for (x, y), (a, b) in zip(own, project(mapped, points)):
            worst = max(worst, math.hypot(x - a, y - b))
        ellipsoid, wanted = mapped.ellipsoid, truth.ellipsoid
        for key in ("semi_major_metre", "inverse_flattening"):
            if not math.isclose(getattr(ellipsoid, key), getattr(wanted, key), rel_tol=1e-14):
                faults.append(f"{key} {getattr(ellipsoid, key)}, expected {getattr(wanted, key)}")
    if not worst <= TOLERANCE_M:
        faults.append(f"points differ by {worst} m")
    print(f"{definition}: {'; '.join(faults) if faults else f'ok, {worst:.1e} m'}")
    return not faults


def main():
    results = [check(sys.argv[1], *case) for case in CASES]
    print(f"{sum(results)} of {len(results)} agree")
    return 0 if all(results) else 1


if __name__ == "__main__":
    sys.exit(main())
