"""`load-regulation`: how far a source's voltage falls from no load to full load.

load_regulation_percent = (V_no - V_full) / V_full * 100, of the full-load voltage; output_resistance_ohm =
(V_no - V_full) / (I_full - I_no), over the same two ends. The levels between are for the curve. A source
that limits before full load has no full-load voltage, and that is said instead of a number.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from sinkwright.definitions.plan import LoadRegulation
from sinkwright.procedures.gathering import Point, gather
from sinkwright.procedures.leads import Terminals
from sinkwright.procedures.procedure import NOT_REACHED, Found, Procedure, Step
from sinkwright.procedures.settling import settle

if TYPE_CHECKING:
    from sinkwright.definitions.plan import SourceUnderTest
    from sinkwright.uncertainty.causes import Uncertain

#: Telemetry and the ramp add about this much to each point.
OVERHEAD_s = 0.4


def full_load_A(test: LoadRegulation, source: SourceUnderTest) -> float:
    """The full-load current in A: the test's own, or the source's rating."""
    # The plan's own check has seen to one of the two.
    return test.full_load_current_A or source.rated_current_A or 0.0


def levels(test: LoadRegulation, source: SourceUnderTest) -> list[float]:
    """The demands in A from no load to full load, evenly spaced."""
    count = max(test.points, 2)
    step_A = (full_load_A(test, source) - test.no_load_current_A) / (count - 1)
    return [test.no_load_current_A + step_A * n for n in range(count)]


def steps(test: LoadRegulation, source: SourceUnderTest) -> list[Step]:
    """What the test is expected to draw."""
    each_s = test.settle_s + test.measure_s + OVERHEAD_s
    return [Step(level, each_s) for level in levels(test, source)]


def regulation_of(no_load: Uncertain, full_load: Uncertain) -> Uncertain:
    """Load regulation in percent of the full-load voltage."""
    return (no_load - full_load) / full_load * 100.0


@dataclass
class LoadRegulationRun(Procedure[LoadRegulation]):
    """One load-regulation test under way."""

    kind = "load-regulation"
    not_tested = (
        "Recovery after a load step, and ripple and noise: this load reads means over milliseconds.",
        "Regulation against the mains voltage, and drift with time and temperature.",
    )

    no_load: Point | None = None
    full_load: Point | None = None
    reason: str = NOT_REACHED

    async def carry_out(self) -> None:
        demands = levels(self.test, self.source)
        for demand_A in demands:
            point = await self._point(demand_A)
            if point is None:
                if demand_A in (demands[0], demands[-1]):
                    self.reason = self.notes[-1]
                continue
            if self._is_limited(point):
                self._tell_limited(point, demands[-1])
                return
            self.points.append(point.to_json())
            if demand_A == demands[0]:
                self.no_load = point
            elif demand_A == demands[-1]:
                self.full_load = point
        self.notes.append("Load regulation is stated as a percentage of the full-load voltage.")

    async def _point(self, demand_A: float) -> Point | None:
        if demand_A > 0:
            await self.bench.sink(demand_A)
        else:
            await self.bench.off()
        asked_A = demand_A if demand_A > 0 else None
        if not await settle(self.bench, asked_A, self.test.settle_s):
            self.notes.append(f"The readings at {demand_A:.3f} A did not settle, so that point is left out.")
            return None
        return await gather(self.bench, asked_A, self.test.measure_s, f"at {demand_A:.3f} A")

    def _is_limited(self, point: Point) -> bool:
        """Short of its demand, or with less than half of its voltage left: no longer in regulation."""
        collapsed = self.no_load is not None and point.voltage.mean < 0.5 * self.no_load.voltage.mean
        return point.limited or collapsed

    def _tell_limited(self, point: Point, full_A: float) -> None:
        self.reason = (
            f"The source limited at {point.current.mean:.3f} A, with {point.voltage.mean:.3f} V left, before "
            f"the full load of {full_A:.3f} A was reached."
        )

    def found(self) -> dict[str, Found]:
        terminals = Terminals(self.bench.board, self.source)
        unresolved = terminals.unresolved(self.no_load, self.full_load)
        first = terminals.voltage(self.no_load) if self.no_load else None
        last = terminals.voltage(self.full_load) if self.full_load else None
        found = {
            "no_load_voltage_V": Found(first, self.reason, terminals.unresolved(self.no_load)),
            "full_load_voltage_V": Found(last, self.reason, unresolved),
            "load_regulation_percent": Found(None, self.reason, unresolved),
            "output_resistance_ohm": Found(None, self.reason, unresolved),
        }
        if first is not None and last is not None and self.no_load and self.full_load:
            rise = terminals.current(self.full_load) - terminals.current(self.no_load)
            found["load_regulation_percent"] = Found(regulation_of(first, last), "", unresolved)
            found["output_resistance_ohm"] = Found((first - last) / rise, "", unresolved)
        return found
