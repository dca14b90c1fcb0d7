"""What a row of the fault table is, and how the findings of its runs are judged. Which rows there are: rows_*.py.

A row is run with its fault beginning at several moments of the control schedule, and the worst counts: one slow
input is read every 66 steps only.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from enum import Enum
from typing import Any

from sinkwright_wire.vocabulary import EventKind, Fault, ResetCause

from .children import Case

PERIOD_us = 2350
ONSET_us = 1_200_000
#: The onsets of eight runs cover the schedule's 66 steps, at eight places within the step.
_PHASE_us = 19_670
PHASES = 8
#: What counts as no current: below the resolution of any meter that a fuse is chosen by.
_NOTHING_A = 0.005
#: After the bound, time for what follows from the detection.
_AFTERWARDS_us = 400_000

#: A bench supply that can hurt: 12 V, 5 A, with leads.
SUPPLY = """kind = "supply"
voltage_V = 12.0
resistance_ohm = 0.045
limit_A = 5.0
capacitance_F = 470e-6
leads_ohm = 0.02
"""
#: One ampere from 0.52 s on, with telemetry at 100 frames a second.
SINKING: list[list[Any]] = [
    [50_000, "HELLO", 1, 0],
    [450_000, "SET_TELEMETRY", 4],
    [500_000, "SET_POINT", 1, 1_000_000],
    [520_000, "ENABLE", 0, 0, 0],
]


class Outcome(Enum):
    """What is left once the firmware has done what it can."""

    SAFE = "safe"
    DISCONNECT = "detected, cannot be made safe by firmware: alarm, disconnect now"
    HARMFUL = "not safe"


#: The faults whose sentence tells a person to pull a lead.
_ALARMS = frozenset({"CURRENT_ALTHOUGH_OFF", "REVERSED_SOURCE", "OVER_VOLTAGE"})


#: What the table says where no fault is latched.
NOTHING = "no fault"


def restarted(cause: int) -> str:
    """How the table names a restart with this ResetCause."""
    return f"restart ({ResetCause(cause).name})"


@dataclass(frozen=True)
class Row:
    """One line of the table: the fault, and what must come of it within `bound` control periods."""

    key: str
    fault: str
    detected_as: tuple[str, ...]
    bound: int
    outcome: Outcome = Outcome.SAFE
    defects: tuple[dict[str, Any], ...] = ()
    trouble: dict[str, Any] = field(default_factory=dict)
    commands: Sequence[list[Any]] = ()
    source: str = SUPPLY
    phases: int = PHASES
    at_boot: bool = False
    #: Whether the board's tick counter passes 2**30 at the onset.
    wraps: bool = False
    onset_us: int = ONSET_us
    afterwards_us: int = _AFTERWARDS_us
    periods_a_grant: int = 1
    #: The largest true current after the onset.
    most_A: float = 1000.0
    #: Whether the fault may find no occasion in a run (a function that is not called): that run is then not judged.
    strikes_by_chance: bool = False

    def cases(self) -> list[Case]:
        """Its runs. Times of `defects` and `commands` count from the onset."""
        if self.at_boot:
            return [self._case(0)]
        return [self._case(self.onset_us + _PHASE_us * phase) for phase in range(self.phases)]

    def _case(self, onset_us: int) -> Case:
        defects = [
            {**defect, "from_us": onset_us + defect.get("from_us", 0)}
            | ({"until_us": onset_us + defect["until_us"]} if "until_us" in defect else {})
            for defect in self.defects
        ]
        commands = SINKING + [[onset_us + at, *rest] for at, *rest in self.commands]
        end_us = onset_us + self.bound * PERIOD_us + self.afterwards_us
        ticks = (1 << 30) - onset_us if self.wraps else 0
        return Case(
            self.source,
            commands,
            onset_us,
            max(end_us, ONSET_us),
            defects,
            dict(self.trouble),
            ticks,
            self.periods_a_grant,
        )


@dataclass(frozen=True)
class Found:
    """The worst of a row's runs."""

    detected_as: str
    periods: int | None
    clamped: int | None
    peak_A: float
    outcome: Outcome

    def shortfalls(self, row: Row) -> list[str]:
        """What is worse than the row allows; empty when it holds."""
        lacking = []
        if set(self.detected_as.split(" or ")) - set(row.detected_as):
            lacking.append(f"detected as {self.detected_as}, not {' or '.join(row.detected_as)}")
        if self.detected_as != NOTHING and (self.periods is None or self.periods > row.bound):
            lacking.append(f"after {self.periods} control periods, the bound is {row.bound}")
        if self.detected_as == NOTHING and self.clamped is not None and self.clamped > row.bound:
            lacking.append(f"clamped after {self.clamped} control periods, the bound is {row.bound}")
        if abs(self.peak_A) > row.most_A:
            lacking.append(f"{self.peak_A:.2f} A flowed, the bound is {row.most_A} A")
        if self.outcome is not row.outcome:
            lacking.append(f"{self.outcome.value!r}, not {row.outcome.value!r}")
        return lacking


