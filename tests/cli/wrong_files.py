"""Wrong model and station files. A part of wrong_inputs.py."""
import os

import kit
import netCDF4
import numpy as np
from cases import adjust, case, regrid


def edit(path, name, **attributes):
    with netCDF4.Dataset(path, "a") as file:
        file[name].setncatts(attributes)


# --- model files ------------------------------------------------------------------------------------------------------

@case("missing model file", 66, "windrow: run 'run': no file matches FOLDER/in/tas_2001.nc\n")
def _(folder):
    folder.write("job.toml", kit.job('files = ["in/tas_2001.nc"]\n'))


@case("glob without match", 66, "windrow: run 'run': no file matches FOLDER/in/pr_*.nc\n")
def _(folder):
    regrid(folder, run='files = ["in/pr_*.nc"]\n')


@case("text file for NetCDF", 65, "windrow: FOLDER/in/tas.nc: not a NetCDF file (classic, 64-bit offset or netCDF-4)\n")
def _(folder):
    folder.write("in/tas.nc", "time,lat,lon,tas\n0,0,0,280\n")
    folder.write("job.toml", kit.job())


@case("empty file for NetCDF", 65,
      "windrow: FOLDER/in/tas.nc: not a NetCDF file (classic, 64-bit offset or netCDF-4)\n")
def _(folder):
    folder.write("in/tas.nc", "")
    folder.write("job.toml", kit.job())


@case("folder for a model file", 65, "windrow: FOLDER/in/tas.nc: not a regular file\n")
def _(folder):
    os.mkdir(folder("in/tas.nc"))
    folder.write("job.toml", kit.job())


@case("classic file truncated", 65,
      "windrow: FOLDER/in/tas.nc: the file is truncated: 60000 bytes, the header asks for SIZE\n")
def _(folder):
    kit.model(folder("in/tas.nc"), kind="NETCDF3_64BIT_OFFSET")
    os.truncate(folder("in/tas.nc"), 60000)
    folder.write("job.toml", kit.job())


@case("netCDF-4 file truncated", 65,
      "windrow: FOLDER/in/tas.nc: the file is truncated: 60000 bytes, the header asks for SIZE\n")
def _(folder):
    regrid(folder)
    os.truncate(folder("in/tas.nc"), 60000)


@case("netCDF-4 chunk damaged", 65,
      "windrow: FOLDER/in/tas.nc: variable tas: the file is damaged: HDF5 cannot read it\n")
