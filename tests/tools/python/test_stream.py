"""Streams of the real command, as NumPy arrays."""
import signal
import subprocess
import sys
import time
import unittest

import msgpack
import numpy as np
import zmq
from command import CONVEYOR, MAINS, PATIENCE_S, Folder, clean_up, read_csv, start

from slipbench_client import Stream, StreamError, StreamSilent, VersionError

COUNTER = """
import sys
from slipbench_client import Stream
with Stream(sys.argv[1], timeout_s=60) as stream:
    lost = sum(block.lost_blocks for block in stream)
    print(lost, stream.lost_blocks, stream.lost_rows, stream.rows, stream.end.missed, stream.end.dropped)
"""


def bits(array):
    """Bytes, NaN in one form."""
    return np.where(np.isnan(array), np.nan, array).tobytes()


class Streams(unittest.TestCase):
    def setUp(self):
        self.folder = Folder(self)
        self.endpoint = self.folder.endpoint

    def publish(self, scenario, *arguments, wait=1):
        return start(self, "run", scenario, "--publish", self.endpoint, "--publish-wait", wait, *arguments)

    def stream(self, **options):
        stream = Stream(self.endpoint, **{"timeout_s": PATIENCE_S, "start_timeout_s": PATIENCE_S, **options})
        self.addCleanup(stream.close)
        return stream

    def played(self, *messages):
        """A publisher of the test's own, for what the command does not say: sends these upon a subscription."""
        socket = zmq.Context.instance().socket(zmq.XPUB)
        self.addCleanup(socket.close, 0)
        socket.setsockopt(zmq.RCVTIMEO, 1000 * PATIENCE_S)
        socket.bind(self.endpoint)
        stream = self.stream()
        socket.recv()
        for word, message in messages:
            socket.send_multipart([f"{word}/1".encode(), message if isinstance(message, bytes) else msgpack.packb(message)])
        return stream

    @staticmethod
    def description(run="a", version=1):
        columns = [{"name": "time_s", "unit": "s", "meaning": "time"}]
        return {"version": version, "slipbench": "0", "run": run, "scenario": "played", "seed": 1, "period_s": 0.5,
                "duration_s": 9.0, "columns": columns}

    @staticmethod
    def samples(sequence, first_tick, run="a", rows=2):
        column = np.arange(first_tick, first_tick + rows, dtype="<f8").tobytes()
        return {"run": run, "sequence": sequence, "first_tick": first_tick, "period_s": 0.5, "rows": rows, "columns": [column]}

    def test_read_all_equals_the_csv(self):
        for scenario in (CONVEYOR, MAINS):
            path = self.folder.path / "trace.csv"
            run = self.publish(scenario, "--trace", path)
            with self.stream() as stream:
                trace = stream.read_all()
            run.communicate(timeout=PATIENCE_S)
            columns = read_csv(path)
            self.assertEqual(trace.names, tuple(columns))
            for name, values in columns.items():
                self.assertEqual(bits(trace[name]), values.tobytes(), name)
            self.assertEqual((stream.lost_blocks, stream.lost_rows, stream.rows), (0, 0, trace.rows))
            self.assertEqual((trace.about["status"], stream.end.missed, stream.end.rows), ("done", 0, trace.rows))
            self.assertEqual((trace.unit("torque_Nm"), bool(trace.meaning("torque_Nm"))), ("N m", True))

    def test_blocks_are_views_and_carry_their_time(self):
        self.publish(CONVEYOR)
        rows = 0
        for block in self.stream():
            self.assertEqual(block.new_run, rows == 0)
            self.assertEqual(block.first_tick, rows)
            self.assertEqual(block["speed_rpm"].shape, (block.rows,))
            self.assertFalse(block["speed_rpm"].flags.owndata)
            self.assertFalse(block["speed_rpm"].flags.writeable)
            # One ulp each for the product here and for n h in the engine, which counts plant steps.
            np.testing.assert_allclose(block.time_s, (block.first_tick + np.arange(block.rows)) * block.period_s, rtol=4.5e-16)
            rows += block.rows
        self.assertEqual(rows, 6001)
        self.assertRaisesRegex(KeyError, "did you mean speed_rpm", lambda: block["sped_rpm"])

    def test_what_was_lost_is_counted(self):
        # Rows of 197 MB, as in tests/clients: a process that reads sleeps for 110 of them, its queue holds 64 MiB.
        run = self.publish(CONVEYOR, "--set", "run.trace_period_s=1e-5", "--pace", 2, wait=2)
        witness = self.stream()
        command = [sys.executable, "-B", "-c", COUNTER, self.endpoint]
        reader = clean_up(self, subprocess.Popen(command, stdout=subprocess.PIPE, text=True))
        stopped = False
        for block in witness:
            if not stopped:
                reader.send_signal(signal.SIGSTOP)
                stopped = True
            elif block.first_tick > 400_000:
                reader.send_signal(signal.SIGCONT)
        lost, lost_blocks, lost_rows, rows, missed, dropped = map(int, reader.communicate(timeout=PATIENCE_S)[0].split())
        run.communicate(timeout=PATIENCE_S)
        self.assertGreater(lost_blocks, 0)
        self.assertLessEqual(lost, lost_blocks)  # a loss at the very end has no block after it
        self.assertEqual((missed, dropped), (lost_blocks, lost_blocks))
        self.assertEqual(rows + lost_rows, 600_001)
        self.assertEqual((witness.lost_blocks, witness.end.missed), (0, 0))

    def test_gaps_and_the_first_block(self):
        stream = self.played(("describe", self.description()), ("samples", self.samples(3, 6)),
                             ("samples", self.samples(5, 10)),
                             ("end", {"run": "a", "status": "diverged", "blocks": 8, "rows": 17, "dropped": 9, "missed": 3}))
        blocks = list(stream)
        self.assertEqual([(block.lost_blocks, block.lost_rows) for block in blocks], [(0, 0), (1, 2)])
        self.assertEqual((stream.lost_blocks, stream.lost_rows, stream.end.missed, stream.end.status), (3, 7, 3, "diverged"))
        self.assertEqual(list(stream), [])

    def test_a_new_run_begins_afresh(self):
        end = {"status": "done", "blocks": 1, "rows": 2, "dropped": 0, "missed": 0}
        first = [("describe", self.description()), ("samples", self.samples(0, 0))]
        second = [("samples", self.samples(8, 16, "b")), ("describe", self.description("b")),
                  ("samples", self.samples(9, 18, "b")), ("end", {"run": "b", **end, "blocks": 10, "rows": 20})]
        stream = self.played(*first, *second)
        blocks = list(stream)  # the first run never told its end
        told = [(block.description.run, block.new_run, block.lost_blocks) for block in blocks]
        self.assertEqual(told, [("a", True, 0), ("b", True, 0)])
        self.assertEqual((stream.runs, stream.blocks, stream.lost_blocks), (2, 1, 0))

    def test_read_all_refuses_to_mix_runs_and_follow_reads_both(self):
        self.assertRaisesRegex(StreamError, "a new run began",
                               self.played(("describe", self.description()), ("describe", self.description("b"))).read_all)
        self.endpoint += "2"
        self.publish(MAINS)
        with self.stream(follow=True) as stream:
            one = stream.read_all()
            self.publish(MAINS, "--seed", "77")  # behind the same endpoint; ZeroMQ connects again
            two = stream.read_all()
        self.assertEqual((one.rows, two.rows, one.about["seed"], two.about["seed"], stream.runs), (2001, 2001, 3, 77, 2))
        self.assertEqual(one.array(["time_s", "speed_rpm"]).tobytes(), two.array(["time_s", "speed_rpm"]).tobytes())
        self.assertRaisesRegex(StreamError, "closed", stream.poll)

    def test_silence_is_told(self):
        with self.assertRaisesRegex(StreamSilent, r"no run has shown itself for \d+\.\d s"):
            self.stream(start_timeout_s=0.2).read_all()
        run = self.publish(CONVEYOR, "--pace", 1)
        stream = self.stream(timeout_s=2.0)
        self.assertEqual(stream.wait().scenario, "Conveyor with a hot rotor")
        run.kill()
        with self.assertRaisesRegex(TimeoutError, "no end: the publisher is gone"):
            list(stream)

    def test_poll_never_waits_longer_than_told(self):
        before = time.monotonic()
        self.assertIsNone(self.stream().poll(0.1))
        self.assertLess(time.monotonic() - before, 5.0)  # 0.1 s; the rest is for a busy machine
        self.assertGreater(time.monotonic() - before, 0.09)

    def test_what_is_not_of_the_protocol_is_told(self):
        three = {**self.samples(0, 0), "rows": 3}
        for message, error, sentence in (
                (("describe", self.description("b", version=2)), VersionError, "version 2 of the protocol, known here is 1"),
                (("describe", b"\xc1"), StreamError, "not of this protocol"),
                (("describe", {"run": "b"}), StreamError, "not of this protocol"),
                (("samples", {"run": "a"}), StreamError, "not of this protocol"),
                (("samples", three), StreamError, "block 0: 1 columns for 1 names, or not 3 rows")):
            with self.subTest(sentence):
                self.endpoint += "x"
                with self.assertRaisesRegex(error, sentence):
                    list(self.played(("describe", self.description()), message))
        for endpoint in ("nowhere", "tcp://", "xyz://a"):
            with self.subTest(endpoint), self.assertRaisesRegex(StreamError, "expected tcp://HOST:PORT"):
                Stream(endpoint)

    def test_a_bare_port_is_loopback(self):
        for port in (0, 65536):
            self.assertRaisesRegex(StreamError, "1 to 65535", Stream, port)
        stream = Stream(5600)
        stream.close()
        self.assertEqual(stream.endpoint, "tcp://127.0.0.1:5600")


if __name__ == "__main__":
    unittest.main()
