#!/usr/bin/python3
"""A job fed by CSV tables and the same job fed by CF timeSeries files, in every layout, make identical values.

The layouts are those of CF 1.13, appendix H.2 (orthogonal and incomplete multidimensional, contiguous and indexed
ragged), written with netCDF4's own calls. All values are invented; the model and the stations are tests/cli/kit.py's.
Usage: station_files.py WINDROW
"""
import os
import sys

import netCDF4
import numpy as np

sys.path.insert(0, os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "cli"))
import kit

IDS, LON, LAT, ELEVATION = ["A", "Bravo"], [12.5, 17.5], [42.5, 47.5], [100, 300]
SITES = "station,longitude,latitude,elevation\n" + "".join(
    f"{i},{x},{y},{z}\n" for i, x, y, z in zip(IDS, LON, LAT, ELEVATION))
DATES = netCDF4.num2date(np.arange(730), "days since 2001-01-01", "standard")
EPOCH = "days since 1970-01-01"
FIRST = netCDF4.date2num(DATES[0], EPOCH, "standard")


def observed():
    """(station, day) of invented temperatures in degC to a tenth; some are missing."""
    rng = np.random.default_rng(kit.SEED + 7)
    day = np.arange(730)
    values = 11 + 8 * np.sin(2 * np.pi * (day - 100) / 365.25) + 3 * rng.standard_normal((2, 730))
    values = np.ma.array(np.round(values, 1), mask=np.zeros((2, 730), bool))
    values[0, [40, 41, 300]] = np.ma.masked
    values[1, :59] = np.ma.masked
    return values


def write_csv(folder, values, shift=0):
    days = netCDF4.num2date(np.arange(730) + shift, "days since 2001-01-01", "standard")
    with open(folder("in/daily.csv"), "w") as file:
        file.write("station,date,tas [degC]\n")
        for i, station in enumerate(IDS):
            for date, value in zip(days, values[i]):
                text = "" if value is np.ma.masked else f"{value:.1f}"
                file.write(f"{station},{date.strftime('%Y-%m-%d')},{text}\n")
    folder.write("in/sites.csv", SITES)


class Writer:
    """What all layouts share: the stations' variables. `text`: how identifiers are stored."""

    def __init__(self, path, text="char", elevation_units="m"):
        self.file = netCDF4.Dataset(path, "w")
        self.file.featureType, self.file.Conventions = "timeSeries", "CF-1.11"
        self.file.createDimension("station", 2)
        if text == "char":
            self.file.createDimension("name_strlen", 12)
            ids = self.file.createVariable("station_name", "S1", ("station", "name_strlen"))
            ids[:] = netCDF4.stringtochar(np.array(IDS, "S12"))
        else:
            ids = self.file.createVariable("station_name", str, ("station",))
            ids[:] = np.array(IDS, dtype=object)
        ids.cf_role = "timeseries_id"
        for name, values, units, standard_name in (("lon", LON, "degrees_east", "longitude"),
                                                   ("lat", LAT, "degrees_north", "latitude"),
                                                   ("alt", ELEVATION, elevation_units, "surface_altitude")):
            variable = self.file.createVariable(name, "f4", ("station",))
            variable.units, variable.standard_name = units, standard_name
            variable[:] = np.array(values) / (1000 if units == "km" else 1)

    def time(self, dims, values, units=EPOCH, calendar="standard", bounds=None):
        time = self.file.createVariable("time", "f8", dims, fill_value=-9999.0)
        time.units, time.calendar, time.standard_name = units, calendar, "time"
        time[:] = values
        if bounds is not None:
            self.file.createDimension("edge", 2)
            time.bounds = "time_bnds"
            self.file.createVariable("time_bnds", "f8", (*dims, "edge"))[:] = np.stack(bounds, -1)
        return time

    def data(self, dims, values, kind="f4", units="degC", **extra):
        data = self.file.createVariable("tas", kind, dims, fill_value=extra.pop("fill", -999.0))
        data.units, data.standard_name, data.coordinates = units, "air_temperature", "time lat lon alt station_name"
        for name, value in extra.items():
            data.setncattr(name, value)
        data[:] = values
        self.file.close()


