#!/usr/bin/python3
"""Transfers against an independent implementation: station fit, correction of a cell, evaluation.

Usage: transfers.py DUMP_TRANSFER
Everything is written anew from the published formulas: linear scaling (Teutschbein & Seibert 2012,
10.1016/j.jhydrol.2012.05.052), quantile mapping (Themessl 2012, 10.1007/s10584-011-0224-4) with type-7 quantiles
(Hyndman & Fan 1996) from numpy, smoothing of months as the solution of a linear system instead of sweeps (Rymes & Myers
2001, 10.1016/S0038-092X(01)00052-4). Series are invented, seeds pinned. Bound: 1e-9 relative.
"""
import itertools
import subprocess
import sys
from fractions import Fraction

import numpy as np

BOUND = 1e-9
KNOWN = {}
LENGTHS = [31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31]


def month_length(calendar, year, month):
    if calendar == "360_day":
        return 30
    leap = year % 4 == 0 and (year % 100 != 0 or year % 400 == 0)
    return LENGTHS[month - 1] + (month == 2 and leap and calendar == "standard")


def days(calendar, first, last):
    return [(y, m, d) for y in range(first, last + 1) for m in range(1, 13)
            for d in range(1, month_length(calendar, y, m) + 1)]


class Seasons:
    """Seasons by their definition, in exact fractions of the year."""

    def __init__(self, kind):
        self.kind = kind
        self.width = int(kind) if kind.isdigit() else 0
        self.count = {"month": 12, "year": 1}.get(kind, 73)
        self.cache = KNOWN.setdefault(kind, {})

    def of(self, calendar, date):
        """(season the day is evaluated with, seasons whose sample has it)"""
        year, month, day = date
        if self.kind == "month":
            return month - 1, [month - 1]
        if self.kind == "year":
            return 0, [0]
        length = sum(month_length(calendar, year, m) for m in range(1, 13))
        number = sum(month_length(calendar, year, m) for m in range(1, month)) + day
        if (length, number) not in self.cache:
            position = Fraction(2 * number - 1, 2 * length)
            away = []
            for s in range(self.count):
                d = (position - Fraction(10 * s + 1, 730)) % 1
                away.append(d - 1 if d > Fraction(1, 2) else d)
            half = Fraction(self.width, 730)
            # nearest centre; on a tie the one the day lies after
            nearest = min(range(self.count), key=lambda s: (abs(away[s]), away[s] < 0))
            self.cache[length, number] = nearest, [s for s in range(self.count) if -half < away[s] <= half]
        return self.cache[length, number]


def month_weights(seasons):
    weights = np.zeros((seasons.count, 12))
    for date in days("noleap", 2001, 2001):
        for s in seasons.of("noleap", date)[1]:
            weights[s, date[1] - 1] += 1
    return weights


def nodes_of(sample, n):
    return np.quantile(sample, (np.arange(n) + 0.5) / n, method="linear")


def samples(seasons, calendar, dates, values, keep):
    groups = [[] for _ in range(seasons.count)]
    for date, x in zip(dates, values):
        if keep(date) and not np.isnan(x):
            for s in seasons.of(calendar, date)[1]:
                groups[s].append(x)
    return [np.array(g) for g in groups]


