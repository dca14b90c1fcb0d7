"""Fewer points than samples, without hiding one: lowest and highest of each stretch of time, worked out by
SQLite.

Each sample carries the extremes of its own readings, so an envelope keeps even what a frame's mean hides.
A stretch that only the board kept joins them, coarser. Values come out in SI units. It knows no file.
"""

from __future__ import annotations

import math
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


#: The samples, and after them what only the board kept; its log has no junction, and means of the current only.
_WITH_BOARD_LOG = """(
  SELECT row, time_us, voltage_uV, voltage_min_uV, voltage_max_uV, current_uA, current_min_uA, current_max_uA,
    heatsink_mC, junction_mC, charge_uC FROM sample
  UNION ALL
  SELECT NULL, time_us, voltage_uV, voltage_min_uV, voltage_max_uV, current_uA, current_uA, current_uA,
    heatsink_mC, NULL, charge_uC FROM board_log WHERE missed
)"""

_ENVELOPE = """
SELECT min(time_us), max(time_us), count(*),
  min(voltage_min_uV) * 1e-6, avg(voltage_uV) * 1e-6, max(voltage_max_uV) * 1e-6,
  min(current_min_uA) * 1e-6, avg(current_uA) * 1e-6, max(current_max_uA) * 1e-6,
  min(heatsink_mC) * 1e-3, avg(heatsink_mC) * 1e-3, max(heatsink_mC) * 1e-3,
  min(junction_mC) * 1e-3, avg(junction_mC) * 1e-3, max(junction_mC) * 1e-3,
  max(charge_uC) * 1e-6
FROM {readings} GROUP BY (time_us - :first) / :width ORDER BY 1
"""


def envelope_of(connection: sqlite3.Connection, bins: int) -> list[Bin]:
    """At most `bins` bins of equal width in time; stretches without samples give none."""
    readings = _readings(connection)
    first, last = connection.execute(f"SELECT min(time_us), max(time_us) FROM {readings}").fetchone()
    if first is None:
        return []
    width = (last - first) // bins + 1
    rows = connection.execute(_ENVELOPE.format(readings=readings), {"first": first, "width": width})
    return [Bin._make(math.nan if value is None else value for value in row) for row in rows]


def _readings(connection: sqlite3.Connection) -> str:
    """What to read from: the samples, with the board's own log where it tells more."""
    (there,) = connection.execute("SELECT count(*) FROM sqlite_master WHERE name = 'board_log'").fetchone()
    if there and connection.execute("SELECT 1 FROM board_log WHERE missed LIMIT 1").fetchone():
        return _WITH_BOARD_LOG
    return "sample"


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
        "SELECT count(*), min(time_us), max(number) - min(number) + 1 - count(*),"
        " max(overruns), max(dropped) FROM sample"
    ).fetchone()
    if not totals[0]:
        return None
    count, first_us, missing, overruns, dropped = totals
    readings = _readings(connection)
    (last_us,) = connection.execute(f"SELECT max(time_us) FROM {readings}").fetchone()
    (heatsink_mC,) = connection.execute("SELECT heatsink_mC FROM sample ORDER BY row LIMIT 1").fetchone()
    return Extremes(
        count=count,
        first_us=first_us,
        last_us=last_us,
        missing=max(missing, 0),
        overruns=overruns,
        dropped=dropped,
        voltage_min_V=_extreme(connection, readings, "min(voltage_min_uV)", 1e6),
        voltage_max_V=_extreme(connection, readings, "max(voltage_max_uV)", 1e6),
        current_max_A=_extreme(connection, readings, "max(current_max_uA)", 1e6),
        heatsink_first_degC=heatsink_mC / 1e3,
        heatsink_max_degC=_extreme(connection, readings, "max(heatsink_mC)", 1e3),
        junction_max_degC=_extreme(connection, readings, "max(junction_mC)", 1e3),
    )


def _extreme(connection: sqlite3.Connection, readings: str, extreme: str, parts: float) -> Extreme:
    # SQLite takes the other columns from the row that holds the extreme (lang_select, "bare columns").
    value, time_us = connection.execute(f"SELECT {extreme}, time_us FROM {readings}").fetchone()
    return Extreme(value / parts, time_us)
