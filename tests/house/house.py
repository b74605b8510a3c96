#!/usr/bin/env python3
"""House rules that no compiler holds: who may include whom, which folder alone knows a library, sizes, README files.

    house.py ROOT           checks the tree, prints FILE:LINE: complaint, exit status 1 if there is any
    house.py --self-check   plants one offence of each kind in a small tree and demands that it is found
"""
import os
import re
import sys

FOLDERS = ("plant", "estimators", "controllers", "sim", "tools", "tests", "configs", "cmake")
SKIPPED = {"build", "out", "node_modules", "__pycache__", "slipbench_client.egg-info"}
SOURCES = (".hpp", ".cpp", ".h", ".c", ".py", ".cmake", ".ts", ".js")
LONGEST = 400  # lines; past that a file holds two ideas

# A file in the folder on the left may include files of the folders on the right, and no others. The longest name that fits
# the file's path counts. Tests may include anything below tools, and the tools' own tests their tools; nothing else includes tests or tools.
DRIVE = ("plant", "estimators", "controllers")
RUN = DRIVE + ("sim/scenario", "sim/engine")
ARROWS = {
    "plant": ("plant",),
    "plant/math": ("plant/math",),
    "plant/linear": ("plant",),
    "estimators": ("plant", "estimators"),
    "controllers": ("plant", "controllers"),
    "sim/scenario": DRIVE + ("sim/scenario",),
    "sim/engine": RUN,
    "sim/score": RUN + ("sim/score",),
    "sim/linear": RUN + ("sim/linear",),
    "sim/record": RUN + ("sim/record",),
    "sim/stream": RUN + ("sim/stream",),
    "sim/export": RUN + ("sim/export",),
    "sim/board": RUN + ("sim/board",),
    "sim/sweep": RUN + ("sim/score", "sim/record", "sim/sweep"),
    "tools": DRIVE + ("sim", "tools"),
    "tests": DRIVE + ("sim", "tests"),
    "tests/tools": DRIVE + ("sim", "tests", "tools"),
}

# A project of somebody else that stands here as a test, and programs for a board: their own files are included from beside each other.
STRANGERS = ("tests/outside", "tools/firmware")

# Libraries that one place alone knows: header as a pattern, folders that may include it, what is meant.
LIBRARIES = (
    (r"toml(\+\+|\.h|pp)", ("sim/scenario",), "toml++"),
    (r"(hdf5|H5|highfive)", ("sim/record",), "HDF5"),
    (r"(zmq|zmq_addon|cppzmq)", ("sim/stream", "tests/sim/stream", "tools/bench"), "ZeroMQ"),
    (r"msgpack", ("sim/stream", "tests/sim/stream"), "MessagePack"),
    (r"sqlite3", ("sim/sweep",), "SQLite"),
    (r"nlopt", ("sim/sweep",), "NLopt"),
    (r"CLI/", ("tools",), "CLI11"),
    (r"nlohmann/", ("tools", "tests"), "JSON"),
    (r"catch2/", ("tests",), "Catch2"),
    (r"benchmark/", ("tools/bench",), "Google Benchmark"),
    (r"boost/numeric/odeint\.hpp", (), "Odeint whole (name the stepper's own header)"),
    (r"(iostream|fstream|thread|mutex|future)$", ("sim/scenario", "sim/record", "sim/stream", "sim/sweep", "sim/board",
                                                   "tools", "tests"), "input, output and threads"),
)

# The C library's functions give other bits from one processor to the next: use plant/math/elementary.hpp.
SAME_BITS = ("plant", "estimators", "controllers", "sim/engine")
INEXACT = re.compile(r"\bstd::(a?(sin|cos|tan)h?|atan2|exp2?|expm1|pow|log(10|2|1p)?|hypot|cbrt|fma|erfc?|[tl]gamma)\s*\(")

# Machine paths; written in two parts so that this file does not find itself.
FORBIDDEN = re.compile("|".join(("/" + "work/", "/tmp/" + "build", "/" + "root/", "/home/" + r"\w", r"\b[A-Z]:\\" + "Users")))

INCLUDE = re.compile(r'^\s*#\s*include\s*([<"])([^>"]+)[>"]')


def inside(path, folder):
    return path == folder or path.startswith(folder + "/")


def may_include(path):
    fitting = [folder for folder in ARROWS if inside(path, folder)]
    return ARROWS[max(fitting, key=len)] if fitting else None


