#!/usr/bin/env python3
"""gate.py BUILD_DIR: how much of language, circuit, devices and numerics the tests reach.

Fails when a line is not reached that exceptions.txt does not excuse, when fewer than 95 % of the
branches of a layer are taken, or when an excuse is no longer needed. Reads what gcovr measured.
"""
import json
import pathlib
import subprocess
import sys

ROOT = pathlib.Path(__file__).resolve().parents[2]
LAYERS = ["language", "circuit", "devices", "numerics"]
LEAST_BRANCHES = 0.95


def read_exceptions():
    """{(file, text of the line): reason}"""
    excuses = {}
    for line in (ROOT / "tests/coverage/exceptions.txt").read_text().splitlines():
        if line.strip() and not line.startswith("#"):
            file, text, reason = (part.strip() for part in line.split(" | "))
            excuses[(file, text)] = reason
    return excuses


def measure(build, layer):
    report = subprocess.run(
        ["gcovr", "-r", str(ROOT), "--json", "-f", f"{ROOT}/src/{layer}/.*",
         # gcovr 5.2 cannot merge a function that stands on two lines, one for lanes
         "-e", ".*/devices/real\\.h",
         "--object-directory", str(build / "src" / layer), str(build / "src" / layer)],
        stdout=subprocess.PIPE, text=True, check=True, cwd=build).stdout
    return json.loads(report)["files"]


def main():
    build = pathlib.Path(sys.argv[1]).resolve()
    excuses = read_exceptions()
    used = set()
    failed = False
    for layer in LAYERS:
        lines = reached = branches = taken = excused = 0
        for file in measure(build, layer):
            source = (ROOT / file["file"]).read_text().splitlines()
            for line in file["lines"]:
                if line.get("gcovr/noncode"):
                    continue
                lines += 1
                counted = line.get("branches", [])
                branches += len(counted)
                taken += sum(branch["count"] > 0 for branch in counted)
                if line["count"] > 0:
                    reached += 1
                    continue
                key = (file["file"], source[line["line_number"] - 1].strip())
                if key in excuses:
                    used.add(key)
                    excused += 1
                else:
                    failed = True
                    print(f"not reached: {key[0]}:{line['line_number']}: {key[1]}")
        share = taken / branches
        print(f"{layer}: {reached} of {lines} lines, {excused} excused; "
              f"{100 * share:.1f} % of {branches} branches")
        if share < LEAST_BRANCHES:
            failed = True
            print(f"{layer}: fewer than {100 * LEAST_BRANCHES:.0f} % of the branches are taken")
    for key in set(excuses) - used:
        failed = True
        print(f"no longer needed: {key[0]} | {key[1]}")
    return 1 if failed else 0


sys.exit(main())
