#!/usr/bin/python3
"""An invented world whose true climate is known at every place: what bias adjustment is proven against.

  known_truth.py --seed N --out DIR [--stations 40] [--withheld 40] [--years 40] [--noise 1] [--bias mixed]

Nothing here is real. All fields are sums of random waves, so they can be evaluated at any point: the truth at sites,
and the means over coarse cells of ANOTHER realisation of the same climate (same terrain, normals and trend,
independent weather), to which the model's errors are added. Stations see the odd years only; the even years and the
withheld sites are for scoring. Years alternate because with a trend two consecutive halves would differ by climate,
not by chance.
Written to DIR: model.nc (tas and pr), model_orog.nc; sites.csv, daily.csv (stations, odd years); withheld.csv,
truth.nc (withheld sites, all years), statistics.csv; one job file for each method in JOBS. Scoring: score_truth.py.
"""
import argparse
import csv
import datetime
import os
import zlib

import netCDF4
import numpy as np
from scipy.signal import lfilter
from scipy.special import expit, logit, ndtri

# The region: open ocean in reality. Sites lie in the inner cells, so that each has model cells all around it.
WEST, SOUTH, STEP, CELLS, MARGIN = -33.0, 43.0, 1.25, 8, 1  # degrees, degrees, degrees, cells a side, cells
KM_PER_DEGREE = 111.2  # on a sphere of 6371 km
CENTRE = SOUTH + CELLS * STEP / 2  # latitude at which degrees of longitude are turned into km
SUBPOINTS = 5  # points along a cell's side whose mean is the cell's mean (28 km N-S, 19 km E-W apart)
FIRST_YEAR = 1971

# Temperature of the truth, degC.
T_MEAN = 13.0  # annual mean at sea level in the centre
T_NORTH = -0.6  # K per degree of latitude
T_SEASON = 8.0  # half the range from winter to summer
T_SEASON_EAST = 0.3  # more of it per degree to the east, away from the sea
LAPSE = -0.0065  # K per m, the standard atmosphere's
TREND = 0.03  # K per year
T_LOCAL, T_LOCAL_SEASON, T_LOCAL_KM = 0.8, 0.5, 150  # K, K, km: smooth departures (basins, coasts), and in winter
T_SITE = 0.2  # K: what only the site itself knows (exposure, soil)
T_DAILY, T_DAILY_WINTER = 3.2, 0.8  # K: standard deviation of the weather, and its winter surplus
T_SKEW = -0.1  # cold tail in winter, warm tail in summer
T_DAILY_SITE = 0.5  # K: daily noise of a site
# Length km, persistence from day to day, waves, share of the variance: anomalies of a season, lows and highs, fronts.
T_WEATHER = [(1500, 0.985, 12, 0.08), (800, 0.75, 30, 0.72), (200, 0.4, 60, 0.20)]

# Rain of the truth: a * max(0, g - g0) ** P_POWER of a Gaussian g with the chance of rain P(g > g0).
P_POWER = 1.6  # a truncated Gaussian to a power, the tail of daily rain (common practice)
P_CHANCE = 0.45  # share of days with any rain
P_CHANCE_SEASON = 0.2  # in standard deviations of g, more often in winter
P_CHANCE_HEIGHT, P_CHANCE_LOCAL = 0.3, 0.25  # in logit per km of height; smooth departures
P_SCALE = 6.5  # mm/day: a
P_SCALE_SEASON = -0.2  # in the logarithm, heavier in summer
P_SCALE_HEIGHT, P_SCALE_LOCAL = 0.3, 0.2  # in the logarithm per km of height (uplift); smooth departures (lee)
P_LOCAL_KM = 150  # km
P_SITE = 0.05  # in the logarithm: what only the site itself knows (exposure of the gauge)
P_PER_KELVIN = 0.02  # in the logarithm, heavier with the trend
P_DAILY_SITE = 0.15  # share of the variance of g that only the site sees: showers
P_WITH_T = 0.3  # correlation of g with the temperature's weather: mild is wet in winter, cool is wet in summer
P_WEATHER = [(1500, 0.985, 12, 0.04), (600, 0.5, 30, 0.46), (150, 0.2, 50, 0.35), (40, 0.0, 60, 0.15)]

