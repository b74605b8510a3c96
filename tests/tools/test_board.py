"""The verb `board` with real boards: links of three kinds, and a board that is killed, hung, silent, of another version, late, doubled
or damaged. tests/clients/board.py, written from the page of the protocol alone, is the board."""
import json
import math
import subprocess
import sys
import unittest

from command import PATIENCE_S, SLIPBENCH, SOURCE, Folder, read_csv

BOARD = SOURCE / "tests/clients/board.py"
SCENARIO = SOURCE / "configs/scenarios/board_conveyor.toml"
SHORT = ["--set", "run.duration_s=0.05", "--set", "run.trace_period_s=1e-4", "--set", "score.from_s=0.0"]
TICKS = 501  # of that run, the one at its end included


class Boards(unittest.TestCase):
    def setUp(self):
        self.folder = Folder(self)

    def file(self, name):
        return str(self.folder.path / name)

    def board(self, link, *more):
        done = subprocess.run([SLIPBENCH, "board", SCENARIO, "--lock-step", "--link", link, "--json", *SHORT, *more],
                              capture_output=True, text=True, timeout=2 * PATIENCE_S)
        return done.returncode, json.loads(done.stdout), done.stderr

    def piped(self, fault="", *more):
        return self.board(f"pipe:exec {sys.executable} -B {BOARD} {fault}", *more)

    def server(self, *arguments):
        process = subprocess.Popen([sys.executable, "-B", BOARD, *arguments])
        self.addCleanup(process.communicate)
        self.addCleanup(process.kill)

    def wait_for(self, path):
        for _ in range(PATIENCE_S * 100):
            if (self.folder.path / path).exists():
                return
            subprocess.run(["sleep", "0.01"], check=True)
        self.fail(f"{path} did not appear")

    def coasts_from(self, trace, tick):
        """Every row is there; from `tick` on no current flows, no torque acts, and the board's estimate is none."""
        rows = read_csv(trace)
        self.assertEqual(len(rows["time_s"]), TICKS)
        for k in range(tick, TICKS):
            self.assertLess(abs(rows["i_a_A"][k]) + abs(rows["i_b_A"][k]), 1e-9)  # numbers of 10 A that cancel in double
            self.assertTrue(math.isnan(rows["board.speed_rpm"][k]))
        self.assertFalse(math.isnan(rows["board.speed_rpm"][tick - 1]))
        self.assertGreater(abs(rows["i_a_A"][tick - 1]), 0.5)

    # ---- links ----

    def test_pipe_socket_and_pty_carry_the_same_bits(self):
        results = [self.piped(f"--log {self.file('log')}")]
        self.server("--on", f"unix:{self.file('s')}")
        self.wait_for("s")
        results.append(self.board(f"unix:{self.file('s')}"))
        self.server("--on", f"pty:{self.file('name')}")
        self.wait_for("name")
        device = (self.folder.path / "name").read_text()
        results.append(self.board(f"serial:{device}@115200"))
        for status, result, error in results:
            self.assertEqual(status, 0, error)
            self.assertEqual(result["status"], "done")
            b = result["board"]
            self.assertEqual((b["name"], b["samples"], b["answers"]), ("board.py", TICKS, TICKS))
            self.assertEqual([b[n] for n in ("missing", "damaged", "late", "doubled", "strange", "restarts", "fault")], [0] * 7)
            self.assertEqual(result["digest"], results[0][1]["digest"])
            self.assertGreater(b["exchange_p99_us"], 0)
            self.assertGreaterEqual(b["exchange_p99_us"], b["exchange_p50_us"])
        # 10 bits a byte, 35 + 42 bytes (sim/board/README.md)
        self.assertAlmostEqual(results[2][1]["board"]["serial"]["exchange_us"], 770 / 115200 * 1e6)
        # What the board noted: ticks in a row, 12-bit codes, the DC link of 560 V at 800/2048 V a code within noise of 0.5 V.
        rows = [line.split() for line in (self.folder.path / "log").read_text().splitlines()]
        self.assertEqual([int(r[0]) for r in rows], list(range(TICKS)))
        self.assertTrue(all(-2048 <= int(c) <= 2047 for r in rows for c in r[3:7]))
        self.assertTrue(all(abs(int(r[6]) * 800 / 2048 - 560) < 3 for r in rows))
        self.assertEqual([r[2] for r in rows[:3]], ["0", "1", "1"])  # its own gate enable, as it acts

    def test_estimates_are_scored_and_traced(self):
        trace = self.file("t.csv")
        status, result, error = self.piped("", "--trace", trace)
        self.assertEqual(status, 0, error)
        rows = read_csv(trace)
        errors = [a - b for a, b in zip(rows["board.speed_rpm"], rows["speed_rpm"])]
        rmse = math.sqrt(sum(e * e for e in errors) / len(errors))
        self.assertAlmostEqual(result["estimators"]["board"]["speed_rmse_rpm"], rmse, places=9)
        self.assertIsNone(result["estimators"]["board"]["flux_rmse_Wb"])  # its hello says that it has none
        self.assertIn("observer", result["estimators"])  # rides along
        self.assertEqual(result["board"]["used"]["unit"], "ns")
        # It gives the reference as its estimate, in single precision.
        for e, r in zip(rows["board.speed_rpm"], rows["speed_reference_rpm"]):
            self.assertAlmostEqual(e, r, delta=1e-6 * (1 + abs(r)))

    def test_recording_runs_again_to_the_bit_without_the_board(self):
        for fault, status in (("", 0), ("--fault damaged --at 100 --for 2", 0), ("--fault hang --at 200", 1)):
            kept = self.file("kept.frames")
            found, result, error = self.piped(fault, "--record", kept, "--answer-within", "100")
            self.assertEqual(found, status, error)
            found, again, error = self.board(f"replay:{kept}")
            self.assertEqual(found, status, error)
            self.assertEqual(again["digest"], result["digest"])
            self.assertEqual(again["events"], result["events"])
            self.assertEqual(again["board"]["missing"], result["board"]["missing"])
        whole = (self.folder.path / "kept.frames").read_bytes()
        for spoilt, text in ((b"", "empty"), (b"time_s,speed\n", "no recording"), (whole[:-1], "cut short"),
                             (whole[:200] + whole[201:], "damaged")):
            (self.folder.path / "spoilt.frames").write_bytes(spoilt)
            found, result, _ = self.board(f"replay:{self.file('spoilt.frames')}")
            self.assertEqual(found, 2)
            self.assertIn(text, result["error"]["message"])

    # ---- boards that fail ----

    def test_silent_at_start(self):
        trace = self.file("t.csv")
        status, result, error = self.piped("--fault silent", "--trace", trace)
        self.assertEqual(status, 3)
        self.assertIn("it said no hello within 5 s (nothing came)", error)
        self.assertEqual(result["error"]["code"], "outside")
        self.assertFalse((self.folder.path / "t.csv").exists())  # nothing ran, nothing half written

    def test_another_version(self):
        status, result, error = self.piped("--fault version")
        self.assertEqual(status, 3)
        self.assertIn("it speaks version 2 of the frames, this is version 1", result["error"]["message"])
        self.assertIn("build its firmware anew", error)

    def test_ends_before_its_hello(self):
        status, _, error = self.board("pipe:exit 5")
        self.assertEqual(status, 3)
        self.assertIn("its process ended with status 5 before it said hello", error)

    def test_another_control_period(self):
        status, result, _ = self.piped("--fault period")
        self.assertEqual(status, 2)
        self.assertEqual(result["error"]["key"], "run.control_period_s")

    def test_killed(self):
        trace = self.file("t.csv")
        status, result, error = self.piped("--fault die --at 300", "--trace", trace)
        self.assertEqual(status, 3)
        self.assertIn("its process was killed by signal 9; the gates were opened", error)
        self.assertEqual(result["status"], "lost")
        self.assertEqual(result["board"]["answers"], 300)
        self.assertAlmostEqual(result["board"]["gates_opened_at_s"], 302e-4)  # the third in a row
        self.assertEqual(result["events"][-1]["tick"], 302)
        self.assertIn("no answer from the board for 3 ticks (its process was killed by signal 9): gates opened, the drive coasts",
                      result["events"][-1]["what"])
        self.coasts_from(trace, 302)

    def test_hung(self):
        trace = self.file("t.csv")
        status, result, _ = self.piped("--fault hang --at 300", "--trace", trace, "--answer-within", "100", "--watchdog", "5")
        self.assertEqual(status, 1)
        self.assertEqual(result["status"], "lost")
        self.assertIsNone(result["board"]["gone"])
        self.assertEqual(result["events"][-1]["what"], "no answer from the board for 5 ticks: gates opened, the drive coasts")
        self.coasts_from(trace, 304)

    def test_late(self):
        # It sleeps 150 ms at one tick. With 60 ms allowed two answers are given up, and the third or fourth is in time again.
        status, result, error = self.piped("--fault late --at 100", "--answer-within", "60", "--watchdog", "20")
        self.assertEqual(status, 0, error)
        b = result["board"]
        self.assertGreaterEqual(b["missing"], 2)
        self.assertGreaterEqual(b["late"], 1)
        self.assertLessEqual(b["late"], b["missing"])
        self.assertEqual(b["samples"], b["answers"] + b["missing"])

    def test_twice(self):
        status, result, error = self.piped("--fault twice --at 100 --for 20")
        self.assertEqual(status, 0, error)
        self.assertEqual((result["board"]["doubled"], result["board"]["missing"]), (20, 0))

    def test_damaged_now_and_then(self):
        for fault, damaged in (("damaged", 2), ("cut", 2), ("duty", 2)):
            status, result, error = self.piped(f"--fault {fault} --at 100 --for 2")
            self.assertEqual(status, 0, error)
            self.assertEqual((result["board"]["damaged"], result["board"]["missing"]), (damaged, 2), fault)

    def test_damaged_for_good(self):
        trace = self.file("t.csv")
        status, result, _ = self.piped("--fault damaged --at 300", "--trace", trace)
        self.assertEqual(status, 1)
        self.assertEqual((result["board"]["damaged"], result["board"]["missing"]), (3, 3))
        self.coasts_from(trace, 302)

    def test_answers_of_other_ticks_are_none(self):
        status, result, _ = self.piped("--fault wrong_tick --at 50", "--answer-within", "60")
        self.assertEqual(status, 1)
        self.assertEqual((result["board"]["answers"], result["board"]["strange"]), (50, 3))

    def test_restarted(self):
        status, result, _ = self.piped("--fault restart --at 50", "--answer-within", "60")
        self.assertEqual(status, 1)
        self.assertEqual(result["board"]["restarts"], 1)

    def test_opens_its_gates_and_enables_them_again(self):
        status, result, error = self.piped("--fault open --at 200 --for 100")
        self.assertEqual(status, 0, error)
        self.assertEqual([(e["tick"], e["what"]) for e in result["events"]],
                         [(200, "the board opened the gates"), (300, "the board enabled the gates")])

    def test_fault_of_its_own(self):
        trace = self.file("t.csv")
        status, result, _ = self.piped("--fault fault --at 300", "--trace", trace)
        self.assertEqual(status, 1)
        self.assertEqual((result["status"], result["board"]["fault"]), ("lost", 7))
        self.assertIn("the board opened the gates, fault 7", result["events"][-1]["what"])
        rows = read_csv(trace)
        self.assertLess(abs(rows["i_a_A"][300]), 1e-9)

    # ---- refusals ----

    def test_what_cannot_be_opened_or_meant(self):
        for link, status, text in (
                ("nonsense", 2, "expected pipe:COMMAND"), ("pipe:", 2, "expected pipe:COMMAND"), ("serial:/dev/null@12345", 2, "12345"),
                ("serial:/dev/null", 3, "no serial device"), (f"unix:{self.file('none')}", 3, "cannot connect"), ("replay:none.frames", 2, "cannot be opened"),
                ("unix:" + "x" * 200, 3, "too long")):
            found, result, _ = self.board(link)
            self.assertEqual(found, status, link)
            self.assertIn(text, result["error"]["message"])

    def test_scenarios_that_no_board_drives(self):
        for setting, key in (("run.start=steady", "run.start"), ("estimator.0.name=board", "")):
            more = ["--set", "controller.speed_from=board"] if "name" in setting else []
            status, result, _ = self.piped("", "--set", setting, *more)
            self.assertEqual(status, 2)
            self.assertTrue(result["error"]["key"].startswith(key))


if __name__ == "__main__":
    unittest.main()
