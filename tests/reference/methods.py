#!/usr/bin/python3
"""The methods beyond means and plain quantile mapping, against an independent implementation.

Usage: methods.py DUMP_TRANSFER
Written anew from the published formulas with numpy and scipy: variance scaling (Teutschbein & Seibert 2012,
10.1016/j.jhydrol.2012.05.052), detrended quantile mapping and quantile delta mapping (Cannon et al. 2015,
10.1175/JCLI-D-14-00754.1), gamma distributions on wet days (Piani et al. 2010, 10.1007/s00704-009-0134-9; maximum
likelihood by scipy), a threshold for too many wet days (Schmidli et al. 2006, IJC 26:679). What lies between stations
and cells - targets, logit and logarithms, the reset of the mean - is this project's and written anew too. Series are
invented, seeds pinned. Bound: 1e-6 relative, and what gamma-mapping's nodes make of the exact curve is printed.
"""
import itertools
import subprocess
import sys

import numpy as np
from scipy import optimize, special

from transfers import Seasons, days, distance, month_length, nodes_of, non_decreasing, place, samples, text_of

BOUND = 1e-6


def windows(years, width, step):
    """Window of each year: the middle of blocks, inside the complete ones."""
    first, last = min(years), max(years)
    blocks = (last - first + 1) // step
    if last - first + 1 < width or blocks == 0:
        return {y: (first, last) for y in range(first, last + 1)}
    end = first + blocks * step - 1
    out = {}
    for y in range(first, last + 1):
        start = first + min((y - first) // step, blocks - 1) * step - (width - step) // 2
        start = max(first, min(start, end - width + 1))
        out[y] = (start, min(start + width - 1, last))
    return out


def own_samples(c, values):
    """{(window, season): values}, and the key of each step."""
    window = windows([d[0] for d in c["dates"]], c["window"], c["window_step"])
    groups = {w: samples(c["seasons"], "standard", c["dates"], values, lambda d, w=w: w[0] <= d[0] <= w[1])
              for w in set(window.values())}
    keys = [(window[d[0]], c["seasons"].of("standard", d)[0]) for d in c["dates"]]
    return groups, keys


def fit_gamma(x):
    a = np.log(x.mean()) - np.log(x).mean()
    shape = optimize.brentq(lambda k: np.log(k) - special.digamma(k) - a, 1e-4, 1e6, xtol=1e-15, rtol=1e-15)
    return shape, x.mean() / shape


def wet_nodes(c, wet):
    if c["method"] != "gamma-mapping":
        return nodes_of(wet, c["quantiles"])
    shape, scale = fit_gamma(wet)
    return scale * special.gammaincinv(shape, (np.arange(c["quantiles"]) + 0.5) / c["quantiles"])


def logit(p):
    return np.log(p / (1 - p))


def share(x, wet_day):
    return ((x >= wet_day).sum() + 0.5) / (len(x) + 1)


def split(c, x, p):
    """(threshold, drawn, dry days keep their values)"""
    n = len(x)
    wet = int(np.clip(np.floor(p * (n + 1) - 0.5 + 0.5), 1, n))
    threshold = max(np.sort(x)[n - wet], c["wet_day"] / c["max_ratio"])
    excess = ((x >= c["wet_day"]) & (x < threshold)).sum()
    drawn = max(0, wet - (x >= threshold).sum())
    return threshold, drawn, excess == 0 and drawn == 0


def fit(c):
    """Targets of every season at the station, as a list of dicts."""
    inside = lambda d: c["period"][0] <= d <= c["period"][1]
    cal = samples(c["seasons"], "standard", c["dates"], c["station"], inside)
    common = {d[:2] for d, _ in c["daily"]} & {d[:2] for d in c["dates"]}
    obs = samples(c["seasons"], "standard", [d for d, _ in c["daily"]], [x for _, x in c["daily"]],
                  lambda d: d[:2] in common)
    mod = samples(c["seasons"], "standard", c["dates"], c["station"], lambda d: d[:2] in common)
    out = []
    for k, o, m in zip(cal, obs, mod):
        s = {}
        if c["form"] == "additive":
            s["level"] = k.mean() + o.mean() - m.mean()
            if c["method"] == "variance-scaling":
                s["deviation"] = k.std(ddof=1) * o.std(ddof=1) / m.std(ddof=1)
            else:
                n = c["quantiles"]
                s["nodes"] = nodes_of(k, n) + nodes_of(o, n) - nodes_of(m, n)
        else:
            s["level"] = k.mean() * o.mean() / m.mean()
            least = np.finfo(float).tiny
            wet_o = wet_m = least
            if c["wet_day"] > 0:
                odds = logit(share(k, c["wet_day"])) + logit(share(o, c["wet_day"])) - logit(share(m, c["wet_day"]))
                s["wet"] = 1 / (1 + np.exp(-odds))
                wet_o, wet_m = c["wet_day"], split(c, k, s["wet"])[0]
            if c["method"] != "mean-ratio":
                s["nodes"] = (wet_nodes(c, k[k >= wet_m]) * wet_nodes(c, o[o >= wet_o]) / wet_nodes(c, m[m >= wet_m]))
        out.append(s)
    return out


def adjust_additive(c, targets, cell_groups):
    x = c["series"]
    groups, keys = own_samples(c, x)
    out = np.full(len(x), np.nan)
    tables, nodes, n = [], [], c["quantiles"]
    for s, (target, own) in enumerate(zip(targets, cell_groups)):
        if c["method"] == "variance-scaling":
            continue
        node = nodes_of(own, n)
        correction = non_decreasing(target["nodes"]) - node
        mean = 0.0
        for v in own:
            k, w = place(node, v)
            mean += (v + correction[k] + float(w) * (correction[k + 1] - correction[k])) / len(own)
        tables.append(correction + target["level"] - mean)
        nodes.append(node)
    own_nodes = {(w, s): nodes_of(g, n) for w, per in groups.items() for s, g in enumerate(per)}
    for t, (v, (w, s)) in enumerate(zip(x, keys)):
        if np.isnan(v):
            continue
        own = cell_groups[s]
        if c["method"] == "variance-scaling":
            ratio = np.clip(targets[s]["deviation"] / own.std(ddof=1), 1 / c["max_ratio"], c["max_ratio"])
            out[t] = (v - own.mean()) * ratio + targets[s]["level"]
            continue
        if c["method"] == "detrended-quantile-mapping":
            k, weight = place(nodes[s], v - (groups[w][s].mean() - own.mean()))
        else:
            k, weight = place(own_nodes[w, s], v)
        out[t] = v + tables[s][k] + float(weight) * (tables[s][k + 1] - tables[s][k])
    return out


def mapped(node, wanted, x):
    """Linear between nodes, the outermost ratio beyond."""
    inside = np.interp(x, node, wanted)
    return np.where(x < node[0], x * wanted[0] / node[0], np.where(x > node[-1], x * wanted[-1] / node[-1], inside))


def at_tau(ratio, tau):
    return np.interp(tau * len(ratio) - 0.5, np.arange(len(ratio)), ratio)


class WetSeason:
    """Threshold, nodes and final targets of one season of the cell."""

    def __init__(self, c, target, own):
        self.c, self.own, own_sorted = c, own, np.sort(own)
        if c["wet_day"] > 0:
            self.threshold, drawn, self.keep = split(c, own, target["wet"])
            assert drawn == 0, "this comparison leaves out what is drawn"
        else:
            self.threshold, self.keep = np.finfo(float).tiny, True
        wet = own_sorted[own_sorted >= self.threshold]
        mean = own.mean() * np.clip(target["level"] / own.mean(), 1 / c["max_ratio"], c["max_ratio"])
        rest = own[own < self.threshold].sum() if self.keep else 0.0
        total = mean * len(own) - rest
        if c["method"] == "mean-ratio":
            self.ratio = np.clip(total / wet.sum(), 1 / c["max_ratio"], c["max_ratio"])
            return
        self.node = wet_nodes(c, wet)
        shape = non_decreasing(target["nodes"])
        least = 0 if c["method"] == "gamma-mapping" else c["wet_day"]
        self.wanted = lambda f: np.clip(np.maximum(f * shape, least) / self.node, 1 / c["max_ratio"], c["max_ratio"])
        factor = optimize.brentq(lambda f: self.amounts(self.wanted(f), wet).sum() - total, 1e-3, 1e3, xtol=1e-15,
                                 rtol=1e-15)
        self.ratio = self.wanted(factor)

    def amounts(self, ratio, wet):
        if self.c["method"] == "quantile-delta-mapping":
            return wet * at_tau(ratio, np.arange(len(wet)) / (len(wet) - 1))
        return mapped(self.node, ratio * self.node, wet)


def adjust_wet(c, targets, cell_groups):
    x = c["series"]
    groups, keys = own_samples(c, x)
    ready = [WetSeason(c, t, g) for t, g in zip(targets, cell_groups)]
    out = np.full(len(x), np.nan)
    for t, (v, (w, s)) in enumerate(zip(x, keys)):
        if np.isnan(v):
            continue
        r, sample = ready[s], groups[w][s]
        if v < r.threshold:
            out[t] = v if r.keep else 0
        elif c["method"] == "mean-ratio":
            out[t] = v * r.ratio
        elif c["method"] == "quantile-delta-mapping":
            ordered, dry = np.sort(sample), (sample < r.threshold).sum()
            equal = np.flatnonzero(ordered == v)  # a year after the last complete block is in no window's sample
            rank = equal.mean() if len(equal) else np.interp(v, ordered, np.arange(len(ordered)))
            out[t] = v * at_tau(r.ratio, (rank - dry) / (len(ordered) - dry - 1))
        else:
            change = sample.mean() / cell_groups[s].mean() if c["method"].startswith("detrended") else 1.0
            out[t] = change * mapped(r.node, r.ratio * r.node, v / change)
    return out


def make_case(method, form, wet_day, season, seed):
    rng = np.random.default_rng(seed)
    dates = days("standard", 1961, 1978)
    phase = lambda when: -np.cos(2 * np.pi * (30.4 * (np.array([d[1] for d in when]) - 1)) / 365)

    def series(level, amplitude, spread, when, dry):
        base = level + amplitude * phase(when)
        if form == "multiplicative":
            return np.where(rng.random(len(when)) < dry, 0, (base + 3) * rng.gamma(0.8, 1.0, len(when)))
        return base + spread * rng.gumbel(size=len(when))

    run = series(9, 5, 5, dates, 0.35) + (0 if form == "multiplicative" else np.linspace(0, 3, len(dates)))
    if form == "multiplicative":
        run *= np.linspace(1, 1.3, len(dates))
    run[::53] = np.nan
    observed = days("standard", 1963, 1976)
    return dict(method=method, form=form, wet_day=wet_day, season=season, seasons=Seasons(season), quantiles=20,
                max_ratio=6.0, calendar="standard", carry_target=True, daily_model=True, dates=dates, window=8,
                window_step=4, station=series(8, 6, 3, dates, 0.3), cell=series(7, 5, 4, dates, 0.35), series=run,
                period=((1962, 1, 1), (1975, 12, month_length("standard", 1975, 12))), normals_period=(1961, 1992),
                daily=list(zip(observed, series(10, 7, 4, observed, 0.6))), monthly=[], normal=[], fade_level=1.0,
                fade_shape=1.0, mean_offset=0.0, reduction=np.array([]))


def main(tool):
    kinds = [("variance-scaling", "additive", 0.0), ("detrended-quantile-mapping", "additive", 0.0),
             ("quantile-delta-mapping", "additive", 0.0), ("mean-ratio", "multiplicative", 1.0),
             ("quantile-mapping", "multiplicative", 1.0), ("quantile-mapping", "multiplicative", 0.0),
             ("detrended-quantile-mapping", "multiplicative", 1.0), ("quantile-delta-mapping", "multiplicative", 1.0),
             ("quantile-delta-mapping", "multiplicative", 0.0), ("gamma-mapping", "multiplicative", 1.0)]
    failed = 0
    for seed, ((method, form, wet_day), season) in enumerate(itertools.product(kinds, ("month", "31"))):
        c = make_case(method, form, wet_day, season, seed)
        done = subprocess.run([tool], input=text_of(c), capture_output=True, text=True, check=False)
        if done.returncode != 0:
            sys.exit(f"{method} {form} {season}: {done.stderr}")
        got = {line.split()[0]: np.array([float(v) for v in line.split()[1:]]) for line in done.stdout.splitlines()}
        inside = lambda d: c["period"][0] <= d <= c["period"][1]
        groups = samples(c["seasons"], "standard", c["dates"], c["cell"], inside)
        out = (adjust_additive if form == "additive" else adjust_wet)(c, fit(c), groups)
        here = distance(got["out"], out)
        failed += not here <= BOUND
        print(f"{'ok    ' if here <= BOUND else 'FAILED'} {method}, {form}, wet day {wet_day}, season {season}: {here:.1e}")
    print(f"{failed} of {2 * len(kinds)} beyond {BOUND}")
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]))