# Terrain: LOW + SPREAD * exp(RELIEF * h), 0 to HIGHEST metres. Length km, waves, share of the variance of h.
LOW, SPREAD, RELIEF, HIGHEST = -100.0, 350.0, 0.8, 2000.0
TERRAIN = [(200, 60, 0.55), (60, 100, 0.30), (20, 150, 0.15)]

# What the model gets wrong, by kind. t, K: mean, its smooth variation, winter's surplus, and that one's variation;
# spread, logarithm of a factor of the weather's departures: mean, variation; rain, logarithm of a factor: mean,
# variation, variation that changes sign from winter to summer; mm/day of drizzle added; mm/day of light rain lost.
BIASES = {
    "mixed": dict(t=(1.2, 1.0, 0.6, 0.6), spread=(0.2, 0.08), rain=(0.15, 0.2, 0.15), drizzle=1.0, lost=0.0),
    "shift": dict(t=(2.0, 0.0, 0.0, 0.0), spread=(0.0, 0.0), rain=(0.4, 0.0, 0.0), drizzle=0.0, lost=0.0),
    "dry": dict(t=(-2.0, 1.0, -0.6, 0.6), spread=(-0.2, 0.08), rain=(-0.1, 0.2, 0.15), drizzle=0.0, lost=1.0),
    "seasonal": dict(t=(0.0, 0.5, 3.0, 1.0), spread=(0.2, 0.08), rain=(0.0, 0.1, 0.4), drizzle=1.0, lost=0.0),
}
BIAS_KM = 500  # length of a bias's variation: it is smooth, of the model and not of the place
DRIZZLE = [(300, 0.5, 60, 1.0)]  # its weather, as above

# Methods to be scored: adjustment of tas, of pr, and reach. Goals are stated for the first, the second is to be beaten.
JOBS = {
    "quantile-delta-mapping": ('method = "quantile-delta-mapping"\nform = "additive"',
                               'method = "quantile-delta-mapping"\nform = "multiplicative"\nwet_day = "1 mm/day"',
                               "kriging-height"),
    "mean-shift": ('method = "mean-shift"\nseason = "month"', 'method = "mean-ratio"\nseason = "month"',
                   "inverse-distance"),
    "quantile-mapping": ('method = "quantile-mapping"\nform = "additive"',
                         'method = "quantile-mapping"\nform = "multiplicative"\nwet_day = "1 mm/day"', "kriging"),
}


def stream(seed, name):
    """Random numbers of one purpose: more stations or years of one seed do not change the rest of its world."""
    return np.random.Generator(np.random.PCG64([seed, zlib.crc32(name.encode())]))


def kilometres(lon, lat):
    """Plane coordinates, shape (points, 2)."""
    x = (np.asarray(lon) - WEST) * np.cos(np.radians(CENTRE)) * KM_PER_DEGREE
    return np.stack([x, (np.asarray(lat) - SOUTH) * KM_PER_DEGREE], axis=-1)


class Waves:
    """cos and sin of random wave vectors: independent amplitudes give a field of unit variance with the covariance
    exp(-d^2 / 2 length^2) in expectation (random Fourier features, Rahimi and Recht 2007)."""

    def __init__(self, rng, length, count):
        self.vectors = rng.standard_normal((2, count)) / length

    def at(self, points):
        phase = points @ self.vectors
        return np.concatenate([np.cos(phase), np.sin(phase)], axis=1) / np.sqrt(self.vectors.shape[1])


class Smooth:
    """A field constant in time with unit variance."""

    def __init__(self, seed, name, scales):
        rng = stream(seed, name)
        self.parts = []
        for length, count, share in scales:
            waves = Waves(rng, length, count)
            self.parts.append((waves, np.sqrt(share) * rng.standard_normal(2 * count)))

    def at(self, points):
        return sum(waves.at(points) @ amplitude for waves, amplitude in self.parts)


class Weather:
    """A field that changes from day to day; `realisation` names its amplitudes, which persist as AR(1)."""

    def __init__(self, seed, name, realisation, scales, days):
        vectors, rng = stream(seed, name), stream(seed, name + realisation)
        self.waves = [Waves(vectors, length, count) for length, _, count, _ in scales]
        parts = []
        for (_, persistence, count, share) in scales:
            noise = rng.standard_normal((days, 2 * count))
            noise[1:] *= np.sqrt(1 - persistence**2)
            parts.append(np.sqrt(share) * lfilter([1.0], [1.0, -persistence], noise, axis=0))
        self.amplitudes = np.concatenate(parts, axis=1).astype("f4")

    def basis(self, points):
        return np.concatenate([waves.at(points) for waves in self.waves], axis=1).T.astype("f4")