def orthogonal(path, values):
    file = Writer(path)
    file.file.createDimension("time", 730)
    file.time(("time",), FIRST + np.arange(730) + 0.5)
    file.data(("station", "time"), values)


def orthogonal_turned(path, values):
    """(time, station), unlimited time, a string identifier, hours since, a gregorian calendar, packed as short.

    Unpacked in double, values are off by some 1e-15 from the table's decimals, which float32 products do not show."""
    file = Writer(path, "string", "km")
    file.file.createDimension("time", None)
    hours = 24 * (FIRST + np.arange(730)) + 12
    file.time(("time",), hours, "hours since 1970-01-01 00:00:00", "gregorian")
    file.data(("time", "station"), values.T, "i2", scale_factor=0.1, add_offset=0.0, fill=-32768)


def with_bounds(path, values):
    """Stamped at the end of the day; only the bounds say which day it is."""
    file = Writer(path, "string")
    file.file.createDimension("time", 730)
    begin = FIRST + np.arange(730)
    file.time(("time",), begin + 1, bounds=(begin, begin + 1))
    file.data(("station", "time"), values)


def incomplete(path, values):
    """A time for each station: only the days with a value stand, at the front, then fill."""
    file = Writer(path)
    file.file.createDimension("obs", 730)
    time, data = np.ma.masked_all((2, 730)), np.ma.masked_all((2, 730))
    for s in range(2):
        there = np.flatnonzero(~values.mask[s])
        time[s, :len(there)] = FIRST + there
        data[s, :len(there)] = values[s, there]
    file.time(("station", "obs"), time)
    file.data(("station", "obs"), data)


def contiguous(path, values):
    file = Writer(path)
    there = [np.flatnonzero(~values.mask[s]) for s in range(2)]
    file.file.createDimension("obs", sum(map(len, there)))
    counts = file.file.createVariable("row_size", "i4", ("station",))
    counts.sample_dimension, counts[:] = "obs", [len(t) for t in there]
    file.time(("obs",), FIRST + np.concatenate(there))
    file.data(("obs",), np.concatenate([values[s, there[s]] for s in range(2)]), "f8")


def indexed(path, values):
    """Samples in the order of days, stations mixed."""
    file = Writer(path, "string")
    order = [(day, s) for day in range(730) for s in (1, 0) if not values.mask[s, day]]
    file.file.createDimension("obs", len(order))
    index = file.file.createVariable("which", "i4", ("obs",))
    index.instance_dimension, index[:] = "station", [s for _, s in order]
    file.time(("obs",), FIRST + np.array([day for day, _ in order]))
    file.data(("obs",), np.array([values[s, day] for day, s in order]), "f8")


LAYOUTS = [orthogonal, orthogonal_turned, with_bounds, incomplete, contiguous, indexed]
STATIONS = "[stations]\n{}min_years = 1\n"


def product(folder, name, stations):
    """The product's values and the stations told in its ledger."""
    folder.write("job.toml", kit.job(field=kit.ADJUST, rest=STATIONS.format(stations) +
                                     f'[output]\ndirectory = "{name}"\n'))
    done = folder.run("run", "job.toml")
    assert done.returncode == 0, done.stderr
    made = [f for f in os.listdir(folder(name)) if f.endswith(".nc")]
    with netCDF4.Dataset(folder(name, made[0])) as file:
        data = file.variables["tas"]
        data.set_auto_mask(False)
        return data[:].tobytes(), getattr(data, "comment", "")


def main(program):
    with kit.Folder(program) as folder:
        kit.model(folder("in/tas.nc"))
        values = observed()
        write_csv(folder, values)
        wanted, _ = product(folder, "csv", 'sites = "in/sites.csv"\ndaily = "in/daily.csv"\n')
        other = values.copy()
        other[0, 500] += 5
        write_csv(folder, other)
        changed, _ = product(folder, "changed", 'sites = "in/sites.csv"\ndaily = "in/daily.csv"\n')
        assert changed != wanted, "the comparison cannot tell a changed value"
        for layout in LAYOUTS:
            layout(folder("in/stations.nc"), values)
            for name, sites in (("own", ""), ("named", 'sites = "in/stations.nc"\n'),
                                ("csv", 'sites = "in/sites.csv"\n')):
                made, _ = product(folder, f"{layout.__name__}-{name}", sites + 'daily = "in/stations.nc"\n')
                assert made == wanted, f"{layout.__name__}, sites {name}: values differ from those of the CSV tables"
            print(f"{layout.__name__}: {len(wanted) // 4} values as from CSV")
        shifted(folder, values, wanted)
        undercatch(folder, values)
        inspected(folder, values)


