"""Installs into a scratch prefix and uses the installation as a stranger would: builds the project in tests/outside and the
samples of README.md there, runs them, and compares digests with the installed command's.

usage: outside.py SOURCE BUILD SCRATCH CMAKE CXX
"""
import json
import pathlib
import re
import shutil
import subprocess
import sys

source, build, scratch = (pathlib.Path(a).resolve() for a in sys.argv[1:4])
cmake, compiler = sys.argv[4:6]
prefix = scratch / "prefix"
failures = []


def check(holds, what):
    print(("ok    " if holds else "FAILED ") + what)
    if not holds:
        failures.append(what)


def run(*words, status=0):
    result = subprocess.run([str(w) for w in words], capture_output=True, text=True, cwd=scratch)
    if result.returncode != status:
        sys.exit(f"{' '.join(map(str, words))}\ngave {result.returncode}, wanted was {status}\n{result.stdout}{result.stderr}")
    return result


def built(project):
    """Configures and builds a project against the prefix; its compiler may read nothing of the source tree."""
    out = project.with_name(project.name + "-build")
    run(cmake, "-S", project, "-B", out, "-G", "Ninja", f"-Dslipbench_ROOT={prefix}", f"-DCMAKE_CXX_COMPILER={compiler}",
        "-DCMAKE_BUILD_TYPE=Release", "-DCMAKE_EXPORT_COMPILE_COMMANDS=ON", "-DCMAKE_FIND_USE_PACKAGE_REGISTRY=OFF")
    run(cmake, "--build", out)
    read = re.findall(r"^ +(/\S+)", run("ninja", "-C", out, "-t", "deps").stdout, re.M)
    ours = [r for r in read if source in pathlib.Path(r).parents and scratch not in pathlib.Path(r).parents]
    check(any(prefix in pathlib.Path(r).parents for r in read) and not ours,
          f"{project.name}: headers come from the installation alone {ours[:3]}")
    flags = (out / "compile_commands.json").read_text()
    check(all(f in flags for f in ("-ffp-contract=off", "-fno-math-errno", "-std=")), f"{project.name}: options came along")
    return out


def samples(document):
    text = document.read_text()
    found = {kind: re.findall(rf"```{kind}\n(.*?)```", text, re.S) for kind in ("cmake", "cpp")}
    if any(len(blocks) != 1 for blocks in found.values()):
        sys.exit(f"{document.name}: one cmake and one cpp sample are wanted: {({k: len(v) for k, v in found.items()})}")
    return found["cmake"][0], found["cpp"][0]


shutil.rmtree(scratch, ignore_errors=True)
scratch.mkdir(parents=True)
run(cmake, "--install", build, "--prefix", prefix)
command = prefix / "bin" / "slipbench"
scenario = prefix / "share/slipbench/configs/scenarios/conveyor_hot_rotor.toml"
wanted = json.loads(run(command, "run", scenario, "--json").stdout)

# The project that brings an estimator of its own.
project = scratch / "outside"
shutil.copytree(source / "tests" / "outside", project)
program = built(project) / "own_estimator"
said = run(program, scenario, "estimator.3.drift_corner_Hz=0.4").stdout
print(said)
digests = dict(re.findall(r"^digest (\w+) (\w{64})$", said, re.M))
for name, digest in wanted["digest"].items():
    check(digests.get(name) == digest, f"digest of {name} equals the command's")
check(len(digests) == len(wanted["digest"]) + 1 and "own" in digests, "one estimator more")
for name, figures in wanted["estimators"].items():
    row = re.search(rf"^{name} +\S+ +(\S+)", said, re.M)
    check(row and row.group(1) == f"{figures['speed_rmse_rpm']:.3f}", f"score of {name} equals the command's")
# Plausible, no more: under a tenth of the demo machine's 1440 rpm, where the scenario would call it lost.
check(0.0 < float(re.search(r"^own +voltage_model +(\S+) +never$", said, re.M).group(1)) < 144.0, "the own one is not lost")
refused = run(program, scenario, "estimator.3.drift_corner_Hz=50", status=2).stderr
check("estimator.3.drift_corner_Hz" in refused and "20" in refused, f"its settings have a range: {refused.strip()}")
check("drift_corner_Hz" in run(program, scenario, "estimator.3.drift_corne_Hz=1", status=2).stderr, "and a nearest name")

# The samples of the first page.
project = scratch / "readme"
project.mkdir()
for name, text in zip(("CMakeLists.txt", "main.cpp"), samples(source / "README.md")):
    (project / name).write_text(text)
said = run(built(project) / "drive_study", scenario).stdout
print(said)
check(all(re.search(rf"^{name}\b.*\d", said, re.M) for name in wanted["estimators"]), "README's sample names each estimator")
sys.exit(1 if failures else 0)