class World:
    """The climate of one seed: everything that truth and model share."""

    def __init__(self, seed):
        self.seed = seed
        self.terrain = Smooth(seed, "terrain", TERRAIN)
        self.t_local, self.t_winter = (Smooth(seed, n, [(T_LOCAL_KM, 80, 1.0)]) for n in ("t local", "t winter"))
        self.p_chance, self.p_scale = (Smooth(seed, n, [(P_LOCAL_KM, 80, 1.0)]) for n in ("p chance", "p scale"))

    def height(self, points):
        return np.clip(LOW + SPREAD * np.exp(RELIEF * self.terrain.at(points)), 0, HIGHEST)


class Climate:
    """Normals of a world at given places, in the course of the year."""

    def __init__(self, world, lon, lat, t_site=0.0, p_site=0.0):
        points = kilometres(lon, lat)
        self.height = world.height(points)
        east = lon - WEST - CELLS * STEP / 2
        sea_level = T_MEAN + T_NORTH * (lat - CENTRE) + T_LOCAL * world.t_local.at(points)
        self.t_mean = sea_level + LAPSE * self.height + t_site
        self.t_winter = T_LOCAL_SEASON * world.t_winter.at(points) - T_SEASON - T_SEASON_EAST * east
        km = self.height / 1000
        self.chance = logit(P_CHANCE) + P_CHANCE_HEIGHT * km + P_CHANCE_LOCAL * world.p_chance.at(points)
        self.scale = np.log(P_SCALE) + P_SCALE_HEIGHT * km + P_SCALE_LOCAL * world.p_scale.at(points) + p_site

    def temperature(self, winter, years):
        """Shape (days, places); winter is 1 in mid-January, -1 in mid-July; years since the first."""
        return self.t_mean + winter[:, None] * self.t_winter + TREND * years[:, None]

    def rain(self, g, winter, years):
        """From the Gaussian g, shape (days, places), in mm/day."""
        threshold = -ndtri(expit(self.chance)) - P_CHANCE_SEASON * winter[:, None]
        in_time = np.exp(P_SCALE_SEASON * winter + P_PER_KELVIN * TREND * years)
        excess = np.maximum(g - threshold.astype("f4"), np.float32(0))
        return excess ** np.float32(P_POWER) * np.outer(in_time, np.exp(self.scale)).astype("f4")


def temperature_weather(t, winter):
    """Departures from the normals, K, from the weather field t, shape (days, places)."""
    c = winter[:, None].astype("f4")
    return (T_DAILY + T_DAILY_WINTER * c) * (t + np.float32(T_SKEW) * c * (t * t - 1))


def rain_weather(t, p, winter):
    """The Gaussian g of rain from the two weather fields, shape (days, places)."""
    c = P_WITH_T * winter[:, None].astype("f4")
    return c * t + np.sqrt(1 - c * c) * p


class Days:
    """Dates of a calendar with the phase of the year. The model's calendar has no 29 February."""

    def __init__(self, years, leap):
        first = datetime.date(FIRST_YEAR, 1, 1)
        dates = [first + datetime.timedelta(d) for d in range((datetime.date(FIRST_YEAR + years, 1, 1) - first).days)]
        self.dates = [d for d in dates if leap or (d.month, d.day) != (2, 29)]
        self.year = np.array([d.year for d in self.dates])
        self.month = np.array([d.month for d in self.dates])
        start = np.searchsorted(self.year, self.year)
        length = np.bincount(self.year)[self.year]
        fraction = (np.arange(len(self.dates)) - start + 0.5) / length
        self.winter = np.cos(2 * np.pi * (fraction - 15.5 / 365.25))
        self.elapsed = self.year - FIRST_YEAR + fraction


def calibration_years(year):
    return np.asarray(year) % 2 == 1


def place_sites(world, name, count):
    """Anywhere in the inner cells, by chance."""
    rng = stream(world.seed, name)
    position = rng.uniform(MARGIN * STEP, (CELLS - MARGIN) * STEP, (count, 2))
    return np.round(WEST + position[:, 0], 4), np.round(SOUTH + position[:, 1], 4), rng


