#!/usr/bin/env python3
"""A client of the stream, written from sim/stream/README.md alone, with pyzmq and msgpack only.

usage: client.py ENDPOINT [SECONDS]     waits for a run, then gives up after SECONDS (5) without a message

Prints one JSON object: what came and what was missed. Each column has a SHA-256, over its float64 in little-endian order,
a NaN as 7ff8000000000000; `sha256` is over these digests in the order of the columns. Exit status 0 after `end`, 1 without
one, 2 for a stream of a later version. For little-endian machines.
"""
import array
import hashlib
import json
import math
import sys

import msgpack
import zmq

KNOWN_VERSION = 1


def one_nan(column):
    """NaN in one form; the column as it came where it has none: a sum with a NaN in it is NaN."""
    values = array.array("d", column)
    return array.array("d", (math.nan if v != v else v for v in values)).tobytes() if math.isnan(sum(values)) else column


class Listener:
    def __init__(self):
        self.run = self.expected = None
        self.digests = []
        self.seen = {"first_word": None, "unnamed": 0, "status": None}

    def describe(self, m):
        if m["version"] > KNOWN_VERSION:
            print(f"client: the stream speaks version {m['version']}, known here is {KNOWN_VERSION}: take a later client",
                  file=sys.stderr)
            sys.exit(2)
        if m["run"] != self.run:  # the first one, or a new run: begin afresh
            self.run, self.expected = m["run"], None
            self.digests = [hashlib.sha256() for _ in m["columns"]]
            self.seen.update(version=m["version"], columns=[column["name"] for column in m["columns"]],
                             rows=0, blocks=0, gaps=0, lost_rows=0)

    def samples(self, m):
        if self.expected is None:
            self.expected = m["sequence"], m["first_tick"]
            self.seen.update(first_sequence=m["sequence"], first_tick=m["first_tick"])
        for digest, column in zip(self.digests, m["columns"], strict=True):
            if len(column) != 8 * m["rows"]:
                raise ValueError(f"block {m['sequence']}: a column of {len(column)} bytes for {m['rows']} rows")
            digest.update(one_nan(column))
        self.missed(m["sequence"], m["first_tick"])
        self.expected = m["sequence"] + 1, m["first_tick"] + m["rows"]
        self.seen["rows"] += m["rows"]
        self.seen["blocks"] += 1

    def missed(self, sequence, tick):
        self.seen["gaps"] += sequence - self.expected[0]
        self.seen["lost_rows"] += tick - self.expected[1]

    def end(self, m):
        if self.expected:
            self.missed(m["blocks"], m["rows"])
        self.seen.update(status=m["status"], end=m)

    def listen(self, endpoint, silence_s):
        socket = zmq.Context.instance().socket(zmq.SUB)
        socket.setsockopt(zmq.LINGER, 0)
        socket.subscribe(b"")
        socket.connect(endpoint)
        try:
            while self.seen["status"] is None:
                topic, body = socket.recv_multipart()
                word = topic.split(b"/")[0].decode("ascii")
                self.seen["first_word"] = self.seen["first_word"] or word
                m = msgpack.unpackb(body)
                if word == "describe":
                    self.describe(m)
                    socket.setsockopt(zmq.RCVTIMEO, int(1000 * silence_s))
                elif word in ("samples", "end"):
                    if m["run"] == self.run:
                        getattr(self, word)(m)
                    else:  # not described yet
                        self.seen["unnamed"] += 1
        except zmq.Again:
            print(f"client: nothing from {endpoint} for {silence_s} s", file=sys.stderr)
        self.seen["sha256"] = hashlib.sha256(b"".join(digest.digest() for digest in self.digests)).hexdigest()
        print(json.dumps(self.seen))
        return 0 if self.seen["status"] else 1


if __name__ == "__main__":
    if len(sys.argv) not in (2, 3):
        sys.exit(__doc__)
    sys.exit(Listener().listen(sys.argv[1], float(sys.argv[2]) if len(sys.argv) == 3 else 5.0))
