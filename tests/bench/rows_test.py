"""rows_test.py BENCH: ampstead-bench --quick --json is well formed and its peers agree.

Never a time: whether a goal is met is not asked here.
"""

import json
import subprocess
import sys

bench = sys.argv[1]
failures = 0


def check(good, what):
    global failures
    if not good:
        print("FAILED:", what)
        failures += 1


def number(value):
    return isinstance(value, (int, float)) and not isinstance(value, bool)


run = subprocess.run([bench, "--quick", "--json"], capture_output=True, text=True)
check(run.returncode == 0, f"exit status {run.returncode}: {run.stderr}")
report = json.loads(run.stdout)
check(report["quick"] is True and report["repeats"] == 3, "what was asked")
rows = {row["row"]: row for row in report["rows"]}
every = ["point", "iterate", "samples", "grow", "cores", "review", "tiny"]
for name in every:
    check(name in rows, f"row {name} is missing")
for name, row in rows.items():
    check("trouble" not in row, f"{name}: {row.get('trouble')}")
    check(number(row["ratio"]) and row["ratio"] > 0, f"{name}: ratio {row['ratio']}")
    check(row["direction"] in ("at most", "at least"), f"{name}: direction")
    ratio, goal = row["ratio"], row["goal"]
    if number(ratio) and abs(ratio - goal) > 1e-5 * goal:
        met = ratio < goal if row["direction"] == "at most" else ratio > goal
        check(row["met"] is met, f"{name}: met {row['met']}, ratio {ratio}, goal {goal}")
    check(row["agree"] is True, f"{name}: the answers differ by {row['difference']}")
    if row["difference"] is not None:
        check(row["difference"] <= row["allowed"] <= 1e-9, f"{name}: allowed {row['allowed']}")
    for key, figure in row["figures"].items():
        check(figure["value"] is None or number(figure["value"]), f"{name}: {key}")
for name in every:
    if name == "review":
        continue  # a process that does nothing gives no answer
    check(rows[name]["difference"] is not None, f"{name}: nothing was compared")

one = subprocess.run([bench, "tiny", "--quick"], capture_output=True, text=True)
check(one.returncode == 0 and one.stdout.startswith("tiny") and "point" not in one.stdout,
      "one row alone")
wrong = subprocess.run([bench, "speed"], capture_output=True, text=True)
check(wrong.returncode == 2 and "'speed'" in wrong.stderr, "an unknown row")
sys.exit(1 if failures else 0)
