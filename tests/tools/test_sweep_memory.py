"""Peak memory of a sweep: under 300 MB, and the same for ten thousand cases as for a thousand."""
import os
import unittest

from sweeps import SCENARIO, Bench, drawn

MB = 1024.0


class Memory(unittest.TestCase):
    def peak_MB(self, bench, store, *arguments):
        process = bench.start("--store", store, "--threads", 2, "--quiet", *arguments)
        _, status, usage = os.wait4(process.pid, 0)
        process.returncode = os.waitstatus_to_exitcode(status)
        _, err = process.communicate()
        self.assertEqual(process.returncode, 0, err)
        return usage.ru_maxrss / MB

    def test_flat(self):
        short = SCENARIO.replace("duration_s = 0.02", "duration_s = 0.004").replace("[0.02, 100.0]", "[0.004, 100.0]")
        for name, plan in (("drawn", drawn), ("grid", grid)):
            bench = Bench(self, plan(1000), short)
            thousand = self.peak_MB(bench, "thousand")
            bench.write("plan.toml", plan(10_000))
            ten_thousand = self.peak_MB(bench, "ten", "--csv", "ten.csv")
            again = self.peak_MB(bench, "ten")  # all of it resumed
            print(f"{name}: peak {thousand:.1f} MB of 1,000 cases, {ten_thousand:.1f} MB of 10,000, {again:.1f} MB resumed")
            self.assertLess(ten_thousand, 300.0)
            # Batches in flight and the page cache of SQLite (2 MB) breathe; 9,000 rows kept would be some 9 MB.
            self.assertLess(ten_thousand, thousand + 6.0)
            self.assertLess(again, thousand + 6.0)


def grid(count):
    return f"""scenario = "scenario.toml"
[[vary]]
key = "belief.rotor_resistance"
from = 0.7
to = 1.4
count = {count // 10}
[[vary]]
key = "belief.stator_resistance"
from = 0.8
to = 1.2
count = 10
"""


if __name__ == "__main__":
    unittest.main()
