"""A table of columns over time: what a trace file holds, or what a stream has sent."""
from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Iterable, Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from .columns import Column
from .errors import NoColumn, TraceError


class Trace(Mapping[str, NDArray[np.float64]]):
    """Columns by name, each a float64 array of shape (rows,); NaN where there is no value.

    trace["speed_rpm"], trace["ekf.speed_rpm"]; by attribute trace.speed_rpm, trace.ekf.speed_rpm. As a mapping it has the
    columns' names for keys; its length is the number of columns, `rows` that of rows.

    columns     tuple of Column (name, unit, meaning), in order
    about       dict of what the source tells of the run: title, seed, scenario (text), slipbench (version), ...; may be empty
    """

    def __init__(self, columns: Sequence[Column], arrays: Sequence[NDArray[np.float64]],
                 about: dict[str, Any] | None = None) -> None:
        """Raises TraceError where the arrays do not fit the columns: one each, of one dimension, all of one length."""
        if len(columns) != len(arrays):
            raise TraceError(f"{len(columns)} columns are named, {len(arrays)} are there")
        arrays = [np.asarray(array, dtype=np.float64) for array in arrays]
        shapes = {array.shape for array in arrays}
        if len(shapes) > 1 or any(len(shape) != 1 for shape in shapes):
            raise TraceError(f"columns must have one dimension and one length, found shapes {sorted(shapes)}")
        self.columns = tuple(columns)
        self.about = dict(about or {})
        self._arrays = {column.name: array for column, array in zip(self.columns, arrays)}
        if len(self._arrays) != len(self.columns):
            names = [column.name for column in self.columns]
            raise TraceError(f"column '{next(name for name in names if names.count(name) > 1)}' is there twice")

    def __getitem__(self, name: str) -> NDArray[np.float64]:
        try:
            return self._arrays[name]
        except KeyError:
            raise NoColumn(name, self._arrays) from None

    def __iter__(self) -> Iterator[str]:
        return iter(self._arrays)

    def __len__(self) -> int:
        return len(self._arrays)

    def __getattr__(self, name: str) -> Any:
        if name.startswith("_"):
            raise AttributeError(name)
        if name in self._arrays:
            return self._arrays[name]
        if any(key.startswith(name + ".") for key in self._arrays):
            return self.group(name)
        raise AttributeError(str(NoColumn(name, self._arrays)))

    def __dir__(self) -> Iterable[str]:
        return [*super().__dir__(), *{name.split(".")[0] for name in self._arrays}]

    def __repr__(self) -> str:
        title = f" of '{self.about['title']}'" if self.about.get("title") else ""
        span = f", {self.time_s[0]:g} s to {self.time_s[-1]:g} s" if "time_s" in self and self.rows else ""
        return f"<Trace{title}: {len(self)} columns, {self.rows} rows{span}>"

    @property
    def rows(self) -> int:
        """Number of rows."""
        return len(next(iter(self._arrays.values()))) if self._arrays else 0

    @property
    def names(self) -> tuple[str, ...]:
        """The columns' names, in order."""
        return tuple(self._arrays)

    @property
    def estimators(self) -> tuple[str, ...]:
        """Names of the estimators: those that have a column of trust."""
        return tuple(name.removesuffix(".trust") for name in self._arrays if name.endswith(".trust"))

    def column(self, name: str) -> Column:
        """Name, unit and meaning of a column. Raises NoColumn."""
        for column in self.columns:
            if column.name == name:
                return column
        raise NoColumn(name, self._arrays)

    def unit(self, name: str) -> str:
        """Unit of a column for people: "rpm", "N m"; "" for a pure number. Raises NoColumn."""
        return self.column(name).unit

    def meaning(self, name: str) -> str:
        """What a column means, in words; "" from a CSV trace, which does not tell. Raises NoColumn."""
        return self.column(name).meaning

    def group(self, name: str) -> Trace:
        """The columns NAME.*, without that prefix: those of an estimator, or `measured`. Raises NoColumn."""
        found = [column for column in self.columns if column.name.startswith(name + ".")]
        if not found:
            raise NoColumn(name, sorted({key.split(".")[0] for key in self._arrays if "." in key}))
        short = [column._replace(name=column.name[len(name) + 1:]) for column in found]
        return Trace(short, [self._arrays[column.name] for column in found], self.about)

    def between(self, from_s: float, to_s: float) -> Trace:
        """Rows with from_s <= time_s <= to_s, ends included (to a millionth of a row's distance, as t = n h is rounded).

        The arrays are views, not copies. Raises NoColumn without `time_s`, ValueError where to_s < from_s.
        """
        if to_s < from_s:
            raise ValueError(f"between({from_s}, {to_s}): the end is before the beginning")
        time = self["time_s"]
        slack = 1e-6 * float(time[1] - time[0]) if self.rows > 1 else 0.0
        first, last = int(np.searchsorted(time, from_s - slack, "left")), int(np.searchsorted(time, to_s + slack, "right"))
        return Trace(self.columns, [array[first:last] for array in self._arrays.values()], self.about)

    def array(self, names: Sequence[str] | None = None) -> NDArray[np.float64]:
        """A copy as one float64 array of shape (rows, columns); all columns, or those named. Raises NoColumn."""
        chosen = [self[name] for name in (self.names if names is None else names)]
        return np.column_stack(chosen) if chosen else np.empty((0, 0))

    def structured(self, names: Sequence[str] | None = None) -> NDArray[np.void]:
        """A copy as one structured array of shape (rows,), a float64 field a column. Raises NoColumn."""
        chosen = list(self.names if names is None else names)
        out = np.empty(self.rows, dtype=[(name, np.float64) for name in chosen])
        for name in chosen:
            out[name] = self[name]
        return out
