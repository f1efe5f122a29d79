"""Wrong command lines, job files and places for output. A part of wrong_inputs.py."""
import os
import subprocess

import kit
from cases import adjust, case, regrid

# --- command line -----------------------------------------------------------------------------------------------------

@case("unknown command", 64, "windrow: unknown command 'rnu'; did you mean 'run'?\n")
def _(folder):
    return ["rnu", "job.toml"]


@case("misspelt option", 64, "windrow: unknown option '--thread'; did you mean '--threads'?\n")
def _(folder):
    return ["run", "job.toml", "--thread", "2"]


@case("threads that are no number", 64, "windrow: --threads two: expected a whole number from 0 to 4096\n")
def _(folder):
    return ["run", "job.toml", "--threads", "two"]


@case("no job file given", 64, "windrow: `windrow run` needs a job file\n")
def _(folder):
    return ["run"]


@case("--set without a value", 78,
      "windrow: --set output.level: no key and value; expected KEY=VALUE with the dotted path of a job-file "
      "key\n")
def _(folder):
    regrid(folder)
    return ["run", "job.toml", "--set", "output.level"]


@case("--set of an unknown key", 78,
      "windrow: --set output.levle=3: unknown key 'levle' in [output]; did you mean 'level'?\n")
def _(folder):
    regrid(folder)
    return ["run", "job.toml", "--set", "output.levle=3"]


@case("--set of a field that is not there", 78,
      "windrow: --set field.3.units=K: 'field' has no entry 3; expected an index from 0 to 0\n")
def _(folder):
    regrid(folder)
    return ["run", "job.toml", "--set", "field.3.units=K"]


# --- job file ---------------------------------------------------------------------------------------------------------

@case("missing job file", 66, "windrow: jub.toml: no such file\n")
def _(folder):
    return ["run", "jub.toml"]


@case("job file that is a folder", 74, "windrow: job.toml: cannot be read: it is a folder\n")
def _(folder):
    os.mkdir(folder("job.toml"))


@case("unknown key", 78,
      "windrow: FOLDER/job.toml:5:1: unknown key 'min_covr' in [[field]]; did you mean 'min_cover'?\n"
      "min_covr = 0.5\n"
      "^\n")
def _(folder):
    regrid(folder, field='variable = "tas"\nmin_covr = 0.5\n')


@case("misspelt method", 78,
      "windrow: FOLDER/job.toml:6:10: unknown method 'quantile-maping'; did you mean 'quantile-mapping'?\n"
      'method = "quantile-maping"\n'
      "         ^\n")
def _(folder):
    adjust(folder, field='variable = "tas"\n[field.adjust]\nmethod = "quantile-maping"\n')


@case("TOML syntax", 78,
      "windrow: FOLDER/job.toml:4:16: not valid TOML: string: expected the closing quote on the same line\n"
      'variable = "tas\n'
      "               ^\n")
def _(folder):
    regrid(folder, field='variable = "tas\n')


@case("unknown CRS", 78,
      "windrow: FOLDER/job.toml:7:7: PROJ does not know the coordinate reference system 'EPSG:999999'; "
      'expected a code such as "EPSG:3035", a PROJ string with +proj=, or WKT\n'
      'crs = "EPSG:999999"\n'
      "      ^\n")
def _(folder):
    regrid(folder, mesh='[mesh]\nkind = "projected"\ncrs = "EPSG:999999"\nx = { from = 0, to = 4, step = 1 }\n'
                        'y = { from = 0, to = 4, step = 1 }\n')


@case("geographic CRS of a projected mesh", 78,
      "windrow: FOLDER/job.toml:7:7: crs 'EPSG:4326' is geographic; a projected mesh needs a projected CRS\n"
      'crs = "EPSG:4326"\n'
      "      ^\n")
def _(folder):
    regrid(folder, mesh='[mesh]\nkind = "projected"\ncrs = "EPSG:4326"\nx = { from = 0, to = 4, step = 1 }\n'
                        'y = { from = 0, to = 4, step = 1 }\n')


@case("mesh beyond the projection", 78,
      "windrow: FOLDER/job.toml:7:7: the mesh reaches beyond its projection: x = 7000000, y = 0 has no place "
      "on the globe\n"
      'crs = "+proj=ortho +lat_0=45 +lon_0=15 +R=6371000"\n'
      "      ^\n")
def _(folder):
    regrid(folder, mesh='[mesh]\nkind = "projected"\ncrs = "+proj=ortho +lat_0=45 +lon_0=15 +R=6371000"\n'
                        'x = { from = 0, to = 9e6, step = 1e6 }\ny = { from = 0, to = 2e6, step = 1e6 }\n')


@case("terrain without mesh height", 78,
      "windrow: FOLDER/job.toml:9:1: [field.terrain] needs the mesh's heights; expected 'height' in [mesh]\n"
      "[field.terrain]\n"
      "^\n")
