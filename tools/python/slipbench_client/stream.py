"""A run as it happens: subscribes to what `slipbench run --publish ENDPOINT` sends."""
from __future__ import annotations

import time
from types import TracebackType
from typing import Any, Iterator

import numpy as np

from .errors import StreamError, StreamSilent, needs
from .messages import Block, Description, End
from .trace import Trace


class Stream:
    """Subscribes to an endpoint: a context manager, and an iterator of blocks that ends with the run.

        with Stream("tcp://127.0.0.1:5600") as stream:
            for block in stream:
                print(block["speed_rpm"].mean(), stream.description.scenario)
        print(stream.end.status, stream.lost_blocks)

    endpoint            tcp://HOST:PORT, ipc://PATH, or PORT for tcp://127.0.0.1:PORT
    timeout_s           once a run has shown itself: the longest silence before StreamSilent (a run speaks once a second)
    start_timeout_s     the longest wait for a run to show itself; None: for ever
    follow              true: after a run's end, go on with the next one
    queue_blocks        blocks kept on this side before the publisher's queue fills (some 256 kB each)

    description         of the run under way; None before the first
    end                 how it ended; None before that
    runs                runs met so far; the figures below are of the last one
    blocks, rows        received
    lost_blocks, lost_rows    lost since the first block received

    Raises StreamError for an endpoint that cannot be used, ClientError where pyzmq or msgpack are not installed.
    Not for use by several threads at once.
    """

    def __init__(self, endpoint: str | int, *, timeout_s: float = 5.0, start_timeout_s: float | None = None,
                 follow: bool = False, queue_blocks: int = 16) -> None:
        try:
            import msgpack
            import zmq
        except ImportError as error:
            raise needs("msgpack" if error.name == "msgpack" else "pyzmq", "stream", "a stream") from None
        endpoint = str(endpoint)
        if endpoint.isdigit() and not 0 < int(endpoint) < 65536:  # ZeroMQ would take it and wait for ever
            raise StreamError(f"endpoint '{endpoint}': a port runs from 1 to 65535")
        self.endpoint = f"tcp://127.0.0.1:{endpoint}" if endpoint.isdigit() else endpoint
        self.timeout_s, self.start_timeout_s, self.follow = timeout_s, start_timeout_s, follow
        self.description: Description | None = None
        self.end: End | None = None
        self.runs = self.blocks = self.rows = self.lost_blocks = self.lost_rows = 0
        self._expected: tuple[int, int] | None = None
        self._heard = time.monotonic()
        self._unpack = msgpack.unpackb
        self._socket: Any = zmq.Context.instance().socket(zmq.SUB)
        try:
            self._socket.setsockopt(zmq.LINGER, 0)
            self._socket.setsockopt(zmq.RCVHWM, queue_blocks)
            self._socket.subscribe(b"")
            self._socket.connect(self.endpoint)
        except zmq.ZMQError as error:
            self.close()
            raise StreamError(f"endpoint '{self.endpoint}': {error}; expected tcp://HOST:PORT, ipc://PATH or PORT, "
                              "as `slipbench run --publish` was given") from None

    def close(self) -> None:
        """Leaves the stream; a second call does nothing."""
        self._socket.close(0)

    def __enter__(self) -> Stream:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None) -> None:
        self.close()

    @property
    def silent_s(self) -> float:
        """Seconds since the last message, or since the stream was opened."""
        return time.monotonic() - self._heard

    def poll(self, wait_s: float = 0.0) -> Block | None:
        """The next block if there is one within wait_s, else None: nothing came, or `end` did. Never raises StreamSilent.

        Raises VersionError for a later protocol, StreamError for what is no message of it or after close().
        """
        until = time.monotonic() + wait_s
        while True:
            left = max(0.0, until - time.monotonic())
            if self._socket.closed:
                raise StreamError(f"{self.endpoint}: the stream is closed")
            if not self._socket.poll(int(1000 * left + 0.999)):
                return None
            block = self._read(*self._receive())
            if block is not None or self.end is not None and not self.follow:
                return block

    def __iter__(self) -> Iterator[Block]:
        """Blocks until the run ends, with `follow` also those of the next runs. Raises StreamSilent, and what poll() does."""
        while self.end is None or self.follow:
            block = self._next()
            if block is not None:
                yield block

    def _next(self) -> Block | None:
        """poll() for a tenth of a second, and StreamSilent where that has gone on for too long."""
        waiting = self.description is None or self.end is not None  # for a run to begin
        allowed = self.start_timeout_s if waiting else self.timeout_s
        block = self.poll(0.1 if allowed is None else min(0.1, allowed))
        if block is None and allowed is not None and self.silent_s > allowed:
            raise StreamSilent(self._silence(waiting))
        return block

    def wait(self) -> Description:
        """Waits for a run to show itself; takes no block. Raises StreamSilent after start_timeout_s, and what poll() does."""
        while self.description is None:
            if self._socket.poll(100):
                self._read(*self._receive())
            elif self.start_timeout_s is not None and self.silent_s > self.start_timeout_s:
                raise StreamSilent(self._silence(waiting=True))
        return self.description

    def read_all(self) -> Trace:
        """All blocks of one run up to its end, as one trace; `about` has title, seed, slipbench, run, status, trace_period_s.

        With `follow`, another call reads the next run. What is lost leaves no rows: see lost_rows. Raises StreamSilent,
        StreamError where another run begins before this one's end or none is left to read, and what poll() does.
        """
        if self.end is not None and not self.follow:
            raise StreamError(f"{self.endpoint}: this stream is at its end; open another, or open it with follow=True")
        if self.end is not None:
            self.description = self.end = None
        told, blocks = self.wait(), list[Block]()
        while self.end is None:
            block = self._next()
            if self.description is not None and self.description.run != told.run:
                raise StreamError(f"{self.endpoint}: a new run began before the end of '{told.scenario}' was told")
            if block is not None:
                blocks.append(block)
        about = {"title": told.scenario, "seed": told.seed, "slipbench": told.slipbench, "run": told.run,
                 "status": self.end.status, "trace_period_s": told.period_s}
        parts = [[block.arrays[k] for block in blocks] or [np.empty(0)] for k in range(len(told.columns))]
        return Trace(told.columns, [np.concatenate(part) for part in parts], about)

    def _silence(self, waiting: bool) -> str:
        if waiting:
            return (f"{self.endpoint}: no run has shown itself for {self.silent_s:.1f} s: is "
                    f"`slipbench run --publish {self.endpoint}` running?")
        return f"{self.endpoint}: nothing for {self.silent_s:.1f} s and no end: the publisher is gone, or stopped"

    def _receive(self) -> tuple[str, dict[str, Any]]:
        self._heard = time.monotonic()
        frames = self._socket.recv_multipart(copy=False)
        word = bytes(frames[0].buffer).split(b"/")[0].decode("ascii", "replace")
        try:
            message = self._unpack(frames[1].buffer)
        except (ValueError, IndexError, TypeError) as error:
            raise StreamError(f"{self.endpoint}: a message '{word}' that is not of this protocol ({error})") from None
        return word, message

    def _read(self, word: str, m: dict[str, Any]) -> Block | None:
        try:
            if word == "describe":
                if self.description is None or m["run"] != self.description.run:
                    self.description, self.end, self._expected = Description.read(m), None, None
                    self.runs += 1
                    self.blocks = self.rows = self.lost_blocks = self.lost_rows = 0
            elif word in ("samples", "end") and self.description is not None and m["run"] == self.description.run:
                if word == "samples":
                    return self._block(m)
                self._end(m)
        except (KeyError, TypeError) as error:
            raise StreamError(f"{self.endpoint}: a message '{word}' that is not of this protocol ({error!r})") from None
        return None

    def _block(self, m: dict[str, Any]) -> Block:
        assert self.description is not None
        block = Block(m, self.description, self._expected)
        self._expected = block.sequence + 1, block.first_tick + block.rows
        self.blocks += 1
        self.rows += block.rows
        self.lost_blocks += block.lost_blocks
        self.lost_rows += block.lost_rows
        return block

    def _end(self, m: dict[str, Any]) -> None:
        self.end = End.read(m)
        if self._expected is not None:
            self.lost_blocks += self.end.blocks - self._expected[0]
            self.lost_rows += self.end.rows - self._expected[1]
