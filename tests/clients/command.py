"""The real command for tests in Python: starts runs that publish, and reads their traces with the standard library alone."""
import array
import math
import os
import pathlib
import shutil
import subprocess
import tempfile

SOURCE = pathlib.Path(os.environ["SLIPBENCH_SOURCE_DIR"])
BINARY = pathlib.Path(os.environ["SLIPBENCH_BINARY_DIR"])
SLIPBENCH = os.environ["SLIPBENCH_COMMAND"]
CONVEYOR = SOURCE / "configs/scenarios/conveyor_hot_rotor.toml"  # inverter, encoder, three estimators
MAINS = SOURCE / "configs/scenarios/mains_start.toml"            # no speed reference: that column is NaN throughout

PATIENCE_S = 60  # for what must happen at once: only a failing test, or a machine stopped dead, comes near it


class Folder:
    """A folder of its own for sockets and files, gone after the test; short, as a socket's path may have 107 bytes."""

    def __init__(self, test):
        self.path = pathlib.Path(tempfile.mkdtemp(prefix="slip"))
        test.addCleanup(shutil.rmtree, self.path)
        self.endpoint = f"ipc://{self.path}/s"


def start(test, *arguments):
    """`slipbench ARGUMENTS` under way; killed when the test is over."""
    process = subprocess.Popen([SLIPBENCH, *map(str, arguments)], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
    clean_up(test, process)
    return process


def clean_up(test, process):
    def stop():
        process.kill()
        process.communicate()
    test.addCleanup(stop)
    return process


def run(*arguments):
    """`slipbench ARGUMENTS` to its end; raises with what it said where it fails."""
    done = subprocess.run([SLIPBENCH, *map(str, arguments)], capture_output=True, text=True, timeout=10 * PATIENCE_S)
    if done.returncode != 0:
        raise AssertionError(f"slipbench {' '.join(map(str, arguments))}: {done.returncode}\n{done.stderr}")
    return done


def read_csv(path):
    """{column: array of float64} in the file's order, NaN in the form that float("nan") has."""
    header, *rows = pathlib.Path(path).read_text().splitlines()
    columns = zip(*(row.split(",") for row in rows))
    return {name: array.array("d", (math.nan if text == "nan" else float(text) for text in column))
            for name, column in zip(header.split(","), columns, strict=True)}