def judge(row: Row, cases: Sequence[Case], findings: Sequence[dict[str, Any]]) -> Found:
    """The worst over the runs of a row."""
    seen = [
        _judge_one(case, finding)
        for case, finding in zip(cases, findings, strict=True)
        if not row.strikes_by_chance or finding["struck_us"] is not None
    ]
    names = sorted({found.detected_as for found in seen})
    worst = {Outcome.SAFE: 0, Outcome.DISCONNECT: 1, Outcome.HARMFUL: 2}
    periods = [found.periods for found in seen]
    clamped = [found.clamped for found in seen if found.clamped is not None]
    return Found(
        " or ".join(names),
        None if None in periods else max(number for number in periods if number is not None),
        max(clamped) if clamped else None,
        max((found.peak_A for found in seen), key=abs),
        max((found.outcome for found in seen), key=lambda outcome: worst[outcome]),
    )


def _was_sinking(case: Case, finding: dict[str, Any]) -> None:
    """Raise when the firmware had come to an end, or never sank, before a fault that was to hit it sinking."""
    early = [time_us for time_us, *_ in finding["restarts"] if time_us < case.onset_us]
    if case.onset_us and (early or any(name == "ENABLE" for name, *_ in finding["refused"])):
        raise AssertionError(f"not sinking when the fault began: {finding['refused']} {finding['restarts']}")


def _judge_one(case: Case, finding: dict[str, Any]) -> Found:
    _was_sinking(case, finding)
    onset_us = finding["struck_us"] or case.onset_us
    clamped_us = finding["clamped_us"]
    clamped = None if clamped_us is None else _periods(clamped_us - onset_us)
    behind_us = finding["clock_behind_us"]
    faults = [
        (Fault(code).name, time_us + behind_us)
        for time_us, kind, code, *_ in finding["events"]
        if kind == EventKind.FAULT and time_us + behind_us >= onset_us - PERIOD_us
    ]
    flows = abs(finding["final_A"]) > _NOTHING_A
    if finding["restarts"]:
        name, periods = restarted(finding["restarts"][0][1]), clamped or 0
    elif faults:
        # Where current goes on flowing, what counts is the alarm; elsewhere what turned the load off.
        name, time_us = faults[-1 if flows else 0]
        periods = _periods(time_us - onset_us)
    else:
        name, periods = NOTHING, None
    if not finding["clamped"]:
        outcome = Outcome.HARMFUL
    elif flows:
        outcome = Outcome.DISCONNECT if name in _ALARMS else Outcome.HARMFUL
    else:
        outcome = Outcome.SAFE
    return Found(name, periods, clamped, finding["peak_A"], outcome)


def _periods(us: int) -> int:
    return max(0, math.ceil(us / PERIOD_us))
