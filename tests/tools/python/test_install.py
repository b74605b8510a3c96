"""pip installs the package from this tree, without a network, and what it installed reads a trace and a stream."""
import os
import shutil
import subprocess
import sys
import unittest

from command import MAINS, SOURCE, Folder, run, start

SAMPLE = """
import pathlib, sys
import slipbench_client
home = pathlib.Path(slipbench_client.__file__).parent
assert str(home).startswith(sys.prefix), home
assert (home / "py.typed").exists()
trace = slipbench_client.read_trace("trace.csv")
with slipbench_client.Stream(sys.argv[1], timeout_s=60) as stream:
    streamed = stream.read_all()
assert trace.array().shape == streamed.array().shape, (trace, streamed)
print(trace.rows, trace.unit("torque_Nm"))
"""


class Install(unittest.TestCase):
    def test_pip_into_a_venv(self):
        folder = Folder(self)
        at = folder.path
        environment = {key: value for key, value in os.environ.items() if key != "PYTHONPATH"}

        def call(*command):
            done = subprocess.run([str(word) for word in command], cwd=at, env=environment, capture_output=True, text=True)
            self.assertEqual(done.returncode, 0, done.stdout + done.stderr)
            return done.stdout

        # A copy, as setuptools leaves its workings beside the sources.
        leftovers = shutil.ignore_patterns("__pycache__", "build", "*.egg-info")
        shutil.copytree(SOURCE / "tools/python", at / "source", ignore=leftovers)
        call(sys.executable, "-m", "venv", "--system-site-packages", "venv")
        call("venv/bin/pip", "install", "--no-build-isolation", "--no-deps", "--no-index", "--quiet", "./source")
        run("run", MAINS, "--quiet", "--trace", at / "trace.csv")
        start(self, "run", MAINS, "--quiet", "--publish", folder.endpoint, "--publish-wait", 1)
        self.assertEqual(call("venv/bin/python", "-c", SAMPLE, folder.endpoint).split(maxsplit=1), ["2001", "N m\n"])
        self.assertIn("ENDPOINT", call("venv/bin/slipbench-live", "--help"))


if __name__ == "__main__":
    unittest.main()
