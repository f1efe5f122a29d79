#!/usr/bin/python3
"""Which module may include what, and the few other rules of the code's shape.

The table below is the only one; DEVELOPERS.md shows it (tests/layers.py --table prints it) and is compared with it.
Usage: layers.py [ROOT] | layers.py --table | layers.py --self-test
"""
import pathlib
import re
import sys
import tempfile

# layer, module, owns, modules it may include (base always), third-party headers only these modules may include
TABLE = [
    (0, "base", "errors, notices, exact sums, angles, cited constants", "", ""),
    (0, "os", "files, atomic replacement, processes, signals, the lease", "", ""),
    (1, "calendar", "CF calendars, time units, seasons", "", ""),
    (1, "units", "unit conversion; water flux to depth rate", "", "udunits2"),
    (1, "sphere", "points, circle arcs, clipping, area", "", ""),
    (1, "stats", "quantiles, moments, gamma fits, monotone regression", "", "boost-math"),
    (1, "codec", "shuffle, deflate, zstd, digests", "", "libdeflate zstd xxhash"),
    (1, "text", "CSV, near misses, numbers and durations", "", ""),
    (2, "mesh", "grids and meshes as cells with declared edges", "sphere codec", ""),
    (2, "linear_map", "sparse rows of pairings; knows no geometry and no file", "codec", ""),
    (2, "station", "sites, series, normals, quality rules", "calendar units text", ""),
    (3, "overlap", "cells x cells -> linear map", "mesh sphere linear_map", ""),
    (3, "reach", "stations x cells -> linear map", "mesh station stats linear_map", ""),
    (3, "adjust", "fits and evaluates transfers", "stats station calendar", ""),
    (3, "scores", "scores, intervals and verdicts of cross-validation", "stats calendar", ""),
    (3, "ensemble", "statistics over members, climatologies, warming levels", "stats calendar", ""),
    (4, "cf", "CF NetCDF of inputs and products", "calendar units codec text mesh", "netcdf hdf5"),
    (4, "geo", "rasters, polygons and CRS", "units text mesh", "gdal proj"),
    (5, "job", "job file -> validated JobSpec, with line and column", "text calendar units os", "toml++"),
    (5, "plan", "spec and summaries -> units of work, memory, staleness; no I/O", "job mesh calendar codec", ""),
    (6, "pipeline", "applies maps and transfers, spools finished tiles, resumes",
     "plan adjust reach overlap linear_map codec os", ""),
    (6, "report", "ledger and report", "stats", "nlohmann"),
    (7, "engine", "wires everything together",
     "os calendar units sphere stats codec text mesh linear_map station overlap reach adjust scores ensemble cf geo job "
     "plan pipeline report", "nlohmann"),
    (8, "cli", "arguments, printing, exit status", "engine os job text", "CLI11 nlohmann"),
]
# What departs from the table, each with its reason: (file, regular expression of what it may include, reason).
EXCEPTIONS = [
    ("src/pipeline/spool.cpp", r"(fcntl|unistd|sys/stat|sys/uio)\.h", "it reads and writes at places within one file"),
]
# Marks of a third-party library in an include line.
LIBRARIES = {
    "udunits2": r"udunits2?\.h",
    "libdeflate": r"libdeflate\.h",
    "zstd": r"zstd(_errors)?\.h",
    "xxhash": r"xxhash\.h",
    "netcdf": r"(netcdf.*\.h|nc[A-Z]\w*\.h|netcdf)",
    "hdf5": r"(hdf5|H5\w+)\.h",
    "gdal": r"(gdal\w*|ogr\w*|cpl_\w+|vrtdataset)\.h",
    "proj": r"proj(_.*|/.*)?\.h(pp)?",
    "boost-math": r"boost/math/.*",
    "toml++": r"(toml\+\+/)?toml\.h(pp)?",
    "nlohmann": r"nlohmann/.*",
    "CLI11": r"CLI/.*",
    "fmt": r"fmt/.*",
    "openmp": r"omp\.h",
    "intrinsics": r"\w+intrin\.h",
    "doctest": r"doctest/.*",
}
OPEN = ("fmt", "openmp", "intrinsics")  # to every .cpp file
STANDARD = set(
    """algorithm array atomic bit bitset cassert cctype cerrno cfenv cfloat charconv chrono cinttypes climits cmath
    compare complex concepts condition_variable csignal cstdarg cstddef cstdint cstdio cstdlib cstring ctime deque
    exception execution filesystem fstream functional future initializer_list iomanip iosfwd istream iterator limits
    list locale map memory memory_resource mutex new numbers numeric optional ostream queue random ranges ratio regex
    set shared_mutex source_location span sstream stack stdexcept stop_token streambuf string string_view
    system_error thread tuple type_traits typeindex typeinfo unordered_map unordered_set utility valarray variant
    vector version iostream""".split()
)
POSIX = re.compile(r"((sys|linux)/\w+|unistd|fcntl|glob|signal|sched|dirent|pthread|errno|time)\.h")
POSIX_OWNERS = {"os", "cli"}  # cli asks whether it writes to a terminal
PRINTS = re.compile(
    r"\bstd::(cout|cerr|clog|exit|quick_exit|abort|terminate|puts|printf)\b|\bfmt::(print|println)\b"
    r"|(?<![\w.>:])(printf|fprintf|puts|putchar|_exit|exit|abort)\s*\("
)
# A second signal must end the process at once, without unwinding.
MAY_END_THE_PROCESS = {"src/os/process.cpp", "src/os/signals.cpp"}
LONGEST, LONGEST_PUBLIC = 600, 300

