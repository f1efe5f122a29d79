#!/usr/bin/python3
"""`windrow prove` on daily series, the demo's temperature of one model: its figures against numpy.

Usage: prove_kelder.py WINDROW DEMO_INPUTS. Runs configs/kelder.toml with one model and one field in a folder of its own.

With mean-shift by month every figure of a monthly mean can be written down: a station's target is its model climate plus
observed minus modelled mean of the months both have; a place gets the tapered inverse-distance mean of the stations that
were not left out, in the years that were not left out (a station itself, where it is not left out). Smoothing monthly
corrections to days keeps the means of months. The biases in the CSV must agree to 1e-6 K, and the CSV's biases of the
years' days with means of the days themselves. Then quantile mapping, as the demo does it: the sentences, the table and
the JSON say the same, and the adjustment, which knows the invented models' faults, helps in the year.
"""
import csv
import json
import os
import re
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np

TOP = os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "..")
LAPSE, RADIUS_M, EARTH_M, SAME_SITE_M, FIRST, YEARS = -0.0065, 150e3, 6371007.1809, 2e3, 1981, 30
MONTHS = ("January February March April May June July August September October November December").split()
FEWEST_YEARS = 10  # min_years of [stations]


def one_model(job):
    """The job with the first model and temperature only."""
    run = re.findall(r"\[\[run\]\]\n(?:.+\n)*", job)
    for text in run[1:]:
        job = job.replace(text, "")
    return re.sub(r'\[\[field\]\]\nvariable = "pr"(.|\n)*?(?=\[mesh\])', "", job)


def model_series(folder, lon, lat):
    """Daily temperature in degC and height of the model cells that hold the places."""
    parts = []
    for decade in (1981, 1991, 2001):
        with netCDF4.Dataset(f"{folder}/heron_all_{decade}-{decade + 9}.nc") as file:
            lat_b, lon_b = file["lat_bnds"][:], file["lon_bnds"][:]
            j = [np.flatnonzero((lat_b.min(1) <= y) & (y < lat_b.max(1)))[0] for y in lat]
            i = [np.flatnonzero(((x - lon_b[:, 0]) % 360) < (lon_b[:, 1] - lon_b[:, 0]))[0] for x in lon]
            parts.append(file["tas"][:].filled(np.nan).astype(float)[:, j, i] - 273.15)
    with netCDF4.Dataset(f"{folder}/heron_orog.nc") as file:
        return np.concatenate(parts).T, file["orog"][:].filled(np.nan).astype(float)[j, i]


def months(days):
    """Index year * 12 + month of each day from 1981-01-01."""
    return days.astype("datetime64[M]").astype(int) - (FIRST - 1970) * 12


def complete(present):
    """WMO-No. 1203, 4.4, as the project's tests name it: under 11 days missing, under 5 in a row."""
    longest = run = 0
    for there in present:
        run = 0 if there else run + 1
        longest = max(longest, run)
    return (~present).sum() < 11 and longest < 5


class World:
    def __init__(self, folder):
        sites = list(csv.DictReader(open(f"{folder}/sites.csv")))
        days = np.arange(np.datetime64(f"{FIRST}-01-01"), np.datetime64(f"{FIRST + YEARS}-01-01"))
        self.month = months(days)
        names = {site["station"]: k for k, site in enumerate(sites)}
        observed = np.full((len(sites), len(days)), np.nan)
        for row in csv.DictReader(open(f"{folder}/daily.csv")):
            if row["tas [degC]"] not in ("", "NA", "NaN"):
                k = (np.datetime64(row["date"]) - days[0]).astype(int)
                if 0 <= k < len(days):
                    observed[names[row["station"]], k] = float(row["tas [degC]"])
        for series in observed:
            for month in range(12 * YEARS):
                chosen = self.month == month
                if not complete(~np.isnan(series[chosen])):
                    series[chosen] = np.nan
        has = np.array([[not np.isnan(series[self.month == m]).all() for m in range(12 * YEARS)] for series in observed])
        kept = has.reshape(len(sites), YEARS, 12).sum(1).min(1) >= FEWEST_YEARS
        self.names = [site["station"] for site, keep in zip(sites, kept) if keep]
        self.observed, self.has = observed[kept], has[kept]
        lon, lat, height = (np.array([float(s[key]) for s, keep in zip(sites, kept) if keep])
                            for key in ("longitude", "latitude", "elevation"))
        self.height = height
        self.model, self.model_height = model_series(folder, lon, lat)
        p, l = np.radians(lat), np.radians(lon)
        h = np.sin((p[:, None] - p) / 2) ** 2 + np.cos(p[:, None]) * np.cos(p) * np.sin((l[:, None] - l) / 2) ** 2
        self.apart = 2 * EARTH_M * np.arctan2(np.sqrt(h), np.sqrt(1 - h))

    def mean_of_months(self, series, chosen, m):
        """Mean over the chosen years of the means of calendar month m."""
        return np.mean([np.nanmean(series[self.month == 12 * y + m]) for y in np.flatnonzero(chosen)])

    def biases(self, fitted, scored, stay):
        """Bias of raw, height and adjusted [station, 3, month]; years as masks, `stay`: the place's own station stays."""
        count = len(self.names)
        out = np.empty((count, 3, 12))
        for m in range(12):
            all_years = np.isin(self.month, 12 * np.arange(YEARS) + m)
            target, climate = np.empty(count), np.empty(count)
            for i in range(count):
                years = np.flatnonzero(self.has[i].reshape(YEARS, 12)[:, m] & fitted)
                common = np.isin(self.month, 12 * years + m)
                climate[i] = self.model[i, all_years].mean() - LAPSE * self.model_height[i]
                correction = np.nanmean(self.observed[i, common]) - LAPSE * self.height[i] - (
                    self.model[i, common].mean() - LAPSE * self.model_height[i])
                target[i] = climate[i] + correction
            for i in range(count):
                others = np.flatnonzero(self.apart[i] > SAME_SITE_M)
                x = self.apart[i, others] / RADIUS_M
                assert x.min() < 0.5  # no fade
                weight = self.apart[i, others] ** -2.0 * (1 - np.minimum(x, 1) ** 2) ** 2
                reached = target[i] if stay else (weight * target[others]).sum() / weight.sum()
                years = self.has[i].reshape(YEARS, 12)[:, m] & scored
                raw = self.mean_of_months(self.model[i], years, m) - self.mean_of_months(self.observed[i], years, m)
                level = raw - LAPSE * self.model_height[i] + LAPSE * self.height[i]
                out[i, :, m] = raw, level, level + reached - climate[i]
        return out

    def split(self, first):
        """Years fitted to one half (mask) and scored in the other, and the other way round: weighted together."""
        parts = self.biases(first, ~first, True), self.biases(~first, first, True)
        years = self.has.reshape(-1, YEARS, 12)
        counts = [(years & mask[None, :, None]).sum(1)[:, None, :] for mask in (~first, first)]
        return (parts[0] * counts[0] + parts[1] * counts[1]) / (counts[0] + counts[1])