def true_series(world, days, name, count, noise):
    """Sites of one kind with their true daily tas, degC, and pr, mm/day, to the 0.1 that observers write down."""
    lon, lat, rng = place_sites(world, name, count)
    t_site, p_site = noise * T_SITE * rng.standard_normal(count), noise * P_SITE * rng.standard_normal(count)
    climate = Climate(world, lon, lat, t_site, p_site)
    points, size = kilometres(lon, lat), len(days.dates)
    t_weather, p_weather = (Weather(world.seed, n, "truth", s, size) for n, s in (("t", T_WEATHER), ("p", P_WEATHER)))
    share = min(noise**2 * P_DAILY_SITE, 1.0)
    p = np.sqrt(1 - share) * (p_weather.amplitudes @ p_weather.basis(points)) \
        + np.sqrt(share) * rng.standard_normal((size, count), dtype="f4")
    t = t_weather.amplitudes @ t_weather.basis(points)
    tas = climate.temperature(days.winter, days.elapsed) + temperature_weather(t, days.winter) \
        + noise * T_DAILY_SITE * rng.standard_normal((size, count))
    pr = climate.rain(rain_weather(t, p, days.winter), days.winter, days.elapsed)
    return lon, lat, climate.height, np.round(tas, 1), np.round(pr, 1)


def model_series(world, days, kind):
    """The model on its grid: tas, degC, pr, mm/day, shape (days, rows, columns), and its orography, m."""
    bias, size, side = BIASES[kind], len(days.dates), CELLS * SUBPOINTS
    fine = (np.arange(side) + 0.5) * STEP / SUBPOINTS
    lat, lon = (a.ravel() for a in np.meshgrid(SOUTH + fine, WEST + fine, indexing="ij"))

    def cells(values):
        return values.reshape(-1, CELLS, SUBPOINTS, CELLS, SUBPOINTS).mean(axis=(2, 4))

    climate, points = Climate(world, lon, lat), kilometres(lon, lat)
    t_weather, p_weather = (Weather(world.seed, n, "model", s, size) for n, s in (("t", T_WEATHER), ("p", P_WEATHER)))
    # Temperature's waves are averaged over each cell; rain is not linear, so it is made at the points. These lack what
    # only a site sees: at a point the distribution is the same, in the mean noise cancels.
    t_basis, p_basis = cells(t_weather.basis(points)).reshape(-1, CELLS**2), p_weather.basis(points)
    owner = np.broadcast_to(np.arange(CELLS**2).reshape(CELLS, 1, CELLS, 1), (CELLS, SUBPOINTS) * 2).ravel()
    normal, departure, rain = (np.empty((size, CELLS, CELLS)) for _ in range(3))
    for first in range(0, size, 365):
        part = slice(first, min(first + 365, size))
        winter, elapsed = days.winter[part], days.elapsed[part]
        t = t_weather.amplitudes[part] @ t_basis
        departure[part] = temperature_weather(t, winter).reshape(-1, CELLS, CELLS)
        g = rain_weather(t[:, owner], p_weather.amplitudes[part] @ p_basis, winter)
        rain[part] = cells(climate.rain(g, winter, elapsed))
        normal[part] = cells(climate.temperature(winter, elapsed))

    # A model's mountains are smoother than cell means: 1-2-1 along both axes. It is colder or warmer accordingly.
    mean_height = cells(climate.height)[0]
    orography = mean_height
    for axis in (0, 1):
        before, after = (np.take(orography, np.clip(np.arange(CELLS) + s, 0, CELLS - 1), axis) for s in (-1, 1))
        orography = (before + 2 * orography + after) / 4
    normal += LAPSE * (orography - mean_height)

    centre = (np.arange(CELLS) + 0.5) * STEP
    y, x = np.meshgrid(SOUTH + centre, WEST + centre, indexing="ij")
    places = kilometres(x.ravel(), y.ravel())
    f = [Smooth(world.seed, f"bias {i}", [(BIAS_KM, 80, 1.0)]).at(places).reshape(CELLS, CELLS) for i in range(5)]
    winter = days.winter[:, None, None]
    t_bias, spread, factor = bias["t"], bias["spread"], bias["rain"]
    tas = normal + np.exp(spread[0] + spread[1] * f[2]) * departure \
        + t_bias[0] + t_bias[1] * f[0] + winter * (t_bias[2] + t_bias[3] * f[1])
    h = Weather(world.seed, "drizzle", "model", DRIZZLE, size)
    drizzle = bias["drizzle"] * np.maximum(h.amplitudes @ h.basis(places), 0).reshape(rain.shape)
    pr = np.exp(factor[0] + factor[1] * f[3] + factor[2] * winter * f[4]) * np.maximum(rain - bias["lost"], 0) + drizzle
    return tas, pr, orography


