"""Ten kill -9 at random moments of a sweep: the store that is left, gone on with, equals the undisturbed one, row for row."""
import json
import random
import time
import unittest

from sweeps import SCENARIO, Bench, database, drawn

# Some hundred units, each a fraction of a second on one thread in double.
PLAN = drawn(6400, runs=2)


class Kills(unittest.TestCase):
    def test_ten_kills(self):
        bench = Bench(self, PLAN, SCENARIO)
        begun = time.monotonic()
        bench.sweep("--store", "undisturbed", "--threads", 1, "--isa", "double")
        whole_s = time.monotonic() - begun
        wanted = bench.rows("undisturbed")
        self.assertEqual(len(wanted), 12800)
        seed = random.SystemRandom().randrange(10**6)
        dice = random.Random(seed)
        kept, kills, cut_in_the_middle = set(), 0, 0
        while kills < 10:
            process = bench.start("--store", "s", "--threads", 1, "--isa", "double")
            time.sleep(dice.uniform(0.0, 0.16) * whole_s)
            if process.poll() is not None:
                self.fail(f"seed {seed}: it ended before it was killed ten times: {process.communicate()}")
            process.kill()
            process.communicate()
            kills += 1
            if not (bench.path / "s").exists() or (bench.path / "s").stat().st_size == 0 and not (bench.path / "s-wal").exists():
                continue  # killed before there was a store
            with database(bench.path / "s") as db:
                self.assertEqual(db.execute("PRAGMA integrity_check").fetchall(), [("ok",)])
                made = db.execute("SELECT count(*) FROM sqlite_master WHERE name = 'result'").fetchone()[0]
            now = set(bench.rows("s")) if made else set()
            self.assertLessEqual(kept, now, f"seed {seed}: rows that were there are gone")
            self.assertLessEqual(now, set(wanted), f"seed {seed}: a row that is not the undisturbed one's")
            cut_in_the_middle += len(kept) < len(now) < 12800
            kept = now
        self.assertGreater(cut_in_the_middle, 2, f"seed {seed}")
        merged = json.loads(bench.sweep("--store", "whole", "--merge", "s", "--json", status=1))["merged"]
        self.assertEqual(merged, {"rows": len(kept), "twice": 0, "missing": 12800 - len(kept)})
        said = json.loads(bench.sweep("--store", "s", "--json", "--threads", 2))
        self.assertEqual(bench.rows("s"), wanted, f"seed {seed}")
        self.assertGreater(said["resumed"], 0)
        print(f"seed {seed}: {len(kept)} of 12800 rows stood after ten kills, {cut_in_the_middle} of which added rows")


if __name__ == "__main__":
    unittest.main()
