#!/usr/bin/python3
"""Scores of the adjusted products against the known truth, at withheld sites in withheld years.

  score_truth.py WINDROW [--seeds 20] [--first 1] [--jobs 2] [--methods NAME,...] [--quick] [--vary]
                 [--json FILE] [--keep DIR]

Each seed's world is made by known_truth.py and adjusted by its job files. A score is the mean over the withheld sites
of the absolute error of a statistic of the pooled even years, for the whole year and for each month. "Raw" is the value
of the model's cell that holds the site, "height alone" the same at the site's height (-6.5 K/km). Beside the monthly
scores stands the sampling noise, the truth's odd years against its even ones: no free-running model can be expected
below it. Weather is alike at all sites of a world, so one world's noise is one draw, and monthly scores are compared
with it as medians over seeds. Fails where a goal is missed. --quick: 2 seeds, too few to judge months by; --vary: the
table over noise, number of stations and kind of bias.
"""
import argparse
import csv
import json
import multiprocessing
import os
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np

import known_truth
from known_truth import JOBS, LAPSE, SCORES

# Share of the raw model's error that the first method has to remove, in the median over seeds.
GOALS = {"tas mean": 0.90, "tas p95": 0.88, "pr wet days": 0.85, "pr p95": 0.85, "pr mean": 0.65}
MOST_NOISE = 2.0  # by month: its error in units of the sampling noise, both medians over seeds
FEWEST_SEEDS = 10  # for judging by month
BASELINE = "mean-shift"  # what it has to beat in each score
SETTINGS = [{}, {"noise": 0.0}, {"noise": 2.0}, {"stations": 20}, {"stations": 80},
            {"bias": "shift"}, {"bias": "dry"}, {"bias": "seasonal"}]


class Series:
    """Daily tas, degC, and pr, mm/day, of shape (days, sites), with the year and month of each day."""

    def __init__(self, tas, pr, year, month):
        self.tas, self.pr, self.year, self.month = tas, pr, year, month

    def statistics(self, odd):
        """Shape (13, scores, sites): the year, then the months, of the odd or the even years."""
        years = known_truth.calibration_years(self.year) == odd
        chosen = [years] + [years & (self.month == m) for m in range(1, 13)]
        each = [known_truth.statistics(self.tas[c], self.pr[c]) for c in chosen]
        return np.array([[values[name] for name in SCORES] for values in each])


def read_series(paths):
    """From the file of tas and the file of pr."""
    values = []
    for path, name in zip(paths, ("tas", "pr")):
        with netCDF4.Dataset(path) as file:
            time = file["time"]
            dates = netCDF4.num2date(time[:], time.units, time.calendar)
            array = np.ma.filled(file[name][:].astype("f8"), np.nan)
            if not np.isfinite(array).all():
                sys.exit(f"{path}: {np.isnan(array).sum()} missing values of {name}; expected none at these sites")
            values.append(array)
    return Series(*values, np.array([d.year for d in dates]), np.array([d.month for d in dates]))


def read_sites(path):
    """Longitude, latitude and elevation of the sites of a file."""
    with open(path) as file:
        rows = list(csv.DictReader(file))
    return tuple(np.array([float(row[name]) for row in rows]) for name in ("longitude", "latitude", "elevation"))


def model_at(folder, lon, lat):
    """The model's series in the cells that hold the places, and the height of its surface there."""
    with netCDF4.Dataset(os.path.join(folder, "model_orog.nc")) as file:
        j, i = (np.searchsorted(file[axis + "_bnds"][:, 1], place) for axis, place in (("lat", lat), ("lon", lon)))
        height = file["orog"][:].filled(np.nan).astype("f8")[j, i]
    path = os.path.join(folder, "model.nc")
    with netCDF4.Dataset(path) as file:
        time = file["time"]
        dates = netCDF4.num2date(time[:], time.units, time.calendar)
        tas, pr = (file[name][:].filled(np.nan).astype("f8")[:, j, i] for name in ("tas", "pr"))
    year, month = (np.array([getattr(d, part) for d in dates]) for part in ("year", "month"))
    return Series(tas - 273.15, pr * 86400, year, month), height