def _(folder):
    kit.model(folder("in/tas.nc"), deflate=True)
    with open(folder("in/tas.nc"), "r+b") as file:
        file.seek(os.path.getsize(folder("in/tas.nc")) * 2 // 3)
        file.write(b"\xa5" * 2000)
    folder.write("job.toml", kit.job())


@case("variable missing", 65,
      "windrow: FOLDER/in/tas.nc: no variable 'tax'; did you mean 'tas'? (data variables in the file: tas)\n")
def _(folder):
    regrid(folder, field='variable = "tax"\n')


@case("source without units", 65,
      "windrow: field 'tas', run 'run': no units are given; expected some that convert to 'degC'\n")
def _(folder):
    regrid(folder, field='variable = "tas"\nunits = "degC"\n')
    with netCDF4.Dataset(folder("in/tas.nc"), "a") as file:
        file["tas"].delncattr("units")


@case("source units unknown", 65, "windrow: field 'tas', run 'run': units 'kelvinish' are not known to UDUNITS\n")
def _(folder):
    regrid(folder, field='variable = "tas"\nunits = "degC"\n')
    edit(folder("in/tas.nc"), "tas", units="kelvinish")


@case("units that do not convert", 65, "windrow: field 'tas', run 'run': units 'K' cannot be converted to 'mm/day'\n")
def _(folder):
    regrid(folder, field='variable = "tas"\nunits = "mm/day"\n')


@case("unknown calendar", 65,
      "windrow: FOLDER/in/tas.nc: time: calendar '365_dya' cannot be used; expected standard, "
      "proleptic_gregorian, julian, noleap (365_day), all_leap (366_day), 360_day, utc or tai\n")
def _(folder):
    regrid(folder)
    edit(folder("in/tas.nc"), "time", calendar="365_dya")


@case("time units without a date", 65,
      "windrow: FOLDER/in/tas.nc: time: time units 'days since yesterday' have a reference that cannot be "
      "read; expected e.g. 1850-01-01 00:00:00 or 1850-1-1T06:00Z\n")
def _(folder):
    regrid(folder)
    edit(folder("in/tas.nc"), "time", units="days since yesterday")


@case("time units that are no time", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': time axis 'time' has the units 'm', which name no date; "
      "expected '<unit> since <date>'\n")
def _(folder):
    regrid(folder)
    edit(folder("in/tas.nc"), "time", units="m")


@case("time goes back", 65,
      "windrow: FOLDER/in/tas.nc: time axis 'time' does not ascend: 2001-01-06 12:00 follows 2001-01-07 12:00 "
      "(position 6)\n")
def _(folder):
    regrid(folder)
    with netCDF4.Dataset(folder("in/tas.nc"), "a") as file:
        time = file["time"][:]
        time[5], time[6] = time[6], time[5]
        file["time"][:], file["time_bnds"][:] = time, time[:, None] + [-0.5, 0.5]


@case("latitude turns", 65,
      "windrow: FOLDER/in/tas.nc: coordinate 'lat': not monotonic: 42.5 and 40 stand side by side (positions 2 "
      "and 3)\n")
def _(folder):
    kit.model(folder("in/tas.nc"), lat=[32.5, 37.5, 42.5, 40.0, 52.5, 57.5])
    folder.write("job.toml", kit.job())


@case("latitude beyond the pole", 65,
      "windrow: FOLDER/in/tas.nc: coordinate 'lat': latitude 100 lies beyond the pole\n")
def _(folder):
    kit.model(folder("in/tas.nc"), lat=[70, 80, 90, 100, 110, 120])
    folder.write("job.toml", kit.job())


@case("longitudes with a gap", 65,
      "windrow: FOLDER/in/tas.nc: coordinate 'lon': gap between 17.5 and 32.5 degrees while the other cells "
      "are 5 degrees apart; a grid without gaps is needed\n")
def _(folder):
    kit.model(folder("in/tas.nc"), lon=[2.5, 7.5, 12.5, 17.5, 32.5, 37.5, 42.5, 47.5])
    folder.write("job.toml", kit.job())


@case("mesh outside the source", 65,
      "windrow: field 'tas', run 'run': the mesh lies outside the model grid (latitude-longitude, 6 x 8 cells, "
      "0 to 40 degrees east, 30 to 60 degrees north)\n")
def _(folder):
    regrid(folder, mesh="[mesh]\nlon = { from = -60, to = -50, step = 1 }\nlat = { from = 40, to = 50, step = 1 }\n")


@case("several levels", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': 3 levels along 'plev' (Pa); a field with a single level is "
      "needed\n")
def _(folder):
    folder.write("job.toml", kit.job())
    kit.model(folder("in/one.nc"), times=[0.5, 1.5])
    with netCDF4.Dataset(folder("in/one.nc")) as one, netCDF4.Dataset(folder("in/tas.nc"), "w") as file:
        for name, dimension in one.dimensions.items():
            file.createDimension(name, len(dimension))
        file.createDimension("plev", 3)
        for name in ("time", "lat", "lon"):
            axis = file.createVariable(name, "f8", name)
            axis.units, axis[:] = one[name].units, one[name][:]
        level = file.createVariable("plev", "f8", "plev")
        level.units, level.positive, level[:] = "Pa", "down", [85000, 50000, 25000]
        data = file.createVariable("tas", "f4", ("time", "plev", "lat", "lon"))
        data.units, data[:] = "K", 280
    os.remove(folder("in/one.nc"))


@case("two files on different grids", 65,
      "windrow: FOLDER/in/tas_2.nc: the grid is another (regular latitude-longitude, 5 x 5 degrees, 5 x 8 "
      "cells, 0 .. 40 E, 30 .. 55 N, edges half-way between centres (no bounds in the file) against regular "
      "latitude-longitude, 5 x 5 degrees, 6 x 8 cells, 0 .. 40 E, 30 .. 60 N, edges half-way between centres "
      "(no bounds in the file)) than in FOLDER/in/tas_1.nc\n")
def _(folder):
    kit.model(folder("in/tas_1.nc"), years=1)
    kit.model(folder("in/tas_2.nc"), years=1, first_year=2002, lat=kit.MODEL_LAT[:5])
    folder.write("job.toml", kit.job())


@case("two files of different calendars", 65,
      "windrow: FOLDER/in/tas_2.nc: the calendar is another (360_day against noleap) than in "
      "FOLDER/in/tas_1.nc\n")
def _(folder):
    kit.model(folder("in/tas_1.nc"), years=1)
    kit.model(folder("in/tas_2.nc"), years=1, first_year=2002, calendar="360_day")
    folder.write("job.toml", kit.job())


@case("two files of different units", 65,
      "windrow: FOLDER/in/tas_2.nc: variable 'tas' has other units ('degC' against 'K') than in "
      "FOLDER/in/tas_1.nc\n")
def _(folder):
    kit.model(folder("in/tas_1.nc"), years=1)
    kit.model(folder("in/tas_2.nc"), years=1, first_year=2002, units="degC")
    folder.write("job.toml", kit.job())


@case("land fraction on another grid", 65,
      "windrow: FOLDER/in/land.nc: is on another grid (latitude-longitude, 6 x 8 cells, 1 to 41 degrees east, "
      "30 to 60 degrees north) than run 'run' (latitude-longitude, 6 x 8 cells, 0 to 40 degrees east, 30 to 60 "
      "degrees north)\n")
def _(folder):
    regrid(folder, run='files = ["in/tas.nc"]\nland_fraction = "in/land.nc"\n')
    kit.fixed(folder("in/land.nc"), "sftlf", "land_area_fraction", "%", 100, lon=kit.MODEL_LON + 1)


@case("land fraction missing", 66, "windrow: FOLDER/in/land.nc: no such file\n")
def _(folder):
    regrid(folder, run='files = ["in/tas.nc"]\nland_fraction = "in/land.nc"\n')


@case("model height missing", 66, "windrow: FOLDER/in/orog.nc: no such file\n")
def _(folder):
    adjust(folder, field=kit.ADJUST + '[field.terrain]\nlapse = "-6.5 K/km"\nmodel_height = "in/orog.nc"\n',
           mesh=kit.MESH + 'height = "in/relief.nc"\n')
    kit.fixed(folder("in/relief.nc"), "relief", "surface_altitude", "m", 200)


# --- stations ---------------------------------------------------------------------------------------------------------

@case("sites missing", 66, "windrow: FOLDER/in/sites.csv: no such file\n")
def _(folder):
    adjust(folder)
    os.remove(folder("in/sites.csv"))


@case("stations in a model file", 65,
      "windrow: FOLDER/in/tas.nc: no variable with cf_role = \"timeseries_id\"; expected one that tells the stations "
      "apart\n")
def _(folder):
    adjust(folder, rest=kit.STATIONS.replace("in/daily.csv", "in/tas.nc"))


@case("no common period", 65,
      'note: station A: left out: no month in common with the run; period_mismatch = "accept" uses it all the '
      "same\n"
      'note: station B: left out: no month in common with the run; period_mismatch = "accept" uses it all the '
      "same\n"
      "windrow: field 'tas': no station is left to adjust to (no month in common with the run; period_mismatch "
      '= "accept" uses it all the same)\n')
def _(folder):
    adjust(folder)
    kit.daily(folder("in/daily.csv"), first_year=1981)


@case("all stations outside the mesh", 65,
      "note: station A: left out: lies outside the mesh\n"
      "note: station B: left out: lies outside the mesh\n"
      "windrow: field 'tas': no station is left to adjust to (lies outside the mesh)\n")
def _(folder):
    adjust(folder)
    kit.sites(folder("in/sites.csv"), kit.SITES.replace("12.5", "32.5").replace("17.5", "37.5"))


@case("empty table", 65, "windrow: FOLDER/in/daily.csv: the table is empty; expected a header line\n")
def _(folder):
    adjust(folder)
    folder.write("in/daily.csv", "")


@case("table without rows", 65, "windrow: FOLDER/in/daily.csv: no rows; expected one for each station and date\n")
def _(folder):
    adjust(folder)
    folder.write("in/daily.csv", "station,date,tas [degC]\n")


@case("table without the column", 65, "windrow: FOLDER/in/daily.csv: no column 'tas'; did you mean 'tsa'?\n")
def _(folder):
    adjust(folder)
    folder.write("in/daily.csv", "station,date,tsa [degC]\nA,2001-01-01,3\n")


@case("column without units", 65,
      "windrow: FOLDER/in/daily.csv: column 'tas': no units; expected a heading 'tas [degC]' or units = { tas "
      '= "degC" } in [stations]\n')
def _(folder):
    adjust(folder)
    folder.write("in/daily.csv", "station,date,tas\nA,2001-01-01,3\n")


@case("column of other units", 65,
      "windrow: FOLDER/in/daily.csv: column 'tas': units 'mm' cannot be converted to 'degC'\n")
def _(folder):
    adjust(folder)
    folder.write("in/daily.csv", "station,date,tas [mm]\nA,2001-01-01,3\n")


@case("bad date", 65, "windrow: FOLDER/in/daily.csv:3: '01/02/2001' is not a date; expected YYYY-MM-DD\n")
def _(folder):
    adjust(folder)
    folder.write("in/daily.csv", "station,date,tas [degC]\nA,2001-01-01,3\nA,01/02/2001,3\n")


@case("day that is in no calendar", 65, "windrow: FOLDER/in/daily.csv:2: '2001-02-29' is no day of the calendar\n")
def _(folder):
    adjust(folder)
    folder.write("in/daily.csv", "station,date,tas [degC]\nA,2001-02-29,3\n")


@case("bad number", 65,
      "windrow: FOLDER/in/daily.csv:2: column 'tas': '3,5' is not a number; a missing value is left empty, NA "
      "or NaN\n")
def _(folder):
    adjust(folder)
    folder.write("in/daily.csv", 'station,date,tas [degC]\nA,2001-01-01,"3,5"\n')


@case("row of too many cells", 65, "windrow: FOLDER/in/daily.csv:2: 4 fields; expected at most 3 as in the header\n")
def _(folder):
    adjust(folder)
    folder.write("in/daily.csv", "station,date,tas [degC]\nA,2001-01-01,3,5\n")


@case("station of two positions", 65,
      "note: FOLDER/in/sites.csv:3: station 'A' stands twice with different positions; both are left out\n"
      "note: FOLDER/in/daily.csv: station 'A' has values but no site; it is left out\n"
      "windrow: field 'tas': no station is left to adjust to (of those in the tables none can be used; the "
      "notes say why)\n")
def _(folder):
    adjust(folder)
    kit.sites(folder("in/sites.csv"), "station,longitude,latitude\nA,12.5,42.5\nA,17.5,47.5\n")
    kit.daily(folder("in/daily.csv"), stations="A")


@case("too few years", 65,
      "note: station 'A': 2 complete years (fewest in January), at least 10 are needed; it is left out\n"
      "note: station 'B': 2 complete years (fewest in January), at least 10 are needed; it is left out\n"
      "windrow: field 'tas': no station is left to adjust to (of those in the tables none can be used; the "
      "notes say why)\n")
def _(folder):
    adjust(folder, rest=kit.STATIONS.replace("min_years = 1", "min_years = 10"))


@case("quantile mapping with monthly stations", 65,
      "windrow: field 'tas', run 'run': quantile-mapping needs stations with daily series; there are none\n")
def _(folder):
    adjust(folder, rest=kit.STATIONS.replace("daily", "monthly"))
    kit.monthly(folder("in/monthly.csv"))
