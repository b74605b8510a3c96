"""slipbench export through the built command: what its files are worth to a C compiler, to cppcheck and on an emulated board."""
import json
import os
import re
import shutil
import subprocess
import tempfile
import unittest

from command import PATIENCE_S, SLIPBENCH, SOURCE

CONVEYOR = os.path.join(SOURCE, "configs/scenarios/conveyor_hot_rotor.toml")
PUMP = os.path.join(SOURCE, "configs/scenarios/pump_two_phase.toml")
BITS = ["-std=c99", "-O2", "-ffp-contract=off", "-fno-math-errno"]
WHOLE = ["--set", "score.from_s=0.0"]
STRICT = ["-Wall", "-Wextra", "-Wconversion", "-Wdouble-promotion", "-pedantic", "-Werror"]
M4F = ["-mcpu=cortex-m4", "-mthumb", "-mfloat-abi=hard", "-mfpu=fpv4-sp-d16"]
ARM = shutil.which("arm-none-eabi-gcc") and shutil.which("qemu-system-arm")


def slipbench(*arguments, **more):
    return subprocess.run([SLIPBENCH, *arguments], capture_output=True, text=True, timeout=PATIENCE_S, **more)


def parts_in(folder):
    return sorted(name[:-2] for name in os.listdir(folder) if name.endswith(".c") and not name.endswith("_replay.c"))


class Exported(unittest.TestCase):
    """Two scenarios, so that both controllers are there; float and double."""

    @classmethod
    def setUpClass(cls):
        cls.top = tempfile.TemporaryDirectory()
        cls.folders = {}
        for scenario, precision, *more in ((CONVEYOR, "float"), (CONVEYOR, "double"), (PUMP, "float", "--controller")):
            folder = os.path.join(cls.top.name, os.path.basename(scenario)[:-5] + "_" + precision)
            answer = slipbench("export", scenario, "--precision", precision, "--to", folder, "--quiet", "--set", "run.duration_s=1.0",
                               *WHOLE, *more)
            assert answer.returncode == 0, answer.stderr
            assert answer.stdout == "", answer.stdout
            cls.folders[os.path.basename(folder)] = folder

    @classmethod
    def tearDownClass(cls):
        cls.top.cleanup()

    def each(self):
        for label, folder in self.folders.items():
            for part in parts_in(folder):
                yield folder, part, self.subTest(f"{label}: {part}")

    def build(self, folder, part, *flags):
        program = os.path.join(folder, part + ".x")
        done = subprocess.run(["cc", *BITS, part + ".c", part + "_replay.c", "-o", program, *flags], cwd=folder,
                              capture_output=True, text=True, timeout=PATIENCE_S)
        self.assertEqual(done.returncode, 0, done.stderr)
        return program

    def test_vectors_replay_to_the_bit_and_strict_warnings_stay_silent(self):
        for folder, part, named in self.each():
            with named:
                for flags in (STRICT, ["-O0", "-lm"], ["-O3", "-march=native"]):  # unoptimised, sqrt is a call
                    run = subprocess.run([self.build(folder, part, *flags)], capture_output=True, text=True, timeout=PATIENCE_S)
                    self.assertEqual(run.returncode, 0, run.stdout)
                    self.assertIn("alike to the bit", run.stdout)

    def test_a_changed_constant_is_found(self):
        for folder, part, named in self.each():
            with named:
                path = os.path.join(folder, part + ".c")
                with open(path, encoding="utf-8") as file:
                    text = file.read()
                # The last hexadecimal digit of the first of the machine's constants, which stands in an equation; a threshold that
                # decides nothing in the vectors would be another matter.
                found = re.search(r"^static const \w+ \w+ = -?0x1\.([0-9a-f]+)p", text, re.MULTILINE)
                at = found.end(1) - 1
                other = "8" if text[at] != "8" else "4"
                with tempfile.TemporaryDirectory() as wrong:
                    shutil.copytree(folder, wrong, dirs_exist_ok=True)
                    with open(os.path.join(wrong, part + ".c"), "w", encoding="utf-8") as file:
                        file.write(text[:at] + other + text[at + 1:])
                    run = subprocess.run([self.build(wrong, part)], capture_output=True, text=True, timeout=PATIENCE_S)
                self.assertEqual(run.returncode, 1, f"{found.group()} changed unnoticed")
                self.assertIn("expected", run.stdout)

    def test_no_library_is_linked(self):
        for folder, part, named in self.each():
            with named:
                compilers = [["cc"]]
                if ARM and folder.endswith("float"):
                    compilers.append(["arm-none-eabi-gcc", *M4F, *STRICT])
                for compiler in compilers:
                    subprocess.run([*compiler, *BITS, "-c", part + ".c", "-o", part + ".o"], cwd=folder, check=True, timeout=PATIENCE_S)
                    undefined = subprocess.run(["nm", "-u", part + ".o"], cwd=folder, capture_output=True, text=True, check=True)
                    self.assertEqual(undefined.stdout.strip(), "")

    @unittest.skipUnless(shutil.which("cppcheck"), "cppcheck is not installed")
    def test_cppcheck_has_nothing_to_say(self):
        for folder, part, named in self.each():
            replays = [part + "_replay.c"] if "pump" in folder else []  # one text for all parts, and slow to check
            with named:  # 13 s for the filter on a processor of its own
                done = subprocess.run(["cppcheck", "--std=c99", "--enable=warning,style,performance,portability", "--inline-suppr",
                                       "--error-exitcode=1", "--quiet", part + ".c", *replays], cwd=folder,
                                      capture_output=True, text=True, timeout=5 * PATIENCE_S)
                self.assertEqual((done.returncode, done.stdout + done.stderr), (0, ""))

    def test_a_header_says_what_an_engineer_must_know(self):
        for folder, part, named in self.each():
            with named:
                with open(os.path.join(folder, part + ".h"), encoding="utf-8") as file:
                    text = file.read()
                for word in ("CAUTION. This is not a safety function", "emergency stop", "local", "export format 1",
                             "-ffp-contract=off", "bytes", "operations", ".toml", part + "_init"):
                    self.assertIn(word, text)


