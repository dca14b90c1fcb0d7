"""A load and a Thevenin source in a few lines, with the methods of Instrument that procedures use.

For tests of what a procedure decides; the true firmware on a simulated board is tested elsewhere. Time
passes only in `next_sample` and `pause`.
"""

from __future__ import annotations

import contextlib
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from types import SimpleNamespace
from typing import Any

from sinkwright.board_run import BoardEnds, BoardRun
from sinkwright.readings import FaultDescription, LoadLimits, RunLog
from sinkwright.sample import Sample
from sinkwright_wire.messages import Fault, Limiting, LogEntry, Mode, State
from sinkwright_wire.vocabulary import RunEnd

#: What stays between the terminals of a load that is fully on.
FLOOR_ohm = 0.075


@dataclass
class FakeSource:
    """`limit_kind` as in a source file; a latched one comes back without load, or never."""

    open_V: float = 12.0
    resistance_ohm: float = 0.05
    limit_A: float | None = None
    limit_kind: str = "constant"
    foldback_A: float = 0.0
    comes_back: bool = True
    leads_ohm: float = 0.0
    latched: bool = False
    _folded: bool = False
    #: Volts added at each frame, by its number: a source that never settles.
    wander: Callable[[int], float] = lambda number: 0.0

    def under(self, demand_A: float) -> tuple[float, float]:
        """(V, A) at the source's terminals for a demanded current; beyond the limit the load is fully on."""
        if demand_A <= 0:
            self.latched = self.latched and not self.comes_back
            self._folded = False
            return (0.0 if self.latched else self.open_V), 0.0
        if self.latched:
            return 0.0, 0.0
        # Once folded back, constant current keeps a source at its lower stable point (reference sheet, 5).
        limit_A = self._limit_at(0.0 if self._folded else self.open_V)
        self._folded = limit_A is not None and demand_A > limit_A
        if not self._folded:
            return self.open_V - demand_A * self.resistance_ohm, demand_A
        if self.limit_kind == "latch":
            self.latched = True
            return 0.0, 0.0
        current_A = self._limit_at(0.0) or 0.0
        return current_A * (FLOOR_ohm + self.leads_ohm), current_A

    def _limit_at(self, voltage_V: float) -> float | None:
        if self.limit_A is None or self.limit_kind != "foldback":
            return self.limit_A
        return self.foldback_A + (self.limit_A - self.foldback_A) * voltage_V / self.open_V


