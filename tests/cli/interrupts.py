#!/usr/bin/python3
"""What stops half-way is gone on with, and no product depends on threads, tile shapes or interruptions.

Usage: interrupts.py WINDROW. One job of quantile mapping is made once, undisturbed; then it is stopped at pinned points
of its progress (bytes in the spool), damaged, and made with other threads, and must come out the same byte for byte.
"""
import contextlib
import hashlib
import os
import random
import signal
import sys
import time

import kit
import netCDF4
import numpy as np

KILLS = random.Random(20240311)  # moments within a spool's growth are random, but pinned
STOP_S, IDLE_S, PATIENCE_S = 5, 1, 120
CELLS = 100
MESH = "[mesh]\n" + "".join(f"{axis} = {{ from = {first}, to = {first + 10}, step = 0.1 }}\n"
                            for axis, first in (("lon", 10), ("lat", 40)))
NAME, SPOOL = "tas_run_mesh", "work/tas-run-mesh.spool"


def digest(path):
    with open(path, "rb") as file:
        return hashlib.sha256(file.read()).hexdigest()


def digests(folder):
    """SHA-256 of the product and its ledger."""
    return [digest(folder("out", NAME + end)) for end in (".nc", ".ledger.json")]


def times(folder):
    return {name: os.stat(folder(name)).st_mtime_ns for name in folder.left("out", "work")}


def finish(folder, *words):
    done = folder.run("run", "job.toml", *words)
    assert done.returncode == 0, (words, done.returncode, done.stderr)
    assert not [name for name in folder.left("out", "work") if name.endswith((".part", ".spool", "lease"))]
    return done.stdout


def forget(folder):
    """Removes product and ledger, so that the next run makes them again."""
    for end in (".nc", ".ledger.json"):
        with contextlib.suppress(FileNotFoundError):
            os.remove(folder("out", NAME + end))


def size(path):
    return os.path.getsize(path) if os.path.exists(path) else 0


def stop(folder, when, how):
    """Starts a run and stops it by signal `how` once `when()` holds; its status and the seconds it took to end. On a
    busy machine a run may be over before this process is awake: then once more from the start."""
    for _ in range(5):
        process = folder.start("run", "job.toml", "--threads", "2")
        end = time.monotonic() + PATIENCE_S
        while process.poll() is None and not when():
            assert time.monotonic() < end, "the run neither ends nor comes to the point where it is to be stopped"
            time.sleep(0.002)
        sent = time.monotonic()
        process.send_signal(how)
        status = process.wait(PATIENCE_S)
        if status != 0:
            return status, time.monotonic() - sent
        forget(folder)
    raise AssertionError("five runs ended before they could be stopped")


def spooled(folder, bytes_):
    return lambda: size(folder(SPOOL)) >= bytes_


def check_signals(folder, whole, expected):
    at_once, midway = (lambda: os.path.exists(folder("work/lease"))), spooled(folder, 0.3 * whole)
    for how, when in ((signal.SIGTERM, at_once), (signal.SIGTERM, midway), (signal.SIGINT, midway)):
        forget(folder)
        status, seconds = stop(folder, when, how)
        assert status == 75 and seconds < STOP_S, (how, status, seconds)
        assert folder.left() == [], folder.left()
        assert "work/lease" not in folder.left("work")
        finish(folder)
        assert digests(folder) == expected, how
        print(f"{how.name}: status 75 after {seconds:.2f} s; gone on with, the same bytes")


def check_kills(folder, whole, expected):
    """Five kills of one job, each going on from the one before; the last one while the product is written."""
    forget(folder)
    shares = sorted(KILLS.random() * 0.9 for _ in range(4))
    for share in shares:
        assert stop(folder, spooled(folder, share * whole), signal.SIGKILL)[0] == -signal.SIGKILL
        assert size(folder(SPOOL)) > 0 and folder.left() == [], folder.left()
    stop(folder, lambda: folder.left() != [], signal.SIGKILL)
    if os.path.exists(folder("out", NAME + ".nc")):  # killed after the rename, then
        assert digest(folder("out", NAME + ".nc")) == expected[0], "half a product under its name"
    finish(folder)
    assert digests(folder) == expected
    print("SIGKILL at " + ", ".join(f"{100 * share:.0f} %" for share in shares) + " and while writing: the same bytes")


