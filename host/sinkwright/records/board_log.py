"""The board's own log of a run within a record: the name that ties the two together, and the log's entries.

Plain values in the wire's integers; knows neither files nor devices.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import Any, NamedTuple, Protocol

from sinkwright.sample import SINKING, Sample

#: Kind of the event that ties a record to a run on the board.
BOARD_RUN = "board-run"


class BoardRunName(NamedTuple):
    """A run on the board, which test of the plan it is, and whether the board would go on with it alone."""

    run: int
    test: int
    alone: bool


def run_named_in(data: Mapping[str, Any]) -> BoardRunName:
    """The name in an event's data. Raises KeyError and TypeError for data that has none."""
    return BoardRunName(int(data["run"]), int(data["test"]), bool(data["alone"]))


class LoggedEntry(NamedTuple):
    """One entry; the fields are the columns of `board_log`, where their meaning stands."""

    time_us: int
    test: int
    missed: int
    spacing_us: int
    voltage_uV: int
    voltage_min_uV: int
    voltage_max_uV: int
    current_uA: int
    heatsink_mC: int
    charge_uC: int


class WireEntry(Protocol):
    """An entry as the board sends it."""

    @property
    def time_ms(self) -> int: ...
    @property
    def voltage_uV(self) -> int: ...
    @property
    def voltage_min_uV(self) -> int: ...
    @property
    def voltage_max_uV(self) -> int: ...
    @property
    def current_uA(self) -> int: ...
    @property
    def heatsink_cC(self) -> int: ...
    @property
    def charge_mC(self) -> int: ...


#: Samples further apart than this leave a gap that the board's log may fill: beyond any hiccup of a link.
GAP_us = 3_000_000
#: Later than any sample: the end of a gap that nothing follows.
FOREVER_us = 1 << 62


def logged(
    entries: Iterable[WireEntry],
    *,
    test: int,
    started_us: int,
    spacing_us: int,
    gaps: Sequence[tuple[int, int]],
) -> list[LoggedEntry]:
    """The board's log of a run that began at `started_us`, for a record with these gaps between samples."""
    found = []
    for entry in entries:
        time_us = started_us + entry.time_ms * 1000
        found.append(
            LoggedEntry(
                time_us=time_us,
                test=test,
                missed=int(any(first < time_us < last for first, last in gaps)),
                spacing_us=spacing_us,
                voltage_uV=entry.voltage_uV,
                voltage_min_uV=entry.voltage_min_uV,
                voltage_max_uV=entry.voltage_max_uV,
                current_uA=entry.current_uA,
                heatsink_mC=entry.heatsink_cC * 10,
                charge_uC=entry.charge_mC * 1000,
            )
        )
    return found


def as_sample(entry: LoggedEntry) -> Sample:
    """The entry as a sample of its whole spacing; what the log does not tell is left at nothing."""
    return Sample(
        number=0, time_us=entry.time_us, state=SINKING, mode=0, limiting=0, fault=0, setpoint=0,
        voltage_uV=entry.voltage_uV, voltage_min_uV=entry.voltage_min_uV, voltage_max_uV=entry.voltage_max_uV,
        current_uA=entry.current_uA, current_min_uA=entry.current_uA, current_max_uA=entry.current_uA,
        force_uV=entry.voltage_uV, heatsink_mC=entry.heatsink_mC, junction_mC=entry.heatsink_mC,
        charge_uC=entry.charge_uC, energy_uJ=0, pairs=1, overruns=0, dropped=0,
    )  # fmt: skip
