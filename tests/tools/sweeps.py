"""Plans in a folder of their own, swept by the real command, and the rows of their stores. Machine and drive are invented."""
import contextlib
import pathlib
import shutil
import sqlite3
import subprocess
import tempfile

from command import PATIENCE_S, SLIPBENCH

# The drive of tests/sim/sweep.
OWN = pathlib.Path(__file__).resolve().parent.parent / "sim" / "sweep"
MACHINE = (OWN / "machine.toml").read_text()
SCENARIO = (OWN / "short_drive.toml").read_text()


def drawn(count, runs=1):
    return f"""scenario = "scenario.toml"
runs = {runs}

[sample]
kind = "latin_hypercube"
count = {count}

[[sample.key]]
key = "belief.rotor_resistance"
distribution = "uniform"
low = 0.7
high = 1.4

[[sample.key]]
keys = ["belief.stator_leakage", "belief.rotor_leakage"]
distribution = "normal"
mean = 1.0
sigma = 0.05
"""


class Bench:
    """A folder with a machine, a scenario and a plan; gone after the test."""

    def __init__(self, test, plan, scenario=SCENARIO):
        self.path = pathlib.Path(tempfile.mkdtemp(prefix="sweep"))
        test.addCleanup(shutil.rmtree, self.path)
        self.test = test
        self.write("machine.toml", MACHINE)
        self.write("scenario.toml", scenario)
        self.write("plan.toml", plan)

    def write(self, name, text):
        (self.path / name).write_text(text)

    def start(self, *arguments, **how):
        """`slipbench sweep plan.toml ARGUMENTS`, under way."""
        return subprocess.Popen([SLIPBENCH, "sweep", "plan.toml", *map(str, arguments)], cwd=self.path, text=True,
                                stdout=subprocess.PIPE, stderr=subprocess.PIPE, **how)

    def sweep(self, *arguments, status=0, **how):
        """The same to its end, whose exit status must be that; what it printed."""
        process = self.start(*arguments, **how)
        out, err = process.communicate(timeout=10 * PATIENCE_S)
        self.test.assertEqual(process.returncode, status, out + err)
        return err if status in (2, 3) else out

    def rows(self, store):
        return rows(self.path / store)


@contextlib.contextmanager
def database(store):
    """A store through SQLite, as anybody may open it; closed after it, as a sweep wants it to itself."""
    with contextlib.closing(sqlite3.connect(store)) as db, db:
        yield db


def rows(store):
    """The rows in order: case, run, status, message, keys, figures."""
    with database(store) as db:
        return db.execute('SELECT * FROM result ORDER BY "case", run').fetchall()


def columns(store):
    with database(store) as db:
        return [row[1] for row in db.execute("PRAGMA table_info(result)")]
