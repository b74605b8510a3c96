"""slipbench sweep through the built command: the same rows whatever ran them, resuming, refusals, Ctrl-C."""
import csv
import json
import math
import signal
import subprocess
import time
import unittest

from command import PATIENCE_S, SLIPBENCH
from sweeps import SCENARIO, Bench, columns, database, drawn

# Of 24 cases 6 have a flux that is kicked out of bounds and 6 a step that does not divide.
ROUGH = """scenario = "scenario.toml"
runs = 2
[[vary]]
key = "process_noise.flux_Wb"
values = [0.0, 1000.0, 0.0001]
[[vary]]
key = "controller.delay_periods"
values = [1, 2]
[[vary]]
key = "run.plant_step_s"
values = [50e-6, 20e-6]
[[vary]]
key = "run.control_period_s"
values = [100e-6, 50e-6]
"""

EVENT = """
[[event]]
at_s = 0.01
kind = "speed_sensor_fault"
fault = "no_signal"
"""


class SameRows(unittest.TestCase):
    def test_a_part_that_is_not_there_leaves_no_store(self):
        bench = Bench(self, drawn(3))
        said = bench.sweep("--merge", "gone.sqlite", "--store", "all.sqlite", status=2)
        self.assertIn("--merge 'gone.sqlite': there is no such file", said)
        self.assertFalse((bench.path / "all.sqlite").exists())

    def test_sets_threads_shards(self):
        bench = Bench(self, drawn(75, runs=2))  # 64 and 11 cases a run: full packs, and one that is not
        bench.sweep("--store", "double", "--isa", "double", "--threads", 1, "--csv", "double.csv")
        wanted = bench.rows("double")
        self.assertEqual([row[:2] for row in wanted], [(k, r) for k in range(75) for r in range(2)])
        for isa in ("sse2", "avx2", "avx512"):
            with self.subTest(isa=isa):
                process = bench.start("--store", isa, "--isa", isa, "--json")
                out, err = process.communicate(timeout=10 * PATIENCE_S)
                if process.returncode == 2 and "this processor lacks it" in err:
                    self.skipTest(f"this processor lacks {isa}")
                self.assertEqual(process.returncode, 0, err)
                said = json.loads(out)
                self.assertEqual((said["isa"], said["done"], said["ran_alone"]), (isa, 150, {}))
                self.assertEqual(bench.rows(isa), wanted)
        for threads in (1, 2, 3):
            bench.sweep("--store", f"threads{threads}", "--threads", threads, "--csv", "threads.csv")
            self.assertEqual(bench.rows(f"threads{threads}"), wanted)
            self.assertEqual((bench.path / "threads.csv").read_bytes(), (bench.path / "double.csv").read_bytes())
        for shard in range(3):
            bench.sweep("--shard", f"{shard}/3")
        parts = [word for shard in range(3) for word in ("--merge", f"plan.{shard}-of-3.sqlite")]
        said = json.loads(bench.sweep("--store", "whole", "--json", *parts))
        self.assertEqual(said["merged"], {"rows": 150, "twice": 0, "missing": 0})
        self.assertEqual(bench.rows("whole"), wanted)
        said = bench.sweep("--store", "gap", *parts[2:], *parts[2:4], status=1)
        self.assertIn("still MISSING", said)
        self.assertIn("found more than once", said)

    def test_csv_is_the_store(self):
        bench = Bench(self, drawn(10))
        bench.sweep("--store", "s", "--csv", "s.csv")
        with open(bench.path / "s.csv", newline="") as file:
            head, *lines = csv.reader(file)
        names = columns(bench.path / "s")
        self.assertEqual(names[:4], ["case", "run", "status", "message"])
        self.assertEqual(head, names[:2] + names[4:])
        for line, row in zip(lines, bench.rows("s"), strict=True):
            for text, value in zip(line, row[:2] + row[4:], strict=True):
                self.assertTrue(math.isnan(float(text)) if value is None else float(text) == value, (text, value))

    def test_texts_in_csv(self):
        words = ['a, "b"', "µ °C", "plain"]
        bench = Bench(self, 'scenario = "scenario.toml"\n[[vary]]\nkey = "title"\nvalues = ' +
                      json.dumps(words, ensure_ascii=False))
        bench.sweep("--store", "s", "--csv", "s.csv")
        with open(bench.path / "s.csv", newline="", encoding="utf-8") as file:
            self.assertEqual([line[2] for line in csv.reader(file)][1:], words)
        self.assertEqual([row[4] for row in bench.rows("s")], words)

    def test_run_repeats_a_row(self):
        bench = Bench(self, drawn(20, runs=3))
        bench.sweep("--store", "s")
        names = columns(bench.path / "s")
        for case, run in ((0, 0), (13, 2), (19, 1)):
            done = subprocess.run([SLIPBENCH, "run", "plan.toml", "--case", str(case), "--run", str(run), "--json"],
                                  cwd=bench.path, capture_output=True, text=True, timeout=PATIENCE_S)
            self.assertEqual(done.returncode, 0, done.stderr)
            said = json.loads(done.stdout)
            row = dict(zip(names, next(row for row in bench.rows("s") if row[:2] == (case, run))))
            self.assertEqual(row["status"], said["status"])
            figures = {f"drive.{name}": value for name, value in said["drive"].items()}
            for name, found in said["estimators"].items():
                figures.update({f"{name}.{figure}": value for figure, value in found.items()})
            compared = [name for name in names if name in figures]
            self.assertEqual(len(compared), len(names) - 7)  # four columns and three keys are no figures
            for name in compared:
                self.assertEqual(row[name], figures[name], name)

    def test_failures_are_rows(self):
        steady = SCENARIO.replace('"magnetised"', '"steady"')
        bench = Bench(self, ROUGH, steady)
        said = json.loads(bench.sweep("--store", "s", "--json", status=1))
        self.assertEqual((said["cases"], said["done"], said["failed"], said["diverged"], said["refused"]), (24, 48, 24, 12, 12))
        bench.sweep("--store", "double", "--isa", "double", status=1)
        self.assertEqual(bench.rows("s"), bench.rows("double"))
        for _, _, status, message, flux, _, step, period, *figures in bench.rows("s"):
            if (step, period) == (2e-5, 5e-5):
                self.assertEqual(status, "refused")
                self.assertIn("whole multiple", message)
            elif flux == 1000:
                self.assertEqual(status, "diverged")
                self.assertRegex(message, r"^stator flux of the plant at 0\.\d+ s$")
            else:
                self.assertIn(status, ("done", "lost"))
                self.assertIsNotNone(figures[0])
                continue
            self.assertEqual(set(figures), {None})
        text = bench.sweep("--store", "s", status=1)
        self.assertIn("DIVERGED: 12 rows", text)
        self.assertIn("REFUSED: 12 rows", text)

    def test_events_run_alone_and_the_summary_says_why(self):
        bench = Bench(self, drawn(9), SCENARIO + EVENT)
        self.assertIn("9 rows ran alone: timed events", bench.sweep("--store", "text"))
        said = json.loads(bench.sweep("--store", "json", "--json"))
        self.assertEqual(said["ran_alone"], {"timed events": 9})
        bench.sweep("--store", "double", "--isa", "double")
        self.assertEqual(bench.rows("json"), bench.rows("double"))

    def test_a_plan_that_varies_nothing(self):
        bench = Bench(self, 'scenario = "scenario.toml"\nruns = 5\n')
        said = json.loads(bench.sweep("--json"))
        self.assertEqual((said["cases"], said["done"], said["store"]), (1, 5, "plan.sqlite"))
        self.assertEqual(len({row[4:] for row in bench.rows("plan.sqlite")}), 5)


