#!/usr/bin/python3
"""What the known truth allows: the methods in plain numpy arrays, without windrow, scored like its products.

  adjust_trial.py [--seeds 5] [--first 1] [--jobs 2] [--bias KIND] [--noise N] [--stations N]

Quantile delta mapping (Cannon et al. 2015, J. Climate 28:6938) by calendar month, additive for tas at height 0,
multiplicative for wet days of pr with their frequency in logit; targets carried by kriging with height as drift. Beside
it the same with each withheld site's own odd years instead of carried targets ("own years"): the limit of any reach.
A trial, written before windrow had these methods; its figures say what to expect and decide nothing.
"""
import argparse
import csv
import os
import sys
import tempfile

import numpy as np
from scipy.optimize import curve_fit
from scipy.special import expit, logit

sys.path.insert(0, os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "..", "tools"))
import known_truth  # noqa: E402
import score_truth  # noqa: E402

LAPSE, WET = known_truth.LAPSE, known_truth.WET
TAU = (np.arange(100) + 0.5) / 100
MAX_RATIO = 10.0
LEAST_HEIGHTS = 300.0  # m: stations spanning less give no height drift


def read_stations(folder):
    """The stations' series as (days, stations), their positions and elevations."""
    lon, lat, elevation = score_truth.read_sites(os.path.join(folder, "sites.csv"))
    with open(os.path.join(folder, "daily.csv")) as file:
        rows = list(csv.reader(file))[1:]
    size = len(rows) // len(lon)
    tas, pr = (np.array([float(row[i]) for row in rows]).reshape(len(lon), size).T for i in (2, 3))
    year, month = (np.array([int(row[1][part]) for row in rows[:size]]) for part in (slice(0, 4), slice(5, 7)))
    return score_truth.Series(tas, pr, year, month), lon, lat, elevation


def exponential(d, nugget, sill, length):
    return nugget + sill * (1 - np.exp(-d / length))


def fit_variogram(distance, values):
    """Nugget, sill and length of values (seasons, stations), standardised and pooled."""
    z = (values - values.mean(1, keepdims=True)) / values.std(1, keepdims=True)
    half = ((z[:, :, None] - z[:, None]) ** 2).mean(0) / 2
    pairs = np.triu_indices(len(distance), 1)
    which = np.digitize(distance[pairs], np.linspace(0, distance.max() / 2, 13)) - 1
    bins = [which == b for b in range(12) if (which == b).sum() >= 5]
    x, y, n = (np.array(v) for v in zip(*((distance[pairs][b].mean(), half[pairs][b].mean(), b.sum()) for b in bins)))
    return curve_fit(exponential, x, y, p0=(0.1, 1, distance.max() / 4), sigma=1 / np.sqrt(n),
                     bounds=([1e-3, 1e-3, 20], [2, 20, 3000]), maxfev=20000)[0]


class Reach:
    """Carries values of stations to places by ordinary kriging, a height drift for each season apart. The drift is
    fitted by generalised least squares: plain ones take a climate's gradient for one of height. The variogram is that of
    what is carried, the targets; a correction holds the steps between the model's cells, which targets do not."""

    def __init__(self, points, heights, places, place_heights, targets):
        self.heights, self.place_heights = heights, np.clip(place_heights, heights.min(), heights.max())
        distance = np.linalg.norm(points[:, None] - points, axis=2)
        h = heights - heights.mean()
        plain = (targets @ h) / (h @ h)
        self.variogram = fit_variogram(distance, targets - plain[:, None] * heights)
        nugget, sill, length = self.variogram
        size = len(points)
        covariance = sill * np.exp(-distance / length) + nugget * np.eye(size)
        design = np.stack([np.ones(size), heights], axis=1)
        inverse = np.linalg.solve(covariance, design)
        self.drift = np.linalg.solve(design.T @ inverse, inverse.T)[1] * (np.ptp(heights) >= LEAST_HEIGHTS)
        system, right = np.ones((size + 1, size + 1)), np.ones((size + 1, len(places)))
        system[:size, :size], system[size, size] = covariance, 0
        right[:size] = sill * np.exp(-np.linalg.norm(points[:, None] - places, axis=2) / length)
        weights = np.maximum(np.linalg.solve(system, right)[:size].T, 0)
        self.weights = weights / weights.sum(1, keepdims=True)

    def __call__(self, values):
        """(..., stations) to (..., places)."""
        slope = (values @ self.drift)[..., None]
        return (values - slope * self.heights) @ self.weights.T + slope * self.place_heights


