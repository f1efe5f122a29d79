"""Tiny invented inputs and a way to run the program on them, for the tests of the command line.

What is in the inputs: a model of 8 x 6 cells of 5 degrees, daily surface temperatures with a seasonal cycle and pinned
noise, and stations inside the mesh. No value in them is from a real model or a real station.
"""
import os
import shutil
import subprocess
import tempfile

import netCDF4
import numpy as np

SEED = 20240311
MODEL_LON, MODEL_LAT = np.arange(2.5, 40, 5), np.arange(32.5, 60, 5)
MESH = "[mesh]\nlon = { from = 10, to = 20, step = 1 }\nlat = { from = 40, to = 50, step = 1 }\n"


class Skip(Exception):
    """What a case needs is not to be had here: another user, a file system of its own."""


class Folder:
    """A temporary folder with in/ for inputs and a job file; relative paths are meant in it."""

    def __init__(self, program):
        self.program = os.path.abspath(program)
        self.path = os.path.realpath(tempfile.mkdtemp(prefix="windrow_cli_"))
        os.chmod(self.path, 0o755)  # other users' runs are tested too
        os.mkdir(self("in"))
        self.mounted = []

    def __call__(self, *names):
        return os.path.join(self.path, *names)

    def __enter__(self):
        return self

    def __exit__(self, *_):
        self.remove()

    def remove(self):
        for name in self.mounted:
            subprocess.run(["umount", self(name)], check=True)
        shutil.rmtree(self.path)

    def mount(self, name, bytes_):
        """A folder that holds no more than so many bytes. Skip where mounting is not allowed."""
        os.mkdir(self(name))
        try:
            done = subprocess.run(["mount", "-t", "tmpfs", "-o", f"size={bytes_}", "tmpfs", self(name)],
                                  capture_output=True)
        except FileNotFoundError:
            raise Skip("there is no mount") from None
        if done.returncode != 0:
            raise Skip("file systems cannot be mounted here")
        self.mounted.append(name)

    def write(self, name, text):
        with open(self(name), "w") as file:
            file.write(text)

    def run(self, *words, before=(), env=None):
        """Runs the program to its end; standard error comes with this folder's path as FOLDER."""
        done = subprocess.run([*before, self.program, *words], cwd=self.path, text=True, capture_output=True,
                              env={**os.environ, **(env or {})}, timeout=120)
        done.stderr = done.stderr.replace(self.path, "FOLDER")
        return done

    def start(self, *words):
        """Starts the program and does not wait for it."""
        return subprocess.Popen([self.program, *words], cwd=self.path, stdout=subprocess.DEVNULL,
                                stderr=subprocess.DEVNULL)

    def left(self, *folders):
        """Files below the folders (without them: below out), hidden ones too."""
        found = []
        for folder in folders or ("out",):
            for at, _, names in os.walk(self(folder)):
                found += [os.path.relpath(os.path.join(at, name), self.path) for name in names]
        return sorted(found)


def series(days, ny, nx, seed=SEED):
    """Degrees Celsius [day, y, x]: a seasonal cycle that cools northwards, with noise that hardly compresses."""
    noise = np.random.default_rng(seed).normal(0, 3, (days, ny, nx))
    season = -10 * np.cos(2 * np.pi * np.arange(days) / 365)
    return (season[:, None, None] + 12 - 0.5 * np.arange(ny)[:, None] + noise).astype("f4")


def model(path, variable="tas", units="K", lon=MODEL_LON, lat=MODEL_LAT, first_year=2001, years=2, calendar="365_day",
          time_units=None, times=None, kind="NETCDF4", standard_name="air_temperature", seed=SEED, deflate=False):
    """A daily model file on a latitude-longitude grid; `lon` and `lat` are the cells' centres in degrees."""
    with netCDF4.Dataset(path, "w", format=kind) as file:
        count = 365 * years if times is None else len(times)
        file.createDimension("time", None)
        for name, centres, direction in (("lat", lat, "north"), ("lon", lon, "east")):
            file.createDimension(name, len(centres))
            axis = file.createVariable(name, "f8", name)
            axis.units, axis[:] = f"degrees_{direction}", centres
        time = file.createVariable("time", "f8", "time")
        time.units, time.calendar = time_units or f"days since {first_year}-01-01", calendar
        time[:] = np.arange(count) + 0.5 if times is None else times
        file.createDimension("edge", 2)
        time.bounds = "time_bnds"
        file.createVariable("time_bnds", "f8", ("time", "edge"))[:] = time[:][:, None] + [-0.5, 0.5]
        data = file.createVariable(variable, "f4", ("time", "lat", "lon"), zlib=deflate)
        data.units, data.standard_name, data.cell_methods = units, standard_name, "time: mean"
        data[:] = series(count, len(lat), len(lon), seed) + np.float32(273.15)


def fixed(path, variable, standard_name, units, value, lon=MODEL_LON, lat=MODEL_LAT):
    """A field without time, the same value everywhere."""
    with netCDF4.Dataset(path, "w") as file:
        for name, centres, direction in (("lat", lat, "north"), ("lon", lon, "east")):
            file.createDimension(name, len(centres))
            axis = file.createVariable(name, "f8", name)
            axis.units, axis[:] = f"degrees_{direction}", centres
        data = file.createVariable(variable, "f4", ("lat", "lon"))
        data.units, data.standard_name, data[:] = units, standard_name, value


SITES = "station,longitude,latitude,elevation\nA,12.5,42.5,100\nB,17.5,47.5,300\n"


def sites(path, text=SITES):
    with open(path, "w") as file:
        file.write(text)


def daily(path, first_year=2001, years=2, heading="station,date,tas [degC]", stations="AB"):
    """Daily station series without 29 February."""
    values = series(365 * years, 1, len(stations), SEED + 1)
    dates = [f"{first_year + d // 365}-{m:02}-{day:02}" for d in range(0, 365 * years, 365)
             for m, length in enumerate((31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31), 1)
             for day in range(1, length + 1)]
    with open(path, "w") as file:
        file.write(heading + "\n")
        for i, station in enumerate(stations):
            for date, value in zip(dates, values[:, 0, i]):
                file.write(f"{station},{date},{value:.1f}\n")


def monthly(path, first_year=2001, years=2, stations="AB"):
    with open(path, "w") as file:
        file.write("station,year,month,tas [degC]\n")
        for station in stations:
            for month in range(12 * years):
                file.write(f"{station},{first_year + month // 12},{month % 12 + 1},{10 + month % 12}\n")


def job(run='files = ["in/tas*.nc"]\n', field='variable = "tas"\n', mesh=MESH, rest="", general=""):
    """The text of a job file of one run and one field."""
    return f"{general}[[run]]\n{run}[[field]]\n{field}{mesh}{rest}"


ADJUST = """variable = "tas"
units = "degC"
[field.adjust]
method = "quantile-mapping"
quantiles = 20
"""
STATIONS = '[stations]\nsites = "in/sites.csv"\ndaily = "in/daily.csv"\nmin_years = 1\n'