class Asked(unittest.TestCase):
    def test_one_part_alone_and_its_figures_in_json(self):
        with tempfile.TemporaryDirectory() as folder:
            answer = slipbench("export", CONVEYOR, "--estimator", "ekf", "--to", folder + "/new", "--json", "--set", "run.duration_s=0.2", *WHOLE)
            self.assertEqual(answer.returncode, 0, answer.stderr)
            document = json.loads(answer.stdout)
            self.assertEqual(list(document["parts"]), ["ekf"])
            part = document["parts"]["ekf"]
            self.assertEqual(sorted(part["files"]), sorted(os.listdir(folder + "/new")))
            self.assertEqual(part["operations"]["all"], sum(n for key, n in part["operations"].items() if key != "all"))

    def test_refusals(self):
        cases = [(["--estimator", "nobody"], 2, "there are: luenberger, reduced, ekf"), (["--precision", "half"], 2, "float or double"),
                 (["--clock-mhz", "80"], 2, "--cost"), (["--precision", "double", "--cost"], 2, "float"),
                 (["--cost", "--clocks-per-instruction", "2"], 2, "LOW..HIGH"),
                 (["--set", "process_noise.flux_Wb=1000.0"], 1, "nothing was exported"), (["--to", "/dev/null/x"], 3, "/dev/null/x")]
        for more, status, words in cases:
            with self.subTest(more), tempfile.TemporaryDirectory() as folder:
                to = [] if "--to" in more else ["--to", folder + "/new"]
                answer = slipbench("export", CONVEYOR, "--set", "run.duration_s=0.2", *WHOLE, *to, *more)
                self.assertEqual(answer.returncode, status, answer.stderr)
                self.assertIn(words, answer.stderr)
                self.assertEqual(os.listdir(folder), [])

    def test_cost_without_the_tools_says_what_to_install(self):
        with tempfile.TemporaryDirectory() as folder:
            answer = slipbench("export", CONVEYOR, "--cost", "--to", folder + "/new", *WHOLE, env={**os.environ, "PATH": folder})
            self.assertEqual(answer.returncode, 3)
            self.assertIn("apt-get install --no-install-recommends gcc-arm-none-eabi libnewlib-arm-none-eabi qemu-system-arm", answer.stderr)
            self.assertEqual(os.listdir(folder), [])


@unittest.skipUnless(ARM, "needs gcc-arm-none-eabi and qemu-system-arm (tools/packages --tests)")
class OnTheBoard(unittest.TestCase):
    def cost(self, scenario, folder, *more):
        answer = slipbench("export", scenario, "--cost", "--json", "--to", folder, "--set", "run.duration_s=0.5", *WHOLE, *more)
        self.assertEqual(answer.returncode, 0, answer.stderr)  # which says too that every bit was alike on the board
        return json.loads(answer.stdout)

    def test_counts_repeat_and_make_periods(self):
        for scenario, *parts in ((CONVEYOR, "--controller", "--estimator", "luenberger", "--estimator", "ekf"), (PUMP, "--controller")):
            with self.subTest(scenario), tempfile.TemporaryDirectory() as folder:
                first, second, third = (self.cost(scenario, folder, *parts, "--clock-mhz", "80", "--clocks-per-instruction", "1.5..2")
                                        for _ in range(3))
                self.assertEqual(first, second)
                self.assertEqual(first, third)
                counts = {name: part["cortex_m4f"] for name, part in first["parts"].items()}
                for name, count in counts.items():
                    self.assertLessEqual(count["instructions_least"], count["instructions_mean"])
                    self.assertLessEqual(count["instructions_mean"], count["instructions_most"])
                    # Each operation is an instruction at least, but for those that a fused compare or a select takes along.
                    self.assertGreater(count["instructions_most"], 0.5 * first["parts"][name]["operations"]["all"])
                    self.assertEqual(count["ticks"], first["parts"][name]["vector_ticks"])
                if scenario == PUMP:
                    continue
                together = counts["controller"]["instructions_most"] + counts["luenberger"]["instructions_most"]
                low, high = first["shortest_control_period_us"]["controller + luenberger"]
                self.assertAlmostEqual(low, together * 1.5 / 80, places=9)
                self.assertAlmostEqual(high, together * 2.0 / 80, places=9)

    def test_the_summary_says_that_instructions_are_not_time(self):
        with tempfile.TemporaryDirectory() as folder:
            answer = slipbench("export", CONVEYOR, "--cost", "--controller", "--to", folder, "--set", "run.duration_s=0.2", *WHOLE)
            self.assertEqual(answer.returncode, 0, answer.stderr)
            self.assertIn("They are not time", answer.stdout)
            self.assertIn("Measure on your part", answer.stdout)


if __name__ == "__main__":
    unittest.main()
