#!/usr/bin/python3
"""Wrong inputs give one clear line, the right exit status, and leave nothing behind.

Usage: wrong_inputs.py WINDROW [NAME...]. Each case is a folder of tiny inputs with one thing wrong; standard error is
compared word for word, with the folder as FOLDER. Statuses are those of sysexits(3): 64 command line, 65 input data,
66 input missing, 73 cannot create output, 74 input/output, 75 interrupted or held, 78 job file.
"""
import sys
from concurrent.futures import ThreadPoolExecutor

import cases
import kit
import wrong_files  # noqa: F401, registers its cases
import wrong_grids  # noqa: F401
import wrong_jobs  # noqa: F401


def main(program, *names):
    chosen = [case for case in cases.CASES if not names or case[0] in names]
    checks, failed = [], 0
    with ThreadPoolExecutor(4) as pool:
        for name, status, told, prepare in chosen:  # inputs are written by one thread, as the netCDF library wants
            folder = kit.Folder(program)
            try:
                checks.append((name, pool.submit(cases.failure, folder, prepare(folder), status, told)))
            except kit.Skip as reason:
                folder.remove()
                print(f"{name}: skipped, {reason}")
        for name, check in checks:
            if found := check.result():
                print(f"=== {name}: {found}")
                failed += 1
    print(f"{len(checks)} wrong inputs, {failed} not as expected")
    return failed or not checks


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]) != 0)