def shifted(folder, values, wanted):
    """Labels a day late and a station day that ends in the morning: the same product; files with bounds do not move."""
    day = 'day = { ends = "09:00", label = "end" }\n'
    write_csv(folder, values, 1)
    made, comment = product(folder, "shifted", 'sites = "in/sites.csv"\ndaily = "in/daily.csv"\n' + day)
    assert made == wanted, "dates are not moved to the day that holds most hours"
    assert comment == ("A station day ends at 09:00 UTC and carries the date of its end; daily values without time "
                       "bounds are moved by -1 day to the date that holds most of their hours."), comment
    with_bounds(folder("in/stations.nc"), values)
    made, _ = product(folder, "bounds", 'daily = "in/stations.nc"\n' + day)
    assert made == wanted, "a file with time bounds is moved"
    print("shifted days: as from CSV")


RAIN = """variable = "pr"
units = "mm/day"
range = [0, 2000]
[field.adjust]
method = "mean-ratio"
"""


def undercatch(folder, values):
    """A factor of 1.25 at every station makes a product 1.25 times as wet, and is said. Amounts are of the model's order,
    far from the cap of ratios."""
    kit.model(folder("in/pr.nc"), "pr", "mm/day", standard_name="lwe_precipitation_rate")
    write_csv(folder, values)
    with open(folder("in/daily.csv")) as file:
        text = file.read()
    with open(folder("in/daily.csv"), "w") as file:
        for line in text.splitlines()[1:]:
            station, date, value = line.split(",")
            file.write(f"{station},{date},{value and 200 + 5 * abs(float(value))}\n")
    with open(folder("in/daily.csv")) as file:
        rows = file.read()
    folder.write("in/daily.csv", "station,date,pr [mm]\n" + rows)
    lines = SITES.splitlines()
    folder.write("in/sites.csv", "\n".join([lines[0] + ",catch"] + [line + ",1.25" for line in lines[1:]]) + "\n")
    found = {}
    for name, key in (("as they are", ""), ("factors", 'undercatch = "catch"\n')):
        job = kit.job('files = ["in/pr.nc"]\n', RAIN,
                      rest=STATIONS.format('sites = "in/sites.csv"\ndaily = "in/daily.csv"\n' + key) +
                      f'[output]\ndirectory = "{name}"\n')
        folder.write("job.toml", job)
        done = folder.run("run", "job.toml")
        assert done.returncode == 0, done.stderr
        with netCDF4.Dataset(folder(name, "pr_run_mesh.nc")) as file:
            found[name] = file["pr"][:].astype("f8"), file["pr"].comment
    ratio = found["factors"][0] / found["as they are"][0]
    worst = float(abs(ratio / 1.25 - 1).max())
    assert worst < 4 * 2.0 ** -24, f"factors of 1.25 make {ratio.min()} to {ratio.max()} times as much"
    assert found["as they are"][1] == "Station values are not corrected for undercatch.", found["as they are"][1]
    assert found["factors"][1] == "Station values are multiplied by the undercatch factors of column 'catch'."
    print(f"undercatch: 1.25 within {worst:.1e}")


def inspected(folder, values):
    """`inspect` tells what the quality checks find, of a table and of a file; of clean ones nothing."""
    for planted in (False, True):
        faulty = values.copy()
        if planted:
            faulty[1, 100:112] = 21.5
        write_csv(folder, faulty)
        contiguous(folder("in/stations.nc"), faulty)
        for name in ("in/daily.csv", "in/stations.nc"):
            done = folder.run("inspect", name)
            assert done.returncode == 0, done.stderr
            said = "note: station 'Bravo', column 'tas': 21.5 on 12 days in a row from 2001-04-11" in done.stdout
            assert said == planted, f"{name}, {'with' if planted else 'without'} a fault:\n{done.stdout}"
    print("inspect: tells a planted fault only")


if __name__ == "__main__":
    main(sys.argv[1])