def errors(series, truth):
    """Mean absolute error over sites, shape (13, scores)."""
    return np.nanmean(np.abs(series.statistics(odd=False) - truth.statistics(odd=False)), axis=2)


def score_world(folder, adjusted):
    """The errors of each series in `adjusted`, of the model alone, and the noise: {name: (13, scores)}."""
    truth = read_series([os.path.join(folder, "truth.nc")] * 2)
    lon, lat, elevation = read_sites(os.path.join(folder, "withheld.csv"))
    raw, height = model_at(folder, lon, lat)
    alone = Series(raw.tas + LAPSE * (elevation - height), raw.pr, raw.year, raw.month)
    out = {"raw": errors(raw, truth), "height alone": errors(alone, truth)}
    out.update((name, errors(series, truth)) for name, series in adjusted.items())
    halves = truth.statistics(odd=True) - truth.statistics(odd=False)
    out["noise"] = np.nanmean(np.abs(halves), axis=2)
    return out


def run_seed(task):
    """Makes one world, runs the program on it and scores the products."""
    windrow, methods, seed, setting, keep = task
    with tempfile.TemporaryDirectory(prefix="windrow-truth-") as folder:
        if keep:
            words = [f"{key}-{value}" for key, value in setting.items()]
            folder = os.path.join(keep, "-".join([f"seed-{seed}"] + words))
        known_truth.make(folder, seed, **setting)
        adjusted = {}
        for name in methods:
            job = os.path.join(folder, f"{name}.toml")
            result = subprocess.run([windrow, "run", job, "--quiet", "--threads", "1"], stdout=subprocess.PIPE,
                                    stderr=subprocess.PIPE, text=True)
            if result.returncode != 0:
                raise RuntimeError(f"{name}, seed {seed}: status {result.returncode}: {result.stderr.strip()}")
            out = os.path.join(folder, f"out-{name}")
            adjusted[name] = read_series([os.path.join(out, "tas.nc"), os.path.join(out, "pr.nc")])
        return score_world(folder, adjusted)


def run_seeds(score, tasks, jobs):
    """{name: (seeds, 13, scores)}; `score` makes the scores of one task."""
    with multiprocessing.Pool(jobs) as pool:
        each = pool.map(score, tasks, chunksize=1)
    return {name: np.array([world[name] for world in each]) for name in each[0]}  # in the order of the seeds


def print_scores(scores):
    names = [name for name in scores if name not in ("raw", "height alone", "noise")]

    def line(title, cells):
        print(f"{title:36}" + "".join(f"{cell:>22}" for cell in cells))

    print(f"\nWhole year: error, median (worst) over {len(scores['raw'])} seeds")
    line("", SCORES)
    line("", SCORES.values())
    for name in ["raw", "height alone", *names, "noise"]:
        line(name, [f"{np.median(v):.3f} ({v.max():.3f})" for v in scores[name][:, 0].T])
    for base in ("raw", "height alone"):
        print(f"Share of the error of {base} that is removed")
        for name in names:
            removed = 100 * (1 - scores[name][:, 0] / scores[base][:, 0])
            line(name, [f"{np.median(v):.1f} % ({v.min():.1f} %)" for v in removed.T])


def by_month(scores, name):
    """Medians over seeds of the errors of a series and of the noise, each of shape (12, scores)."""
    return tuple(np.median(scores[key][:, 1:], axis=0) for key in (name, "noise"))


