"""Builds two states of the tree with the same flags and runs their benchmarks in turns."""
import contextlib
import json
import os
import pathlib
import random
import re
import shutil
import statistics
import subprocess
import sys
import time

UNITS = {"ns": 1.0, "us": 1e3, "ms": 1e6, "s": 1e9}


class Failed(Exception):
    """Something outside failed: git, the build, a benchmark."""


def output(*words, cwd=None):
    result = subprocess.run([str(w) for w in words], capture_output=True, text=True, cwd=cwd)
    if result.returncode != 0:
        raise Failed(f"{' '.join(map(str, words))}: exit status {result.returncode}\n{result.stdout[-3000:]}{result.stderr[-3000:]}")
    return result.stdout


def default_revision(top):
    """The state before: the last commit while the tree has changes of its own, else the one before it."""
    return "HEAD" if output("git", "diff", "HEAD", "--name-only", cwd=top).strip() else "HEAD~1"


@contextlib.contextmanager
def checked_out(top, revision, folder):
    """A worktree of that revision at `folder` for as long as it is used; gives the commit's short name."""
    commit = output("git", "rev-parse", "--verify", f"{revision}^{{commit}}", cwd=top).strip()
    remove = ["git", "worktree", "remove", "--force", "--force", folder]
    if folder.exists():  # left by a comparison that was killed
        subprocess.run(remove, cwd=top, capture_output=True)
        shutil.rmtree(folder, ignore_errors=True)
    output("git", "worktree", "prune", cwd=top)
    output("git", "worktree", "add", "--quiet", "--detach", folder, commit, cwd=top)
    try:
        yield output("git", "rev-parse", "--short", commit, cwd=top).strip()
    finally:
        subprocess.run(remove, cwd=top, capture_output=True)


def programs_of(source):
    return {p.stem for p in (source / "tools" / "bench").glob("bench_*.cpp")}


def built(source, build, names, flags):
    """The benchmark programs of a tree, name -> path."""
    configure = ["cmake", "-S", source, "-B", build, "-G", "Ninja", "-DSLIPBENCH_TESTS=OFF", "-DSLIPBENCH_BENCHMARKS=ON"]
    output(*configure, *flags)
    # One cache for both trees: paths are taken as below each tree's own top.
    os.environ.update(CCACHE_BASEDIR=str(source), CCACHE_NOHASHDIR="1")
    output("cmake", "--build", build, "--target", *sorted(names))
    return {name: build / "tools" / "bench" / name for name in sorted(names)}


def release_flags(top):
    """The optimised build's settings, from this tree's presets, for both sides."""
    presets = json.loads((top / "CMakePresets.json").read_text())["configurePresets"]
    release = next(p for p in presets if p["name"] == "release")
    return [f"-D{key}={value}" for key, value in release["cacheVariables"].items()]


def listed(programs, pattern):
    """"program: benchmark" -> (program's path, its name in there), where the pattern fits."""
    found = {}
    for program, path in programs.items():
        for benchmark in output(path, "--benchmark_list_tests").split("\n"):
            name = f"{re.sub('^bench_', '', program)}: {benchmark}"
            if benchmark and re.search(pattern, name):
                found[name] = (path, benchmark)
    return found


def one_launch(path, names, least_s):
    """Processor time in ns of each of these benchmarks ("program: benchmark" -> name in there) of one program."""
    exact = "|".join(re.sub(r"([.^$*+?()\[\]{}|\\])", r"\\\1", n) for n in names.values())
    text = output(path, "--benchmark_format=json", f"--benchmark_min_time={least_s}", f"--benchmark_filter=^({exact})$")
    times = {}
    for entry in json.loads(text)["benchmarks"]:
        if entry.get("run_type", "iteration") == "iteration" and not entry.get("error_occurred"):
            times.setdefault(entry["run_name"], []).append(entry["cpu_time"] * UNITS[entry["time_unit"]])
    missing = [n for n in names.values() if n not in times]
    if missing:
        raise Failed(f"{path}: no time for {', '.join(missing)}")
    return {name: statistics.median(times[inner]) for name, inner in names.items()}


class Progress:
    """Share done and time left, on standard error where a person watches."""

    def __init__(self, wanted, total):
        self.wanted, self.total, self.done, self.start = wanted, total, 0, time.monotonic()

    def step(self):
        self.done += 1
        if self.wanted:
            left = (time.monotonic() - self.start) / self.done * (self.total - self.done)
            print(f"\rcompare: {100 * self.done // self.total:3d} %, {left:4.0f} s left ", end="", file=sys.stderr, flush=True)
            if self.done == self.total:
                print(file=sys.stderr)


def rounds(base, new, count, least_s, show, seed):
    """Times of what both sides list, "program: benchmark" -> one value a round. In a round every program is launched once a
    side, in random order, so that neither a drift of the machine nor a place in the order favours a side."""
    dice = random.Random(seed)
    sides = {"base": {}, "new": {}}
    launches = {}
    for side, found in (("base", base), ("new", new)):
        for name in (n for n in base if n in new):
            path, inner = found[name]
            launches.setdefault((side, path), {})[name] = inner
    progress = Progress(show, count * len(launches))
    for _ in range(count):
        for side, path in dice.sample(sorted(launches), len(launches)):
            for name, ns in one_launch(path, launches[side, path], least_s).items():
                sides[side].setdefault(name, []).append(ns)
            progress.step()
    return sides["base"], sides["new"]


def save(path, base, new, label):
    path = pathlib.Path(path)
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(json.dumps({"base_label": label, "base": base, "new": new}, indent=1) + "\n")
