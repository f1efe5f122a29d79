#!/usr/bin/python3
"""Scores, their intervals and verdicts against an independent implementation.

Usage: scores.py DUMP_SCORES
Everything is written anew from its definition with numpy and scipy: each draw of years is written down day by day and
scored from the beginning, where the program under test adds up sums of years. Quantiles are numpy's type 7 (Hyndman & Fan
1996), gamma fits scipy's root finding on the likelihood equation and scipy.special's incomplete gamma functions. Series
are invented, seeds pinned. Bound: 1e-12 of the numbers that a score is made of.
"""
import subprocess
import sys
import warnings

import numpy as np
from scipy import optimize, special

BOUND = 1e-12
LENGTHS = [31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31]
SEASONS = [[m] for m in range(1, 13)] + [[12, 1, 2], [3, 4, 5], [6, 7, 8], [9, 10, 11], list(range(1, 13))]
(BIAS, MAE, RMSE, VARIANCE, P5, P50, P95, P99, WET, PERKINS, LAG, SPELL, HIGHEST, LOWEST) = range(14)
NAN = float("nan")
MASK = (1 << 64) - 1
GOLDEN = 0x9E3779B97F4A7C15


def month_length(calendar, year, month):
    if calendar == "360_day":
        return 30
    leap = calendar == "standard" and year % 4 == 0 and (year % 100 != 0 or year % 400 == 0)
    return LENGTHS[month - 1] + (month == 2 and leap)


def mix(z):
    z = (z + GOLDEN) & MASK
    z = ((z ^ (z >> 30)) * 0xBF58476D1CE4E5B9) & MASK
    z = ((z ^ (z >> 27)) * 0x94D049BB133111EB) & MASK
    return z ^ (z >> 31)


def draw(seed, stream, replicate, n):
    """Positions of the years of one replicate."""
    state = mix((mix((mix(seed) + stream) & MASK) + replicate) & MASK)
    return [((mix((state + (k + 1) * GOLDEN) & MASK) >> 32) * n) >> 32 for k in range(n)]


def interval(values):
    values = np.array(values, float)
    kept = values[~np.isnan(values)]
    if not len(kept) or 10 * len(kept) < 9 * len(values):
        return [NAN, NAN]
    return list(np.quantile(kept, [0.05, 0.95]))


class Case:
    def __init__(self, calendar, quantity, paired, wet_day, seed, stream, replicates):
        self.calendar, self.rain, self.paired, self.wet_day = calendar, quantity == "precipitation", paired, wet_day
        self.quantity, self.seed, self.stream, self.replicates = quantity, seed, stream, replicates
        self.dates = [(y, m, d) for y in range(1991, 2013) for m in range(1, 13)
                      for d in range(1, month_length(calendar, y, m) + 1)]
        random = np.random.default_rng(seed)
        keep = random.random(len(self.dates)) > 0.002  # dates that the series do not even have
        self.number = np.flatnonzero(keep)  # the dates are every day of the calendar
        self.dates = [date for date, kept in zip(self.dates, keep) if kept]
        self.stations = [self.series(random, k) for k in range(3)]

    def series(self, random, k):
        n = len(self.dates)
        month = np.array([d[1] for d in self.dates])
        out = []
        for version in range(4):
            if self.rain:
                x = np.where(random.random(n) < 0.45, random.gamma(0.7, 5 + version, n), 0.0).round(1)
            else:
                noise = random.normal(size=n)
                for i in range(1, n):
                    noise[i] += 0.6 * noise[i - 1]
                x = 280 + 8 * np.sin(month / 2) + 3 * noise + (0, 2, 1.5, 0.1)[version]
            x[random.random(n) < 0.01] = NAN
            out.append(x)
        if k == 1:  # a short station, its years overlapping in part
            out[0][[d[0] < 2000 for d in self.dates]] = NAN
        if k == 2:  # too short
            out[0][[d[0] < 2005 for d in self.dates]] = NAN
        return out

    def text(self):
        lines = [f"scores {self.calendar} {self.quantity} {int(self.paired)} {self.wet_day!r} {self.seed} {self.stream} "
                 f"{self.replicates} {len(self.dates)}"]
        lines += ["%d %d %d" % d for d in self.dates]
        lines.append(str(len(self.stations)))
        lines += [" ".join(repr(float(v)) for v in series) for station in self.stations for series in station]
        return "\n".join(lines) + "\n"


