"""schema_test.py PROGRAM SOURCE_DIR: what every verb writes as JSON, over every cell, against
docs/schema (JSON Schema 2020-12). Ends with 77 where python3-jsonschema is not installed."""
import copy
import glob
import json
import os
import subprocess
import sys
import tempfile

try:
    import jsonschema
except ImportError:
    print("skipped: python3-jsonschema is not installed")
    sys.exit(77)

program, source = sys.argv[1], sys.argv[2]
failures = 0
with open(os.path.join(source, "docs", "schema", "ampstead.schema.json"), encoding="utf-8") as file:
    schema = json.load(file)
jsonschema.Draft202012Validator.check_schema(schema)
validator = jsonschema.Draft202012Validator(schema)
seen = set()


def fail(what):
    global failures
    failures += 1
    print("FAILED:", what)


def run(*arguments):
    done = subprocess.run([program, *arguments, "--json"], stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    if done.returncode not in (0, 1, 3):
        fail("status %d: %s" % (done.returncode, " ".join(arguments)))
        return None
    data = json.loads(done.stdout)
    seen.add(data["command"])
    for error in validator.iter_errors(data):
        fail("%s: %s: %s" % (" ".join(arguments), error.json_path, error.message[:200]))
    return data


data = None
for cell in sorted(glob.glob(os.path.join(source, "netlists", "*.cell"))):
    data = run("review", cell)
    for verb in ("point", "sweep", "models"):
        run(verb, cell)
for name in ("beta_multiplier", "mirror", "bandgap"):
    run("states", os.path.join(source, "netlists", name + ".cell"), "--boxes", "2000")
run("point", os.path.join(source, "netlists", "mirror.cell"), "--certify")
run("point", os.path.join(source, "netlists", "mirror.cell"), "--view", "hand", "--corner", "slow")
for process in glob.glob(os.path.join(source, "models", "*.process")):
    run("models", process)
with tempfile.TemporaryDirectory() as work:
    never = os.path.join(work, "never.cell")
    with open(never, "w", encoding="utf-8") as file:
        file.write("rail vcc 1 V\ncurrent I vcc -> x 1 uA\n"
                   "law L x -> gnd i = 1 nA * (1 + sqrt((x.v / 1 V)^2)) / (1 + sqrt((x.v / 1 V)^2))\n")
    if run("review", never)["verdict"] != "unsolved":
        fail("an unsolved cell")

# every verb that the program's own tables give --json has its definition
listed = set(schema["properties"]["command"]["enum"])
if seen != listed:
    fail("verbs of the schema %r, seen %r" % (sorted(listed), sorted(seen)))
text = subprocess.run([program, "help"], stdout=subprocess.PIPE, text=True).stdout
verbs = [line.split()[0] for line in text.split("Verbs:\n")[1].split("\n\n")[0].split("\n")
         if line.startswith("  ") and not line.startswith("   ")]
for verb in verbs:
    shown = subprocess.run([program, "help", verb], stdout=subprocess.PIPE, text=True).stdout
    if "--json" in shown and verb != "help" and verb not in listed:
        fail("the schema lacks the verb " + verb)

# the schema can refuse: a wrong type, an unknown key, a missing key
for change in (lambda d: d.update(temperature="warm"), lambda d: d.update(extra=1),
               lambda d: d.pop("solver"), lambda d: d.update(command="dance")):
    wrong = copy.deepcopy(data)
    change(wrong)
    if validator.is_valid(wrong):
        fail("the schema takes anything")
print("%d failures" % failures if failures else "all verbs agree with the schema")
sys.exit(1 if failures else 0)