def windows(year):
    """Blocks of ten years with the thirty years their ranks are taken from."""
    first, last = year.min(), year.max()
    for start in range(first, last + 1, 10):
        begin = min(max(start - 10, first), max(last - 29, first))
        yield (year >= start) & (year < start + 10), (year >= begin) & (year < begin + 30)


def ranks(values, among):
    """Mid-ranks of values in a sample, as probabilities."""
    sample = np.sort(among)
    middle = (np.searchsorted(sample, values, "left") + np.searchsorted(sample, values, "right")) / 2
    return np.clip(middle / len(sample), TAU[0], TAU[-1])


def quantiles(values):
    return np.quantile(values, TAU, axis=0)


def split(target, level):
    """Level and shape as one: the quantiles moved so that their mean is the level."""
    return target - target.mean(0) + level


def adjust_tas(series, month, model_c, model_s, stations, carry):
    """One month of tas at height 0. `carry` takes (..., stations) to (..., places)."""
    m, odd = model_s.month == month, known_truth.calibration_years(model_s.year)
    obs = stations.tas[stations.month == month]
    all_s, odd_s = model_s.tas[m], model_s.tas[m & odd]
    level = carry(all_s.mean(0) + obs.mean(0) - odd_s.mean(0))
    target = split(carry(quantiles(all_s) + quantiles(obs) - quantiles(odd_s)), level)
    own = quantiles(model_c.tas[m])
    correction = target - split(own, model_c.tas[m].mean(0))
    for place in range(series.shape[1]):
        for block, window in windows(model_c.year):
            x = model_c.tas[block & m, place]
            tau = ranks(x, model_c.tas[window & m, place])
            series[block & m, place] = x + np.interp(tau, TAU, correction[:, place])


def wet_share(values, threshold=WET):
    return ((values >= threshold).sum(0) + 0.5) / (len(values) + 1)


def wet_quantiles(values, share):
    """Logarithms of the quantiles and of the mean of each column's wettest `share` of days, and the least of them."""
    threshold = np.array([np.quantile(v, 1 - s) for v, s in zip(values.T, share)])
    wet = [np.maximum(v[v >= t], 1e-3) for v, t in zip(values.T, threshold)]
    return np.log(np.stack([quantiles(w) for w in wet], axis=1)), np.log([w.mean() for w in wet]), threshold


def adjust_pr(series, month, model_c, model_s, stations, carry):
    """One month of pr."""
    m, odd = model_s.month == month, known_truth.calibration_years(model_s.year)
    obs = stations.pr[stations.month == month]
    all_s, odd_s, all_c = model_s.pr[m], model_s.pr[m & odd], model_c.pr[m]
    obs_share = wet_share(obs)
    share_s = expit(logit(wet_share(all_s)) + logit(obs_share) - logit(wet_share(odd_s)))
    share = expit(carry(logit(share_s)))
    (obs_q, obs_mean, _), (odd_q, odd_mean, _), (all_q, all_mean, _) = (
        wet_quantiles(v, s) for v, s in ((obs, (obs >= WET).mean(0)), (odd_s, obs_share), (all_s, share_s)))
    level, shape = (carry(o - a + b) for o, a, b in ((obs_mean, odd_mean, all_mean), (obs_q, odd_q, all_q)))
    own, _, threshold = wet_quantiles(all_c, share)
    for place in range(series.shape[1]):
        correction = shape[:, place] - own[:, place]
        wet = all_c[:, place] >= threshold[place]
        # The mean of the wet days of the calibration is reset to the level.
        x = all_c[wet, place]
        first = x * np.exp(np.interp(ranks(x, x), TAU, correction))
        correction += level[place] - np.log(first.mean())
        correction = np.minimum(correction, np.log(MAX_RATIO))
        for block, window in windows(model_c.year):
            x, among = model_c.pr[block & m, place], model_c.pr[window & m, place]
            wet, among = x >= threshold[place], among[among >= threshold[place]]
            y = np.zeros_like(x)
            y[wet] = np.maximum(x[wet] * np.exp(np.interp(ranks(x[wet], among), TAU, correction)), WET)
            series[block & m, place] = y


