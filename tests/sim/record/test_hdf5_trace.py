"""The HDF5 trace of a run, read by h5py, equals the CSV trace of the same run to the bit; names, units, the scenario's text
and the version are in it; a path or a disk that can't take it is told with exit status 3 and leaves nothing behind.

usage: test_hdf5_trace.py SLIPBENCH SOURCE
"""
import csv
import os
import pathlib
import signal
import subprocess
import sys
import tempfile
import time
import unittest

import h5py

slipbench, source = sys.argv[1], pathlib.Path(sys.argv[2])
scenario = source / "configs/scenarios/hoist_lowering.toml"
short = ["--set", "run.duration_s=1.5"]  # 1501 rows: one whole block of the writer and a part


def run(*options):
    return subprocess.run([slipbench, "run", str(scenario), *short, "--quiet", *options], capture_output=True, text=True)


class Hdf5Trace(unittest.TestCase):
    def setUp(self):
        self.folder = tempfile.TemporaryDirectory()
        self.path = os.path.join(self.folder.name, "run.h5")

    def tearDown(self):
        self.folder.cleanup()

    def test_equals_the_csv_trace_to_the_bit(self):
        table = os.path.join(self.folder.name, "run.csv")
        self.assertEqual(run("--trace", self.path).returncode, 0)
        self.assertEqual(run("--trace", table).returncode, 0)
        with open(table, newline="") as text:
            rows = list(csv.reader(text))
        with h5py.File(self.path) as file:
            names = []
            file.id.links.iterate(lambda name: names.append(name.decode()), idx_type=h5py.h5.INDEX_CRT_ORDER)
            self.assertEqual(names, ["about", *rows[0]])  # in contract order
            for at, name in enumerate(rows[0]):
                column = file[name][()]
                self.assertEqual(len(column), len(rows) - 1)
                # CSV's shortest text reads back to the same number; hex() tells two numbers apart by their last bit.
                self.assertEqual([float(row[at]).hex() for row in rows[1:]], [float(x).hex() for x in column], name)
            self.assertEqual(file["speed_rpm"].attrs["unit"].decode(), "rpm")
            self.assertIn("mechanical speed", file["speed_rpm"].attrs["meaning"].decode())
            about = file["about"]
            self.assertEqual(about["scenario"][()].decode(), scenario.read_text())
            self.assertEqual(about["overrides"][()].decode(), "run.duration_s=1.5\n")
            version = subprocess.run([slipbench, "--version"], capture_output=True, text=True).stdout.split()[1]
            self.assertEqual(about.attrs["slipbench"].decode(), version)
            self.assertEqual((about.attrs["format"], about.attrs["seed"], about.attrs["trace_period_s"]), (1, 7, 1e-3))

    def test_the_same_run_gives_the_same_bytes(self):
        other = os.path.join(self.folder.name, "other.h5")
        run("--trace", self.path), run("--trace", other)
        self.assertEqual(pathlib.Path(self.path).read_bytes(), pathlib.Path(other).read_bytes())

    def test_bad_places_are_found_at_once(self):
        for path in (os.path.join(self.folder.name, "no/such/run.h5"), "/dev/full/run.h5"):
            answer = run("--trace", path)
            self.assertEqual(answer.returncode, 3, answer.stderr)
            self.assertIn("cannot write", answer.stderr)
        self.assertEqual(os.listdir(self.folder.name), [])

    def test_a_full_disk_is_told_and_leaves_nothing(self):
        # A limit on the size of files stands for the full disk: write() fails just so, with EFBIG instead of ENOSPC.
        limit = f"ulimit -f 200; trap '' XFSZ; exec '{slipbench}' run '{scenario}' --quiet --trace '{self.path}'"
        answer = subprocess.run(["bash", "-c", limit], capture_output=True, text=True)
        self.assertEqual(answer.returncode, 3, answer.stderr)
        self.assertIn("cannot write", answer.stderr)
        self.assertEqual(os.listdir(self.folder.name), [])

    def test_a_stopped_run_keeps_its_rows(self):
        command = [slipbench, "run", str(scenario), "--set", "run.duration_s=10000.0", "--quiet", "--trace", self.path]
        endless = subprocess.Popen(command, stderr=subprocess.PIPE, text=True)
        begun = time.monotonic()
        while not any(".partial" in name for name in os.listdir(self.folder.name)) and time.monotonic() < begun + 60:
            time.sleep(0.02)  # a busy machine: before its file is there it would not have heard the signal either
        time.sleep(0.5)
        endless.send_signal(signal.SIGINT)
        self.assertEqual((endless.wait(timeout=30), endless.stderr.read()), (130, ""))
        endless.stderr.close()
        with h5py.File(self.path) as file:
            self.assertGreater(len(file["time_s"]), 0)
            self.assertEqual(len(file["time_s"]), len(file["speed_rpm"]))


unittest.main(argv=sys.argv[:1])