def check_damage(folder, whole, expected):
    forget(folder)
    stop(folder, spooled(folder, 0.4 * whole), signal.SIGKILL)
    before = size(folder(SPOOL))
    with open(folder(SPOOL), "r+b") as spool:
        spool.seek(before - 100)
        spool.write(bytes(100))
        spool.write(KILLS.randbytes(5000))
    finish(folder)
    assert digests(folder) == expected, "a damaged spool"
    forget(folder)
    (name,) = [name for name in folder.left("work/maps")]
    with open(folder(name), "r+b") as file:
        whole_map = file.read()
        file.seek(len(whole_map) // 2)
        file.write(bytes([whole_map[len(whole_map) // 2] ^ 1]))
    finish(folder)
    assert digests(folder) == expected, "a damaged map"
    assert open(folder(name), "rb").read() == whole_map, "a damaged map was not made again"
    print("a damaged spool's tail and a damaged map are made again")


def check_idle(folder):
    """Nothing to do: under a second (the best of three, for machines that are busy) and no file is touched."""
    before, took = times(folder), []
    for _ in range(3):
        start = time.monotonic()
        assert "0 made, 1 current, 0 failed" in finish(folder)
        took.append(time.monotonic() - start)
    assert times(folder) == before
    assert min(took) < IDLE_S, took
    print(f"nothing to do: {min(took):.2f} s")


def attributes(thing):
    return {name: (np.asarray(thing.getncattr(name)).tolist(), type(thing.getncattr(name)))
            for name in thing.ncattrs()}


def assert_same_content(a, b):
    assert attributes(a) == attributes(b)
    assert {n: len(d) for n, d in a.dimensions.items()} == {n: len(d) for n, d in b.dimensions.items()}
    assert list(a.variables) == list(b.variables)
    for name in a.variables:
        one, other = a[name], b[name]
        one.set_auto_maskandscale(False), other.set_auto_maskandscale(False)
        assert one.dimensions == other.dimensions and one.dtype == other.dtype, name
        assert attributes(one) == attributes(other), name
        assert np.asarray(one[:]).tobytes() == np.asarray(other[:]).tobytes(), name


def check_tiles(folder):
    os.rename(folder("out"), folder("as_given"))
    for tile in ([365, 17, 50], [100, 100, 7]):
        finish(folder, "--set", f"output.tile={tile}")
        with netCDF4.Dataset(folder("as_given", NAME + ".nc")) as a, netCDF4.Dataset(folder("out", NAME + ".nc")) as b:
            assert b["tas"].chunking() == tile and a["tas"].chunking() != tile
            assert_same_content(a, b)
    print("tiles of two other shapes: the same values and attributes")


def check_threads(folder, expected):
    forget(folder)
    finish(folder, "--threads", "1")
    assert digests(folder) == expected, "one thread against two"
    made = []
    for threads in "12":
        finish(folder, "--threads", threads, "--set", "output.compression=deflate")
        made.append(digests(folder))
        forget(folder)
    assert made[0] == made[1] != expected, "one thread against two, deflated"
    print("one thread and two: the same bytes, deflated or not")


def check_appended_year(program):
    """A year more of input makes a product more and leaves the others alone."""
    with kit.Folder(program) as folder:
        folder.write("job.toml", kit.job(rest='[output]\nname = "{field}_{year}.nc"\n'))
        for year in (2001, 2002):
            kit.model(folder(f"in/tas_{year}.nc"), first_year=year, years=1, seed=year)
        assert "2 made, 0 current, 0 failed" in finish(folder)
        before = times(folder)
        kit.model(folder("in/tas_2003.nc"), first_year=2003, years=1, seed=2003)
        assert "1 made, 2 current, 0 failed" in finish(folder)
        after = times(folder)
        assert set(after) - set(before) >= {"out/tas_2003.nc", "out/tas_2003.ledger.json"}
        assert all(after[name] == before[name] for name in before if name.startswith("out/")), "old products touched"
        print("a year appended: one product made, two current")


def main(program):
    with kit.Folder(program) as folder:
        kit.model(folder("in/tas.nc"), years=4)
        kit.sites(folder("in/sites.csv"))
        kit.daily(folder("in/daily.csv"), years=4)
        # Uncompressed, so that the spool's size tells the share that is done.
        folder.write("job.toml", kit.job(field=kit.ADJUST, mesh=MESH,
                                         rest=kit.STATIONS + '[output]\ncompression = "none"\ntile = [365, 20, 20]\n'))
        finish(folder, "--threads", "2")
        expected, whole = digests(folder), CELLS * CELLS * 4 * 365 * 4
        assert os.path.getsize(folder("out", NAME + ".nc")) > whole
        check_idle(folder)
        check_threads(folder, expected)
        check_signals(folder, whole, expected)
        check_kills(folder, whole, expected)
        check_damage(folder, whole, expected)
        check_tiles(folder)
    check_appended_year(program)


if __name__ == "__main__":
    main(*sys.argv[1:])
