#!/usr/bin/python3
"""Products of [ensemble] against numpy and xarray: contrasts, anomalies, statistics, warming levels.

Three invented families of models with pairs of runs. Every product is recomputed from the finished products of the runs
and compared to float32 rounding; xarray opens it and its CF attributes are looked at.
Usage: ensembles.py PROGRAM
"""
import glob
import json
import os
import subprocess
import sys
import tempfile

import cftime
import netCDF4
import numpy as np
import xarray

SEED = 20261201
FIRST, LAST = 1901, 2000
BASELINE, REFERENCE = (1961, 1990), (1901, 1930)
LEVELS = (0.5, 1.0)
CALENDAR = {"heron": "standard", "plover": "360_day", "stilt": "365_day"}
RUNS = [(f"{family}-{part}", family, forcing) for family in CALENDAR
        for part, forcing in (("all", "All forcings"), ("natural", "Natural only"))]
faults = []


def check(good, text):
    if not good:
        faults.append(text)


def month_starts(calendar, first, last):
    units = f"days since {first}-01-01"
    dates = [cftime.datetime(first + k // 12, k % 12 + 1, 1, calendar=calendar) for k in range((last - first + 1) * 12)]
    dates.append(cftime.datetime(last + 1, 1, 1, calendar=calendar))
    return units, cftime.date2num(dates, units, calendar=calendar).astype(float)


def model(path, calendar, trend, seed, variable="tas", units="degC", first=FIRST, last=LAST, hole=False):
    """Monthly means on a global grid of 10 degrees; warming of `trend` kelvin from 1930 to 2000."""
    draw = np.random.default_rng(seed)
    lon, lat = np.arange(5, 360, 10.0), np.arange(-85, 90, 10.0)
    time_units, edges = month_starts(calendar, first, last)
    count = len(edges) - 1
    year = first + np.arange(count) // 12
    warm = trend * np.clip(year - 1930, 0, None) / 70
    season = -8 * np.cos(2 * np.pi * (np.arange(count) % 12) / 12)
    values = (25 - 0.4 * np.abs(lat)[:, None] + warm[:, None, None] + season[:, None, None]
              + draw.normal(0, 0.5, (count, len(lat), len(lon))))
    with netCDF4.Dataset(path, "w") as file:
        for name, length in (("time", None), ("lat", len(lat)), ("lon", len(lon)), ("edge", 2)):
            file.createDimension(name, length)
        for name, centres, way in (("lat", lat, "north"), ("lon", lon, "east")):
            axis = file.createVariable(name, "f8", name)
            axis.units, axis[:] = f"degrees_{way}", centres
        time = file.createVariable("time", "f8", "time")
        time.units, time.calendar, time.bounds = time_units, calendar, "time_bnds"
        time[:] = (edges[:-1] + edges[1:]) / 2
        file.createVariable("time_bnds", "f8", ("time", "edge"))[:] = np.stack([edges[:-1], edges[1:]], 1)
        data = file.createVariable(variable, "f4", ("time", "lat", "lon"), fill_value=np.float32(1e20))
        data.units, data.cell_methods = units, "time: mean"
        data.standard_name = "air_temperature" if variable == "tas" else "precipitation_flux"
        data.long_name = "near-surface air temperature" if variable == "tas" else "precipitation"
        values = values.astype("f4")
        if hole:
            values[5:8, 12:, :] = 1e20
        data[:] = values
        file.institution = "invented"
    return values.astype(float), np.diff(edges), lat


def job(folder, runs, ensemble, rest="", general=""):
    text = general + "".join(
        f'[[run]]\nname = "{name}"\nfamily = "{family}"\nforcing = "{forcing}"\nfiles = ["in/{name}*.nc"]\n'
        + ("anchor = true\n" if name.endswith("all") else "") for name, family, forcing in runs)
    text += '[[field]]\nvariable = "tas"\n[mesh]\nlon = { from = 0, to = 40, step = 2 }\n'
    text += "lat = { from = 30, to = 60, step = 2 }\n[ensemble]\n" + ensemble + rest
    with open(os.path.join(folder, "job.toml"), "w") as file:
        file.write(text)


def run(program, folder, *words, status=0):
    done = subprocess.run([program, *words], cwd=folder, text=True, capture_output=True, timeout=600)
    check(done.returncode == status, f"{' '.join(words)}: exit {done.returncode}: {done.stderr[-400:]}")
    return done


def product(folder, name, variable="tas"):
    """Values as double with NaN, dates of the steps, and the netCDF attributes."""
    path = os.path.join(folder, "out", f"tas_{name}_mesh.nc")
    if not os.path.exists(path):
        check(False, f"{name}: not made")
        return None
    with netCDF4.Dataset(path) as file:
        data = file[variable]
        values = data[:].filled(np.nan).astype(float)
        time = file["time"]
        dates = cftime.num2date(time[:], time.units, time.calendar)
        attributes = {a: data.getncattr(a) for a in data.ncattrs()}
    return values, np.array([d.year for d in dates]), np.array([d.month for d in dates]), attributes


def same(name, got, wanted):
    """Equal to float32 rounding: at most one unit in the last place, as sums of another order may round the other way."""
    if got is None:
        return
    check(got.shape == wanted.shape, f"{name}: shape {got.shape}, expected {wanted.shape}")
    if got.shape != wanted.shape:
        return
    check(np.array_equal(np.isnan(got), np.isnan(wanted)), f"{name}: other values are missing")
    with np.errstate(invalid="ignore"):
        ulp = np.spacing(np.abs(wanted).astype("f4")).astype(float)
        worst = np.nanmax(np.abs(got - wanted) / ulp)
    check(worst <= 1.01, f"{name}: off by {worst:.2f} units in the last place")


def monthly_norm(values, years, months, first, last):
    chosen = (years >= first) & (years <= last)
    return np.stack([values[chosen & (months == m)].mean(axis=0) for m in range(1, 13)])


def statistics(members):
    stack = np.stack(members)
    with np.errstate(invalid="ignore"):
        return {"mean": stack.mean(axis=0), "spread": stack.std(axis=0, ddof=1),
                "q10": np.quantile(stack, 0.1, axis=0), "q90": np.quantile(stack, 0.9, axis=0),
                "agreement": (np.sign(stack) == np.sign(stack.mean(axis=0))).mean(axis=0)}


def annual(values, lengths, lat):
    """Annual global means: cell areas by sines, months by their lengths."""
    weight = np.sin(np.radians(lat + 5)) - np.sin(np.radians(lat - 5))
    mean = (values * weight[None, :, None]).sum(axis=(1, 2)) / (weight.sum() * values.shape[2])
    return (mean * lengths).reshape(-1, 12).sum(axis=1) / lengths.reshape(-1, 12).sum(axis=1)


def crossing(means, level, first=FIRST, reference=REFERENCE):
    """Central year n of the first window n-9..n+10 whose mean reaches the level; None where none does."""
    change = means - means[reference[0] - first:reference[1] - first + 1].mean()
    for i in range(len(change) - 19):
        if change[i:i + 20].mean() >= level:
            return first + i + 9
    return None


def check_attributes(folder, name, variable, wanted, absent=()):
    found = product(folder, name, variable)
    if found is None:
        return
    for key, value in wanted.items():
        check(found[3].get(key) == value, f"{name}: {key} is {found[3].get(key)!r}, expected {value!r}")
    for key in absent:
        check(key not in found[3], f"{name}: has {key}")
    path = os.path.join(folder, "out", f"tas_{name}_mesh.nc")
    with xarray.open_dataset(path, decode_times=True, use_cftime=True) as opened:
        for attribute in ("Conventions", "source", "history", "windrow_members", "cautions"):
            check(attribute in opened.attrs, f"{name}: no {attribute}")
        check(opened.attrs["Conventions"] == "CF-1.13", f"{name}: Conventions")
        for companion in ("status_flag", "crs", "cell_area", "lat_bnds", "lon_bnds"):
            check(companion in opened.variables, f"{name}: no {companion}")
        for word in found[3]["ancillary_variables"].split():
            check(word in opened.variables, f"{name}: ancillary variable {word} is not there")


def monthly_job(program, folder):
    os.mkdir(os.path.join(folder, "in"))
    coarse = {}
    for k, (name, family, forcing) in enumerate(RUNS):
        trend = (1.2, 0.9, 0.75)[k // 2] if forcing.startswith("All") else 0.0
        coarse[name] = model(os.path.join(folder, "in", f"{name}.nc"), CALENDAR[family], trend, SEED + k)
    pairs = "[" + ", ".join(f'["{f}-all", "{f}-natural"]' for f in CALENDAR) + "]"
    words = '["mean", "spread", "quantile:0.1", "quantile:0.9", "agreement"]'
    text = (f"statistics = {words}\ncontrast = {pairs}\nbaseline = [{BASELINE[0]}, {BASELINE[1]}]\n"
            f"warming = {{ levels = [{LEVELS[0]}, {LEVELS[1]}], reference = [{REFERENCE[0]}, {REFERENCE[1]}] }}\n")
    job(folder, RUNS, text)
    planned = run(program, folder, "plan", "job.toml").stdout
    check("contrast heron-all minus heron-natural of tas" in planned, "plan does not name the contrast")
    check(not os.path.exists(os.path.join(folder, "work")), "plan wrote a workspace")
    done = run(program, folder, "run", "job.toml", "--threads", "2", "--make-deps", "deps.mk")
    print(done.stdout.strip().splitlines()[-1] if done.stdout else done.stderr)

    base = {name: product(folder, name) for name, _, _ in RUNS}
    for family in CALENDAR:
        a, b = base[f"{family}-all"], base[f"{family}-natural"]
        name = f"{family}-all-minus-{family}-natural"
        got = product(folder, name)
        same(name, got and got[0], a[0] - b[0])
    anomaly = {}
    for name, _, _ in RUNS:
        values, years, months, _ = base[name]
        norm = monthly_norm(values, years, months, *BASELINE)
        got = product(folder, f"{name}-anomaly")
        same(f"{name}-anomaly", got and got[0], values - norm[months - 1])
        anomaly[name] = got[0]
        same(f"{name}-anomaly climatology", climatology(folder, name), norm)
    for group, forcing in (("all-forcings", "All forcings"), ("natural-only", "Natural only")):
        members = [name for name, _, text in RUNS if text == forcing]
        for label, source in (("", {n: base[n][0] for n in members}), ("anomaly-", anomaly)):
            wanted = statistics([source[n] for n in members])
            for part, values in wanted.items():
                if part == "agreement" and not label:
                    continue
                name = f"ensemble-{group}-{label}{part}"
                got = product(folder, name, f"tas_{part}")
                same(name, got and got[0], values)
    check(not glob.glob(os.path.join(folder, "out", "tas_ensemble-*-forcings-agreement_*")), "agreement without anomalies")

    crossed = 0
    for name, _, _ in RUNS:
        means = annual(*coarse[name])
        for level in LEVELS:
            centre = crossing(means, level)
            label = f"{name}-warming-{level:g}K"
            path = os.path.join(folder, "out", f"tas_{label}_mesh.nc")
            if centre is None:
                check(not os.path.exists(path), f"{label}: made though the level is not reached")
                check(f"does not reach {level:g} K" in done.stderr + done.stdout, f"{label}: not said")
                continue
            crossed += 1
            values, years, months, _ = base[name]
            got = product(folder, label)
            same(label, got and got[0], monthly_norm(values, years, months, centre - 9, centre + 10))
            check_warming(path, label, centre)
    check(crossed >= 4, f"only {crossed} levels are reached: the test shows too little")
    monthly_attributes(folder)
    again(program, folder, text)


def climatology(folder, name):
    with netCDF4.Dataset(os.path.join(folder, "out", f"tas_{name}-anomaly_mesh.nc")) as file:
        return file["tas_climatology"][:].filled(np.nan).astype(float)


def check_warming(path, label, centre):
    with netCDF4.Dataset(path) as file:
        time, data = file["time"], file["tas"]
        bounds = file[time.climatology]
        check(time.climatology == "climatology_bnds" and "bounds" not in time.ncattrs(), f"{label}: climatology")
        begin = cftime.num2date(bounds[:, 0], time.units, time.calendar)
        end = cftime.num2date(bounds[:, 1], time.units, time.calendar)
        check([(d.year, d.month, d.day) for d in begin] == [(centre - 9, m, 1) for m in range(1, 13)],
              f"{label}: climatology begins {begin[0]}")
        check([(d.year, d.month, d.day) for d in end[:11]] == [(centre + 10, m, 1) for m in range(2, 13)],
              f"{label}: climatology ends {end[0]}")
        check((end[11].year, end[11].month) == (centre + 11, 1), f"{label}: December ends {end[11]}")
        check(data.cell_methods == "time: mean within years time: mean over years area: mean", data.cell_methods)
        check(file.windrow_warming_central_year == centre, f"{label}: central year")


def monthly_attributes(folder):
    difference = {"units": "K", "units_metadata": "temperature: difference"}
    check_attributes(folder, "heron-all-minus-heron-natural", "tas",
                     {**difference, "cell_methods": "time: mean area: mean",
                      "long_name": "near-surface air temperature, heron-all minus heron-natural"}, ["standard_name"])
    check_attributes(folder, "plover-natural-anomaly", "tas",
                     {**difference, "standard_name": "air_temperature",
                      "cell_methods": "time: mean area: mean time: anomaly_wrt tas_climatology",
                      "ancillary_variables": "status_flag tas_climatology"})
    check_attributes(folder, "ensemble-all-forcings-mean", "tas_mean",
                     {"units": "degC", "units_metadata": "temperature: on_scale", "standard_name": "air_temperature",
                      "cell_methods": "time: mean area: mean realization: mean"})
    check_attributes(folder, "ensemble-all-forcings-spread", "tas_spread",
                     {**difference, "cell_methods": "time: mean area: mean realization: standard_deviation"})
    check_attributes(folder, "ensemble-all-forcings-q10", "tas_q10",
                     {"units": "degC", "long_name": "ensemble quantile 0.1 of near-surface air temperature"},
                     ["standard_name"])
    check_attributes(folder, "ensemble-natural-only-anomaly-agreement", "tas_agreement", {"units": "1"},
                     ["standard_name", "units_metadata"])
    with netCDF4.Dataset(os.path.join(folder, "out", "tas_plover-natural-anomaly_mesh.nc")) as file:
        norm = file["tas_climatology"]
        check(norm.cell_methods == "climatology_time: mean within years climatology_time: mean over years area: mean",
              norm.cell_methods)
        check(norm.units == "degC" and norm.standard_name == "air_temperature", "climatology: units or name")
        check(file["climatology_time"].climatology == "climatology_bnds", "climatology: bounds")


def again(program, folder, text):
    """Nothing to do touches nothing; one thread gives the same bytes; a new statistic makes itself alone."""
    paths = sorted(glob.glob(os.path.join(folder, "out", "*")))
    before = {p: (os.stat(p).st_mtime_ns, open(p, "rb").read()) for p in paths}
    quiet = run(program, folder, "run", "job.toml")
    check(quiet.stderr == "", f"a job with nothing to do says {quiet.stderr}")
    check(all(os.stat(p).st_mtime_ns == before[p][0] for p in paths), "a job with nothing to do touched a product")
    deps = open(os.path.join(folder, "deps.mk")).read()
    check("tas_heron-all-minus-heron-natural_mesh.nc: " in deps, "--make-deps leaves out the contrast")
    products = [p for p in paths if p.endswith(".nc")]
    vouched = run(program, folder, "vouch", *products)
    check("failed" not in vouched.stdout, "vouch: " + "; ".join(l for l in vouched.stdout.splitlines() if "failed" in l))
    for path in products:
        if "minus" in path or "ensemble" in path or "anomaly" in path or "warming" in path:
            os.remove(path)
    run(program, folder, "run", "job.toml", "--threads", "1")
    other = [os.path.basename(p) for p in paths if open(p, "rb").read() != before[p][1]]
    check(not other, f"with one thread other bytes: {other}")
    stamps = {p: os.stat(p).st_mtime_ns for p in paths}
    job(folder, RUNS, text.replace('"spread", ', '"spread", "quantile:0.5", '))
    made = run(program, folder, "run", "job.toml").stdout
    fresh = set(glob.glob(os.path.join(folder, "out", "*"))) - set(paths)
    check(len(fresh) == 8 and all("q50" in p for p in fresh), f"a new statistic made {len(fresh)} files: {made}")
    check(all(os.stat(p).st_mtime_ns == stamps[p] for p in paths), "a new statistic touched other products")
    # Changed inputs of one run: only what depends on it.
    model(os.path.join(folder, "in", "stilt-natural.nc"), CALENDAR["stilt"], 0.0, SEED + 99)
    run(program, folder, "run", "job.toml")
    touched = {os.path.basename(p) for p in paths if p.endswith(".nc") and os.stat(p).st_mtime_ns != stamps[p]}
    check(touched and all("stilt" in p or "natural-only" in p for p in touched), f"touched: {sorted(touched)}")
    check(not any("stilt-all_" in p or "stilt-all-anomaly" in p for p in touched), f"touched: {sorted(touched)}")


def split_job(program, folder):
    """A file a year, runs of other lengths, missing values, and global means from files."""
    os.mkdir(os.path.join(folder, "in"))
    runs = [("heron-all", "heron", "all"), ("heron-natural", "heron", "natural"), ("plover-all", "plover", "all")]
    model(os.path.join(folder, "in", "heron-all.nc"), "standard", 1.0, SEED + 7, first=1971, last=2000)
    model(os.path.join(folder, "in", "heron-natural.nc"), "standard", 0.0, SEED + 8, first=1975, last=1998, hole=True)
    model(os.path.join(folder, "in", "plover-all.nc"), "standard", 1.0, SEED + 9, first=1970, last=2000)
    # Annual anomalies that reach 1 K in the window 1975-1994, and a run that stays below.
    for name, late in (("heron-all", 1.0), ("heron-natural", 0.0), ("plover-all", 0.25)):
        with netCDF4.Dataset(os.path.join(folder, "in", f"{name}-gmst.cdf"), "w", format="NETCDF3_CLASSIC") as file:
            file.createDimension("time", 151)
            time = file.createVariable("time", "f8", "time")
            time.units, time.calendar = "days since 1850-07-02", "365_day"
            time[:] = 365.0 * np.arange(151)
            series = file.createVariable("gmst", "f8", "time")
            series.units = "K"
            series[:] = np.where(1850 + np.arange(151) >= 1975, late, 0.0)
    job(folder, runs, 'statistics = ["mean"]\ncontrast = [["heron-all", "heron-natural"]]\n'
        'warming = { levels = [1.0], global = "in/{run}-gmst.cdf" }\n',
        rest='[output]\nname = "{field}_{run}_{mesh}_{year}.nc"\nlevel = 0\ntile = [7, 4, 6]\n')
    done = run(program, folder, "run", "job.toml")
    told = done.stdout + done.stderr
    contrast = sorted(glob.glob(os.path.join(folder, "out", "tas_heron-all-minus-heron-natural_mesh_*.nc")))
    check(len(contrast) == 24, f"{len(contrast)} years of contrast, expected 24")
    for year in (1975, 1998):
        with netCDF4.Dataset(os.path.join(folder, "out", f"tas_heron-all-minus-heron-natural_mesh_{year}.nc")) as file:
            got = file["tas"][:].filled(np.nan).astype(float)
        parts = []
        for name in ("heron-all", "heron-natural"):
            with netCDF4.Dataset(os.path.join(folder, "out", f"tas_{name}_mesh_{year}.nc")) as file:
                parts.append(file["tas"][:].filled(np.nan).astype(float))
        same(f"contrast {year}", got, parts[0] - parts[1])
        if year == 1975:
            check(np.isnan(got[5:8]).any() and not np.isnan(got[:5]).any(), "missing months are not missing in the contrast")
    check("72 of 360 steps of 'heron-all' are left out" in told, "steps left out are not said")
    check("run 'plover-all': does not reach 1 K of global warming" in told, "a level not reached is not said")
    warm = glob.glob(os.path.join(folder, "out", "*warming*.nc"))
    if [os.path.basename(p) for p in warm] != ["tas_heron-all-warming-1K_mesh_1984.nc"]:
        check(False, f"warming products: {warm}")
        return
    with netCDF4.Dataset(warm[0]) as file:
        got = file["tas"][:].filled(np.nan).astype(float)
        check(file.windrow_warming_years == "1975-1994", file.windrow_warming_years)
    years = []
    for year in range(1975, 1995):
        with netCDF4.Dataset(os.path.join(folder, "out", f"tas_heron-all_mesh_{year}.nc")) as file:
            years.append(file["tas"][:].filled(np.nan).astype(float))
    same("warming of a product a year", got, np.mean(years, axis=0))
    with open(glob.glob(os.path.join(folder, "out", "*warming*.json"))[0]) as file:
        ledger = json.load(file)
    check(len(ledger["inputs"]) == 20, f"the ledger has {len(ledger['inputs'])} inputs")
    vouched = run(program, folder, "vouch", *contrast[:2], *warm)
    check("failed" not in vouched.stdout, "vouch of the split job")


def wrong_jobs(program, folder):
    """What cannot be computed is said in one line a product, and the runs' own products are made all the same."""
    os.mkdir(os.path.join(folder, "in"))
    runs = [("heron-all", "heron", "all"), ("heron-natural", "heron", "natural")]
    model(os.path.join(folder, "in", "heron-all.nc"), "standard", 1.0, SEED + 7, first=1981, last=1990)
    model(os.path.join(folder, "in", "heron-natural.nc"), "360_day", 0.0, SEED + 8, first=1981, last=1990)
    with netCDF4.Dataset(os.path.join(folder, "in", "short.cdf"), "w") as file:
        file.createDimension("time", 30)
        time = file.createVariable("time", "f8", "time")
        time.units, time.calendar = "days since 1871-07-02", "365_day"
        time[:] = 365.0 * np.arange(30)
        series = file.createVariable("gmst", "f8", "time")
        series.units, series[:] = "K", 0.0
    contrast = 'contrast = [["heron-all", "heron-natural"]]\n'
    cases = [
        (contrast, 65, ["contrast heron-all minus heron-natural of tas: 'heron-all' has calendar standard, "
                        "'heron-natural' 360_day; expected one calendar"]),
        ("baseline = [1981, 1995]\n", 65,
         ["run 'heron-all': its steps 1981-01-16 to 1990-12-16 do not hold all of the baseline, 1981-1995: 1991 is not "
          "whole", "run 'heron-natural': its steps 1981-01-16 to 1990-12-16 do not hold all of the baseline, 1981-1995: "
          "1991 is not whole"]),
        ('warming = { levels = [1.0], global = "in/none-{run}.nc" }\n', 66,
         [f"{folder}/in/none-{name}.nc: no such file; it is 'global' in 'warming' of [ensemble]" for name, _, _ in runs]),
        ('warming = { levels = [1.0], global = "in/short.cdf" }\n', 65,
         [f"{folder}/in/short.cdf: the global mean has 30 of the 51 years of the reference 1850-1900; it holds 30 of the "
          "years 1871 to 1900"]),
        ('warming = { levels = [1.0], global = "in/{run}.nc" }\n', 65,
         [f"{folder}/in/{name}.nc: variable tas has 648 cells and 120 steps; expected a series of global means"
          for name, _, _ in runs]),
        ("warming = { levels = [1.0] }\n", 65,
         [f"run '{name}': the global mean has 0 of the 51 years of the reference 1850-1900; it holds 10 of the years 1981 "
          "to 1990" for name, _, _ in runs]),
    ]
    for text, status, wanted in cases:
        job(folder, runs, text)
        done = run(program, folder, "run", "job.toml", status=status)
        told = [line for line in done.stderr.splitlines() if line.startswith("windrow: ")]
        check(told == ["windrow: " + line for line in wanted], f"{text.strip()}: said {told}")
        check(sorted(os.listdir(os.path.join(folder, "out"))) ==
              sorted(f"tas_{name}_mesh{end}" for name, _, _ in runs for end in (".nc", ".ledger.json")),
              f"{text.strip()}: left {os.listdir(os.path.join(folder, 'out'))}")
    # A series of global means is no field.
    with open(os.path.join(folder, "job.toml"), "w") as file:
        file.write('[[run]]\nfiles = ["in/short.cdf"]\n[[field]]\nvariable = "gmst"\nmethod = "nearest"\n[mesh]\n'
                   "lon = { from = 0, to = 4, step = 2 }\nlat = { from = 30, to = 34, step = 2 }\n")
    done = run(program, folder, "run", "job.toml", status=65)
    check(f"windrow: {folder}/in/short.cdf: is a series of one value, such as a mean over an area; it has no place; "
          "expected values on a grid, with coordinates in degrees_north and degrees_east\n" in done.stderr,
          f"a series as a field: {done.stderr}")


def little_memory(program, folder):
    """The products' size does not decide the memory: a mesh of 400 000 cells under a ceiling of 400 MB, tile by tile."""
    os.mkdir(os.path.join(folder, "in"))
    runs = [("heron-all", "heron", "all"), ("heron-natural", "heron", "natural")]
    for k, (name, _, _) in enumerate(runs):
        model(os.path.join(folder, "in", f"{name}.nc"), "standard", 1.0, SEED + k, first=1981, last=1990)
    job(folder, runs, 'contrast = [["heron-all", "heron-natural"]]\nbaseline = [1981, 1990]\n',
        general='[job]\nmemory = "400 MB"\n')
    with open(os.path.join(folder, "job.toml")) as file:
        text = file.read().replace("step = 2 }\nlat", "step = 0.05 }\nlat").replace("to = 60, step = 2 }",
                                                                                    "to = 55, step = 0.05 }")
    with open(os.path.join(folder, "job.toml"), "w") as file:
        file.write(text)
    done = run(program, folder, "run", "job.toml", "--threads", "2")
    told = done.stdout.strip().splitlines()[-1]
    print("under a ceiling of 400 MB:", told)
    peak = float(told.split("peak memory ")[1].split(" MiB")[0]) * 2**20
    check(peak <= 400e6, f"peak memory {peak / 1e6:.0f} MB under a ceiling of 400 MB")


def main():
    program = os.path.abspath(sys.argv[1])
    for name in (monthly_job, split_job, wrong_jobs, little_memory):
        with tempfile.TemporaryDirectory(prefix="windrow_ensembles_") as folder:
            name(program, folder)
    print("\n".join(faults) or "ensembles: every product as recomputed")
    return 1 if faults else 0


if __name__ == "__main__":
    sys.exit(main())