def _(folder):
    adjust(folder, field=kit.ADJUST + '[field.terrain]\nlapse = "-6.5 K/km"\nmodel_height = "in/orog.nc"\n')


@case("adjustment without stations", 78,
      "windrow: FOLDER/job.toml:6:1: [field.adjust] needs observations; expected a table [stations]\n"
      "[field.adjust]\n"
      "^\n")
def _(folder):
    adjust(folder, rest="")


@case("station day without a time", 78,
      "windrow: FOLDER/job.toml:16:16: 'ends' is no time of day; expected one from \"00:00\" to \"24:00\"\n"
      'day = { ends = "9 am" }\n'
      "               ^\n")
def _(folder):
    adjust(folder, rest=kit.STATIONS + 'day = { ends = "9 am" }\n')


@case("station day in a named zone", 78,
      "windrow: FOLDER/job.toml:16:16: 'CET' is no zone; expected UTC or hours ahead of it, such as \"UTC+1\" or "
      "\"UTC-3:30\"\n"
      'day = { zone = "CET" }\n'
      "               ^\n")
def _(folder):
    adjust(folder, rest=kit.STATIONS + 'day = { zone = "CET" }\n')


@case("sites not named beside a table", 78,
      "windrow: FOLDER/job.toml:12:1: [stations] has no 'sites'; expected a CSV file with station, longitude, latitude "
      "and elevation\n"
      "[stations]\n"
      "^\n")
def _(folder):
    adjust(folder, rest='[stations]\ndaily = "in/daily.csv"\n')


@case("factors for undercatch without a sites table", 78,
      "windrow: FOLDER/job.toml:14:14: factors for 'undercatch' stand in a sites table; expected 'sites' in "
      "[stations]\n"
      'undercatch = "factor"\n'
      "             ^\n")
def _(folder):
    adjust(folder, rest='[stations]\ndaily = "in/daily.nc"\nundercatch = "factor"\n')


@case("field units unknown", 78,
      "windrow: FOLDER/job.toml:5:9: units 'degX' are not known to UDUNITS; expected units such as degC, "
      "mm/day or m s-1\n"
      'units = "degX"\n'
      "        ^\n")
def _(folder):
    regrid(folder, field='variable = "tas"\nunits = "degX"\n')


@case("memory too small", 78,
      "windrow: field 'tas', run 'run': memory = 1 MiB is too little; at least SIZE are needed\n")
def _(folder):
    adjust(folder, general='[job]\nmemory = "1 MiB"\n')


# --- output -----------------------------------------------------------------------------------------------------------

@case("output folder under a file", 73,
      "windrow: FOLDER/in/tas.nc/out: the folder cannot be made: a part of the path is a file\n")
def _(folder):
    regrid(folder, rest='[output]\ndirectory = "in/tas.nc/out"\n')


@case("output folder is a file", 73, "windrow: FOLDER/out: the folder cannot be made: a part of the path is a file\n")
def _(folder):
    regrid(folder)
    folder.write("out", "")


@case("workspace is a file", 73, "windrow: FOLDER/work: the folder cannot be made: a part of the path is a file\n")
def _(folder):
    regrid(folder)
    folder.write("work", "")


@case("product's name is a folder", 73, "windrow: FOLDER/out/tas_run_mesh.nc: cannot be written: Is a directory\n")
def _(folder):
    regrid(folder)
    os.makedirs(folder("out/tas_run_mesh.nc"))


@case("dependencies cannot be written", 73, "windrow: in/tas.nc/deps.mk: cannot be written: Not a directory\n")
def _(folder):
    regrid(folder)
    return ["run", "job.toml", "--make-deps", "in/tas.nc/deps.mk"]


@case("log cannot be written", 73, "windrow: in/tas.nc/log.json: cannot open the log: Not a directory\n")
def _(folder):
    regrid(folder)
    return ["run", "job.toml", "--log-json", "in/tas.nc/log.json"]


@case("workspace held by a live process", 75,
      "windrow: FOLDER/work: the workspace is held by process PID on HOST; run again later or use --wait "
      "SECONDS\n")
def _(folder):
    regrid(folder)
    os.mkdir(folder("work"))
    # The runner of this test is alive for as long as the case.
    folder.write("work/lease", f"{os.uname().nodename} {os.getpid()} 2024-01-01T00:00:00Z\n")


# Larger than the file systems below, but by less than the check before the start refuses.
LARGE = "[mesh]\nlon = { from = 10, to = 20, step = 0.25 }\nlat = { from = 40, to = 50, step = 0.25 }\n"
PLAIN = '[output]\ncompression = "none"\ntile = [73, 40, 40]\n'


