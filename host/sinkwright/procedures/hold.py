"""`hold`: a plain set-point until the first of its ends, and the means of its last tenth.

The ends are watched here, on the board's clock and meters, one telemetry frame at a time; when this program
dies the board's own silence policy turns the load off. Frames older than the last tenth are in the record
only.
"""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

from sinkwright.definitions.plan import Hold
from sinkwright.procedures.gathering import Point, point_of, time_mean
from sinkwright.procedures.leads import Terminals
from sinkwright.procedures.procedure import NOT_REACHED, Found, Procedure, Step, board_clock
from sinkwright.uncertainty.parts import Averaged

if TYPE_CHECKING:
    from sinkwright.definitions.plan import SourceUnderTest
    from sinkwright.sample import Sample

#: Below this the means of the last tenth are one frame's, whose scatter cannot be told.
LEAST_FRAMES = 2


def steps(test: Hold, source: SourceUnderTest) -> list[Step]:
    """What is expected to be drawn; without a time or charge end the capacity tells how long."""
    current_A = test.current_A or 0.0
    lengths = [test.duration_s]
    if current_A > 0:
        charge_Ah = test.end_charge_Ah if test.end_charge_Ah is not None else source.capacity_Ah
        lengths.append(charge_Ah * 3600 / current_A if charge_Ah is not None else None)
        if test.end_energy_Wh is not None and source.rated_voltage_V:
            lengths.append(test.end_energy_Wh * 3600 / (source.rated_voltage_V * current_A))
    known = [length for length in lengths if length is not None]
    return [Step(current_A, min(known) if known else 0.0)]


@dataclass
class HoldRun(Procedure[Hold]):
    """One hold under way."""

    kind = "hold"
    not_tested = ("What the voltage did between two readings of the converter, some milliseconds apart.",)

    last: Sample | None = None
    frames: int = 0
    tail: deque[Sample] = field(default_factory=deque)

    async def carry_out(self) -> None:
        demand_A = self.test.current_A or 0.0
        await self.bench.sink(demand_A)
        while self.stopped_by is None:
            frame = await self.bench.next_frame()
            self.last = frame
            self.frames += 1
            self._keep_last_tenth(frame)
            self.stopped_by = self._end_reached(frame)
        await self.bench.off()
        self._keep_point(demand_A)
        self.notes.append(f"Ended by {self.stopped_by} after {self._elapsed_s():.1f} s.")

    def _keep_point(self, demand_A: float) -> None:
        if not self.tail:
            return
        point = point_of(list(self.tail), demand_A, "")
        self.points.append(point.to_json())
        if point.limited:
            self.notes.append(
                f"The source limited: it gave {point.current.mean:.3f} A of the {demand_A:.3f} A asked for."
            )

    def _keep_last_tenth(self, frame: Sample) -> None:
        if frame.pairs:
            self.tail.append(frame)
        begin_us = frame.time_us - (frame.time_us - self.bench.commanded_us) // 10
        while len(self.tail) > LEAST_FRAMES and self.tail[0].time_us < begin_us:
            self.tail.popleft()

    def _elapsed_s(self) -> float:
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
        point = point_of(list(self.tail), self.test.current_A or 0.0, "in the last tenth", time_mean)
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
        duration = board_clock() * elapsed_s
        found = {
            "capacity_Ah": _no_current(),
            "energy_Wh": _no_current(),
            "duration_s": Found(duration, "", cut_short),
        }
        if self.last is None or self.last.charge_C <= 0 or elapsed_s <= 0:
            return found
        charge_C, energy_J = self.last.charge_C, self.last.energy_J
        whole = replace(
            point,
            voltage=Averaged(energy_J / charge_C, 0.0, self.frames, "voltage over the whole hold"),
            current=Averaged(charge_C / elapsed_s, 0.0, self.frames, "current over the whole hold"),
        )
        charge = terminals.current(whole) * duration
        found["capacity_Ah"] = Found(charge / 3600.0, "", cut_short)
        unresolved = cut_short or terminals.unresolved(point)
        found["energy_Wh"] = Found(terminals.voltage(whole) * charge / 3600.0, "", unresolved)
        return found


_MEANS = ("voltage_V", "current_A", "power_W", "resistance_ohm")
_METERS = ("capacity_Ah", "energy_Wh", "duration_s")


def _no_current() -> Found:
    return Found(None, "No current flowed, so this has no value.")
