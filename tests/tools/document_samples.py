"""Runs the samples in every README: what a reader would copy must work, in the order it stands in, from the top of the sources.

    document_samples.py SOURCE SLIPBENCH [--include DIR]... [--library ARGUMENT]...
    document_samples.py --self-check SLIPBENCH    plants bad samples and demands that each is found

Each document gets a copy of the sources, and its blocks follow one another there:
    ```toml      a scenario must run, a machine must pass `check`; a fragment must be TOML
    ```sh        must end with 0, with slipbench on the path
    ```python    must end with 0, with tools/python on the path of modules
    ```cpp       with a main: must compile against SOURCE and every --include; with --library (arguments to the linker), run too
    ```js        must be JavaScript that node can read
A block headed "```sh not-run: REASON" is left alone. Other tags are text; a block without a tag, or set off by mere
indentation, is refused, for no one would run it. What is linked or shown must be there.
"""
import argparse
import os
import pathlib
import re
import shutil
import subprocess
import sys
import tempfile
import tomllib

FENCE = re.compile(r"^```([^\n]*)\n(.*?)^```[ \t]*$", re.S | re.M)
ALIASES = {"bash": "sh", "shell": "sh", "console": "sh", "py": "python", "c++": "cpp", "javascript": "js"}
SKIPPED = {"build", "out", "node_modules", ".git"}
PATIENCE = 300  # s: beyond it a sample hangs


def documents(source):
    return [p for p in sorted(source.rglob("*.md")) if not SKIPPED & set(p.relative_to(source).parts)]


def indented_blocks(text):
    """Lines that Markdown takes for code by their indentation alone: after an empty line, and not within a list."""
    in_list, before = False, ""
    for line in FENCE.sub("", text).split("\n"):
        if line.startswith("    ") and not before and not in_list:
            yield line.strip()
        if line and not line.startswith(" "):
            in_list = re.match(r"([-*+]|\d+\.) ", line) is not None
        before = line.strip()


class Samples:
    def __init__(self, source, slipbench, include=(), library=()):
        self.source, self.slipbench = source, pathlib.Path(slipbench).resolve()
        self.include, self.library = [str(source), *include], list(library)
        self.ran, self.faults = 0, []

    def document(self, path):
        text, name = path.read_text(), path.relative_to(self.source)
        for target in re.findall(r"\]\((?!https?:|#)([^)#]+)", text):
            if not (path.parent / target).exists():
                self.faults.append(f"{name}: no such file: {target}")
        for line in indented_blocks(text):
            self.faults.append(f"{name}: set off by indentation: {line!r}; put it between ``` with a tag")
        with tempfile.TemporaryDirectory() as folder:
            copy = pathlib.Path(folder) / "slipbench"
            for number, (head, block) in enumerate(FENCE.findall(text), 1):
                tag, _, rest = head.partition(" ")
                if not copy.exists():
                    shutil.copytree(self.source, copy, ignore=shutil.ignore_patterns(*SKIPPED))
                if fault := self.block(tag, rest.strip(), block, copy):
                    self.faults.append(f"{name}, block {number} ({tag or 'no tag'}): {fault}")

    def block(self, tag, rest, block, copy):
        if not tag:
            return "no tag: say sh, toml, python, cpp, js, or text where nothing is to be run"
        if tag in ALIASES:
            return f"write it as {ALIASES[tag]}"
        if rest:
            known = re.fullmatch(r"not-run: \S.*", rest)
            return None if known else f"{rest!r} is not understood: not-run: REASON is"
        run = getattr(self, "run_" + tag, None)
        return run(block, copy) if run else None

    def command(self, arguments, copy):
        self.ran += 1
        path = f"{self.slipbench.parent}:{os.environ['PATH']}"
        modules = f"{copy / 'tools' / 'python'}:{os.environ.get('PYTHONPATH', '')}".rstrip(":")
        environment = dict(os.environ, PATH=path, PYTHONPATH=modules, PYTHONDONTWRITEBYTECODE="1", MPLBACKEND="Agg")
        try:
            result = subprocess.run(arguments, cwd=copy, env=environment, capture_output=True, text=True, timeout=PATIENCE)
        except FileNotFoundError:
            return f"{arguments[0]} is needed: tools/packages --tests"
        except subprocess.TimeoutExpired:
            return f"no end after {PATIENCE} s"
        return f"exit status {result.returncode}\n{result.stderr or result.stdout}" if result.returncode else None

    def run_toml(self, block, copy):
        if "[run]" not in block and "[machine]" not in block:
            try:
                tomllib.loads(block)
            except tomllib.TOMLDecodeError as error:
                return str(error)
            return None  # a fragment that its text explains
        (copy / "sample.toml").write_text(block)
        return self.command([self.slipbench, "run" if "[run]" in block else "check", "sample.toml", "--json"], copy)

    def run_sh(self, block, copy):
        return self.command(["bash", "-euo", "pipefail", "-c", block], copy)

    def run_python(self, block, copy):
        return self.command([sys.executable, "-c", block], copy)

    def run_cpp(self, block, copy):
        if not re.search(r"\bmain\s*\(", block):
            return None  # a fragment that its text explains
        (copy / "sample.cpp").write_text(block)
        compiler = [os.environ.get("CXX", "c++"), "-std=c++20", *(f"-I{folder}" for folder in self.include), "sample.cpp"]
        if not self.library:
            return self.command([*compiler, "-fsyntax-only"], copy)
        return self.command([*compiler, "-o", "sample", *self.library], copy) or self.command(["./sample"], copy)

    def run_js(self, block, copy):
        file = "sample.mjs" if re.search(r"^\s*(import|export)\b", block, re.M) else "sample.js"
        (copy / file).write_text(block)
        return self.command(["node", "--check", file], copy)