SCORES = {"tas mean": "K", "tas p95": "K", "pr wet days": "share", "pr p95": "mm/day", "pr mean": "mm/day",
          "pr p95 of all days": "mm/day"}
WET = 1.0  # mm/day: a wet day is one with at least this (ETCCDI's R1mm; Zhang et al. 2011, WIREs Climate Change 2:851)


def statistics(tas, pr):
    """The values the scores compare, each of shape (places,), from tas, degC, and pr, mm/day, of shape (days, places).
    pr p95 is that of wet days, as ETCCDI's R95p has it; that of all days stands beside it."""
    wet = pr >= WET
    return {"tas mean": tas.mean(0), "tas p95": np.quantile(tas, 0.95, axis=0), "pr wet days": wet.mean(0),
            "pr p95": np.array([np.quantile(v[w], 0.95) if w.any() else np.nan for v, w in zip(pr.T, wet.T)]),
            "pr mean": pr.mean(0), "pr p95 of all days": np.quantile(pr, 0.95, axis=0)}


def describe(file, title):
    file.Conventions = "CF-1.8"
    file.title = title
    file.source = "invented data (known_truth.py); no real model, station or place"


def write_grid(path, fields, days=None):
    """Fields (name, standard name, units, values) on the model's grid as CF NetCDF, with bounds."""
    with netCDF4.Dataset(path, "w") as file:
        describe(file, "an invented model")
        file.createDimension("bnds", 2)
        dimensions = ("lat", "lon")
        for axis, long_name, unit, start in (("lat", "latitude", "degrees_north", SOUTH),
                                             ("lon", "longitude", "degrees_east", WEST)):
            file.createDimension(axis, CELLS)
            edges = start + STEP * np.arange(CELLS + 1)
            variable = file.createVariable(axis, "f8", (axis,))
            variable.setncatts({"standard_name": long_name, "units": unit, "bounds": axis + "_bnds"})
            variable[:] = (edges[1:] + edges[:-1]) / 2
            file.createVariable(axis + "_bnds", "f8", (axis, "bnds"))[:] = np.stack([edges[:-1], edges[1:]], axis=1)
        if days is not None:
            file.createDimension("time", len(days.dates))
            variable = file.createVariable("time", "f8", ("time",))
            variable.setncatts({"standard_name": "time", "units": f"days since {FIRST_YEAR}-01-01",
                                "calendar": "365_day", "bounds": "time_bnds"})
            start = np.arange(len(days.dates), dtype=float)
            variable[:] = start + 0.5
            file.createVariable("time_bnds", "f8", ("time", "bnds"))[:] = np.stack([start, start + 1], axis=1)
            dimensions = ("time", "lat", "lon")
        for name, standard_name, units, values in fields:
            variable = file.createVariable(name, "f4", dimensions, fill_value=np.float32(1e20))
            variable.setncatts({"standard_name": standard_name, "units": units,
                                "cell_methods": "area: mean" if days is None else "area: time: mean"})
            variable[:] = values


def write_sites(path, prefix, lon, lat, height):
    with open(path, "w", newline="") as file:
        table = csv.writer(file)
        table.writerow(["station", "longitude", "latitude", "elevation", "name"])
        for i, (x, y, z) in enumerate(zip(lon, lat, height)):
            table.writerow([f"{prefix}{i + 1:03}", f"{x:.4f}", f"{y:.4f}", f"{z:.1f}", f"invented {prefix}{i + 1}"])


def write_daily(path, days, tas, pr):
    seen = np.flatnonzero(calibration_years(days.year))
    dates = [days.dates[d].isoformat() for d in seen]
    with open(path, "w") as file:
        file.write("station,date,tas [degC],pr [mm/day]\n")
        for i in range(tas.shape[1]):
            file.writelines(f"s{i + 1:03},{date},{t:.1f},{p:.1f}\n"
                            for date, t, p in zip(dates, tas[seen, i].tolist(), pr[seen, i].tolist()))


