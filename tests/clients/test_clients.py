"""Two clients written from the protocol's page alone, one in Python, one for Node, beside the real command: all they receive
must equal the CSV trace bit by bit, and what they miss must be what the publisher counts.

Environment: SLIPBENCH_COMMAND, SLIPBENCH_SOURCE_DIR, SLIPBENCH_BINARY_DIR (node_modules go there).
"""
import array
import hashlib
import json
import pathlib
import shutil
import signal
import subprocess
import sys
import unittest

import msgpack
import zmq

from command import BINARY, CONVEYOR, MAINS, PATIENCE_S, Folder, clean_up, read_csv, start

HERE = pathlib.Path(__file__).parent


def install_node_client():
    """client.mjs and its pinned packages in the build folder; again only when the lock file has changed."""
    for tool in ("node", "npm"):
        if not shutil.which(tool):
            raise AssertionError(f"the test of the Node client needs `{tool}` on the PATH: tools/packages --tests installs it")
    version = subprocess.run(["node", "--version"], capture_output=True, text=True, check=True).stdout
    if int(version.lstrip("v").split(".")[0]) < 18:
        raise AssertionError(f"node is {version.strip()}, the Node client needs 18 or later")
    folder = BINARY / "node_client"
    folder.mkdir(parents=True, exist_ok=True)
    shutil.copy(HERE / "client.mjs", folder)
    lock, stamp = (HERE / "package-lock.json").read_text(), folder / "installed.json"
    if not stamp.exists() or stamp.read_text() != lock:
        for name in ("package.json", "package-lock.json"):
            shutil.copy(HERE / name, folder)
        # The binaries come inside the package; no script of anybody's needs to run.
        command = ["npm", "ci", "--ignore-scripts", "--prefer-offline", "--no-audit", "--no-fund"]
        npm = subprocess.run(command, cwd=folder, capture_output=True, text=True)
        if npm.returncode != 0:
            raise AssertionError(f"npm ci could not install the Node client's packages (network, or npm's cache?):\n{npm.stderr}")
        stamp.write_text(lock)
    return folder / "client.mjs"


def expected_digest(columns, first_tick=0):
    """What the clients print as `sha256`, had they had all rows of the trace from first_tick on."""
    digests = [hashlib.sha256(column[first_tick:].tobytes()).digest() for column in columns.values()]
    return hashlib.sha256(b"".join(digests)).hexdigest()


class Witness:
    """A subscriber inside the test that keeps up, to know how far the run is."""

    def __init__(self, test, endpoint):
        self.socket = zmq.Context.instance().socket(zmq.SUB)
        test.addCleanup(self.socket.close, 0)
        self.socket.setsockopt(zmq.RCVTIMEO, 1000 * PATIENCE_S)
        self.socket.subscribe(b"")
        self.socket.connect(endpoint)

    def until(self, wanted):
        """Reads on until wanted(word, message), returns that message."""
        while True:
            topic, body = self.socket.recv_multipart()
            word, message = topic.split(b"/")[0].decode(), msgpack.unpackb(body)
            if wanted(word, message):
                return message

    def until_tick(self, tick):
        return self.until(lambda word, message: word == "samples" and message["first_tick"] >= tick)

    def end(self):
        return self.until(lambda word, message: word == "end")


