"""Planted offences: a small clean tree, one wrong line at a time, and the check that has to find it."""
import house

CLEAN = {
    "plant/README.md": "What the drive is.\n",
    "plant/machine.hpp": '// A machine.\n#pragma once\n#include <cmath>\n#include "plant/math/vec.hpp"\n',
    "plant/math/README.md": "Numbers.\n",
    "plant/math/vec.hpp": "// A vector.\n#pragma once\n",
    "estimators/README.md": "Estimators.\n",
    "estimators/observer.hpp": '// An observer.\n#pragma once\n#include "plant/machine.hpp"\n',
    "controllers/README.md": "Controllers.\n",
    "controllers/loop.hpp": '// A loop.\n#pragma once\n#include "plant/machine.hpp"\n',
    "sim/scenario/README.md": "Scenario.\n",
    "sim/scenario/read.hpp": '// Reads.\n#pragma once\n#include <toml++/toml.h>\n#include "estimators/observer.hpp"\n',
    "sim/engine/README.md": "Engine.\n",
    "sim/engine/run.hpp": '// Runs.\n#pragma once\n#include "sim/scenario/read.hpp"\n#include "controllers/loop.hpp"\n',
    "sim/score/README.md": "Score.\n",
    "sim/score/error.hpp": '// Errors.\n#pragma once\n#include "sim/engine/run.hpp"\n',
    "sim/record/README.md": "Record.\n",
    "sim/record/trace.hpp": '// Trace.\n#pragma once\n#include <hdf5.h>\n#include "sim/engine/run.hpp"\n',
    "sim/stream/README.md": "Stream.\n",
    "sim/stream/publish.hpp": '// Publishes.\n#pragma once\n#include <zmq.hpp>\n#include "sim/engine/run.hpp"\n',
    "tools/README.md": "Tools.\n",
    "tools/main.hpp": '// The command.\n#pragma once\n#include "sim/score/error.hpp"\n#include "sim/record/trace.hpp"\n',
    "tests/README.md": "Tests.\n",
    "tests/helper.hpp": '// Helps.\n#pragma once\n#include <catch2/catch.hpp>\n#include "sim/score/error.hpp"\n',
}


def include(path, header):
    return path, f'#include "{header}"\n'


def library(path, header):
    return path, f"#include <{header}>\n"


# (the line added to which file, what the complaint has to name)
OFFENCES = {
    "arrows": [
        include("plant/machine.hpp", "estimators/observer.hpp"),
        include("plant/machine.hpp", "sim/engine/run.hpp"),
        include("plant/math/vec.hpp", "plant/machine.hpp"),
        include("estimators/observer.hpp", "controllers/loop.hpp"),
        include("estimators/observer.hpp", "sim/engine/run.hpp"),
        include("controllers/loop.hpp", "estimators/observer.hpp"),
        include("controllers/loop.hpp", "sim/scenario/read.hpp"),
        include("sim/scenario/read.hpp", "sim/engine/run.hpp"),
        include("sim/engine/run.hpp", "sim/score/error.hpp"),
        include("sim/engine/run.hpp", "sim/record/trace.hpp"),
        include("sim/score/error.hpp", "sim/record/trace.hpp"),
        include("sim/record/trace.hpp", "sim/score/error.hpp"),
        include("sim/record/trace.hpp", "tools/main.hpp"),
        include("sim/score/error.hpp", "tests/helper.hpp"),
        include("tools/main.hpp", "tests/helper.hpp"),
        include("tests/helper.hpp", "tools/main.hpp"),
        include("plant/machine.hpp", "../estimators/observer.hpp"),
        include("plant/math/vec.hpp", "vec.hpp"),
        library("controllers/loop.hpp", "estimators/observer.hpp"),
        ("plant/machine.hpp", '  #  include "sim/engine/run.hpp" // hidden\n'),
        ("elsewhere/new.hpp", '// New.\n#pragma once\n#include "plant/machine.hpp"\n'),
    ],
    "libraries": [
        library("sim/engine/run.hpp", "toml++/toml.h"),
        library("tools/main.hpp", "toml.hpp"),
        library("tools/main.hpp", "hdf5.h"),
        library("sim/score/error.hpp", "H5Cpp.h"),
        library("sim/engine/run.hpp", "zmq.hpp"),
        library("tools/main.hpp", "zmq.h"),
        library("sim/engine/run.hpp", "boost/numeric/odeint.hpp"),
        library("estimators/observer.hpp", "thread"),
        library("tools/main.hpp", "catch2/catch.hpp"),
    ],
    "same_bits": [
        ("plant/machine.hpp", "double f(double x) { return std::sin(x); }\n"),
        ("sim/engine/run.hpp", "double f(double x) { return std::pow(x, 2.0); }\n"),
        ("estimators/observer.hpp", "double f(double x) { return std::atan2(x, 1.0); }\n"),
    ],
    "sizes": [("tools/main.hpp", "\n" * 400)],
    "headers": [("plant/bare.hpp", "#pragma once\n"), ("plant/twice.hpp", "// No guard.\n")],
    "words": [
        ("tools/README.md", "Built in /" + "work/main.\n"),
        ("plant/machine.hpp", "// see /tmp/" + "build-x\n"),
        ("tests/helper.hpp", "// /home/" + "somebody/data\n"),
    ],
    "readmes": [("sim/board/link.hpp", "// A link.\n#pragma once\n")],
}


def self_check():
    wrong = [f"clean tree: {complaint}" for complaint in house.complaints(CLEAN)]
    count = 0
    for check in house.CHECKS:
        if check.__name__ not in OFFENCES:
            wrong.append(f"{check.__name__}: no offence planted")
        for path, text in OFFENCES.get(check.__name__, []):
            tree = dict(CLEAN)
            tree[path] = tree.get(path, "") + text
            count += 1
            found = list(check(tree))
            if len(found) != 1 or not (found[0].startswith(path) or check.__name__ == "readmes"):
                wrong.append(f"{check.__name__}: planted in {path}: {text.strip()!r}: found {found}")
    print("\n".join(wrong) if wrong else f"{count} planted offences, each found once, none in the clean tree")
    return 1 if wrong else 0