LAYER = {row[1]: row[0] for row in TABLE}
ALLOWED = {row[1]: {row[1], "base", *row[3].split()} for row in TABLE}
OWNERS = {name: [row[1] for row in TABLE if name in row[4].split()] for row in TABLE for name in row[4].split()}


def markdown():
    lines = ["| layer | module | owns | may include (and `base`) | third-party headers |", "|---|---|---|---|---|"]
    for layer, module, owns, modules, libraries in TABLE:
        others = ", ".join(f"`{m}`" for m in modules.split())
        lines.append(f"| {layer} | `{module}` | {owns} | {others} | {', '.join(libraries.split())} |")
    lines += [f"\nException: `{file}` may include `{pattern}`: {reason}." for file, pattern, reason in EXCEPTIONS]
    return "\n".join(lines) + "\n"


STRING = r'R"(\w*)\(.*?\)\1"|"(?:\\.|[^"\\\n])*"|\'(?:\\.|[^\'\\\n])\''
COMMENT = r"//[^\n]*|/\*.*?\*/"


def without_comments(text, strings_too=False):
    """The text without comments (and string contents), line numbers kept."""
    blank = lambda m: "\n" * m.group(0).count("\n")
    keep = lambda m: blank(m) if strings_too or m.group(0).startswith("/") else m.group(0)
    return re.sub(STRING + "|" + COMMENT, keep, text, flags=re.S)


def check_include(file, module, public, target, complain):
    """One include of one file; `target` is what stands between the quotes or angles."""
    if any(file == name and re.fullmatch(pattern, target) for name, pattern, _ in EXCEPTIONS):
        return
    if (match := re.fullmatch(r"windrow/(\w+)/\w+\.h", target)):
        other = match.group(1)
        if other not in LAYER:
            complain(f"includes {target} of a module that the table does not have")
        elif other not in ALLOWED[module]:
            complain(f"module {module} may not include {target} (module {other})")
        return
    if target in STANDARD:
        return
    library = next((name for name, mark in LIBRARIES.items() if re.fullmatch(mark, target)), None)
    if library is None and POSIX.fullmatch(target):
        if module not in POSIX_OWNERS or public:
            complain(f"operating-system header {target} belongs to .cpp files of {' and '.join(sorted(POSIX_OWNERS))}")
    elif library is None:
        complain(f"includes {target}, which is neither standard, windrow's nor a library of the table")
    elif public or (library in OPEN and not file.endswith(".cpp")):
        complain(f"third-party header {target} belongs in a .cpp file")
    elif library not in OPEN and module not in OWNERS.get(library, []):
        complain(f"{target} ({library}) belongs to module {' or '.join(OWNERS.get(library, ['tests']))}")


def check_file(root, path, problems):
    file = path.relative_to(root).as_posix()
    text = path.read_text(encoding="utf-8")
    parts = path.relative_to(root).parts
    public = parts[0] == "include"
    lines = text.count("\n")
    limit = LONGEST_PUBLIC if public else LONGEST
    if lines > limit:
        problems.append(f"{file}: {lines} lines, at most {limit}")
    if parts[0] not in ("src", "include"):
        return
    module = parts[2] if public else parts[1]
    if module not in LAYER:
        problems.append(f"{file}: module {module} is not in the table")
        return
    code = zip(without_comments(text).split("\n"), without_comments(text, strings_too=True).split("\n"))
    for number, (line, bare) in enumerate(code, 1):
        complain = lambda what: problems.append(f"{file}:{number}: {what}")
        if (match := re.match(r'\s*#\s*include\s*(?:"([^"]+)"|<([^>]+)>)', line)):
            quoted, angled = match.groups()
            private = quoted and "/" not in quoted and not public and (root / "src" / module / quoted).exists()
            if not private:
                check_include(file, module, public, quoted or angled, complain)
        elif module != "cli" and file not in MAY_END_THE_PROCESS and (match := PRINTS.search(bare)):
            complain(f"'{match.group(0).strip('( ')}': only cli prints or exits")