def fit_station(c):
    """Level and shape, target and correction, per season."""
    seasons, n = c["seasons"], c["quantiles"]
    in_period = lambda d: c["period"][0] <= d <= c["period"][1]
    calibration = samples(seasons, c["calendar"], c["dates"], c["station"], in_period)
    cal_mean = np.array([g.mean() for g in calibration])
    model_months = {}
    for (y, m, _), x in zip(c["dates"], c["station"]):
        model_months.setdefault((y, m), []).append(x)
    model_months = {k: np.nanmean(v) for k, v in model_months.items()}
    reduction = c["reduction"] if len(c["reduction"]) else np.zeros(12)
    observed, modelled, shape, mismatch = np.full(seasons.count, np.nan), np.full(seasons.count, np.nan), None, False
    weights = month_weights(seasons)
    pairs = 0
    if c["daily"] and c["daily_model"]:
        common = {d[:2] for d, _ in c["daily"]} & set(model_months)
        pairs = len(common)
        obs = samples(seasons, "standard", [d for d, _ in c["daily"]],
                      [x - reduction[d[1] - 1] for d, x in c["daily"]], lambda d: d[:2] in common)
        mod = samples(seasons, c["calendar"], c["dates"], c["station"], lambda d: d[:2] in common)
        observed = np.array([g.mean() for g in obs])
        modelled = np.array([g.mean() for g in mod])
        if c["method"] == "quantile-mapping":
            shape = np.array([nodes_of(o, n) - nodes_of(m, n) for o, m in zip(obs, mod)])
    elif c["monthly"]:
        used = [(y, m, v) for y, m, v in c["monthly"] if (y, m) in model_months]
        pairs = len(used)
        for s in range(seasons.count):
            w = np.array([weights[s, m - 1] for _, m, _ in used])
            observed[s] = np.average([v - reduction[m - 1] for _, m, v in used], weights=w)
            modelled[s] = np.average([model_months[y, m] for y, m, _ in used], weights=w)
    else:
        first, last = c["normals_period"]
        inside = [k for k in model_months if first <= k[0] <= last]
        if not inside:
            mismatch = True
            inside = [k for k in model_months if in_period(k + (1,))]
        pairs = len(inside)
        means = [np.mean([model_months[k] for k in inside if k[1] == m]) for m in range(1, 13)]
        observed = weights @ (np.array(c["normal"]) - reduction) / weights.sum(axis=1)
        modelled = weights @ means / weights.sum(axis=1)
    if c["method"] == "mean-ratio":
        correction = np.log(observed / modelled)
        return dict(target_level=np.log(cal_mean) + correction, correction_level=correction,
                    facts=(1, 0, pairs, int(mismatch)))
    correction = observed - modelled
    fit = dict(target_level=cal_mean + correction, correction_level=correction,
               facts=(1, int(shape is not None), pairs, int(mismatch)))
    if shape is not None:
        target = np.array([nodes_of(g, n) for g in calibration]) + shape
        fit["target_shape"] = target - fit["target_level"][:, None]
        fit["correction_shape"] = shape - correction[:, None]
    return fit


def non_decreasing(v):
    """Isotonic regression by the min-max formula (Robertson, Wright & Dykstra 1988, from memory)."""
    n = len(v)
    sums = np.concatenate([[0], np.cumsum(v)])
    mean = lambda i, j: (sums[j + 1] - sums[i]) / (j + 1 - i)
    return np.array([max(min(mean(i, j) for j in range(k, n)) for i in range(k + 1)) for k in range(n)])


def place(nodes, x):
    """Position of x among the nodes as (lower node, single-precision weight); ties in their middle."""
    n = len(nodes)
    equal = np.flatnonzero(nodes == x)
    if len(equal):
        middle = (equal[0] + equal[-1]) / 2
        k = min(int(middle), n - 2)
        return k, np.float32(middle - k)
    if x < nodes[0]:
        return 0, np.float32(0)
    if x > nodes[-1]:
        return n - 2, np.float32(1)
    k = int(np.searchsorted(nodes, x)) - 1
    return k, np.float32((x - nodes[k]) / (nodes[k + 1] - nodes[k]))


def daily_from_monthly(monthly, lengths):
    """The fixed point of the sweeps: second differences constant within a month, given monthly means."""
    n = sum(lengths)
    month = np.repeat(np.arange(12), lengths)
    a, b = np.zeros((n + 12, n + 12)), np.zeros(n + 12)
    for d in range(n):
        a[d, d] -= 2
        a[d, (d - 1) % n] += 1
        a[d, (d + 1) % n] += 1
        a[d, n + month[d]] = 1
        a[n + month[d], d] = 1 / lengths[month[d]]
    b[n:] = monthly
    return np.linalg.solve(a, b)[:n]


