#!/usr/bin/python3
"""Times decoded and encoded in every calendar against cftime, and the leap seconds of utc against the list of IERS that
comes with the system's time zone data. Usage: calendars.py DUMP_TIMES

Values are binary fractions of their unit whose length in microseconds is whole, so both sides must agree to the
microsecond. cftime has no utc and no tai: those are compared through their differences from proleptic_gregorian.
"""
import os
import random
import subprocess
import sys
import warnings

import cftime

CALENDARS = ["standard", "gregorian", "proleptic_gregorian", "julian", "noleap", "365_day", "all_leap", "366_day",
             "360_day"]
# unit, its microseconds, the binary fraction down to which microseconds stay whole
UNITS = [("days", 86_400_000_000, 1024), ("hours", 3_600_000_000, 1024), ("minutes", 60_000_000, 256),
         ("seconds", 1_000_000, 64), ("milliseconds", 1000, 1), ("microseconds", 1, 1)]
# Only spellings that cftime reads: it passes over " -6:00" and " +1", which CF 1.13 section 4.4 allows (unit tests).
OFFSETS = ["", "", " -06:00", "+05:30", " +01:00", " UTC", "Z"]
LEAP_LIST = "/usr/share/zoneinfo/leap-seconds.list"
CASES_PER_CALENDAR = 3000


def asked(program, lines):
    answer = subprocess.run([program], input="".join(line + "\n" for line in lines), capture_output=True, text=True,
                            check=True).stdout.splitlines()
    assert len(answer) == len(lines), f"{len(answer)} answers to {len(lines)} questions"
    return answer


def reference_text(draw, calendar):
    """A random reference that exists in the calendar; years before 1 are cftime's astronomical ones."""
    while True:
        year, month, day = draw.choice([draw.randint(1, 2300), draw.randint(1570, 1600), draw.randint(-50, 3)]), \
            draw.randint(1, 12), draw.randint(1, 31)
        try:
            cftime.datetime(year, month, day, calendar=calendar, has_year_zero=True)
        except ValueError:
            continue
        break
    pad = draw.random() < 0.5 and year >= 0
    date = f"{year:04d}-{month:02d}-{day:02d}" if pad else f"{year}-{month}-{day}"
    if draw.random() < 0.3:
        return date
    hour, minute, second = draw.randint(0, 23), draw.randint(0, 59), draw.randint(0, 59)
    return f"{date}{draw.choice([' ', 'T'])}{hour:02d}:{minute:02d}:{second:02d}{draw.choice(OFFSETS)}"


def compare_with_cftime(program, draw):
    lines, expected = [], []
    while len(lines) < 2 * CASES_PER_CALENDAR * len(CALENDARS):
        calendar = CALENDARS[len(lines) // (2 * CASES_PER_CALENDAR)]
        unit, microseconds, fraction = draw.choice(UNITS)
        units = f"{unit} since {reference_text(draw, calendar)}"
        span = draw.choice([100, 40_000, 700_000]) * 86_400_000_000 // microseconds
        value = draw.randint(-span * fraction, span * fraction) / fraction
        date = cftime.num2date(value, units, calendar, only_use_cftime_datetimes=True, has_year_zero=True)
        clock = ((date.hour * 60 + date.minute) * 60 + date.second) * 1_000_000 + date.microsecond
        lines.append(f"decode\t{calendar}\t{units}\t{value!r}")
        expected.append(f"{date.year} {date.month} {date.day} {clock}")
        lines.append(f"encode\t{calendar}\t{units}\t{date.year}-{date.month}-{date.day}\t{clock}")
        expected.append(value)
    wrong = 0
    for line, answer, wanted in zip(lines, asked(program, lines), expected):
        same = answer == wanted if isinstance(wanted, str) else not answer.startswith("refused") and \
            float(answer) == wanted
        if not same:
            wrong += 1
            if wrong <= 20:
                print(f"{line!r}: {answer}; cftime: {wanted}")
    print(f"{len(lines)} times in {len(CALENDARS)} calendars against cftime {cftime.__version__}: {wrong} wrong")
    return wrong


def compare_invalid_dates(program):
    """What cftime refuses as a date must be refused as a reference, and the other way round."""
    lines, exists = [], []
    for calendar in CALENDARS:
        for year in (0, 4, 1500, 1582, 1600, 1700, 1900, 2000, 2001):
            for month in range(1, 13):
                for day in (4, 5, 14, 15, 28, 29, 30, 31, 32):
                    try:
                        cftime.datetime(year, month, day, calendar=calendar, has_year_zero=True)
                        exists.append(True)
                    except ValueError:
                        exists.append(False)
                    lines.append(f"decode\t{calendar}\tdays since {year}-{month}-{day}\t0")
    wrong = 0
    for line, answer, there in zip(lines, asked(program, lines), exists):
        if answer.startswith("refused") == there:
            wrong += 1
            print(f"{line!r}: {answer}; cftime: {'a date' if there else 'no date'}")
    print(f"{len(lines)} dates, {exists.count(False)} of them not in their calendar: {wrong} wrong")
    return wrong


def compare_leap_seconds(program):
    """IERS leap-seconds.list: lines of NTP time (seconds since 1900-01-01) and TAI-UTC from then on."""
    if not os.path.exists(LEAP_LIST):
        print(f"leap seconds: not compared, {LEAP_LIST} is not installed")
        return 0
    table = []
    with open(LEAP_LIST, encoding="utf-8") as lines:
        for line in lines:
            if line.strip() and not line.startswith("#"):
                ntp, tai_utc = line.split()[:2]
                table.append((int(ntp), int(tai_utc)))
    questions, expected = [], []
    for ntp, _ in table:
        for second in (ntp - 1, ntp):
            # The list starts on 1972-01-01 with 10 s; what was before is no whole second.
            difference = max([tai_utc for start, tai_utc in table if start <= second], default=10) - 10
            day = cftime.num2date(second // 86400, "days since 1900-01-01", "proleptic_gregorian")
            for calendar, leaps in (("utc", difference), ("tai", 0), ("proleptic_gregorian", 0)):
                questions.append(f"encode\t{calendar}\tseconds since 1972-01-01\t{day.year}-{day.month}-{day.day}\t"
                                 f"{second % 86400 * 1_000_000}")
                expected.append(second - table[0][0] + leaps)
    wrong = 0
    for question, answer, wanted in zip(questions, asked(program, questions), expected):
        if answer.startswith("refused") or float(answer) != wanted:
            wrong += 1
            print(f"{question!r}: {answer}; list of IERS: {wanted}")
    print(f"{len(table) - 1} leap seconds against {LEAP_LIST}: {wrong} wrong")
    return wrong


def main():
    warnings.simplefilter("ignore", cftime.CFWarning)  # years before 1 are compared on purpose
    program, draw = sys.argv[1], random.Random(15821015)
    wrong = compare_with_cftime(program, draw) + compare_invalid_dates(program) + compare_leap_seconds(program)
    sys.exit(1 if wrong else 0)


main()
