"""The schemas that the command prints, against an implementation of JSON Schema that knows nothing of this project: shipped
files pass; broken ones fail, and the command's own reader refuses the same; and every key of the table is held to its range,
type and kind.

usage: schema.py SOURCE SLIPBENCH
"""
import json
import pathlib
import re
import subprocess
import sys
import tempfile
import tomllib

from jsonschema import Draft7Validator

source, slipbench = pathlib.Path(sys.argv[1]).resolve(), sys.argv[2]
failures = []

BASE = """
format = 1
title = "Base, data invented"
seed = 3
[run]
duration_s = 0.2
plant_step_s = 50e-6
control_period_s = 100e-6
trace_period_s = 1e-3
[machine]
pole_pairs = 2
stator_resistance_ohm = 1.6
rotor_resistance_ohm = 1.25
stator_leakage_H = 6.2e-3
rotor_leakage_H = 6.2e-3
magnetizing_inductance_H = 0.172
rated_power_W = 4000
rated_line_voltage_V = 400.0
rated_current_A = 7.85
rated_frequency_Hz = 50.0
rated_speed_rpm = 1440.0
[shaft]
inertia_kgm2 = 0.02
[[load]]
kind = "profile"
torque_Nm = [[0.0, 0.0], [0.1, 10.0]]
[[load]]
kind = "fan"
rated_torque_Nm = 4
rated_speed_rpm = 1440
[supply]
kind = "inverter"
dc_link_V = 560.0
[sensors.current]
offset_A = [0.1, 0.0, -0.1]
[sensors.speed]
kind = "encoder"
lines_per_rev = 512
[reference]
speed_rpm = [[0.0, 0.0], [0.1, 500.0]]
[controller]
kind = "rotor_flux_oriented"
dead_time_compensation = false
[[estimator]]
name = "ekf"
kind = "extended_kalman"
load_torque = true
[belief]
rotor_resistance = 0.8
"""