def adjusted(model_c, place_heights, model_s, stations, reaches):
    """The adjusted series at places; `reaches` of tas and of pr."""
    tas, pr = np.empty_like(model_c.tas), np.empty_like(model_c.pr)
    for month in range(1, 13):
        adjust_tas(tas, month, model_c, model_s, stations, reaches[0])
        adjust_pr(pr, month, model_c, model_s, stations, reaches[1])
    return score_truth.Series(tas + LAPSE * place_heights, pr, model_c.year, model_c.month)


def break_ties(series, seed):
    """Days of exactly no rain in an order by chance, so that a share of them can be made wet."""
    rng = known_truth.stream(seed, "ties")
    series.pr += 1e-6 * rng.random(series.pr.shape)


def month_targets(stations, model, name):
    """Means of the months, shape (12, stations): of the model's whole run as corrected in the odd years."""
    odd = known_truth.calibration_years(model.year)

    def means(series, chosen=True):
        each = np.array([getattr(series, name)[(series.month == m) & chosen].mean(0) for m in range(1, 13)])
        return each if name == "tas" else np.log(each)

    return means(model) + means(stations) - means(model, odd)


def try_world(folder, seed):
    """Scores of one world."""
    stations, lon, lat, heights = read_stations(folder)
    place_lon, place_lat, place_heights = score_truth.read_sites(os.path.join(folder, "withheld.csv"))
    model_s, z_s = score_truth.model_at(folder, lon, lat)
    model_c, z_c = score_truth.model_at(folder, place_lon, place_lat)
    truth = score_truth.read_series([os.path.join(folder, "truth.nc")] * 2)
    odd = known_truth.calibration_years(truth.year)
    own = score_truth.Series(truth.tas[odd], truth.pr[odd], truth.year[odd], truth.month[odd])
    for series, z in ((model_s, z_s), (model_c, z_c), (stations, heights), (own, place_heights)):
        series.tas = series.tas - LAPSE * z
    for series in (model_s, model_c):
        break_ties(series, seed)
    points, places = known_truth.kilometres(lon, lat), known_truth.kilometres(place_lon, place_lat)
    reaches = [Reach(points, heights, places, place_heights, month_targets(stations, model_s, name))
               for name in ("tas", "pr")]
    return score_truth.score_world(folder, {
        "trial": adjusted(model_c, place_heights, model_s, stations, reaches),
        "own years": adjusted(model_c, place_heights, model_c, own, [lambda v: v] * 2)})


def try_seed(task):
    seed, setting = task
    with tempfile.TemporaryDirectory(prefix="windrow-trial-") as folder:
        known_truth.make(folder, seed, **setting)
        return try_world(folder, seed)


def main():
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--seeds", type=int, default=5)
    parser.add_argument("--first", type=int, default=1)
    parser.add_argument("--jobs", type=int, default=2)
    parser.add_argument("--bias", default="mixed")
    parser.add_argument("--noise", type=float, default=1.0)
    parser.add_argument("--stations", type=int, default=40)
    options = parser.parse_args()
    setting = {name: getattr(options, name) for name in ("bias", "noise", "stations")}
    tasks = [(seed, setting) for seed in range(options.first, options.first + options.seeds)]
    scores = score_truth.run_seeds(try_seed, tasks, options.jobs)
    score_truth.print_scores(scores)
    score_truth.print_months(scores, "trial")


if __name__ == "__main__":
    main()
