"""tools/bench/compare from end to end: nothing found between a tree and itself, a planted slowdown found, misuse refused.

usage: test_compare.py SOURCE SCRATCH
"""
import json
import pathlib
import statistics
import subprocess
import sys

source, scratch = pathlib.Path(sys.argv[1]).resolve(), pathlib.Path(sys.argv[2]).resolve()
scratch.mkdir(parents=True, exist_ok=True)
times = scratch / "times.json"
failures = 0


def check(holds, what):
    global failures
    print(("ok    " if holds else "FAILED ") + what)
    failures += not holds


def compare(*words):
    result = subprocess.run([source / "tools/bench/compare", *words], capture_output=True, text=True)
    print(f"compare {' '.join(map(str, words))}: {result.returncode}\n{result.stderr}", end="")
    return result


some = ["--only", "tick: |double/rk4", "--rounds", "8", "--keep", times, "--json"]
same = compare("--against-itself", *some)
check(same.returncode == 0, "a tree is no slower than itself")
document = json.loads(same.stdout)
check(len(document["benchmarks"]) >= 4 and document["rounds"] == 8, f"{len(document['benchmarks'])} benchmarks, 8 rounds")
check(all(b["low"] <= b["ratio"] <= b["high"] for b in document["benchmarks"]), "each ratio lies in its interval")

# Half as much again on the steadiest benchmark of those times: far past what neighbours on this machine add to it.
kept = json.loads(times.read_text())
steady = min(kept["base"], key=lambda n: statistics.stdev(kept["base"][n]) / statistics.mean(kept["base"][n]))
kept["new"] = {n: [1.5 * t for t in v] if n == steady else v for n, v in kept["base"].items()}
(scratch / "slowed.json").write_text(json.dumps(kept))
slowed = compare("--again", scratch / "slowed.json", "--json")
found = [b["name"] for b in json.loads(slowed.stdout)["benchmarks"] if b["verdict"] == "slower"]
check(slowed.returncode == 1 and found == [steady], f"a planted slowdown of {steady} is found alone: {found}")
check("SLOWER" in compare("--again", scratch / "slowed.json").stdout, "and marked for people")

if (source / ".git").exists() and subprocess.run(["git", "diff", "--quiet", "HEAD"], cwd=source).returncode == 0:
    head = compare("HEAD", *some, "--threshold", "0.25")  # built in another place: code may lie otherwise, a tenth or so
    check(head.returncode == 0, "the last commit, built anew, is no slower by a quarter")
    trees = subprocess.run(["git", "worktree", "list"], cwd=source, capture_output=True, text=True).stdout
    check(f"{source}/build/compare/" not in trees, "and leaves no worktree behind")
else:
    print("left out: the comparison with the last commit, which wants a clean tree under git")

check(compare("no-such-revision").returncode == 3, "an unknown revision is refused")
check(compare("--against-itself", "--only", "nothing of that name").returncode == 2, "so is a pattern that fits nothing")
check(compare("--against-itself", "--rounds", "2").returncode == 2, "so are too few rounds")
check(compare("--again", sys.argv[0]).returncode == 2, "so is a file of something else")
sys.exit(1 if failures else 0)