def print_months(scores, name):
    print(f"\nBy month: error of {name}, sampling noise (medians over {len(scores['raw'])} seeds), and their ratio")
    error, noise = by_month(scores, name)
    print(f"{'':30}" + "".join(f"{m:>7}" for m in range(1, 13)))
    for i, (score, units) in enumerate(SCORES.items()):
        for title, values in ((f"{score} [{units}]", error), ("    noise", noise), ("    ratio", error / noise)):
            print(f"{title:30}" + "".join(f"{v:7.2f}" for v in values[:, i]))


def missed(scores, name):
    """What falls short of the goals, a line each."""
    out = []
    error, noise = by_month(scores, name)
    for i, score in enumerate(SCORES):
        if score not in GOALS:
            continue
        removed = np.median(1 - scores[name][:, 0, i] / scores["raw"][:, 0, i])
        if removed < GOALS[score]:
            out.append(f"{score}: {name} removes {100 * removed:.1f} %; goal {100 * GOALS[score]:.0f} %")
        if BASELINE in scores and name != BASELINE:
            own, other = (np.median(scores[k][:, 0, i]) for k in (name, BASELINE))
            if own >= other:
                out.append(f"{score}: {name} errs by {own:.3f}, {BASELINE} by {other:.3f}")
        ratio = (error / noise)[:, i]
        if len(scores["raw"]) >= FEWEST_SEEDS and ratio.max() > MOST_NOISE:
            out.append(f"{score}: in month {ratio.argmax() + 1} {name} errs by {ratio.max():.2f} times the noise; "
                       f"goal {MOST_NOISE:g}")
    return out


def print_variations(table, name):
    print(f"\nVaried: share of the raw error that {name} removes, median (worst) over seeds")
    print(f"{'':16}" + "".join(f"{score:>24}" for score in SCORES))
    for setting, scores in table:
        words = ", ".join(f"{key} {value}" for key, value in setting.items()) or "as above"
        removed = 100 * (1 - scores[name][:, 0] / scores["raw"][:, 0])
        print(f"{words:16}" + "".join(f"{f'{np.median(v):.1f} % ({v.min():.1f} %)':>24}" for v in removed.T))


def main():
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("windrow")
    parser.add_argument("--seeds", type=int, default=20)
    parser.add_argument("--first", type=int, default=1, help="the first seed")
    parser.add_argument("--jobs", type=int, default=2, help="seeds at a time")
    parser.add_argument("--methods", default=",".join(JOBS), help="which of the job files; goals hold for the first")
    parser.add_argument("--quick", action="store_true", help="2 seeds")
    parser.add_argument("--vary", action="store_true", help="also the table over noise, stations and kind of bias")
    parser.add_argument("--json", help="file for all scores")
    parser.add_argument("--keep", help="folder to keep the worlds in")
    options = parser.parse_args()
    methods = options.methods.split(",")
    if unknown := [name for name in methods if name not in JOBS]:
        parser.error(f"no job for '{unknown[0]}'; expected {', '.join(JOBS)}")
    windrow = os.path.abspath(options.windrow)
    seeds = range(options.first, options.first + (2 if options.quick else options.seeds))
    table = []
    for setting in SETTINGS if options.vary else SETTINGS[:1]:
        used = methods if not setting else methods[:1]
        table.append((setting, run_seeds(run_seed, [(windrow, used, s, setting, options.keep) for s in seeds],
                                         options.jobs)))
        if not setting:
            print_scores(table[0][1])
            print_months(table[0][1], methods[0])
    if options.vary:
        print_variations(table, methods[0])
    if options.json:
        with open(options.json, "w") as file:
            json.dump({"scores": list(SCORES), "seeds": list(seeds), "settings": [
                {"setting": setting, "errors": {name: v.tolist() for name, v in scores.items()}}
                for setting, scores in table]}, file)
    short = missed(table[0][1], methods[0])
    print("\n" + ("\n".join(short) if short else "All goals are met."))
    if short:
        sys.exit("FAILED")


if __name__ == "__main__":
    try:
        main()
    except RuntimeError as error:
        sys.exit(str(error))
