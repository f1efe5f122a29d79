"""What `inspect` says about real files with odd metadata: kind of grid, cells, calendar, period, or a refusal that names
what is missing. Expectations were read off the files with ncdump. The two area means are invented in the layout of such
series (one cell without extent, one of them on a 360-day calendar).

Usage: inspect_files.py WINDROW TESTDATA
"""
import json
import os
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np

WINDROW, DATA = os.path.abspath(sys.argv[1]), os.path.abspath(sys.argv[2])
failures = 0


def inspect(path):
    done = subprocess.run([WINDROW, "inspect", "--json", path], capture_output=True, text=True)
    return done.returncode, json.loads(done.stdout) if done.stdout.startswith("{") else {}, done.stderr


def check(name, variable, path, **expected):
    global failures
    status, facts, errors = inspect(path)
    found = facts.get(variable, {})
    problems = [] if status == 0 else [f"exit status {status}: {errors.strip()}"]
    for key, text in expected.items():
        value = str(found.get(key, "(nothing)"))
        if (value != text[1:]) if text.startswith("=") else (text not in value):
            problems.append(f"{key}: {value!r}, expected {text!r}")
    print(f"{'FAIL' if problems else 'ok  '} {name} {'; '.join(problems)}")
    failures += bool(problems)


def area_mean(path, calendar):
    with netCDF4.Dataset(path, "w") as out:
        for name, length in (("time", None), ("lat", 1), ("lon", 1)):
            out.createDimension(name, length)
        time = out.createVariable("time", "f8", ("time",))
        time.units, time.calendar = "days since 1850-01-01", calendar
        year = 360 if calendar == "360_day" else 365
        time[:] = 100 * year + year * np.arange(5) + 180
        for name, units in (("lat", "degrees_north"), ("lon", "degrees_east")):
            v = out.createVariable(name, "f8", (name,))
            v.units = units
            v[:] = 0
        tas = out.createVariable("tas", "f4", ("time", "lat", "lon"))
        tas.units, tas.standard_name = "K", "air_temperature"
        tas[:] = 297 + 0.01 * np.arange(5)[:, None, None]


def main():
    at = lambda name: os.path.join(DATA, name)
    gauss = dict(grid="latitude-longitude, 96 x 192 cells, global", grid_recognised_by="Gaussian N48")
    check("gcm tas", "tas", at("gcm/tas_2005_t63.nc"), **gauss, time_step="=monthly", calendar="=proleptic_gregorian",
          period="=2005-01-16 to 2005-12-16", steps="=12", units="=K")
    check("gcm orog", "orog", at("gcm/orog_t63.nc"), **gauss, time_step="=fixed", units="=m")
    check("gcm sftlf", "sftlf", at("gcm/sftlf_t63.nc"), **gauss, time_step="=fixed", units="=%")
    check("rcm orography", "HSURF", at("cf/rcm_hsurf_rotated_alps.nc"),
          grid_recognised_by="rotated pole at -162 E, 39.25 N, 0.11 x 0.11 degrees, 100 x 120 cells",
          because_of="rotated_latitude_longitude", longitude="=centres from 6.2950 to 29.1552", units="=m")
    check("projected in km", "prcp", at("cf/small_lambert_km_axes.nc"),
          grid="=projected (Lambert Conic Conformal (2SP)), 569 x 619 cells",
          grid_recognised_by="projected (lambert_conformal_conic), 1 x 1 km, 569 x 619 cells",
          period="=1980-07-01 to 1980-07-01", calendar="=standard")
    check("coordinates transposed", "Total_precipitation_surface_1_Hour_Accumulation",
          at("cf/small_latlon_transposed_vs_data.nc"), grid_recognised_by="curvilinear, 118 x 87 cells",
          because_of="two-dimensional coordinates", period="=2018-09-14 to 2018-09-14")
    check("longitudes wrap inside", "pm10_conc", at("cf/tiny_lon_wraps_mid_array.nc"),
          grid_recognised_by="regular latitude-longitude, 0.1 x 0.1 degrees, 11 x 11 cells",
          longitude="=-0.5000 to 0.6000", latitude="=49.9000 to 51.0000", time_step="=fixed")
    check("two levels", "u", at("cf/tiny_packed_descending.nc"), cannot_be_used="2 levels along 'level' (millibars)")
    check("stations", "pr", at("cf/tiny_dsg_timeseries.nc"), grid="=10 points", because_of="featureType timeSeries",
          steps="=20", calendar="=standard", period="=2000-01-01 to 2019-01-01")
    check("surface categories", "LSMASK", at("cf/landsea_1deg.nc"), grid="180 x 360 cells, global", time_step="=fixed")
    check("climatology without dates", "sst", at("cf/sst_clim_2_months.nc"),
          cannot_be_used="time axis 'time' has the units 'Month', which name no date; expected '<unit> since <date>'")
    check("relief", "ROSE", at("colorado/relief_etopo5.nc"), grid="73 x 108 cells", longitude="=249.9606 to 258.9607",
          latitude="=35.9583 to 42.0417", units="=meters")
    with tempfile.TemporaryDirectory() as folder:
        for calendar in ("360_day", "proleptic_gregorian"):
            path = os.path.join(folder, calendar + ".nc")
            area_mean(path, calendar)
            check(f"area mean, {calendar}", "tas", path, grid="=1 points", calendar="=" + calendar, steps="=5",
                  grid_recognised_by="one point without extent")
    print(f"{failures} failures")
    return 1 if failures else 0


sys.exit(main())
