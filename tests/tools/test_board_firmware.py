"""The firmware of this build: as a process, on an emulated Cortex-M4F by pipes and by UART; the same bits from all, the same count in every
run, and its faults. Images are there where the ARM tools were when the build was made."""
import json
import os
import select
import shutil
import struct
import subprocess
import sys
import time
import unittest

from board import ANSWER, ASK, HELLO, SAMPLE, frame, opened
from command import BINARY, PATIENCE_S, SLIPBENCH, SOURCE

SCENARIO = SOURCE / "configs/scenarios/board_conveyor.toml"
FIRMWARE = BINARY / "tools/firmware"
EMULATED = (FIRMWARE / "board_semihosting.elf").exists() and shutil.which("qemu-system-arm")
LONG = "--long" in sys.argv


def answer_of(*arguments):
    done = subprocess.run([SLIPBENCH, *map(str, arguments), "--json"], capture_output=True, text=True, timeout=10 * PATIENCE_S)
    if done.returncode != 0:
        raise AssertionError(f"{arguments}: {done.returncode}\n{done.stderr}")
    return json.loads(done.stdout)


def driven(link, *more):
    return answer_of("board", SCENARIO, "--lock-step", "--link", link, *more)


@unittest.skipIf(LONG, "quick ones apart")
class Bits(unittest.TestCase):
    @classmethod
    def setUpClass(cls):
        cls.host = driven("host")  # 2 s of drive, 20,001 ticks

    def test_process_closes_the_loop(self):
        b = self.host["board"]
        self.assertEqual((b["samples"], b["answers"], b["missing"], b["fault"]), (20001, 20001, 0, 0))
        self.assertEqual(self.host["status"], "done")

    @unittest.skipUnless(EMULATED, "no ARM tools or no QEMU here")
    def test_emulated_board_answers_with_the_same_bits_at_the_same_cost_in_three_runs(self):
        runs = [driven("emulated") for _ in range(3)]
        for run in runs:
            # Digests of all rows of the plant, of the observer riding along, and of the board's estimates.
            self.assertEqual(run["digest"], self.host["digest"])
            self.assertEqual(run["board"]["answers"], 20001)
            self.assertEqual(run["board"]["used"], runs[0]["board"]["used"])
        self.assertEqual(runs[0]["board"]["used"]["unit"], "instructions")
        self.assertGreater(runs[0]["board"]["used"]["least"], 500)  # two sines and 500 operations are more than that

    def test_estimates_are_those_of_the_same_estimator_riding_along(self):
        # The observer of the scenario, fed by the engine in double with the same samples, against the board's in single precision: a
        # hundred roundings of 6e-8 a tick, of which the observer forgets all but the last few hundred.
        board, riding = (self.host["estimators"][n] for n in ("board", "observer"))
        for figure in ("speed_rmse_rpm", "speed_bias_rpm", "torque_rmse_Nm"):
            self.assertAlmostEqual(board[figure] / riding[figure], 1.0, delta=2e-5, msg=figure)

    def test_figures_are_those_of_the_simulated_drive_in_single_precision(self):
        simulated = answer_of("run", SCENARIO, "--set", "controller.precision=float", "--set", "estimator.0.precision=float")
        ours, theirs = self.host["estimators"]["board"], simulated["estimators"]["observer"]
        # What differs: duties in 65,535 steps of 8.5 mV; Clarke and believed voltage in float on the board, in double there. Either turns a
        # converter's code of 15 mA sooner or later, and from there on the two runs round the same noise differently. So do two runs in
        # double with the DC link 1 ppm apart: 4e-4 in speed, 1.8e-3 in torque.
        for figure, share in (("speed_rmse_rpm", 1e-3), ("speed_bias_rpm", 1e-3), ("flux_rmse_Wb", 4e-3), ("torque_rmse_Nm", 4e-3)):
            self.assertAlmostEqual(ours[figure] / theirs[figure], 1.0, delta=share, msg=figure)
        self.assertAlmostEqual(self.host["mean"]["speed_rpm"] / simulated["mean"]["speed_rpm"], 1.0, delta=1e-5)


@unittest.skipUnless(LONG and EMULATED, "long, and only with the ARM tools and QEMU")
class Long(unittest.TestCase):
    def test_emulated_uart_answers_with_the_same_bits(self):
        self.assertEqual(driven("emulated_uart")["digest"], driven("host")["digest"])