class Resuming(unittest.TestCase):
    def test_what_is_there_is_left_alone(self):
        bench = Bench(self, drawn(130))
        bench.sweep("--store", "s")
        wanted = bench.rows("s")
        with database(bench.path / "s") as db:
            db.execute('DELETE FROM result WHERE "case" IN (3, 70, 71)')
        said = json.loads(bench.sweep("--store", "s", "--json"))
        self.assertEqual((said["done"], said["resumed"]), (130, 2))  # the last unit, of two cases, was whole
        self.assertEqual(bench.rows("s"), wanted)
        said = json.loads(bench.sweep("--store", "s", "--json"))
        self.assertEqual((said["done"], said["resumed"]), (130, 130))

    def test_refused_with_what_changed(self):
        bench = Bench(self, drawn(5))
        bench.sweep("--store", "s")
        wanted = bench.rows("s")

        def refused(what, *arguments):
            text = bench.sweep("--store", "s", *arguments, status=2)
            self.assertEqual(text.count("\n"), 1, text)
            self.assertIn(what, text)
            self.assertEqual(bench.rows("s"), wanted)

        bench.write("plan.toml", drawn(5).replace("1.4", "1.5"))
        refused("another plan (line 12 was 'high = 1.4', is 'high = 1.5')")
        bench.write("plan.toml", drawn(5))
        refused("another --set", "--set", "shaft.inertia_kgm2=0.03")
        refused("another --set", "--set", "plan.sample.count=6")
        refused("another --seed", "--seed", "6")
        bench.write("scenario.toml", SCENARIO.replace("0.1", "0.2"))
        refused("another scenario")
        bench.write("scenario.toml", SCENARIO)
        with database(bench.path / "s") as db:
            db.execute("UPDATE about SET content = '0.0.1' WHERE item = 'slipbench'")
        refused("another version of slipbench (line 1 was '0.0.1'")
        with database(bench.path / "other") as db:
            db.execute("CREATE TABLE mine (a)")
        text = bench.sweep("--store", "other", status=2)
        self.assertIn("no store of a sweep", text)
        with database(bench.path / "other") as db:
            self.assertEqual(db.execute("SELECT name FROM sqlite_master").fetchall(), [("mine",)])

    def test_two_at_once(self):
        bench = Bench(self, drawn(64), SCENARIO.replace("duration_s = 0.02", "duration_s = 200.0"))
        first = bench.start("--store", "s")
        try:
            deadline = time.monotonic() + PATIENCE_S
            while not (bench.path / "s-wal").exists() and time.monotonic() < deadline:
                time.sleep(0.01)
            text = bench.sweep("--store", "s", status=3)
            self.assertEqual(text.count("\n"), 1, text)
            self.assertIn("in use by another process", text)
            self.assertIsNone(first.poll())
        finally:
            first.kill()
            first.communicate()

    def test_interrupt(self):
        # Each unit of 64 takes some tenths of a second; the whole, a minute.
        bench = Bench(self, drawn(6400), SCENARIO.replace("duration_s = 0.02", "duration_s = 0.2"))
        kept = []

        def interrupted_after(pause_s):
            process = bench.start("--store", "s", "--json")
            time.sleep(pause_s)
            process.send_signal(signal.SIGINT)
            asked = time.monotonic()
            out, err = process.communicate(timeout=PATIENCE_S)
            self.assertEqual(process.returncode, 130, err)
            self.assertLess(time.monotonic() - asked, 10.0)  # heard at once, whatever else this machine does
            said = json.loads(out)
            self.assertTrue(said["interrupted"])
            self.assertEqual(said["resumed"], len(kept))  # units that are there are not run again
            rows = bench.rows("s")
            self.assertEqual(len(rows), said["done"])
            self.assertEqual([row for row in rows if row in set(kept)], kept)
            return rows

        for pause_s in (1, 1, 2, 4, 8, 16):  # sanitizers make it slow
            kept = interrupted_after(pause_s)
            if len(kept) > 64:
                break
        self.assertTrue(64 < len(kept) < 6400, len(kept))
        kept = interrupted_after(1)


if __name__ == "__main__":
    unittest.main()