class Clients(unittest.TestCase):
    @classmethod
    def setUpClass(cls):
        cls.commands = {"python": [sys.executable, "-B", str(HERE / "client.py")], "node": ["node", str(install_node_client())]}

    def setUp(self):
        self.folder = Folder(self)
        self.endpoint = self.folder.endpoint

    def client(self, which, seconds=PATIENCE_S):
        command = [*self.commands[which], self.endpoint, str(seconds)]
        return clean_up(self, subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True))

    def both(self, seconds=PATIENCE_S):
        return {which: self.client(which, seconds) for which in self.commands}

    def told(self, client, status=0):
        out, error = client.communicate(timeout=2 * PATIENCE_S)
        self.assertEqual(client.returncode, status, error)
        return json.loads(out) if out else error

    def publish(self, scenario, *arguments, wait=2):
        return start(self, "run", scenario, "--publish", self.endpoint, "--publish-wait", wait, *arguments)

    def finish(self, run, status=0):
        _, error = run.communicate(timeout=2 * PATIENCE_S)
        self.assertEqual(run.returncode, status, error)
        return error

    def test_every_row_equals_the_trace(self):
        for scenario in (CONVEYOR, MAINS):
            trace = self.folder.path / "trace.csv"
            with self.subTest(scenario.name):
                run = self.publish(scenario, "--trace", trace)
                clients = self.both()
                self.finish(run)
                columns = read_csv(trace)
                for which, client in clients.items():
                    seen = self.told(client)
                    with self.subTest(which):
                        self.assertEqual(seen["columns"], list(columns))
                        self.assertEqual(seen["sha256"], expected_digest(columns))
                        rows = len(columns["time_s"])
                        wanted = {"version": 1, "status": "done", "rows": rows, "gaps": 0, "lost_rows": 0, "first_sequence": 0}
                        self.assertEqual({key: seen[key] for key in wanted}, wanted)
                        end = {"blocks": seen["blocks"], "rows": rows, "dropped": 0, "missed": 0}
                        self.assertEqual({key: seen["end"][key] for key in end}, end)

    def test_the_digest_sees_one_bit(self):
        columns = {"a": array.array("d", [1.0, 2.0]), "b": array.array("d", [0.0, -1.0])}
        other = {"a": array.array("d", [1.0, 2.0]), "b": array.array("d", [-0.0, -1.0])}
        self.assertNotEqual(expected_digest(columns), expected_digest(other))

    def test_a_late_subscriber_is_told_the_columns_and_gets_the_tail(self):
        trace = self.folder.path / "trace.csv"
        run = self.publish(CONVEYOR, "--trace", trace, "--pace", 2, wait=1)  # 6 s in 3
        witness = Witness(self, self.endpoint)
        witness.until_tick(1000)
        clients = self.both()
        self.finish(run)
        columns = read_csv(trace)
        for which, client in clients.items():
            seen = self.told(client)
            with self.subTest(which):
                self.assertGreaterEqual(seen["first_tick"], 1000)
                self.assertEqual(seen["columns"], list(columns))
                self.assertEqual(seen["rows"], len(columns["time_s"]) - seen["first_tick"])
                self.assertEqual(seen["sha256"], expected_digest(columns, seen["first_tick"]))
                self.assertEqual((seen["gaps"], seen["end"]["missed"], seen["status"]), (0, 0, "done"))

    def test_a_diverged_run_says_so(self):
        # Forward Euler turns a flux at 60 Hz by 1.1 rad in 3 ms and lengthens it by half each step: more than this machine damps.
        trace = self.folder.path / "trace.csv"
        keys = ("plant_step_s=3e-3", "control_period_s=3e-3", "trace_period_s=3e-3", "duration_s=99", "method=euler")
        sets = [word for key in keys for word in ("--set", f"run.{key}")]
        run = self.publish(MAINS, "--set", "machine.file=../machines/krause_50hp.toml", *sets, "--trace", trace)
        clients = self.both()
        self.finish(run, 1)
        columns = read_csv(trace)
        self.assertGreater(len(columns["time_s"]), 1)
        for which, client in clients.items():
            seen = self.told(client)
            with self.subTest(which):
                self.assertEqual((seen["status"], seen["gaps"], seen["end"]["missed"]), ("diverged", 0, 0))
                self.assertEqual(seen["sha256"], expected_digest(columns))

    def test_an_interrupted_run_says_so(self):
        trace = self.folder.path / "trace.csv"
        run = self.publish(CONVEYOR, "--trace", trace, "--pace", 1, wait=3)
        clients, witness = self.both(), Witness(self, self.endpoint)
        witness.until_tick(100)
        run.send_signal(signal.SIGINT)
        self.finish(run, 130)
        columns = read_csv(trace)
        for which, client in clients.items():
            seen = self.told(client)
            with self.subTest(which):
                self.assertEqual((seen["status"], seen["gaps"], seen["end"]["missed"]), ("interrupted", 0, 0))
                self.assertLess(seen["rows"], 6001)
                self.assertEqual(seen["sha256"], expected_digest(columns))

    def test_a_killed_run_leaves_no_client_hanging(self):
        run = self.publish(CONVEYOR, "--pace", 1, wait=3)
        clients, witness = self.both(seconds=2), Witness(self, self.endpoint)
        witness.until_tick(100)
        run.kill()
        for which, client in clients.items():
            seen = self.told(client, status=1)
            with self.subTest(which):
                self.assertIsNone(seen["status"])
                self.assertGreaterEqual(seen["rows"], 100)

    def test_stopped_clients_miss_what_the_publisher_counts(self):
        # 41 columns of 600 001 rows are 197 MB. A client asleep for 110 MB has its 64 MiB queue full (and a socket buffer,
        # a few hundred kB), whatever the machine's speed; awake for the last third it reads on.
        run = self.publish(CONVEYOR, "--set", "run.trace_period_s=1e-5", "--pace", 2, wait=3)
        clients, witness = self.both(), Witness(self, self.endpoint)
        witness.until_tick(0)
        for client in clients.values():
            client.send_signal(signal.SIGSTOP)
        witness.until_tick(400_000)
        for client in clients.values():
            client.send_signal(signal.SIGCONT)
        end = witness.end()
        self.finish(run)
        self.assertEqual(end["missed"], 0, "the witness kept up")
        missed = []
        for which, client in clients.items():
            seen = self.told(client)
            with self.subTest(which):
                self.assertGreater(seen["gaps"], 0)
                self.assertEqual(seen["gaps"], seen["end"]["missed"])
                self.assertEqual(seen["rows"] + seen["lost_rows"], 600_001)
                self.assertEqual(seen["blocks"] + seen["gaps"], end["blocks"])
                self.assertEqual(seen["end"]["dropped"], end["dropped"])
            missed.append(seen["gaps"])
        self.assertGreaterEqual(end["dropped"], max(missed))  # a block that both missed counts once
        self.assertLessEqual(end["dropped"], sum(missed))

    def test_what_a_client_that_never_wakes_lacks_is_counted(self):
        run = self.publish(CONVEYOR, "--set", "run.trace_period_s=1e-4", "--json", "--pace", 6, wait=3)
        clients, witness = self.both(seconds=2), Witness(self, self.endpoint)
        witness.until_tick(5000)
        for client in clients.values():
            client.send_signal(signal.SIGSTOP)
        end = witness.end()
        out, error = run.communicate(timeout=2 * PATIENCE_S)
        stream = json.loads(out)["stream"]
        self.assertEqual(end["missed"], 0, "the witness kept up")
        lacking = []
        for client in clients.values():
            client.send_signal(signal.SIGCONT)
            lacking.append(stream["blocks"] - self.told(client, status=1)["blocks"])
        # The block that was on the wire when the program left is counted as dropped, and may have come through.
        self.assertIn(stream["dropped"] - max(lacking), (0, 1), error)
        self.assertGreater(min(lacking), 0)

    def test_a_later_version_is_refused_and_unknown_words_and_keys_are_not(self):
        # The command speaks version 1 only: a later one has to be played here.
        for version, status in ((1, 0), (2, 2)):
            socket = zmq.Context.instance().socket(zmq.XPUB)
            self.addCleanup(socket.close, 0)
            socket.setsockopt(zmq.XPUB_VERBOSE, 1)
            socket.setsockopt(zmq.RCVTIMEO, 1000 * PATIENCE_S)
            socket.bind(self.endpoint)
            clients = self.both()
            for _ in clients:
                socket.recv()
            column = {"name": "time_s", "unit": "s", "meaning": "time", "later": [1]}
            for word, message in (
                    ("weather", {"sun": True}),
                    ("describe", {"version": version, "columns": [column], "later": {"x": 1}}),
                    ("samples", {"sequence": 7, "first_tick": 70, "rows": 1, "columns": [bytes(8)], "later": 0}),
                    ("end", {"status": "done", "blocks": 8, "rows": 71, "dropped": 0, "missed": 0})):
                socket.send_multipart([word.encode() + b"/1", msgpack.packb({"run": "00000000000000aa", **message})])
            for which, client in clients.items():
                seen = self.told(client, status)
                with self.subTest(which, version=version):
                    if version == 1:
                        self.assertEqual((seen["rows"], seen["gaps"], seen["first_word"]), (1, 0, "weather"))
                    else:
                        self.assertIn("version 2", seen)
            socket.close(0)


if __name__ == "__main__":
    unittest.main()