class Spoken(unittest.TestCase):
    """A board spoken to directly: its frames in and out."""

    def start(self, words):
        self.process = subprocess.Popen(words, stdin=subprocess.PIPE, stdout=subprocess.PIPE)
        self.addCleanup(self.process.communicate)
        self.addCleanup(self.process.kill)
        self.rest = b""
        hello = self.heard()
        self.assertEqual(struct.unpack_from("<BHH", hello), (HELLO, 1, 0))  # unasked, session 0

    def say(self, payload):
        self.raw(frame(payload))

    def raw(self, data):
        os.write(self.process.stdin.fileno(), data)

    def heard(self, within=PATIENCE_S):
        """The next good frame; None when none comes in time."""
        end = time.monotonic() + within
        while True:
            while b"\0" in self.rest:
                coded, self.rest = self.rest.split(b"\0", 1)
                if coded and (payload := opened(coded)) is not None:
                    return payload
            ready, _, _ = select.select([self.process.stdout], [], [], max(end - time.monotonic(), 0))
            if not ready:
                return None
            data = os.read(self.process.stdout.fileno(), 4096)
            if not data:
                return None
            self.rest += data

    def ask(self, silence=0, version=1):
        self.say(struct.pack("<BHHH", ASK, version, 77, silence))
        return self.heard()

    def sample(self, tick, current=(1, 2, -3), dc_link=1434):
        self.say(struct.pack("<BHIBhhhhIff", SAMPLE, tick & 0xFFFF, tick, 1, *current, dc_link, 0, 0.0, 0.0))
        return self.heard(2)

    def gates_and_fault(self, payload):
        kind, _, _, gates, fault = struct.unpack_from("<BHIBB", payload)
        self.assertEqual(kind, ANSWER)
        return gates, fault

    def silence(self, periods, wait_s):
        self.ask(silence=periods)
        self.assertEqual(self.gates_and_fault(self.sample(0)), (1, 0))
        time.sleep(wait_s)
        self.assertEqual(self.gates_and_fault(self.sample(1)), (0, 1))
        self.assertEqual(self.gates_and_fault(self.sample(2)), (0, 1))
        self.ask(silence=0)
        self.assertEqual(self.gates_and_fault(self.sample(0)), (1, 0))
        time.sleep(wait_s)  # in lock-step it may be kept waiting
        self.assertEqual(self.gates_and_fault(self.sample(1)), (1, 0))


@unittest.skipIf(LONG, "quick ones apart")
class Faults(Spoken):
    def setUp(self):
        self.start([FIRMWARE / "board_host"])

    def test_answers_nothing_before_an_ask(self):
        self.say(struct.pack("<BHIBhhhhIff", SAMPLE, 0, 0, 1, 0, 0, 0, 1434, 0, 0.0, 0.0))
        self.assertIsNone(self.heard(0.2))
        hello = self.ask()
        self.assertEqual(struct.unpack_from("<BHHI", hello), (HELLO, 1, 77, 100000))

    def test_ask_of_another_version_gets_a_hello_of_its_own(self):
        self.assertEqual(struct.unpack_from("<BH", self.ask(version=9)), (HELLO, 1))
        self.assertIsNone(self.sample(0))

    def test_same_sample_again_is_not_computed_again(self):
        self.ask()
        first = [self.sample(0), self.sample(1)]
        again = self.sample(1)
        self.assertEqual(again, first[1])
        self.ask()
        self.assertEqual([self.sample(0), self.sample(1)], first)  # anew from power-up
        self.assertNotEqual(self.sample(2), first[1])

    def test_silence_opens_the_gates_until_the_next_ask(self):
        self.silence(500, 0.3)  # 50 ms

    def test_converter_at_its_end_opens_the_gates(self):
        for code in (2047, -2048):
            self.ask()
            self.assertEqual(self.gates_and_fault(self.sample(0, (1, code, 1))), (0, 2))
            self.assertEqual(self.gates_and_fault(self.sample(1)), (0, 2))

    def test_damaged_samples_are_passed_over(self):
        self.ask()
        good = frame(struct.pack("<BHIBhhhhIff", SAMPLE, 0, 0, 1, 1, 2, -3, 1434, 0, 0.0, 0.0))
        self.raw(good[:10] + bytes([good[10] % 255 + 1]) + good[11:] + b"\x55" * 5000)
        self.assertIsNone(self.heard(0.2))
        self.assertEqual(self.gates_and_fault(self.sample(0)), (1, 0))

    def test_ends_with_its_input(self):
        self.process.stdin.close()
        self.process.stdin = None
        self.assertEqual(self.process.wait(PATIENCE_S), 0)


@unittest.skipUnless(LONG and EMULATED, "long, and only with the ARM tools and QEMU")
class FaultsOnUart(Spoken):
    """The image itself; `-serial stdio` is its line."""

    def test_silence_opens_the_gates_by_the_boards_own_timer(self):
        self.start(["qemu-system-arm", "-M", "mps2-an386", "-nodefaults", "-display", "none", "-kernel", FIRMWARE / "board_uart.elf",
                    "-icount", "shift=7,sleep=off", "-chardev", "stdio,id=line,signal=off", "-serial", "chardev:line"])
        self.silence(500, 2.0)  # 50 ms of its own time; QEMU takes less than that for 400,000 instructions, unless it is not let run


if __name__ == "__main__":
    unittest.main(argv=[word for word in sys.argv if word != "--long"])