class Years:
    """The days of one season on which both series have values, by year."""

    def __init__(self, case, months, observed, modelled):
        self.case, self.by_year = case, {}
        wraps = months == [12, 1, 2]
        for i, (y, m, _) in enumerate(case.dates):
            if m in months and not np.isnan(observed[i]) and not np.isnan(modelled[i]):
                self.by_year.setdefault(y + (wraps and m == 12), []).append(i)
        self.years = sorted(self.by_year)
        length = {y: sum(month_length(case.calendar, y - (wraps and m == 12), m) for m in months) for y in self.years}
        self.complete = {y for y in self.years if len(self.by_year[y]) >= length[y] - min(15, 3 * len(months))}
        self.well_sampled = sum(2 * len(self.by_year[y]) >= length[y] for y in self.years)
        self.o, self.m = observed, modelled
        self.cache = {}

    def yearly(self, y):
        """Pairs of days, and spell, maximum and minimum of both series, of one year."""
        if y not in self.cache:
            days, number = self.by_year[y], self.case.number
            pairs = [(a, b) for a, b in zip(days, days[1:]) if b == a + 1 and number[b] == number[a] + 1]
            follows = {b for _, b in pairs}
            extremes = []
            for x in (self.o, self.m):
                longest = now = 0
                for i in days:
                    now = 0 if x[i] >= self.case.wet_day else (now + 1 if i in follows else 1)
                    longest = max(longest, now)
                extremes.append((longest, max(x[i] for i in days), min(x[i] for i in days)))
            self.cache[y] = (pairs, extremes)
        return self.cache[y]

    def scores(self, chosen):
        """14 x (observed, modelled, value) of the years chosen, repetitions and all."""
        out = np.full((14, 3), NAN)
        i = np.array([i for y in chosen for i in self.by_year[y]], int)
        if not len(i):
            return out
        o, m, case = self.o[i], self.m[i], self.case
        out[BIAS] = o.mean(), m.mean(), (m - o).mean()
        if case.paired:
            out[MAE, 2], out[RMSE, 2] = np.abs(m - o).mean(), np.sqrt(((m - o) ** 2).mean())
        if len(i) > 1:
            a, b = o.var(ddof=1), m.var(ddof=1)
            out[VARIANCE] = a, b, b / a if a > 0 else NAN
        for score, p in ((P5, 0.05), (P50, 0.5), (P95, 0.95), (P99, 0.99)):
            a, b = np.quantile(o, p), np.quantile(m, p)
            out[score] = a, b, b - a
        width = 1.0 if case.rain else 0.5
        low = np.floor(min(o.min(), m.min()) / width)
        bins = (low + np.arange(np.floor(max(o.max(), m.max()) / width) - low + 2)) * width
        out[PERKINS, 2] = np.minimum(np.histogram(o, bins)[0], np.histogram(m, bins)[0]).sum() / len(i)
        if case.rain:
            a, b = (o >= case.wet_day).mean(), (m >= case.wet_day).mean()
            out[WET] = a, b, b - a
        pairs = np.array([p for y in chosen for p in self.yearly(y)[0]], int).reshape(-1, 2)
        if len(pairs) > 1:
            a, b = (np.corrcoef(x[pairs[:, 0]], x[pairs[:, 1]])[0, 1] if np.ptp(x[pairs[:, 0]]) > 0 and
                    np.ptp(x[pairs[:, 1]]) > 0 else NAN for x in (self.o, self.m))
            out[LAG] = a, b, b - a
        whole = [self.yearly(y)[1] for y in chosen if y in self.complete]
        if whole:
            (so, ho, lo), (sm, hm, lm) = np.array(whole, float).mean(axis=0)
            out[HIGHEST] = ho, hm, hm - ho
            out[SPELL if case.rain else LOWEST] = (so, sm, sm - so) if case.rain else (lo, lm, lm - lo)
        return out

    def drawn(self, replicate):
        case = self.case
        return [self.years[k] for k in draw(case.seed, case.stream, replicate, len(self.years))]


def departures(table):
    d = np.abs(table[:, 2])
    d[VARIANCE] = abs(np.log(table[VARIANCE, 2]))
    d[PERKINS] = 1 - table[PERKINS, 2]
    return d