def check_table(root, problems):
    for layer, module, _, modules, _ in TABLE:
        for other in modules.split():
            if LAYER[other] > layer or (LAYER[other] == layer and module in ALLOWED[other]):
                problems.append(f"table: {module} (layer {layer}) may not list {other} (layer {LAYER[other]})")
    cmake = (root / "CMakeLists.txt").read_text(encoding="utf-8")
    built = re.search(r"set\(WINDROW_ALL_MODULES\s+([^)]*)\)", cmake).group(1).split()
    if built != [row[1] for row in TABLE]:
        problems.append("CMakeLists.txt: WINDROW_ALL_MODULES and the table name other modules, or in another order")
    if markdown() not in (root / "DEVELOPERS.md").read_text(encoding="utf-8"):
        problems.append("DEVELOPERS.md: does not show the table as tests/layers.py --table prints it")


def check(root):
    problems = []
    check_table(root, problems)
    for folder in ("src", "include", "tests", "tools"):
        for path in sorted((root / folder).rglob("*")):
            if path.suffix in (".h", ".cpp", ".py") and path.is_file():
                check_file(root, path, problems)
    return problems


def self_test():
    """Each rule must catch a breach of it, and stay silent about a clean tree."""
    bad = {
        "src/sphere/a.cpp": ('#include "windrow/mesh/mesh.h"\n', "may not include"),
        "src/stats/b.cpp": ("#include <gdal_priv.h>\n", "belongs to module geo"),
        "src/stats/c.h": ("#include <fmt/format.h>\n", "belongs in a .cpp file"),
        "include/windrow/cf/d.h": ("#include <netcdf.h>\n", "belongs in a .cpp file"),
        "src/plan/e.cpp": ('void f() {\n  std::cout << "x";\n}\n', "only cli prints"),
        "src/plan/f.cpp": ("void f() { std::exit(3); }\n", "only cli prints"),
        "src/text/g.cpp": ("\n" * 601, "at most 600"),
        "include/windrow/text/h.h": ("\n" * 301, "at most 300"),
        "src/novel/i.cpp": ("", "not in the table"),
        "src/text/j.cpp": ("#include <boost/any.hpp>\n", "neither standard"),
        "src/text/k.cpp": ("#include <unistd.h>\n", "operating-system header"),
        "src/mesh/l.cpp": ('#include "../sphere/secret.h"\n', "neither standard"),
    }
    clean = {
        "src/mesh/ok.cpp": '#include "private.h"\n#include <vector>\n#include <fmt/format.h>\n'
        '#include "windrow/sphere/arc.h"  // why\n// std::cout in a comment\nconst char* text = "std::exit(1)";\n',
        "src/mesh/private.h": "",
        "src/cli/main.cpp": "#include <CLI/CLI.hpp>\nint main() { std::cout << 1; }\n",
    }
    with tempfile.TemporaryDirectory() as folder:
        root = pathlib.Path(folder)
        for name, text in {**{k: v[0] for k, v in bad.items()}, **clean}.items():
            (root / name).parent.mkdir(parents=True, exist_ok=True)
            (root / name).write_text(text)
        modules = " ".join(row[1] for row in TABLE)
        (root / "CMakeLists.txt").write_text(f"set(WINDROW_ALL_MODULES {modules})\n")
        (root / "DEVELOPERS.md").write_text(markdown())
        problems = check(root)
        (root / "DEVELOPERS.md").write_text(markdown().replace("sphere", "globe"))
        drift = check(root)
    missed = [name for name, (_, what) in bad.items() if not any(p.startswith(name) and what in p for p in problems)]
    false_alarms = [p for p in problems if p.split(":")[0] not in bad]
    if not any("DEVELOPERS.md" in p for p in drift):
        missed.append("DEVELOPERS.md")
    return [f"not caught: {name}" for name in missed] + [f"false alarm: {p}" for p in false_alarms]


def main(arguments):
    if arguments == ["--table"]:
        sys.stdout.write(markdown())
        return 0
    if arguments == ["--self-test"]:
        problems = self_test()
    else:
        problems = check(pathlib.Path(arguments[0]) if arguments else pathlib.Path(__file__).resolve().parents[1])
    print("\n".join(problems) or "layers: nothing to object to")
    return 1 if problems else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