def write_truth(path, days, tas, pr):
    """The withheld sites' days as (time, station); where they lie stands in withheld.csv."""
    with netCDF4.Dataset(path, "w") as file:
        describe(file, "the true days of the withheld sites of an invented world")
        file.createDimension("time", len(days.dates))
        file.createDimension("station", tas.shape[1])
        variable = file.createVariable("time", "f8", ("time",))
        variable.setncatts({"standard_name": "time", "units": f"days since {FIRST_YEAR}-01-01",
                            "calendar": "proleptic_gregorian"})
        variable[:] = np.arange(len(days.dates)) + 0.5
        for name, values, units in (("tas", tas, "degC"), ("pr", pr, "mm/day")):
            variable = file.createVariable(name, "f4", ("time", "station"))
            variable.setncatts({"units": units, "cell_methods": "time: mean"})
            variable[:] = values


def write_statistics(path, days, tas, pr):
    seen = calibration_years(days.year)
    with open(path, "w", newline="") as file:
        table = csv.writer(file)
        table.writerow(["site", "years"] + [f"{name} [{units}]" for name, units in SCORES.items()])
        for years, chosen in (("odd", seen), ("even", ~seen)):
            values = statistics(tas[chosen], pr[chosen])
            for i in range(tas.shape[1]):
                table.writerow([f"w{i + 1:03}", years] + [f"{values[name][i]:.4f}" for name in SCORES])


def write_job(path, name):
    tas, pr, reach = JOBS[name]
    with open(path, "w") as file:
        file.write(f"""# Invented data: the known truth of known_truth.py, adjusted by {name} with {reach}.
[job]
workspace = "work-{name}"

[[run]]
name  = "model"
files = ["model.nc"]

[[field]]
variable = "tas"
units = "degC"

[field.adjust]
{tas}

[field.terrain]
lapse = "-6.5 K/km"
model_height = "model_orog.nc"

[[field]]
variable = "pr"
units = "mm/day"
range = [0, 1000]

[field.adjust]
{pr}

[mesh]
kind = "towns"
sites = "withheld.csv"

[stations]
sites = "sites.csv"
daily = "daily.csv"

[reach]
method = "{reach}"

[output]
directory = "out-{name}"
name = "{{field}}.nc"
""")


def make(folder, seed, stations=40, withheld=40, years=40, noise=1.0, bias="mixed"):
    """Writes everything of one seed into a folder."""
    os.makedirs(folder, exist_ok=True)
    world, real, model = World(seed), Days(years, leap=True), Days(years, leap=False)
    lon, lat, height, tas, pr = true_series(world, real, "stations", stations, noise)
    write_sites(os.path.join(folder, "sites.csv"), "s", lon, lat, height)
    write_daily(os.path.join(folder, "daily.csv"), real, tas, pr)
    lon, lat, height, tas, pr = true_series(world, real, "withheld", withheld, noise)
    write_sites(os.path.join(folder, "withheld.csv"), "w", lon, lat, height)
    write_truth(os.path.join(folder, "truth.nc"), real, tas, pr)
    write_statistics(os.path.join(folder, "statistics.csv"), real, tas, pr)
    tas, pr, orography = model_series(world, model, bias)
    write_grid(os.path.join(folder, "model.nc"), [("tas", "air_temperature", "K", tas + 273.15),
                                                  ("pr", "precipitation_flux", "kg m-2 s-1", pr / 86400)], model)
    write_grid(os.path.join(folder, "model_orog.nc"), [("orog", "surface_altitude", "m", orography)])
    for name in JOBS:
        write_job(os.path.join(folder, f"{name}.toml"), name)


def main():
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--seed", type=int, required=True)
    parser.add_argument("--out", required=True, help="folder to write to")
    parser.add_argument("--stations", type=int, default=40)
    parser.add_argument("--withheld", type=int, default=40, help="sites withheld")
    parser.add_argument("--years", type=int, default=40)
    parser.add_argument("--noise", type=float, default=1.0, help="factor of all that only a site itself knows")
    parser.add_argument("--bias", choices=BIASES, default="mixed")
    options = vars(parser.parse_args())
    make(options.pop("out"), **options)


if __name__ == "__main__":
    main()
