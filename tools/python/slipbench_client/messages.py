"""The three messages of the stream (sim/stream/README.md, version 1) as Python sees them."""
from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .columns import Column
from .errors import NoColumn, StreamError, VersionError

KNOWN_VERSION = 1


@dataclass(frozen=True)
class Description:
    """What a run is, told before its rows."""

    run: str                     # another for every run
    version: int                 # of the protocol
    slipbench: str               # version of the program
    scenario: str                # title, or the file's name
    seed: int
    period_s: float              # between rows
    duration_s: float            # as planned
    columns: tuple[Column, ...]  # in the order of the blocks

    @property
    def names(self) -> tuple[str, ...]:
        """The columns' names, in order."""
        return tuple(column.name for column in self.columns)

    @classmethod
    def read(cls, m: dict[str, Any]) -> Description:
        """From the body of `describe`. Raises VersionError where it is later than KNOWN_VERSION."""
        if m["version"] > KNOWN_VERSION:
            raise VersionError(f"the stream speaks version {m['version']} of the protocol, known here is {KNOWN_VERSION}: "
                               "take the slipbench_client that came with the publisher")
        columns = tuple(Column(column["name"], column["unit"], column["meaning"]) for column in m["columns"])
        return cls(m["run"], m["version"], m["slipbench"], m["scenario"], m["seed"], m["period_s"], m["duration_s"], columns)


@dataclass(frozen=True)
class End:
    """How a run ended, and what was lost of it."""

    run: str
    status: str   # done | diverged | interrupted
    blocks: int   # made by the run
    rows: int     # made by the run
    dropped: int  # blocks that did not reach at least one subscriber, as far as the publisher knows
    missed: int   # of these, blocks that this subscriber should have had

    @classmethod
    def read(cls, m: dict[str, Any]) -> End:
        """From the body of `end`."""
        return cls(m["run"], m["status"], m["blocks"], m["rows"], m["dropped"], m.get("missed", 0))


class Block:
    """A few rows of a run. block["speed_rpm"]: float64 of shape (rows,), a read-only view into the message, not a copy.

    description         what the run is
    sequence            number of the block in the run, from 0
    first_tick          number of its first row, from 0 at t = 0
    period_s, rows      between rows; how many
    new_run             true for the first block of a run
    lost_blocks         blocks lost just before this one; lost_rows the same in rows
    """

    def __init__(self, m: dict[str, Any], description: Description, expected: tuple[int, int] | None) -> None:
        """From the body of `samples`; `expected`: the sequence and the row that should follow, None for a run's first block.

        Raises StreamError where columns or rows are not as described.
        """
        self.description = description
        self.sequence: int = m["sequence"]
        self.first_tick: int = m["first_tick"]
        self.period_s: float = m["period_s"]
        self.rows: int = m["rows"]
        self.new_run = expected is None
        due = expected or (self.sequence, self.first_tick)
        self.lost_blocks, self.lost_rows = self.sequence - due[0], self.first_tick - due[1]
        if len(m["columns"]) != len(description.columns) or any(len(data) != 8 * self.rows for data in m["columns"]):
            raise StreamError(f"block {self.sequence}: {len(m['columns'])} columns for {len(description.columns)} names, or "
                              f"not {self.rows} rows in each: this is no stream of slipbench, or a broken one")
        self._arrays = [np.frombuffer(data, dtype="<f8") for data in m["columns"]]

    def __getitem__(self, name: str) -> NDArray[np.float64]:
        try:
            return self._arrays[self.description.names.index(name)]
        except ValueError:
            raise NoColumn(name, self.description.names) from None

    @property
    def arrays(self) -> list[NDArray[np.float64]]:
        """All columns in order, each a view of shape (rows,)."""
        return self._arrays

    @property
    def time_s(self) -> NDArray[np.float64]:
        """Time of each row, shape (rows,): the column of that name, or what the rows' numbers make of it."""
        if "time_s" in self.description.names:
            return self["time_s"]
        return (self.first_tick + np.arange(self.rows)) * self.period_s

    def __repr__(self) -> str:
        lost = f", {self.lost_blocks} lost before it" if self.lost_blocks else ""
        return f"<Block {self.sequence}: {self.rows} rows from {self.first_tick * self.period_s:g} s{lost}>"
