"""Fewer points than samples, without hiding one: lowest and highest of each stretch of time, worked out by
SQLite.

Each sample carries the extremes of its own readings, so an envelope keeps even what a frame's mean hides.
Values come out in SI units. It knows one table and no file.
"""

from __future__ import annotations

import sqlite3
from dataclasses import dataclass
from typing import NamedTuple


class Bin(NamedTuple):
    """One stretch of time: when, how many samples, and the lowest, mean and highest of each reading in it."""

    first_us: int
    last_us: int
    samples: int
    voltage_min_V: float
    voltage_V: float
    voltage_max_V: float
    current_min_A: float
    current_A: float
    current_max_A: float
    heatsink_min_degC: float
    heatsink_degC: float
    heatsink_max_degC: float
    junction_min_degC: float
    junction_degC: float
    junction_max_degC: float
    charge_C: float


_ENVELOPE = """
SELECT min(time_us), max(time_us), count(*),
  min(voltage_min_uV) * 1e-6, avg(voltage_uV) * 1e-6, max(voltage_max_uV) * 1e-6,
  min(current_min_uA) * 1e-6, avg(current_uA) * 1e-6, max(current_max_uA) * 1e-6,
  min(heatsink_mC) * 1e-3, avg(heatsink_mC) * 1e-3, max(heatsink_mC) * 1e-3,
  min(junction_mC) * 1e-3, avg(junction_mC) * 1e-3, max(junction_mC) * 1e-3,
  max(charge_uC) * 1e-6
FROM sample GROUP BY (time_us - :first) / :width ORDER BY 1
"""


def envelope_of(connection: sqlite3.Connection, bins: int) -> list[Bin]:
    """At most `bins` bins of equal width in time; stretches without samples give none."""
    first, last = connection.execute("SELECT min(time_us), max(time_us) FROM sample").fetchone()
    if first is None:
        return []
    width = (last - first) // bins + 1
    return [Bin(*row) for row in connection.execute(_ENVELOPE, {"first": first, "width": width})]


class Extreme(NamedTuple):
    """A value and the board time, in microseconds, of the frame that it came in."""

    value: float
    time_us: int


@dataclass(frozen=True)
class Extremes:
    """What a whole record amounts to. `missing` frames were numbered by the board and never arrived."""

    count: int
    first_us: int
    last_us: int
    missing: int
    overruns: int
    dropped: int
    voltage_min_V: Extreme
    voltage_max_V: Extreme
    current_max_A: Extreme
    heatsink_first_degC: float
    heatsink_max_degC: Extreme
    junction_max_degC: Extreme


def extremes_of(connection: sqlite3.Connection) -> Extremes | None:
    """Count, gaps and extremes of the sample table; None when it is empty."""
    totals = connection.execute(
        "SELECT count(*), min(time_us), max(time_us), max(number) - min(number) + 1 - count(*),"
        " max(overruns), max(dropped) FROM sample"
    ).fetchone()
    if not totals[0]:
        return None
    count, first_us, last_us, missing, overruns, dropped = totals
    (heatsink_mC,) = connection.execute("SELECT heatsink_mC FROM sample ORDER BY row LIMIT 1").fetchone()
    return Extremes(
        count=count,
        first_us=first_us,
        last_us=last_us,
        missing=max(missing, 0),
        overruns=overruns,
        dropped=dropped,
        voltage_min_V=_extreme(connection, "min(voltage_min_uV)", 1e6),
        voltage_max_V=_extreme(connection, "max(voltage_max_uV)", 1e6),
        current_max_A=_extreme(connection, "max(current_max_uA)", 1e6),
        heatsink_first_degC=heatsink_mC / 1e3,
        heatsink_max_degC=_extreme(connection, "max(heatsink_mC)", 1e3),
        junction_max_degC=_extreme(connection, "max(junction_mC)", 1e3),
    )


def _extreme(connection: sqlite3.Connection, extreme: str, parts: float) -> Extreme:
    # SQLite takes the other columns from the row that holds the extreme (lang_select, "bare columns").
    value, time_us = connection.execute(f"SELECT {extreme}, time_us FROM sample").fetchone()
    return Extreme(value / parts, time_us)