def includes(tree):
    for path, text in tree.items():
        if path.endswith((".hpp", ".cpp", ".h", ".c")):
            for number, line in enumerate(text.splitlines(), 1):
                found = INCLUDE.match(line)
                if found:
                    yield path, number, found.group(1), found.group(2)


def arrows(tree):
    for path, number, bracket, header in includes(tree):
        ours = header.split("/")[0] in FOLDERS and "/" in header
        if any(inside(path, stranger) for stranger in STRANGERS) and f"{os.path.dirname(path)}/{header}" in tree:
            continue
        if bracket == '"' and header not in tree:
            yield f"{path}:{number}: \"{header}\" is no file here: quoted includes run from the top folder"
        elif bracket == "<" and ours and header in tree:
            yield f"{path}:{number}: <{header}> is ours: quote it"
        elif bracket == '"':
            allowed = may_include(path)
            if allowed is None:
                yield f"{path}:{number}: no arrows are set for this folder: add it to ARROWS in tests/house/house.py"
            elif not any(inside(header, folder) for folder in allowed):
                yield f"{path}:{number}: includes {header}, allowed from here: {', '.join(allowed)}"


def libraries(tree):
    for path, number, _, header in includes(tree):
        for pattern, homes, what in LIBRARIES:
            if re.match(pattern, header) and not any(inside(path, home) for home in homes):
                yield f"{path}:{number}: <{header}>: {what} is for {', '.join(homes) or 'nobody'} only"


def same_bits(tree):
    for path, text in tree.items():
        if path.endswith((".hpp", ".cpp")) and any(inside(path, folder) for folder in SAME_BITS):
            for number, line in enumerate(text.splitlines(), 1):
                if INEXACT.search(line.split("//")[0]):
                    yield f"{path}:{number}: the C library's function: use plant/math/elementary.hpp"


def sizes(tree):
    for path, text in tree.items():
        lines = text.count("\n")
        if path.endswith(SOURCES) and lines > LONGEST:
            yield f"{path}:{lines}: longer than {LONGEST} lines: two ideas"


def headers(tree):
    for path, text in tree.items():
        if path.endswith(".hpp"):
            if not text.startswith("// "):
                yield f"{path}:1: a header opens with one line on what the thing is"
            if "#pragma once" not in text:
                yield f"{path}:1: no #pragma once"


def words(tree):
    for path, text in tree.items():
        for number, line in enumerate(text.splitlines(), 1):
            found = FORBIDDEN.search(line)
            if found:
                yield f"{path}:{number}: \"{found.group()}\": a path of one machine"


def readmes(tree):
    """Every folder with files of its own; test folders mirror the sources, so tests/README.md serves them all."""
    folders = {os.path.dirname(path) for path in tree}
    for folder in sorted(folders):
        top = folder.split("/")[0]
        if top not in FOLDERS or top == "cmake" or (top in ("tests", "configs") and folder != top):
            continue
        if f"{folder}/README.md" not in tree:
            yield f"{folder}: no README.md (what lives here, what does not, how to add one more)"


CHECKS = (arrows, libraries, same_bits, sizes, headers, words, readmes)


def read_tree(root):
    tree = {}
    for at, folders, names in os.walk(root):
        below = os.path.relpath(at, root)
        if below == ".":
            folders[:] = [f for f in folders if f in FOLDERS or f == ".ci"]
        folders[:] = [f for f in folders if f not in SKIPPED]
        for name in names:
            if name == ".git":  # a worktree's, which names the machine's paths
                continue
            path = os.path.normpath(os.path.join(below, name)).replace(os.sep, "/")
            try:
                with open(os.path.join(at, name), encoding="utf-8") as file:
                    tree[path] = file.read()
            except UnicodeDecodeError:
                pass  # a picture or the like
    return tree


def complaints(tree):
    return [complaint for check in CHECKS for complaint in check(tree)]


def main(arguments):
    if arguments == ["--self-check"]:
        from planted import self_check
        return self_check()
    if len(arguments) != 1:
        print(__doc__)
        return 2
    tree = read_tree(arguments[0])
    if sum(path.endswith(".hpp") for path in tree) < 10:
        print(f"{arguments[0]}: hardly any source here: is it the project's top folder?")
        return 2
    found = complaints(tree)
    print("\n".join(found) if found else f"{len(tree)} files: nothing to complain of")
    return 1 if found else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
