"""The last seconds of some columns of a stream, and their outline for a plot."""
from __future__ import annotations

from collections import deque
from typing import Sequence

import numpy as np
from numpy.typing import NDArray

from .messages import Block

Array = NDArray[np.float64]


class History:
    """Keeps `window_s` seconds of the named columns. A row of NaN stands where rows were lost, so that a line breaks there;
    a new run empties it."""

    def __init__(self, names: Sequence[str], window_s: float) -> None:
        self.names, self.window_s = tuple(names), window_s
        self._chunks: deque[Array] = deque()  # each of shape (1 + names, rows): time first

    def add(self, block: Block) -> None:
        """Takes a block's rows in, lets those go that are older than the window. Raises NoColumn."""
        if block.new_run:
            self._chunks.clear()
        if block.lost_rows:
            self._chunks.append(np.full((1 + len(self.names), 1), np.nan))
            self._chunks[-1][0] = (block.first_tick - 0.5) * block.period_s
        self._chunks.append(np.stack([block.time_s, *(block[name] for name in self.names)]))
        oldest = self._chunks[-1][0, -1] - self.window_s
        while self._chunks[0][0, -1] < oldest:
            self._chunks.popleft()

    def rows(self) -> tuple[Array, dict[str, Array]]:
        """Time, shape (rows,), and each column over it, within the window."""
        if not self._chunks:
            return np.empty(0), {name: np.empty(0) for name in self.names}
        table = np.concatenate(self._chunks, axis=1)
        table = table[:, table[0] >= table[0, -1] - self.window_s]
        return table[0], dict(zip(self.names, table[1:]))


def outline(time: Array, values: Array, buckets: int = 1000) -> tuple[Array, Array]:
    """At most 2 buckets + 1 points that look the same on paper: the smallest and the largest value of each bucket of rows.

    time, values: shape (rows,). A bucket's NaNs are passed over unless it has nothing else: a lone one shows no break.
    """
    size = len(time) // buckets
    if size < 4:
        return time, values
    whole = len(time) // size * size
    cells = values[:whole].reshape(-1, size)
    points = np.stack([np.fmin.reduce(cells, axis=1), np.fmax.reduce(cells, axis=1)], axis=1).ravel()
    return np.append(time[:whole:size].repeat(2), time[-1]), np.append(points, values[-1])