# What is changed into what, and the key at which it breaks.
BROKEN = [
    ("unknown key", "seed = 3", "sead = 3"),
    ("unknown key in a table", "inertia_kgm2 = 0.02", "inertia_kgm2 = 0.02\ninertia = 1.0"),
    ("unknown table", "[belief]", "[believe]"),
    ("unknown list", "[belief]", "[[loads]]\nkind = \"fan\"\n[belief]"),
    ("text for a number", "dc_link_V = 560.0", "dc_link_V = \"560\""),
    ("truth for a number", "dc_link_V = 560.0", "dc_link_V = true"),
    ("number for a text", "title = \"Base, data invented\"", "title = 5"),
    ("fraction for a whole number", "pole_pairs = 2", "pole_pairs = 2.5"),
    ("number for a truth", "dead_time_compensation = false", "dead_time_compensation = 0"),
    ("fraction for a method's truth", "load_torque = true", "load_torque = 0.5"),
    ("number for knots", "torque_Nm = [[0.0, 0.0], [0.1, 10.0]]", "torque_Nm = 10.0"),
    ("no knots", "torque_Nm = [[0.0, 0.0], [0.1, 10.0]]", "torque_Nm = []"),
    ("a knot of three", "torque_Nm = [[0.0, 0.0], [0.1, 10.0]]", "torque_Nm = [[0.0, 0.0, 0.0]]"),
    ("two of three", "offset_A = [0.1, 0.0, -0.1]", "offset_A = [0.1, 0.0]"),
    ("table for a list of tables", "[[estimator]]", "[estimator]"),
    ("list of tables for a table", "[supply]", "[[supply]]"),
    ("zero where it is excluded", "inertia_kgm2 = 0.02", "inertia_kgm2 = 0.0"),
    ("above the range", "pole_pairs = 2", "pole_pairs = 101"),
    ("below the range, in a knot", "[0.1, 500.0]", "[0.1, -2e6]"),
    ("below the range", "seed = 3", "seed = -3"),
    ("another version", "format = 1", "format = 2"),
    ("no such word", "kind = \"extended_kalman\"", "kind = \"extended_calman\""),
    ("no such word of a selector", "kind = \"encoder\"", "kind = \"coder\""),
    ("key of another kind", "dc_link_V = 560.0", "dc_link_V = 560.0\nfrequency_Hz = 50.0"),
    ("key of another kind in a list", "rated_torque_Nm = 4", "rated_torque_Nm = 4\ntorque_Nm = 4"),
    ("the form of another kind", "kind = \"profile\"", "kind = \"constant_torque\""),
    ("key of another circuit", "pole_pairs = 2", "pole_pairs = 2\ncircuit = \"gamma\""),
    ("setting of another method", "load_torque = true", "adaptation_bandwidth_Hz = 60.0"),
    ("missing key", "rated_power_W = 4000", ""),
    ("missing key of a kind", "dc_link_V = 560.0", ""),
    ("missing key in a list", "name = \"ekf\"", ""),
    ("missing key of the circuit taken without a word", "stator_leakage_H = 6.2e-3", ""),
    ("missing selector", "kind = \"fan\"", ""),
    ("missing table", "[shaft]\ninertia_kgm2 = 0.02", ""),
]
SYSTEM = """
format = 1
[system]
A = [[0.0, 1.0], [-4.0, -0.5]]
B = [[0.0], [2.0]]
C = [[1.0, 0.0]]
states = ["angle", "speed"]
sample_period_s = 0.1
[design]
kind = "place"
poles = [[0.5, 0.1], [0.5, -0.1]]
faster_than_controller = 2.0
"""
BROKEN_SYSTEM = [
    ("unknown key", "C = [[1.0, 0.0]]", "C = [[1.0, 0.0]]\nF = [[1.0]]"),
    ("unknown table", "[design]", "[designs]"),
    ("no A", "A = [[0.0, 1.0], [-4.0, -0.5]]", ""),
    ("text in A", "-4.0", "\"-4.0\""),
    ("flat B", "[[0.0], [2.0]]", "[0.0, 2.0]"),
    ("huge number", "-4.0", "-4e200"),
    ("name twice", "\"angle\", \"speed\"", "\"angle\", \"angle\""),
    ("empty name", "\"angle\"", "\"\""),
    ("no period", "sample_period_s = 0.1", "sample_period_s = 0"),
    ("unknown kind", "\"place\"", "\"palce\""),
    ("no kind", "kind = \"place\"", ""),
    ("key of another kind", "kind = \"place\"", "kind = \"place\"\nQ = [[1.0]]"),
    ("pole of three", "[0.5, 0.1]", "[0.5, 0.1, 0.0]"),
    ("factor of zero", "faster_than_controller = 2.0", "faster_than_controller = 0.0"),
    ("another version", "format = 1", "format = 2"),
]
BROKEN_MACHINE = [
    ("unknown key", "pole_pairs = 2", "pole_pairs = 2\npoles = 4"),
    ("a scenario's table", "[machine]", "[shaft]\ninertia_kgm2 = 0.02\n[machine]"),
    ("names another file", "pole_pairs = 2", "pole_pairs = 2\nfile = \"x.toml\""),
    ("missing key", "rated_current_A = 7.85", ""),
    ("missing leakage", "rotor_leakage_H = 6.2e-3", ""),
    ("number for its title", "format = 1", "format = 1\ntitle = 4"),
    ("zero resistance", "stator_resistance_ohm = 1.6", "stator_resistance_ohm = 0"),
]


def check(what, holds, seen=""):
    if not holds:
        failures.append(what)
        print(f"FAILED: {what}\n  saw: {seen}")


def output(*arguments):
    return json.loads(subprocess.run([slipbench, "check", *arguments], capture_output=True, text=True, check=True).stdout)


def validator(kind):
    schema = output("--schema", kind)
    Draft7Validator.check_schema(schema)
    return Draft7Validator(schema)


def broken(schema, text, table, folder, kind):
    check(f"{kind}: the base is valid", schema.is_valid(tomllib.loads(text)), list(schema.iter_errors(tomllib.loads(text))))
    for number, (what, old, new) in enumerate([("the base", "", "")] + table):
        check(f"{kind}, {what}: stands in the base", old in text, old)
        changed = text.replace(old, new, 1)
        file = folder / f"{kind}{number}.toml"
        file.write_text(changed)
        read = subprocess.run([slipbench, "check", file], capture_output=True, text=True)
        check(f"{kind}, {what}: the reader", read.returncode == (2 if number else 0), read.stderr)
        if number:
            check(f"{kind}, {what}: the schema refuses it", not schema.is_valid(tomllib.loads(changed)))


