#!/usr/bin/python3
"""The demo's inputs: the same bytes every time, and as tools/demo_inputs/invented.h says they are.

Usage: demo_inputs.py PROGRAM. All expected values are invented and come from that header.
"""
import csv
import filecmp
import os
import re
import subprocess
import sys
import tempfile

import netCDF4
import numpy as np

HEADER = os.path.join(os.path.dirname(__file__), "..", "..", "tools", "demo_inputs", "invented.h")
CONSTANTS = {name: float(value) for name, value in re.findall(r"\b(k\w+) = (-?[\d.]+)[;,]", open(HEADER).read())}


def series(folder, model, run, variable):
    files = sorted(f for f in os.listdir(folder) if f.startswith(f"{model}_{run}_"))
    return np.concatenate([netCDF4.Dataset(os.path.join(folder, f))[variable][:] for f in files])


def main(program):
    with tempfile.TemporaryDirectory() as first, tempfile.TemporaryDirectory() as second:
        for folder in (first, second):
            subprocess.run([program, folder], check=True)
        names = sorted(os.listdir(first))
        assert len(names) == 20, names
        same, different, _ = filecmp.cmpfiles(first, second, names, shallow=False)
        assert not different and len(same) == 20, f"not the same bytes twice: {different}"

        # The pair of runs differs by the forced trend alone; over 30 years its mean is 1.5 decades' worth.
        for model, days, resolution in (("heron", 10957, 5e-5), ("plover", 10950, 0.01)):
            every, natural = series(first, model, "all", "tas"), series(first, model, "natural", "tas")
            assert every.shape[0] == days and not np.ma.is_masked(every)
            signal = (every - natural).mean(axis=(1, 2))
            trend = CONSTANTS["kForcedTrend"] * (np.arange(days) + 0.5) / (days / 3)
            assert np.abs(signal - trend).max() < resolution, np.abs(signal - trend).max()

        # Every station brought to sea level and to the island's latitude shows the one true climate. Tolerance: three
        # standard errors of a mean of 30 years' weather with a daily memory of 0.8 (sd 2.4 K * sqrt(9 / 10957) = 0.07 K).
        sites = {row["station"]: row for row in csv.DictReader(open(os.path.join(first, "sites.csv")))}
        assert len(sites) == int(CONSTANTS["kStations"])
        values = {}
        for row in csv.DictReader(open(os.path.join(first, "daily.csv"))):
            values.setdefault(row["station"], []).append(float(row["tas [degC]"]))
        for station, site in sites.items():
            if len(values[station]) < 10400:  # only stations that cover the whole period
                continue
            sea = np.mean(values[station]) - CONSTANTS["kLapse"] * float(site["elevation"])
            sea -= CONSTANTS["kTemperaturePerDegree"] * (float(site["latitude"]) - CONSTANTS["kCentreLat"])
            truth = CONSTANTS["kMeanTemperature"] + 1.5 * CONSTANTS["kForcedTrend"]
            assert abs(sea - truth) < 0.21, (station, sea, truth)
    print("demo inputs: 20 files, the same bytes twice, trend and climate as invented")


if __name__ == "__main__":
    main(sys.argv[1])