def expect_compare(case, months):
    """Rows of the comparison: raw, height and adjusted over the stations with enough years."""
    judged = []
    for o, *versions in case.stations:
        common = np.where(np.isnan(sum(versions)), NAN, o)
        three = [Years(case, months, common, v) for v in versions]
        if three[0].well_sampled >= 10:
            judged.append(three)
    years = sorted({y for three in judged for y in three[0].years})
    whole = np.array([[departures(v.scores(v.years)) for v in three] for three in judged]).mean(axis=0)
    drawn = []
    for r in range(case.replicates):
        taken = [years[k] for k in draw(case.seed, case.stream, r, len(years))]
        table = [[departures(v.scores(sorted(y for y in taken if y in v.by_year))) for v in three] for three in judged]
        drawn.append(np.nanmean(np.array(table), axis=0))
    drawn = np.array(drawn)
    rows = []
    for s in range(14):
        if (s in (MAE, RMSE) and not case.paired) or (s in (WET, SPELL) and not case.rain) or (s == LOWEST and case.rain):
            continue
        over_raw = interval(drawn[:, 0, s] - drawn[:, 2, s])
        over_height = interval(drawn[:, 1, s] - drawn[:, 2, s])
        verdict = 0 if over_height[0] > 0 else 2 if over_height[1] < 0 else 1
        rows.append([s, len(judged), 3 - len(judged), len(years), *whole[:, s], *over_raw, *over_height, verdict])
    return rows


def expect_change(case, months, ratio):
    raw, adjusted = case.stations[0][1], case.stations[0][3]
    both = Years(case, months, raw, adjusted)
    periods = []
    for first, last in ((1992, 2000), (2001, 2012)):
        part = Years(case, months, raw, adjusted)
        part.years = [y for y in both.years if first <= y <= last]
        part.by_year = {y: both.by_year[y] for y in part.years}
        periods.append(part)
    combine = (lambda a, b: b / a) if ratio else (lambda a, b: b - a)

    def changes(early, late):
        a, b = periods[0].scores(early)[BIAS], periods[1].scores(late)[BIAS]
        return combine(a[0], b[0]), combine(a[1], b[1])

    added = []
    for r in range(case.replicates):
        modelled, product = changes(periods[0].drawn(r), periods[1].drawn(case.replicates + r))
        added.append(product - modelled)
    modelled, product = changes(periods[0].years, periods[1].years)
    low, high = interval(added)
    return [modelled, product, product - modelled, low, high, 9, 12, float(low <= 0 <= high)]


def expect_correlation(case, months):
    inside = np.array([d[1] in months for d in case.dates])
    rows = []
    for pairs in ([(0, 1), (1, 2)], [(0, 2)]):
        found = []
        for a, b in pairs:
            four = np.array([case.stations[a][0], case.stations[b][0], case.stations[a][1], case.stations[b][1]])[:, inside]
            four = four[:, ~np.isnan(four).any(axis=0)]
            if four.shape[1] >= 100:
                found.append((np.corrcoef(four[:2])[0, 1], np.corrcoef(four[2:])[0, 1]))
        rows.append([len(found), *(np.mean(found, axis=0) if found else (NAN, NAN))])
    return rows


def expect_area(case, months):
    years = Years(case, months, sum(s[0] for s in case.stations) / 3, sum(s[1] for s in case.stations) / 3)
    whole = years.scores(years.years)
    drawn = [years.scores(years.drawn(r)) for r in range(case.replicates)]
    row, sound = [len([i for y in years.years for i in years.by_year[y]]), years.well_sampled], True
    parts = []
    for s in (VARIANCE, P95, HIGHEST):
        ratio = lambda t: t[s, 1] / t[s, 0] if t[s, 0] > 0 else NAN
        parts += [whole[s, 0], whole[s, 1], ratio(whole), *interval([ratio(t) for t in drawn])]
        sound = sound and 0.8 <= ratio(whole) <= 1.25
    return row + [2 if years.well_sampled < 10 else 0 if sound else 1] + parts


class Checker:
    def __init__(self):
        self.worst, self.count, self.failures = 0.0, 0, []

    def __call__(self, what, found, expected, scale=0.0, bound=BOUND):
        """`scale`: the size of the numbers that a difference was made of."""
        if len(found) != len(expected):
            self.failures.append(f"{what}: {len(found)} numbers, expected {len(expected)}")
            return
        for k, (f, e) in enumerate(zip(found, expected)):
            self.count += 1
            if np.isnan(f) and np.isnan(e):
                continue
            error = abs(f - e) / max(abs(e), scale) if e or scale else abs(f)
            self.worst = max(self.worst, error / bound)
            if not error <= bound:
                self.failures.append(f"{what} [{k}]: found {f!r}, expected {e!r}")


