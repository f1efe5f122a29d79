"""The list of wrong inputs, what each is made from, and the check of one. The cases are in wrong_*.py beside this."""
import os
import re

import kit

CASES = []

# Figures that depend on the libraries or the machine.
VARYING = [(r"the header asks for \d+", "the header asks for SIZE"), (r"at least \d+ MiB", "at least SIZE"),
           (r"process \d+ on \S+;", "process PID on HOST;"), (r"[\d.]+ MB are free", "SIZE are free")]


def case(name, status, told):
    """Registers a function that prepares a folder and returns the command's words (default: run job.toml), and words to
    put before the program."""
    def register(prepare):
        CASES.append((name, status, told, prepare))
        return prepare
    return register


def regrid(folder, **settings):
    """A job of regridding with its model file."""
    kit.model(folder("in/tas.nc"))
    folder.write("job.toml", kit.job(**settings))


def adjust(folder, **settings):
    """A job of quantile mapping with its model and station files."""
    kit.model(folder("in/tas.nc"))
    kit.sites(folder("in/sites.csv"))
    kit.daily(folder("in/daily.csv"))
    folder.write("job.toml", kit.job(**{"field": kit.ADJUST, "rest": kit.STATIONS, **settings}))


def failure(folder, prepared, status, told):
    """Runs the program in a prepared folder and removes it; what differs from what is expected, in words, empty when
    nothing does."""
    with folder:
        words, before = prepared if isinstance(prepared, tuple) else (prepared or ["run", "job.toml"], [])
        done = folder.run(*words, before=before)
        for pattern, placeholder in VARYING:
            done.stderr = re.sub(pattern, placeholder, done.stderr)
        found = ""
        if done.returncode != status:
            found += f"status {done.returncode}, expected {status}\n"
        if done.stderr != told:
            found += f"said\n{done.stderr}expected\n{told}"
        if sum(line.startswith("windrow: ") for line in done.stderr.splitlines()) != 1:
            found += "not exactly one line of error\n"
        outputs = [name for top in ("out", "disk/out") if os.path.isdir(folder(top)) for name in folder.left(top)]
        temporaries = [name for name in folder.left("") if name.endswith(".part")]
        if outputs or temporaries:
            found += f"left behind: {outputs + temporaries}\n"
        return found
