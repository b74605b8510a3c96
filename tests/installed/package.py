"""Packs the build as a .deb, looks at its fields and files, unpacks it and runs the command from there.

usage: package.py SOURCE BUILD SCRATCH CPACK
"""
import json
import pathlib
import re
import shutil
import subprocess
import sys

source, build, scratch = (pathlib.Path(a).resolve() for a in sys.argv[1:4])
cpack = sys.argv[4]
failures = []


def check(holds, what):
    print(("ok    " if holds else "FAILED ") + what)
    if not holds:
        failures.append(what)


def output(*words):
    result = subprocess.run([str(w) for w in words], capture_output=True, text=True, cwd=scratch)
    if result.returncode != 0:
        sys.exit(f"{' '.join(map(str, words))}\ngave {result.returncode}\n{result.stdout}{result.stderr}")
    return result.stdout


shutil.rmtree(scratch, ignore_errors=True)
scratch.mkdir(parents=True)
output(cpack, "--config", build / "CPackConfig.cmake", "-B", scratch)
found = list(scratch.glob("*.deb"))
check(len(found) == 1, f"one package: {[f.name for f in found]}")
deb = found[0]

fields = dict(re.findall(r"^(\S+): (.*)$", output("dpkg-deb", "--field", deb), re.M))
version = re.search(r"project\(slipbench VERSION (\S+)", (source / "CMakeLists.txt").read_text()).group(1)
check(fields["Package"] == "slipbench" and fields["Version"] == version, f"name and version {version}")
check(fields["Architecture"] == output("dpkg", "--print-architecture").strip(), "architecture is this one's")
check(re.search(r"\blibc6 \(>= 2\.\d+\)", fields["Depends"]) and "libstdc++6" in fields["Depends"],
      f"depends on the libraries it was linked with: {fields['Depends']}")
check("-dev" not in fields["Depends"], "none of them a development package")

# Lines of `dpkg-deb -c`: mode, owner/group, size, date, time, ./path
lines = [line.split(None, 5) for line in output("dpkg-deb", "--contents", deb).splitlines()]
check(all(line[1] == "root/root" for line in lines), "all is root's")
check(all(line[0][8] != "w" for line in lines if line[0][0] != "l"), "nothing is for all to write")
files = {line[5].split(" -> ")[0] for line in lines if not line[5].endswith("/")}
outside = sorted(f for f in files if not f.startswith("./usr/"))
check(not outside, f"nothing outside usr/ {outside[:5]}")

headers = {f"./usr/include/slipbench/{p.relative_to(source)}" for folder in ("plant", "estimators", "controllers", "sim")
           for p in (source / folder).rglob("*.h*")}
configs = {f"./usr/share/slipbench/{p.relative_to(source)}" for p in (source / "configs").rglob("*") if p.is_file()}
check(len(headers) > 50 and headers <= files, f"all {len(headers)} headers {sorted(headers - files)[:5]}")
check(len(configs) > 5 and configs <= files, f"all {len(configs)} files of configs/ {sorted(configs - files)[:5]}")
known = re.compile(r"\./usr/(bin/slipbench|lib/libslipbench_[a-z_]+\.a|lib/cmake/slipbench/slipbench(Config|Targets)[\w-]*\.cmake|"
                   r"share/doc/slipbench/(README\.md|LICENSE|copyright|sim/(stream|board)/README\.md)|libexec/slipbench/board_(host|semihosting\.elf|uart\.elf)|share/man/man\d/slipbench[\w-]*\.\d(\.gz)?|"
                   r"share/(bash-completion/completions/slipbench|zsh/(site-functions|vendor-completions)/_slipbench))")
rest = files - headers - configs
strange = sorted(f for f in rest if not known.fullmatch(f))
check(not strange, f"nothing unexpected {strange[:5]}")
check({"./usr/bin/slipbench", "./usr/share/doc/slipbench/copyright", "./usr/share/doc/slipbench/sim/stream/README.md",
       "./usr/lib/libslipbench_engine.a", "./usr/lib/cmake/slipbench/slipbenchConfig.cmake"} <= rest, "command, licence, libraries and package for CMake")

tree = scratch / "tree"
output("dpkg-deb", "--extract", deb, tree)
command = tree / "usr/bin/slipbench"
scenario = tree / "usr/share/slipbench/configs/scenarios/conveyor_hot_rotor.toml"
check(output(command, "--version").split() == ["slipbench", version], "unpacked, the command tells its version")
unpacked = json.loads(output(command, "run", scenario, "--json"))
built = json.loads(output(build / "tools/slipbench/slipbench", "run", scenario, "--json"))
check(unpacked["digest"] == built["digest"], "and runs a shipped scenario to the same bits as the build's")
driven = json.loads(output(command, "board", scenario.parent / "board_conveyor.toml", "--lock-step", "--link", "host", "--set", "run.duration_s=0.1",
                           "--set", "score.from_s=0.0", "--json"))
check(driven["board"]["answers"] == 1001, "and the firmware that came along closes a loop")
check("qualified people" in (tree / "usr/share/doc/slipbench/README.md").read_text(), "the cautions came along")
sys.exit(1 if failures else 0)