@dataclass
class FakeInstrument:
    """`at_frame` maps a frame's number to something done just before it, such as latching a fault."""

    source: FakeSource = field(default_factory=FakeSource)
    at_frame: dict[int, Callable[[FakeInstrument], None]] = field(default_factory=dict)
    force_V: float | None = None

    def __post_init__(self) -> None:
        self.identity = SimpleNamespace(
            name="bench-fake", board_id="00", firmware_version="0", interpreter="none", simulated=True,
            control_period_s=0.00235, boot_number=1, board_file_crc=0, calibration_number=0, url="fake:",
        )  # fmt: skip
        self.on_event: list[Any] = []
        self.sinking = False
        self.demand_A = 0.0
        self.fault_code = Fault.NONE
        self.limiting = Limiting.NONE
        self.time_us = 0
        self.number = 0
        self.charge_uC = 0.0
        self.energy_uJ = 0.0
        self.interval_s = 0.0
        self.limits_in_force = LoadLimits(4.0, 30.0, 40.0, 85.0, 125.0, 400.0, 3.0)
        self.calls: list[str] = []
        self.ends = BoardEnds()
        self.fetched: list[int] = []
        self.kept: tuple[LogEntry, ...] = ()
        self.ended_by = RunEnd.NONE
        self.run = 0
        self._run_began_us = 0

    # -- what procedures call -----------------------------------------------------------------------------

    async def set_current(self, current_A: float) -> None:
        self.calls.append(f"set {current_A:.3f}")
        self.demand_A = current_A

    def name_run(self) -> int:
        return self.run + 1

    async def set_ends(self, ends: BoardEnds) -> None:
        self.ends = ends

    async def board_run(self) -> BoardRun:
        state = State.SINKING if self.sinking else State.ENDED if self.ended_by else State.OFF
        return BoardRun(
            self.run, state, self.ended_by, True, False, self._run_began_us, self.time_us,
            round(self.charge_uC), round(self.energy_uJ), 0,
        )  # fmt: skip

    async def log(self) -> RunLog:
        return RunLog(1.0, self.kept)

    async def mark_fetched(self, run: int) -> None:
        self.fetched.append(run)

    async def on(self, when_host_silent: str = "stop", run: int = 0) -> None:
        self.calls.append("on" if when_host_silent == "stop" else "on alone")
        self.sinking = True
        self.run = run
        self._run_began_us = self.time_us
        self.ended_by = RunEnd.NONE
        self.charge_uC = self.energy_uJ = 0.0

    async def off(self) -> None:
        self.calls.append("off")
        self.sinking = False
        self.ended_by = RunEnd.NONE

    async def clear(self) -> None:
        self.calls.append("clear")
        self.fault_code = Fault.NONE

    async def limits(self, which: str = "in force") -> LoadLimits:
        return self.limits_in_force

    async def set_limits(self, **limits: float) -> LoadLimits:
        self.limits_in_force = self.limits_in_force.changed(**limits)
        return self.limits_in_force

    async def stream(self, interval_s: float) -> None:
        self.interval_s = interval_s

    async def status(self) -> Any:
        return SimpleNamespace(time_us=self.time_us, zero_samples=64, zero_current_A=0.0012)

    async def fault(self) -> FaultDescription | None:
        if self.fault_code == Fault.NONE:
            return None
        return FaultDescription(
            self.fault_code, self.fault_code.sentence, 86.0, 85.0, "°C", True, self.time_us
        )

    async def pause(self, duration_s: float) -> None:
        self.time_us += round(duration_s * 1e6)

    def finishing(self) -> contextlib.AbstractContextManager[None]:
        return contextlib.nullcontext()

    async def next_sample(self, timeout_s: float) -> Sample | None:
        action = self.at_frame.get(self.number)
        if action is not None:
            action(self)
        self.time_us += round(self.interval_s * 1e6)
        self.number += 1
        return self._sample()

    def end(self, reason: RunEnd) -> None:
        """What the board's own ends do."""
        self.ended_by = reason
        self.sinking = False

    def trip(self, fault: Fault) -> None:
        """What a protection does."""
        self.fault_code = fault
        self.sinking = False

    # -- the physics --------------------------------------------------------------------------------------

    def _sample(self) -> Sample:
        demand_A = self.demand_A if self.sinking else 0.0
        terminal_V, current_A = self.source.under(demand_A)
        seen_V = terminal_V - current_A * self.source.leads_ohm + self.source.wander(self.number)
        limiting = self.limiting
        if demand_A - current_A > 0.05:
            limiting = Limiting.NO_SOURCE if current_A == 0 else Limiting.SOURCE
        self.charge_uC += current_A * self.interval_s * 1e6
        self.energy_uJ += current_A * seen_V * self.interval_s * 1e6
        state = State.FAULT if self.fault_code else State.SINKING if self.sinking else State.OFF
        if state == State.OFF and self.ended_by:
            state = State.ENDED
        voltage_uV, current_uA = round(seen_V * 1e6), round(current_A * 1e6)
        return Sample(
            number=self.number, time_us=self.time_us, state=state, mode=Mode.CURRENT, limiting=limiting,
            fault=self.fault_code, setpoint=round(self.demand_A * 1e6), voltage_uV=voltage_uV,
            voltage_min_uV=voltage_uV - 1000, voltage_max_uV=voltage_uV + 1000, current_uA=current_uA,
            current_min_uA=current_uA - 1000, current_max_uA=current_uA + 1000,
            force_uV=round((self.force_V if self.force_V is not None else seen_V) * 1e6), heatsink_mC=31_000,
            junction_mC=35_000, charge_uC=round(self.charge_uC), energy_uJ=round(self.energy_uJ), pairs=21,
            overruns=0, dropped=0,
        )  # fmt: skip


class FakeWriter:
    """Keeps in lists what a record would keep in a file."""

    def __init__(self) -> None:
        self.path = Path("fake.sqlite")
        self.failed = False
        self.samples: list[Sample] = []
        self.events: list[tuple[int, str, str, dict]] = []
        self.results: list[Any] = []
        self.board_log: list[Any] = []

    def add_samples(self, samples: list[Sample]) -> None:
        self.samples.extend(samples)

    def add_event(self, time_us: int, kind: str, text: str, data: dict) -> None:
        self.events.append((time_us, kind, text, data))

    def add_board_log(self, entries: list[Any]) -> None:
        self.board_log.extend(entries)

    def add_result(self, result: Any) -> None:
        self.results.append(result)