def check_case(case, lines, check):
    def line(name):
        words = next(lines).split()
        assert words[0] == name, (words[0], name)
        return [float(w) for w in words[1:]]

    scale = 1.0 if case.rain else 280.0  # temperatures in K: scores are differences of numbers near 280
    verdicts = set()
    for months in SEASONS:
        what = f"{case.calendar} {case.quantity} months {months}"
        years = Years(case, months, case.stations[0][0], case.stations[0][1])
        whole = years.scores(years.years)
        drawn = np.array([years.scores(years.drawn(r))[:, 2] for r in range(case.replicates)])
        days = sum(len(d) for d in years.by_year.values())
        check(what, line("facts"), [days, years.well_sampled, float(years.well_sampled < 10)])
        for s in range(14):
            check(f"{what} score {s}", line("score"), [*whole[s], *interval(drawn[:, s])], scale)
        for expected in expect_compare(case, months):
            found = line("compare")
            verdicts.add(found[-1])
            check(f"{what} compare {expected[0]}", found, expected, scale)
        for ratio in (False, True):
            check(f"{what} change {ratio}", line("change"), expect_change(case, months, ratio), scale)
        for expected in expect_correlation(case, months):
            check(f"{what} correlation", line("correlation"), expected)
        if case.rain:
            check(f"{what} area", line("area"), expect_area(case, months), scale)
    return verdicts


def check_gamma(program, check):
    random = np.random.default_rng(1958)
    samples = [np.array([1.0, 2, 3, 4, 5]), np.array([0.5, 1, 2, 4, 8, 16])]
    samples += [random.gamma(a, 4.0, n) + 1e-6 for a in (0.2, 0.7, 2, 15, 30, 400) for n in (5, 60, 900)]
    text = "".join(f"gamma {len(s)} " + " ".join(repr(float(v)) for v in s) + "\n" for s in samples)
    lines = subprocess.run([program], input=text, capture_output=True, text=True, check=True).stdout.splitlines()
    for sample, words in zip(samples, lines):
        excess = np.log(sample.mean()) - np.log(sample).mean()
        thom = (1 + np.sqrt(1 + 4 * excess / 3)) / (4 * excess)
        shape = optimize.brentq(lambda a: np.log(a) - special.digamma(a) - excess, thom / 10, thom * 10, xtol=1e-300,
                                rtol=1e-14)
        scale = sample.mean() / shape
        expected = [excess, thom, sample.mean() / thom, shape, scale]
        expected += [scale * special.gammaincinv(shape, p) for p in (0.01, 0.5, 0.95)]
        expected += [special.gammainc(shape, x / scale) for x in (0.1, 1.0, 10.0)]
        # The plain difference of logarithms and ln a - psi(a) lose digits here, not in the program: about 4e-16 |ln| / A.
        loss = 8e-16 * (abs(np.log(sample.mean())) + np.log(thom + 1) + 1) / excess
        found = [float(w) for w in words.split()[1:]]
        check(f"gamma {thom:.3g}", found[:5], expected[:5], bound=max(BOUND, loss))
        # Quantiles and probabilities of the fit found, so that they answer for themselves.
        a, b = found[3:5]
        expected = [b * special.gammaincinv(a, p) for p in (0.01, 0.5, 0.95)]
        expected += [special.gammainc(a, x / b) for x in (0.1, 1.0, 10.0)]
        # scipy's incomplete gamma functions lose digits far out in the tail: below 1e-30 nobody asks.
        expected = [0.0 if e < 1e-30 else e for e in expected]
        check(f"gamma functions {thom:.3g}", [0.0 if f < 1e-30 else f for f in found[5:]], expected, bound=1e-11)


def main(program):
    check = Checker()
    check_gamma(program, check)
    verdicts = set()
    for case in (Case("standard", "temperature", False, 1.0, 11, 0, 11),
                 Case("360_day", "precipitation", True, 1.0, 12, 3, 11),
                 Case("noleap", "precipitation", False, 0.5, 13, 2**63 + 5, 7)):
        result = subprocess.run([program], input=case.text(), capture_output=True, text=True, check=True)
        verdicts |= check_case(case, iter(result.stdout.splitlines()), check)
    if not {0.0, 1.0} <= verdicts:
        check.failures.append(f"the cases are too tame: verdicts {verdicts}")
    print(f"{check.count} numbers, worst {check.worst:.3g} of its bound")
    print("\n".join(check.failures[:20]))
    return 1 if check.failures else 0


if __name__ == "__main__":
    np.seterr(invalid="ignore", divide="ignore")
    warnings.filterwarnings("ignore", "Mean of empty slice")  # scores that no station has
    sys.exit(main(sys.argv[1]))
