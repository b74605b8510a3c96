"""What a column is: its name, its unit, what it means."""
from __future__ import annotations

from typing import NamedTuple

# The last word of a name is its unit; how it is written for people follows the HDF5 traces.
UNITS = {unit: unit for unit in ("s", "rpm", "Hz", "V", "A", "Wb", "rad", "ohm")} | {"Nm": "N m"}


class Column(NamedTuple):
    """`name` as in the trace, `unit` for people ("N m"; "" for a pure number), `meaning` ("" where the source tells none)."""

    name: str
    unit: str = ""
    meaning: str = ""


def unit_of(name: str) -> str:
    """The unit that a column's name carries: "N m" for "ekf.torque_Nm"; "" where it carries none ("ekf.trust")."""
    head, _, last = name.rpartition("_")
    return UNITS.get(last, "") if head else ""