def adjust(c, fit):
    """(adjusted series, seasons capped) for the cell."""
    seasons, n, carry_target = c["seasons"], c["quantiles"], c["carry_target"]
    in_period = lambda d: c["period"][0] <= d <= c["period"][1]
    groups = samples(seasons, c["calendar"], c["dates"], c["cell"], in_period)
    own = np.array([g.mean() for g in groups])
    season = [seasons.of(c["calendar"], d)[0] for d in c["dates"]]
    fade, far = c["fade_level"], fit["correction_level"] + c["mean_offset"]
    x = np.array(c["series"])
    capped = 0
    if c["method"] == "mean-ratio":
        near = np.exp(fit["target_level"]) / own if carry_target else np.exp(fit["correction_level"])
        ratio = fade * near + (1 - fade) * np.exp(far)
        capped = int(((ratio > c["max_ratio"]) | (ratio < 1 / c["max_ratio"])).sum())
        ratio = np.clip(ratio, 1 / c["max_ratio"], c["max_ratio"])
        factor = spread(c, ratio, True) if smoothed(c) else ratio[season]
        return x * factor, capped
    near = fit["target_level"] if carry_target else own + fit["correction_level"]
    level = fade * near + (1 - fade) * (own + far)
    if c["method"] == "mean-shift":
        return x + (spread(c, level - own, False) if smoothed(c) else (level - own)[season]), 0
    tables, nodes = [], []
    for s in range(seasons.count):
        node = nodes_of(groups[s], n)
        shape = node - own[s]
        if "target_shape" in fit:
            carried = fit["target_shape"][s] if carry_target else shape + fit["correction_shape"][s]
            away = shape + fit["correction_shape"][s] * (1 + c["mean_offset"])
            shape = c["fade_shape"] * carried + (1 - c["fade_shape"]) * away
        correction = non_decreasing(level[s] + shape) - node
        mean = 0.0
        for v in groups[s]:
            k, w = place(node, v)
            mean += v + correction[k] + float(w) * (correction[k + 1] - correction[k])
        tables.append(correction + level[s] - mean / len(groups[s]))
        nodes.append(node)
    out = np.full(len(x), np.nan)
    for t, v in enumerate(x):
        if not np.isnan(v):
            k, w = place(nodes[season[t]], v)
            table = tables[season[t]]
            out[t] = v + table[k] + float(w) * (table[k + 1] - table[k])
    return out, 0


def smoothed(c):
    return c["daily_model"] and c["season"] == "month"


def spread(c, monthly, ratio):
    """One value a step from twelve; ratios made exact in the calibration totals, month by month."""
    tables, keys = {}, []
    for y, m, d in c["dates"]:
        lengths = tuple(month_length(c["calendar"], y, k) for k in range(1, 13))
        if lengths not in tables:
            tables[lengths] = daily_from_monthly(monthly, lengths)
        keys.append((lengths, sum(lengths[:m - 1]) + d - 1))
    daily = np.array([tables[lengths][i] for lengths, i in keys])
    if not ratio:
        return daily
    daily = np.maximum(daily, 0)
    cell = np.array(c["cell"])
    in_period = np.array([c["period"][0] <= d <= c["period"][1] for d in c["dates"]])
    month = np.array([m for _, m, _ in c["dates"]])
    for m in range(1, 13):
        use = in_period & (month == m) & ~np.isnan(cell)
        daily[month == m] *= monthly[m - 1] * cell[use].sum() / (cell[use] * daily[use]).sum()
    return daily


def text_of(c):
    dump = lambda name, values: f"{name} {len(values)} " + " ".join(repr(float(v)) for v in values)
    lines = [f"method {c['method']}", f"form {c.get('form', 'additive')}", f"wet_day {c.get('wet_day', 0.0)}",
             f"window {c.get('window', 30)}", f"window_step {c.get('window_step', 10)}", f"season {c['season']}", f"quantiles {c['quantiles']}",
             f"max_ratio {c['max_ratio']}", f"carry_target {int(c['carry_target'])}",
             f"daily_model {int(c['daily_model'])}", f"calendar {c['calendar']}", f"dates {len(c['dates'])}"]
    lines += ["%d %d %d" % d for d in c["dates"]]
    lines += ["period %d %d %d %d %d %d" % (c["period"][0] + c["period"][1]),
              "normals_period %d %d" % c["normals_period"], "accept_mismatch 0", f"fade_level {c['fade_level']}",
              f"fade_shape {c['fade_shape']}", f"mean_offset {c['mean_offset']}", dump("reduction", c["reduction"]),
              dump("station", c["station"]), dump("cell", c["cell"]), dump("series", c["series"]),
              f"daily {len(c['daily'])}"]
    lines += ["%d %d %d %r" % (d + (float(x),)) for d, x in c["daily"]]
    lines += [f"monthly {len(c['monthly'])}"] + ["%d %d %r" % (y, m, float(v)) for y, m, v in c["monthly"]]
    lines += [dump("normal", c["normal"])]
    return "\n".join(lines) + "\n"


def course(dates):
    return np.array([-np.cos(2 * np.pi * (30.4 * (m - 1) + d) / 365) for _, m, d in dates])