def values(key):
    """(good, bad) values of a key, from what `check --keys` says of it."""
    low, high = key["minimum"], key["maximum"]
    if key["type"] == "truth":
        return [True, False], ["yes", 3]
    if key["type"] == "text":
        return key["words"] or ["any text"], (["no such word"] if key["words"] else []) + [4, True, ["x"]]
    good = [x for x in (high,) if x is not None] or [1 if low is None else low + 1]
    bad = ["1", True] + [x + 1 for x in (high,) if x is not None] + [x - 1 for x in (low,) if x is not None]
    if key["default"] is not None and not isinstance(key["default"], list):
        good.append(key["default"])
    if low is not None:
        (bad if key["minimum_excluded"] else good).append(low)
    if key["type"] == "whole":
        bad.append(good[0] + 0.5)
    if key["type"] == "knots":
        return [[[0.0, x]] for x in good], [[[0.0, x]] for x in bad] + [[], [[0.0]], good[0]]
    if key["type"] == "triple":
        return [[x, good[0], good[0]] for x in good], [[good[0], x, good[0]] for x in bad] + [[good[0]], good[0]]
    if key["type"] == "list":
        return [[x, good[0]] for x in good], [[good[0], x] for x in bad] + [[], good[0], [[good[0]]]]
    if key["type"] == "matrices":
        return [[[[x, good[0]]]] for x in good], [[[[good[0], x]]] for x in bad] + [[], [[]], [[good[0]]], good[0]]
    return good, bad + [[good[0]]]


def complaints(schema, section, entries, name):
    """What the schema says of one key, in a document that holds nothing but its section. Some versions leave the key out of
    the path where its schema is plainly false: the value stands for it."""
    document = entries
    for part in reversed(section["section"].replace("[]", "").split(".") if section["section"] else []):
        document = {part: [document] if section["list"] else document}
    return [error for error in schema.iter_errors(document) if name in error.absolute_path
            or (error.validator is None and error.instance == entries[name])
            or (error.validator == "additionalProperties" and f"'{name}'" in error.message)]


def every_key(schema):
    table = output("--keys", "--json")
    sections = {section["section"]: section for section in table["sections"]}
    words = {key["key"]: key["words"] for key in table["keys"]}
    tried = 0
    for key in table["keys"]:
        section, name = sections[key["section"]], key["key"].split(".")[-1]
        kinds = [{selector: word} for selector, chosen in (key["when"] or {"": [""]}).items() for word in chosen]
        for kind in kinds:
            chosen = {k: v for k, v in kind.items() if k}
            good, bad = values(key)
            for value in good:
                check(f"{key['key']} = {value!r} {chosen}", not complaints(schema, section, chosen | {name: value}, name),
                      complaints(schema, section, chosen | {name: value}, name))
            for value in bad:
                check(f"{key['key']} = {value!r} {chosen} is refused", complaints(schema, section, chosen | {name: value}, name))
            tried += len(good) + len(bad)
        if key["when"]:
            selector = section["selector"]
            here = {w for other in table["keys"] if other["key"] == key["key"] for w in (other["when"] or {}).get(selector, [])}
            for word in set(words[f"{key['section']}.{selector}"]) - here:
                check(f"{key['key']} with {selector} = {word} is refused",
                      complaints(schema, section, {selector: word, name: values(key)[0][0]}, name))
    for section in sections.values():
        check(f"[{section['section']}]: an unknown key", complaints(schema, section, {"no_such_key": 1}, "no_such_key"))
    return tried


scenario, machine, system = validator("scenario"), validator("machine"), validator("system")
shipped = 0
for folder, schema in (("scenarios", scenario), ("machines", machine), ("systems", system)):
    for file in sorted((source / "configs" / folder).glob("*.toml")):
        errors = [error.message for error in schema.iter_errors(tomllib.loads(file.read_text()))]
        check(f"{file.name} is valid", not errors, errors)
        shipped += 1
check("files are shipped", shipped >= 8, shipped)
with tempfile.TemporaryDirectory() as name:
    broken(scenario, BASE, BROKEN, pathlib.Path(name), "scenario")
    plate = "format = 1\n" + re.search(r"\[machine\].*?(?=\[shaft\])", BASE, re.S).group()
    broken(machine, plate, BROKEN_MACHINE, pathlib.Path(name), "machine")
    broken(system, SYSTEM, BROKEN_SYSTEM, pathlib.Path(name), "system")
    with_file = re.sub(r"(?s)\[machine\].*?(?=\[shaft\])", '[machine]\nfile = "m.toml"\ntotal_leakage_H = 0.01\n', BASE)
    check("a machine file may give the rest, and its circuit", scenario.is_valid(tomllib.loads(with_file)))
tried = every_key(scenario)
print(f"{shipped} shipped files, {len(BROKEN) + len(BROKEN_MACHINE) + len(BROKEN_SYSTEM)} broken ones, {tried} values of keys; {len(failures)} failed")
sys.exit(1 if failures or tried < 500 else 0)
