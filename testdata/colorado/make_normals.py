#!/usr/bin/python3
"""How sites.csv and normals.csv beside this file were made from the two tables of the US cooperative network.

Usage: make_normals.py META.csv MONTHLY.csv FOLDER
  META     id,name,lon,lat,elev_m,...                          one station a line
  MONTHLY  id,year,month,tmin_degC,tmax_degC,precip_mm         one month a line, empty where missing

A month's temperature is the mean of tmin and tmax, where both are present. A calendar month has a normal when at least
80 % of the years 1961-1990 (24 of 30) have a value: WMO-No. 1203 (2017), section 4.4, as summarised in a secondary
source. Stations with normals in all twelve months are kept.
"""
import csv
import decimal
import sys

FIRST, LAST, NEEDED = 1961, 1990, 24


def main(meta, monthly, folder):
    values = {}
    for row in csv.DictReader(open(monthly, encoding="utf-8")):
        if FIRST <= int(row["year"]) <= LAST and row["tmin_degC"] and row["tmax_degC"]:
            mean = (decimal.Decimal(row["tmin_degC"]) + decimal.Decimal(row["tmax_degC"])) / 2
            values.setdefault((row["id"], int(row["month"])), {})[row["year"]] = mean
    sites = list(csv.DictReader(open(meta, encoding="utf-8")))
    kept = [s for s in sites if all(len(values.get((s["id"], m), {})) >= NEEDED for m in range(1, 13))]
    with open(f"{folder}/sites.csv", "w", encoding="utf-8", newline="") as out:
        table = csv.writer(out, lineterminator="\n")
        table.writerow(["station", "longitude", "latitude", "elevation", "name"])
        table.writerows([s["id"], s["lon"], s["lat"], s["elev_m"], s["name"]] for s in kept)
    with open(f"{folder}/normals.csv", "w", encoding="utf-8", newline="") as out:
        table = csv.writer(out, lineterminator="\n")
        table.writerow(["station", "month", "tas [degC]"])
        for site in kept:
            for month in range(1, 13):
                years = values[site["id"], month]
                table.writerow([site["id"], month, f"{sum(years.values()) / len(years):.2f}"])
    print(f"{len(kept)} of {len(sites)} stations have twelve normals")


if __name__ == "__main__":
    main(*sys.argv[1:])
