"""schema_test.py PROGRAM SOURCE_DIR: what every verb writes as JSON, over every cell, against
docs/schema (JSON Schema 2020-12). Ends with 77 where python3-jsonschema is not installed."""
import copy
import glob
import json
import math
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
everything = os.path.join(source, "tests", "faults", "everything.cell")
for cell in [everything] + [os.path.join(source, "netlists", name + ".cell")
                            for name in ("mirror", "bandgap", "widlar_mos")]:
    data_of = {verb: run(verb, cell, *options) for verb, options in (
        ("explain", ()), ("sensitivity", ()), ("spread", ("--samples", "40")))}
    if not data_of["sensitivity"].get("sensitivities") or "samples" not in data_of["spread"]:
        fail("no sensitivities or no samples: " + cell)
if not run("size", everything).get("choices"):
    fail("no choices")
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
    half = os.path.join(work, "half.cell")
    with open(half, "w", encoding="utf-8") as file:
        file.write("rail v 3 V\nresistor RA v -> mid 10k\nresistor RB mid -> gnd 5k\n"
                   "choose RB from 1k to 15k so mid.v = 1.2 V\n")
    if "E96" not in run("size", half)["choices"]["RB"].get("preferred", {}):
        fail("no preferred values")

# measured curves of our own making: a diode of 10 fA, a square law with a smooth foot, a resistor
with tempfile.TemporaryDirectory() as work:
    def curves(name, lines):
        path = os.path.join(work, name)
        with open(path, "w", encoding="utf-8") as file:
            file.write("\n".join(lines) + "\n")
        return path

    def foot(v):
        return 0.05 * math.log1p(math.exp(v / 0.05))

    diode = curves("diode.csv", ["v,i"] + ["%.10g,%.10g" % (v, 1e-14 * math.expm1(v / 0.0256926))
                                           for v in (0.3 + 0.01 * k for k in range(40))])
    square = curves("square.csv", ["vgs,vds,vsb,id"] + [
        "%.4g,%.4g,0,%.10g" % (g, d, 1e-4 * (foot(g - 0.5) ** 2 - foot(g - 0.5 - d) ** 2))
        for d in (0.1, 1.8) for g in (0.05 * k for k in range(37))])
    ohms = curves("ohms.csv", ["v,i"] + ["%.4g,%.10g" % (0.1 * k, 1e-5 * k) for k in range(1, 20)])
    run("calibrate", diode, "--kind", "diode")
    run("calibrate", ohms, "--kind", "resistor")
    fitted = run("calibrate", square, "--kind", "nmos", "--size", "10u/1u")
    if not fitted["devices"] or not fitted["models"][0]["parameters"]:
        fail("an empty calibration")

# every verb that the program's own tables give --json has its definition
listed = set(schema["properties"]["command"]["enum"])
if seen != listed:
    fail("verbs of the schema %r, seen %r" % (sorted(listed), sorted(seen)))
text = subprocess.run([program, "help"], stdout=subprocess.PIPE, text=True).stdout
verbs = [line.split()[0] for line in text.split("Verbs:\n")[1].split("\n\n")[0].split("\n")
         if line.startswith("  ") and not line.startswith("   ")]
for verb in verbs:
    shown = subprocess.run([program, "help", verb], stdout=subprocess.PIPE, text=True).stdout
    told = "spread" if verb == "merge" else verb  # a merged run is the whole run
    if "--json" in shown and verb != "help" and told not in listed:
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
