"""Reads traces that `slipbench run --trace FILE` has written: CSV and HDF5."""
from __future__ import annotations

import itertools
import os
from pathlib import Path
from typing import Any, Iterator

import numpy as np
from numpy.typing import NDArray

from .columns import Column, unit_of
from .errors import TraceError, VersionError, needs
from .trace import Trace

KNOWN_FORMAT = 1
HDF5_SIGNATURE = b"\x89HDF\r\n\x1a\n"


def read_trace(path: str | os.PathLike[str]) -> Trace:
    """The trace in a file; its first bytes tell CSV from HDF5.

    Values are those of the run to the bit. CSV: units come from the names, `meaning` and `about` are empty. HDF5: units and
    meanings are the file's, `about` has title, seed, scenario (text), slipbench (version), trace_period_s, format. Columns
    come in the file's order, of either kind.

    Raises TraceError where the file is missing, is no trace, or breaks off; VersionError where its format is later than 1;
    ClientError where it is HDF5 and h5py is not installed.
    """
    path = Path(path)
    try:
        with path.open("rb") as file:
            start = file.read(len(HDF5_SIGNATURE))
    except OSError as error:
        raise TraceError(f"{path}: {error.strerror or error}") from None
    return _read_hdf5(path) if start == HDF5_SIGNATURE else _read_csv(path)


def _read_csv(path: Path) -> Trace:
    try:
        with path.open(encoding="ascii") as file:
            names = file.readline().rstrip("\n").split(",")
            if names[0] != "time_s":
                raise TraceError(f"{path}: not a trace: its first line begins with '{names[0][:40]}', expected 'time_s'")
            try:
                table = _numbers(file, len(names))
            except ValueError:
                raise _bad_line(path, len(names)) from None
    except UnicodeDecodeError:
        raise TraceError(f"{path}: neither CSV nor HDF5: write it with slipbench run --trace FILE.csv or FILE.h5") from None
    return Trace([Column(name, unit_of(name)) for name in names], list(np.ascontiguousarray(table.T)))


def _numbers(lines: Iterator[str], width: int) -> NDArray[np.float64]:
    first = next(lines, None)
    if first is None:
        return np.empty((0, width))
    table = np.loadtxt(itertools.chain((first,), lines), delimiter=",", comments=None, ndmin=2)
    if table.shape[1] != width:
        raise ValueError(f"{table.shape[1]} values a line, {width} names")
    return table


def _bad_line(path: Path, width: int) -> TraceError:
    """Finds the line that could not be read."""
    with path.open(encoding="ascii") as file:
        next(file)
        for number, line in enumerate(file, 2):
            cells = line.rstrip("\n").split(",")
            if len(cells) != width:
                return TraceError(f"{path}:{number}: {len(cells)} values for {width} columns: is the file complete?")
            for place, cell in enumerate(cells, 1):
                try:
                    float(cell)
                except ValueError:
                    return TraceError(f"{path}:{number}: value {place} is '{cell[:40]}', expected a number or nan")
    return TraceError(f"{path}: its lines could not be read as numbers")


def _text(value: Any) -> Any:
    """h5py's bytes and NumPy scalars as plain Python."""
    value = value.item() if isinstance(value, np.generic) else value
    return value.decode("utf-8") if isinstance(value, bytes) else value


def _names(file: Any, h5: Any) -> list[str]:
    """The columns in the order they were written; by name where a tool that keeps no order has copied the file."""
    tracked = h5.h5g.open(file.id, b"/").get_create_plist().get_link_creation_order() & h5.h5p.CRT_ORDER_TRACKED
    names: list[str] = []
    file.id.links.iterate(lambda name: names.append(name.decode()),
                          idx_type=h5.h5.INDEX_CRT_ORDER if tracked else h5.h5.INDEX_NAME)
    return [name for name in names if isinstance(file[name], h5.Dataset)]


def _read_hdf5(path: Path) -> Trace:
    try:
        import h5py  # only who reads HDF5 needs it
    except ImportError:
        raise needs("h5py", "hdf5", f"{path}: an HDF5 trace") from None
    try:
        with h5py.File(path, "r") as file:
            if "about" not in file or "time_s" not in file:
                raise TraceError(f"{path}: an HDF5 file, but no trace: it has no 'about' and 'time_s'")
            about = {key: _text(value) for key, value in file["about"].attrs.items()}
            if about.get("format", 0) > KNOWN_FORMAT:
                raise VersionError(f"{path}: the trace's format is {about['format']}, known here is {KNOWN_FORMAT}: "
                                   "take a later slipbench_client")
            about.update({key: _text(data[()]) for key, data in file["about"].items()})
            names = _names(file, h5py)
            columns = [Column(name, *(_text(file[name].attrs.get(key, "")) for key in ("unit", "meaning"))) for name in names]
            return Trace(columns, [file[name][:] for name in names], about)
    except (OSError, RuntimeError) as error:
        raise TraceError(f"{path}: HDF5 cannot read it: {error}") from None