def prove(windrow, job, folder, *more):
    table = os.path.join(folder, "scores.csv")
    done = subprocess.run([windrow, "prove", job, "--quiet", "--json", "--csv", table, *more], check=True,
                          capture_output=True, text=True)
    (proof,) = json.loads(done.stdout)["fields"]
    return list(csv.DictReader(open(table))), proof


def main(windrow, maker):
    failed = []

    def check(what, holds):
        print(f"{'' if holds else 'NOT '}{what}")
        if not holds:
            failed.append(what)

    with tempfile.TemporaryDirectory(prefix="windrow-prove-") as folder:
        inputs, job = os.path.join(folder, "build", "kelder", "in"), os.path.join(folder, "configs", "kelder.toml")
        os.mkdir(os.path.dirname(job))
        with open(job, "w") as file:
            file.write(one_model(open(os.path.join(TOP, "configs", "kelder.toml")).read()))
        subprocess.run([maker, inputs], check=True)
        world = World(inputs)
        rows, proof = prove(windrow, job, folder, "--set", 'field.0.adjust.method="mean-shift"', "--set",
                            'field.0.adjust.season="month"')
        check(f"{len(world.names)} stations", proof["stations"] == len(world.names) == proof["daily_stations"])
        every = np.ones(YEARS, bool)
        odd = np.arange(FIRST, FIRST + YEARS) % 2 == 1
        expected = {"each station left out": world.biases(every, every, False),
                    "odd or even years left out": world.split(odd),
                    "the first or second half of the years left out": world.split(np.arange(YEARS) < YEARS // 2)}
        told = {(r["left_out"], r["station"], r["season"]): r for r in rows if r["score"] == "bias of monthly mean"}
        for design, values in expected.items():
            worst = np.zeros(3)
            for i, name in enumerate(world.names):
                for m, month in enumerate(MONTHS):
                    row = told[design, name, month]
                    worst = np.maximum(worst, np.abs([float(row[v]) - values[i, k, m]
                                                      for k, v in enumerate(("raw", "height", "adjusted"))]))
            check(f"{design}: within 1e-6 K of numpy (raw {worst[0]:.1e}, height {worst[1]:.1e}, adjusted {worst[2]:.1e})",
                  worst.max() <= 1e-6)
        days = {r["station"]: r for r in rows if r["left_out"] == "each station left out" and r["season"] == "year"
                and r["score"] == "bias"}
        worst = max(abs(float(days[name]["raw"]) - np.nanmean(world.model[i] - world.observed[i]))
                    for i, name in enumerate(world.names))
        check(f"bias of the year's days, raw: within 1e-6 K of numpy ({worst:.1e})", worst <= 1e-6)

        rows, proof = prove(windrow, job, folder)
        rests = "blocks of stations and odd or even years left out"
        check(f"the verdict rests on {rests}", proof["verdict_rests_on"] == rests)
        (design,) = [d for d in proof["designs"] if d["left_out"] == rests]
        for season in design["seasons"]:
            for score in season["scores"]:
                mine = [r for r in rows if r["left_out"] == rests and r["season"] == season["season"]
                        and r["score"] == score["score"]]
                if score["score"] == "bias":
                    mean = np.mean([abs(float(r["adjusted"])) for r in mine])
                    check(f"{season['season']}: the JSON's bias {score['adjusted']:.4f} K is the CSV's mean",
                          abs(mean - score["adjusted"]) < 1e-8 and len(mine) == score["stations"])
                    check(f"{season['season']}: intervals hold the scores",
                          all(float(r["low"]) <= float(r["adjusted"]) <= float(r["high"]) for r in mine))
        check("the adjustment helps in the year",
              [s["verdict"] for s in design["seasons"] if s["season"] == "year"] == ["helps"])
        check("no skill of days is claimed", all("no skill is claimed" in s for s in proof["verdict"]))
    if failed:
        sys.exit("FAILED: " + "; ".join(failed))


if __name__ == "__main__":
    main(*sys.argv[1:])