PLANTED = {
    "a command that fails": "```sh\nslipbench --version\nfalse\n```",
    "a command that fails early": "```sh\nfalse\ntrue\n```",
    "a pipe that fails": "```sh\nslipbench nonsense | cat\n```",
    "a scenario that is none": "```toml\n[run]\nduration_s = 1\n```",
    "a machine that is none": "```toml\n[machine]\npole_pairs = 1\n```",
    "a fragment that is no TOML": "```toml\nx = = 1\n```",
    "Python that raises": "```python\nraise ValueError\n```",
    "C++ that does not compile": "```cpp\nint main() { return nothing; }\n```",
    "C++ without a library": "```cpp\n#include \"sim/no_such.hpp\"\nint main() {}\n```",
    "JavaScript that node cannot read": "```js\nconst = 1\n```",
    "no tag": "```\ntrue\n```",
    "another name": "```bash\ntrue\n```",
    "no reason": "```sh not-run\ntrue\n```",
    "indented": "Type\n\n    true\n",
    "a link": "[there](nowhere.md)",
}
GOOD = ("1. list\n\n    its text\n\n```sh\necho 'print(1)' > made.py\n```\n\n```python\nexec(open('made.py').read())\n```\n\n"
        "```cpp\nint main() {}\n```\n\n```cpp\nfragment;\n```\n\n```sh not-run: ends everything\nexit 9\n```\n\n"
        "```text\nanything\n```\n\n```toml\na = 1\n```\n\n[itself](README.md) [a part](#part)\n")


def self_check(slipbench):
    missed = []
    for what, text in [("nothing", GOOD), *PLANTED.items()]:
        with tempfile.TemporaryDirectory() as folder:
            (pathlib.Path(folder) / "README.md").write_text(text)
            samples = Samples(pathlib.Path(folder).resolve(), slipbench)
            samples.document(samples.source / "README.md")
        if bool(samples.faults) != (what != "nothing"):
            missed.append(f"planted {what}; found: {samples.faults}")
    print("\n".join(missed) if missed else f"{len(PLANTED)} bad samples found, the good ones passed")
    return 1 if missed else 0


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("source", nargs="?")
    parser.add_argument("slipbench")
    parser.add_argument("--self-check", action="store_true")
    parser.add_argument("--include", action="append", default=[])
    parser.add_argument("--library", action="append", default=[])
    given = parser.parse_args()
    if given.self_check:
        return self_check(given.slipbench)
    samples = Samples(pathlib.Path(given.source).resolve(), given.slipbench, given.include, given.library)
    for path in documents(samples.source):
        samples.document(path)
    print("\n".join(samples.faults))
    print(f"{samples.ran} samples ran; {len(samples.faults)} faults")
    return 1 if samples.faults or samples.ran == 0 else 0


sys.exit(main())
