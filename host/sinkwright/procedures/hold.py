"""`hold`: a plain set-point until the first of its ends, and the means of its last tenth.

The board keeps to the ends by itself, with or without this program, and usually sees them first; they are
watched here as well, on the board's clock and meters, one telemetry frame at a time. Frames older than the
last tenth are in the record only.
"""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

from sinkwright.board_run import BoardEnds
from sinkwright.definitions.plan import Hold
from sinkwright.procedures.endings import BOARD_ENDS
from sinkwright.procedures.gathering import Point, point_of, time_mean
from sinkwright.procedures.leads import Terminals
from sinkwright.procedures.procedure import CLOCK_SHARE, NOT_REACHED, Found, Procedure, Step, board_clock
from sinkwright.procedures.setpoint import SetPoint
from sinkwright.records.board_log import as_sample
from sinkwright.uncertainty.charge import integrated_charge
from sinkwright.uncertainty.parts import Averaged
from sinkwright_wire.vocabulary import Limiting, State

if TYPE_CHECKING:
    from sinkwright.definitions.plan import SourceUnderTest
    from sinkwright.sample import Sample

#: Below this the means of the last tenth are one frame's, whose scatter cannot be told.
LEAST_FRAMES = 2
#: Where the law has arrived, or is on its way after the source's own changes.
_HELD = (Limiting.NONE, Limiting.RAMPING)


def steps(test: Hold, source: SourceUnderTest, most_A: float) -> list[Step]:
    """What is expected to be drawn; without a time or charge end the capacity tells how long.

    `most_A` is what the limits let flow. Without a stated voltage the current of another mode is 0: not known.
    """
    setpoint = SetPoint.of(test)
    current_A = setpoint.most_current(test, source, most_A)
    lengths = [test.duration_s]
    if current_A > 0:
        charge_Ah = test.end_charge_Ah if test.end_charge_Ah is not None else source.capacity_Ah
        lengths.append(charge_Ah * 3600 / current_A if charge_Ah is not None else None)
        if test.end_energy_Wh is not None and source.rated_voltage_V:
            power_W = setpoint.power_at(source.rated_voltage_V, current_A)
            lengths.append(test.end_energy_Wh * 3600 / power_W)
    known = [length for length in lengths if length is not None]
    held = None if setpoint.key == "current_A" else setpoint
    return [Step(current_A, min(known) if known else 0.0, held)]


def ends_on_board(test: Hold, source: SourceUnderTest) -> BoardEnds:
    """The ends as the board is to keep them: its voltage is that at the load, so known leads are taken off."""
    voltage_V = test.end_voltage_V
    if voltage_V is not None and source.sense == "two-wire":
        voltage_V = max(
            0.0, voltage_V - SetPoint.of(test).current_at(voltage_V) * (source.lead_resistance_ohm or 0.0)
        )
    return BoardEnds(
        voltage_V, test.end_charge_Ah, test.end_energy_Wh, test.duration_s, test.end_temperature_degC
    )