@case("disk full under workspace and output", 73,
      "windrow: FOLDER/disk/work" "/tas-run-mesh.spool: cannot be written: No space left on device\n")
def _(folder):
    folder.mount("disk", 2 << 20)
    regrid(folder, mesh=LARGE, general='[job]\nworkspace = "disk/work"\n',
           rest=PLAIN.replace("]\n", ']\ndirectory = "disk/out"\n', 1))


@case("disk full under the output", 73,
      "windrow: FOLDER/out/tas_run_mesh.nc: cannot be written: No space left on device\n")
def _(folder):
    folder.mount("out", 2 << 20)
    regrid(folder, mesh=LARGE, rest=PLAIN)


@case("disk far too small", 73,
      "windrow: FOLDER/out: too little space: SIZE are free, the products hold 4.7 MB before compression\n")
def _(folder):
    folder.mount("out", 1 << 18)
    regrid(folder, mesh=LARGE, rest=PLAIN)


def as_nobody(folder):
    """Words that run a program without the rights of root; nothing for other users, who have none."""
    if os.getuid() != 0:
        return []
    words = ["setpriv", "--reuid=65534", "--regid=65534", "--clear-groups"]
    try:
        done = subprocess.run([*words, folder.program, "--version"], capture_output=True)
    except FileNotFoundError:
        raise kit.Skip("there is no setpriv") from None
    if done.returncode != 0:
        raise kit.Skip("the program cannot be run as another user")
    return words


@case("output folder not writable", 73, "windrow: FOLDER/out: cannot be written: Permission denied\n")
def _(folder):
    regrid(folder)
    for name, mode in (("out", 0o555), ("work", 0o777)):
        os.mkdir(folder(name))
        os.chmod(folder(name), mode)
    return ["run", "job.toml"], as_nobody(folder)


@case("workspace not writable", 73, "windrow: FOLDER/work: cannot be written: Permission denied\n")
def _(folder):
    regrid(folder)
    for name, mode in (("out", 0o777), ("work", 0o555)):
        os.mkdir(folder(name))
        os.chmod(folder(name), mode)
    return ["run", "job.toml"], as_nobody(folder)


@case("input not readable", 74, "windrow: FOLDER/in/tas.nc: cannot be opened: Permission denied\n")
def _(folder):
    regrid(folder)
    os.chmod(folder("in/tas.nc"), 0)
    return ["run", "job.toml"], as_nobody(folder)


# --- other commands ---------------------------------------------------------------------------------------------------

@case("inspect what is not there", 66, "windrow: in/tas.nc: no such file\n")
def _(folder):
    return ["inspect", "in/tas.nc"]


@case("inspect a text", 65, "windrow: in/tas.nc: is neither NetCDF nor a raster nor a table (.csv)\n")
def _(folder):
    folder.write("in/tas.nc", "temperatures of Kelder\n")
    return ["inspect", "in/tas.nc"]


@case("vouch for what is not there", 66, "windrow: out/tas.nc: no such file\n")
def _(folder):
    return ["vouch", "out/tas.nc"]


@case("plan of a job with an unknown key", 78,
      "windrow: FOLDER/job.toml:8:2: unknown table 'outptu' in the job file; did you mean 'output'?\n"
      "[outptu]\n"
      " ^\n")
def _(folder):
    regrid(folder, rest="[outptu]\nlevel = 1\n")
    return ["plan", "job.toml"]


@case("proof of a job without adjustment", 78,
      "windrow: FOLDER/job.toml: no field has [field.adjust]: there is nothing to prove; expected a field adjusted to "
      "stations\n")
def _(folder):
    regrid(folder)
    return ["prove", "job.toml", "--quiet", "--csv", "out/scores.csv"]


@case("proof with one station", 65,
      "windrow: field 'tas', run 'run': with station 'A' left out nothing is left to fit: no other station can be used; "
      "expected stations at two sites at least\n")
def _(folder):
    adjust(folder)
    kit.sites(folder("in/sites.csv"), "station,longitude,latitude,elevation\nA,12.5,42.5,100\n")
    kit.daily(folder("in/daily.csv"), stations="A")
    return ["prove", "job.toml", "--quiet", "--csv", "out/scores.csv"]


@case("proof with two stations at one site", 65,
      "windrow: field 'tas', run 'run': with station 'A' left out nothing is left to fit: all 2 stations lie within 2 km "
      "of it; expected stations at two sites at least\n")
def _(folder):
    adjust(folder)
    kit.sites(folder("in/sites.csv"), "station,longitude,latitude,elevation\nA,12.5,42.5,100\nB,12.51,42.51,120\n")
    return ["prove", "job.toml", "--quiet"]


@case("proof without a job", 64, "windrow: `windrow prove` needs a job file\n")
def _(folder):
    return ["prove", "--csv", "scores.csv"]