def make_case(method, season, calendar, source, carry_target, seed):
    rng = np.random.default_rng(seed)
    wet = method == "mean-ratio"
    monthly_run = source == "monthly run"
    dates = [(y, m, 15) for y in range(1990, 1998) for m in range(1, 13)] if monthly_run else days(calendar, 1990, 1997)
    last_day = month_length(calendar, 1996, 12)

    def series(level, amplitude, spread_, when):
        base = level + amplitude * course(when)
        if wet:
            dry = 0 if len(when) < 1000 else 0.5  # monthly sums are never dry
            amount = rng.gamma(0.7, 1.0, len(when)) * (rng.random(len(when)) >= dry) + 0.001
            return np.round((base + 12) * amount, 1)
        return np.round(base + spread_ * rng.gumbel(size=len(when)), 1)  # rounded: ties on purpose

    station, cell = series(8, 6, 3, dates), series(7, 5, 4, dates)
    run = series(9, 5, 5, dates)
    run[::53] = np.nan
    if source == "daily":
        station[::97] = np.nan
        cell[::89] = np.nan if not smoothed(dict(daily_model=True, season=season)) or wet else cell[::89]
    c = dict(method=method, season=season, seasons=Seasons(season), quantiles=20, max_ratio=1.6, calendar=calendar,
             carry_target=carry_target, daily_model=not monthly_run, dates=dates, station=station, cell=cell, series=run,
             period=((1991, 1, 1), (1996, 12, last_day)), normals_period=(1961, 1992), daily=[], monthly=[], normal=[],
             fade_level=[1.0, 0.35, 0.0][seed % 3], fade_shape=[0.6, 1.0, 0.0][seed % 3], mean_offset=0.0625,
             reduction=np.array([]) if wet else np.linspace(-1, 1.2, 12))
    observed = [d for d in days("standard", 1988, 1995) if d[:2] not in ((1992, 2), (1994, 11))]
    values = series(10, 7, 4, observed)
    if source == "daily":
        c["daily"] = [(d, v) for d, v in zip(observed, values)]
    elif source in ("monthly", "monthly run"):
        months = sorted({d[:2] for d in observed})
        c["monthly"] = [(y, m, np.mean([v for d, v in zip(observed, values) if d[:2] == (y, m)])) for y, m in months]
    else:
        c["normal"] = [np.mean([v for d, v in zip(observed, values) if d[1] == m]) for m in range(1, 13)]
        if source == "old normals":
            c["normals_period"] = (1931, 1960)
    return c


def distance(got, want):
    got, want = np.ravel(got), np.ravel(want)
    if got.shape != want.shape or not np.array_equal(np.isnan(got), np.isnan(want)):
        return np.inf
    return np.nanmax(np.abs(got - want) / np.maximum(1, np.abs(want)), initial=0)


def main(tool):
    cases = [(m, s, k, "daily") for m in ("mean-shift", "mean-ratio", "quantile-mapping")
             for s, k in (("month", "standard"), ("month", "noleap"), ("31", "standard"), ("31", "360_day"),
                          ("year", "standard"))]
    cases += [("mean-shift", s, "standard", source) for s in ("month", "31", "year")
              for source in ("monthly", "normals", "old normals")]
    cases += [("quantile-mapping", "month", "standard", "monthly"), ("mean-ratio", "31", "noleap", "normals"),
              ("mean-shift", "month", "360_day", "monthly run"), ("mean-ratio", "month", "standard", "monthly run")]
    failed, worst, seed, capped = 0, 0.0, 0, 0
    for (method, season, calendar, source), carry in itertools.product(cases, (True, False)):
        seed += 1
        c = make_case(method, season, calendar, source, carry, seed)
        done = subprocess.run([tool], input=text_of(c), capture_output=True, text=True, check=False)
        if done.returncode != 0:
            sys.exit(f"{method} {season} {calendar} {source}: {done.stderr}")
        got = {line.split()[0]: np.array([float(v) for v in line.split()[1:]]) for line in done.stdout.splitlines()}
        fit = fit_station(c)
        out, caps = adjust(c, fit)
        capped += caps
        wanted = dict(fit, out=out)
        distances = {name: distance(got[name], want) for name, want in wanted.items()}
        distances["capped"] = abs(got["counts"][1] - caps)
        here = max(distances.values())
        worst = max(worst, here)
        if not here <= BOUND:
            failed += 1
            print(f"FAILED {method} {season} {calendar} {source} carry_target={carry}: {distances}")
    if capped == 0:
        sys.exit("no case met the cap: the comparison lost its point")
    print(f"{seed} transfers compared, largest relative difference {worst:.2e}, {failed} beyond {BOUND}")
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]))