@dataclass
class HoldRun(Procedure[Hold]):
    """One hold under way."""

    kind = "hold"
    not_tested = ("What the voltage did between two readings of the converter, some milliseconds apart.",)

    last: Sample | None = None
    frames: int = 0
    tail: deque[Sample] = field(default_factory=deque)
    #: How long it sank, by the board, where the board itself ended it.
    lasted_s: float | None = None

    async def carry_out(self) -> None:
        await self.bench.hold(self.setpoint, ends_on_board(self.test, self.source))
        while self.stopped_by is None:
            frame = await self.bench.next_frame()
            self.last = frame
            self.frames += 1
            if frame.state == State.ENDED:
                await self._take_boards_end()
                break
            self._keep_last_tenth(frame)
            self.stopped_by = self._end_reached(frame)
        await self.bench.off()
        self._fill_last_tenth()
        self._keep_point()
        self.notes.append(f"Ended by {self.stopped_by} after {self._elapsed_s():.1f} s.")

    def take_from_board(self, samples: list[Sample], lasted_s: float) -> None:
        """A hold that the board carried through alone: its log as samples, the last with the final meters."""
        for sample in samples:
            self.last = sample
            self.frames += 1
            self._keep_last_tenth(sample)
        self.lasted_s = lasted_s
        self._keep_point()

    async def _take_boards_end(self) -> None:
        """The board ended the run: it knows why and when. The frame's meters are final, its means mixed."""
        run = await self.bench.instrument.board_run()
        self.stopped_by = BOARD_ENDS[run.ended_by]
        self.lasted_s = run.duration_s

    def _keep_point(self) -> None:
        if not self.tail:
            return
        asked_A = self.setpoint.demand_A
        point = point_of(list(self.tail), self._demand_A(), "")
        self.points.append(point.to_json())
        if asked_A is not None and point.limited:
            self.notes.append(
                f"The source limited: it gave {point.current.mean:.3f} A of the {asked_A:.3f} A asked for."
            )
        elif asked_A is None and self.tail[-1].limiting not in _HELD:
            self.notes.append(f"The set-point was not held. {Limiting(self.tail[-1].limiting).sentence}")

    @property
    def setpoint(self) -> SetPoint:
        return SetPoint.of(self.test)

    def _demand_A(self) -> float:
        """The current asked for; in other modes the law asks for what flows."""
        asked_A = self.setpoint.demand_A
        return asked_A if asked_A is not None else sum(f.current_A for f in self.tail) / len(self.tail)

    def _keep_last_tenth(self, frame: Sample) -> None:
        if frame.pairs:
            self.tail.append(frame)
        begin_us = frame.time_us - (frame.time_us - self.bench.commanded_us) // 10
        while len(self.tail) > LEAST_FRAMES and self.tail[0].time_us < begin_us:
            self.tail.popleft()

    def _fill_last_tenth(self) -> None:
        """Where this program slept through part of the last tenth, the means are those of the board's log."""
        begin_us = self.bench.commanded_us + round(0.9 * self._elapsed_s() * 1e6)
        kept = self.bench.kept_by_board
        if any(entry.missed and entry.time_us >= begin_us for entry in kept):
            self.tail.clear()
            for entry in kept:
                self._keep_last_tenth(as_sample(entry))

    def _elapsed_s(self) -> float:
        if self.lasted_s is not None:
            return self.lasted_s
        return (self.last.time_us - self.bench.commanded_us) / 1e6 if self.last else 0.0

    def _end_reached(self, frame: Sample) -> str | None:
        """The first end that this frame meets, by its key."""
        test = self.test
        reached = {
            "end_voltage_V": test.end_voltage_V is not None and self._source_V(frame) <= test.end_voltage_V,
            "end_charge_Ah": test.end_charge_Ah is not None and frame.charge_C >= test.end_charge_Ah * 3600,
            "end_energy_Wh": test.end_energy_Wh is not None and frame.energy_J >= test.end_energy_Wh * 3600,
            "end_temperature_degC": test.end_temperature_degC is not None
            and frame.heatsink_degC >= test.end_temperature_degC,
            "duration_s": test.duration_s is not None and self._elapsed_s() >= test.duration_s,
        }
        return next((key for key, met in reached.items() if met), None)

    def _source_V(self, frame: Sample) -> float:
        """The voltage at the source's terminals: known leads must not make an end come early."""
        leads_ohm = self.source.lead_resistance_ohm if self.source.sense == "two-wire" else None
        return frame.voltage_V + frame.current_A * (leads_ohm or 0.0)

    def found(self) -> dict[str, Found]:
        if len(self.tail) < LEAST_FRAMES:
            return {name: Found(None, NOT_REACHED) for name in (*_MEANS, *_METERS)}
        point = point_of(list(self.tail), self._demand_A(), "in the last tenth", time_mean)
        terminals = Terminals(self.bench.board, self.source)
        cut_short = "" if self.stopped_by else "The hold was stopped before any of its ends."
        unresolved = cut_short or terminals.unresolved(point)
        voltage, current = terminals.voltage(point), terminals.current(point)
        means = {
            "voltage_V": Found(voltage, "", unresolved),
            "current_A": Found(current, "", cut_short),
            "power_W": Found(voltage * current, "", unresolved),
            "resistance_ohm": _no_current(),
        }
        if current.value > 0:
            means["resistance_ohm"] = Found(voltage / current, "", unresolved)
        return {**means, **self._meters(point, terminals, cut_short)}

    def _meters(self, point: Point, terminals: Terminals, cut_short: str) -> dict[str, Found]:
        """Charge and energy: the board's meters, read as means over the whole hold times its duration.

        Gains and offsets err alike in every second, so they act on the whole and are not averaged down.
        """
        elapsed_s = self._elapsed_s()
        found = {
            "capacity_Ah": _no_current(),
            "energy_Wh": _no_current(),
            "duration_s": Found(board_clock() * elapsed_s, "", cut_short),
        }
        if self.last is None or self.last.charge_C <= 0 or elapsed_s <= 0:
            return found
        charge_C, energy_J = self.last.charge_C, self.last.energy_J
        whole = replace(
            point,
            voltage=Averaged(energy_J / charge_C, 0.0, self.frames, "voltage over the whole hold"),
            current=Averaged(charge_C / elapsed_s, 0.0, self.frames, "current over the whole hold"),
        )
        charge = integrated_charge(terminals.current(whole), elapsed_s, CLOCK_SHARE * 1e6)
        found["capacity_Ah"] = Found(charge / 3600.0, "", cut_short)
        unresolved = cut_short or terminals.unresolved(point)
        found["energy_Wh"] = Found(terminals.voltage(whole) * charge / 3600.0, "", unresolved)
        return found


_MEANS = ("voltage_V", "current_A", "power_W", "resistance_ohm")
_METERS = ("capacity_Ah", "energy_Wh", "duration_s")


def _no_current() -> Found:
    return Found(None, "No current flowed, so this has no value.")
