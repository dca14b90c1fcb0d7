"""`current-limit`: where a source stops giving more, what it gives into a short circuit, how it comes back.

All by constant current, because a sampled voltage or resistance loop never settles on an ideal limit
(reference sheet, section 2): a ramp up to the knee, the load fully on for the short circuit, a descent for
the release. The knee is the first current at which the voltage leaves its band around the no-load voltage,
or at which the current stays below its demand; it is narrowed by halving between the last good and the
first bad demand.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from sinkwright.definitions.plan import CurrentLimit
from sinkwright.procedures.gathering import Point, gather
from sinkwright.procedures.leads import Terminals
from sinkwright.procedures.procedure import NOT_REACHED, Found, Procedure, Step
from sinkwright.procedures.settling import settle
from sinkwright.uncertainty.causes import Cause, Uncertain

if TYPE_CHECKING:
    from sinkwright.definitions.plan import SourceUnderTest

OVERHEAD_s = 0.4
RATING_MULTIPLE = 1.5
#: Halving goes on until the knee is known to this share of its demand, or to a few codes of the set-point
#: DAC.
NARROW_SHARE = 0.002
NARROW_A = 0.004
HALVINGS = 8
#: A latching source is off until its current has been zero for a while; this is how long it is given.
RECOVERY_s = 4.0
#: Short-circuit current below this share of the limit is told as foldback, or as switched off.
FOLDBACK_SHARE = 0.9
OFF_SHARE = 0.05


def up_to_A(test: CurrentLimit, source: SourceUnderTest) -> float:
    """The largest demand in A: the test's own, or one and a half times the source's rating."""
    # The plan's own check has seen to one of the two.
    return test.up_to_A or RATING_MULTIPLE * (source.rated_current_A or 0.0)


def levels(test: CurrentLimit, source: SourceUnderTest) -> list[float]:
    """The demands of the ramp in A, evenly spaced and without zero."""
    count = max(test.points, 2)
    return [up_to_A(test, source) * (n + 1) / count for n in range(count)]


def steps(test: CurrentLimit, source: SourceUnderTest) -> list[Step]:
    """What is expected to be drawn: ramp, halvings near its end, short circuit, descent."""
    each_s = test.settle_s + test.measure_s + OVERHEAD_s
    ramp = [Step(level, each_s) for level in levels(test, source)]
    narrowing = [Step(0.0, 0.8), Step(ramp[-1].current_A, each_s)] * HALVINGS
    return [Step(0.0, each_s), *ramp, *narrowing, Step(ramp[-1].current_A, each_s), *reversed(ramp)]


@dataclass
class CurrentLimitRun(Procedure[CurrentLimit]):
    """One current-limit test under way."""

    kind = "current-limit"
    not_tested = (
        "How fast the limit acts, and any peak of current before it does.",
        "Whether the source stands its limit for longer than this test took.",
    )

    no_load: Point | None = None
    good: Point | None = None
    bad_A: float | None = None
    short: Point | None = None
    limit_reason: str = NOT_REACHED
    short_reason: str = NOT_REACHED

    async def carry_out(self) -> None:
        self.no_load = await self._measure(None)
        if self.no_load is None:
            self.limit_reason = self.short_reason = self.notes[-1]
            return
        self.points.append(self.no_load.to_json())
        await self._find_knee()
        if self.bad_A is None:
            return
        came_back = await self._narrow_knee()
        if came_back:
            await self._short_circuit()
            await self._descend()
            came_back = await self._comes_back()
        self._tell_kind(came_back)

    # -- the ramp -----------------------------------------------------------------------------------------

    async def _find_knee(self) -> None:
        demands = levels(self.test, self.source)
        for demand_A in demands:
            point = await self._measure(demand_A)
            if point is None:
                continue
            if self._is_past_knee(point):
                self.bad_A = demand_A
                return
            self.good = point
            self.points.append(point.to_json())
        self.limit_reason = f"No limit was found up to {demands[-1]:.3f} A."
        self.short_reason = f"{self.limit_reason} So the source was not brought into its short circuit."
        self.notes.append(self.limit_reason)

    async def _measure(self, demand_A: float | None) -> Point | None:
        """A settled point, or None with a note."""
        label = "with the gate clamped" if demand_A is None else f"at {demand_A:.3f} A"
        if demand_A is None:
            await self.bench.off()
        else:
            await self.bench.sink(demand_A)
        if not await settle(self.bench, demand_A, self.test.settle_s):
            self.notes.append(f"The readings {label} did not settle, so that point is left out.")
            return None
        return await gather(self.bench, demand_A, self.test.measure_s, label)

    def _is_past_knee(self, point: Point) -> bool:
        return point.limited or not self._is_in_band(point.voltage.mean)

    def _is_in_band(self, voltage_V: float) -> bool:
        assert self.no_load is not None
        open_V = self.no_load.voltage.mean
        return abs(voltage_V - open_V) <= abs(open_V) * self.test.band_percent / 100

    # -- the knee -----------------------------------------------------------------------------------------

    async def _narrow_knee(self) -> bool:
        """Halve between the last good and the first bad demand; False when the source did not come back."""
        good_A = self.good.demand_A or 0.0 if self.good else 0.0
        for _ in range(HALVINGS):
            if not await self._comes_back():
                return False
            assert self.bad_A is not None
            if self.bad_A - good_A <= max(NARROW_A, NARROW_SHARE * self.bad_A):
                return True
            middle_A = (good_A + self.bad_A) / 2
            point = await self._measure(middle_A)
            if point is None:
                return True
            if self._is_past_knee(point):
                self.bad_A = middle_A
            else:
                good_A = middle_A
                self.good = point
                self.points.append(point.to_json())
        return await self._comes_back()

    async def _comes_back(self) -> bool:
        """Turn off and wait until the voltage is in its band again."""
        await self.bench.off()
        end_us = self.bench.now_us + round(RECOVERY_s * 1e6)
        while self.bench.now_us < end_us:
            frame = await self.bench.next_frame()
            if frame.pairs and self._is_in_band(frame.voltage_V) and self._is_in_band(frame.voltage_min_V):
                return True
        return False

    # -- short circuit and release ------------------------------------------------------------------------

    async def _short_circuit(self) -> None:
        demand_A = up_to_A(self.test, self.source)
        point = await self._measure(demand_A)
        if point is None:
            self.short_reason = self.notes[-1]
            return
        if not point.limited:
            self.short_reason = (
                f"At {demand_A:.3f} A the source still gave all that was asked, at {point.voltage.mean:.3f} "
                "V, so the "
                "load could not be brought fully on. Ask for more with up_to_A."
            )
            return
        self.short = point
        self.points.append(point.to_json())
        self.notes.append(
            f"The short-circuit current was measured with the load fully on, where its own resistance leaves "
            f"{point.voltage.mean:.3f} V."
        )

    async def _descend(self) -> None:
        """Lower the demand until the voltage is back in its band."""
        for demand_A in reversed(levels(self.test, self.source)):
            point = await self._measure(demand_A)
            if point is None:
                continue
            self.points.append(point.to_json())
            if not self._is_past_knee(point):
                self.notes.append(f"On the way down the voltage was back in its band at {demand_A:.3f} A.")
                return
        self.notes.append("On the way down the voltage did not come back while any current was drawn.")

    def _tell_kind(self, came_back: bool) -> None:
        if not came_back:
            self.notes.append(
                f"The source latched: {RECOVERY_s:g} s after the load was turned off its voltage was still "
                "away. "
                "Switch it off and on before it is used again."
            )
            if self.short is None:
                self.short_reason = "The source latched off at its limit, so no short circuit was measured."
            return
        limit = self._limit()
        if self.short is None or limit is None:
            return
        share = self.short.current.mean / limit.value
        if share < OFF_SHARE:
            self.notes.append("The source switches off at its limit, and returns when no current is drawn.")
        elif share < FOLDBACK_SHARE:
            self.notes.append(
                f"The source folds back: into a short circuit it gives {share * 100:.0f} % of the current "
                "at its knee."
            )

    # -- results ------------------------------------------------------------------------------------------

    def _limit(self) -> Uncertain | None:
        """The knee: the last good reading, plus half of what is left between it and the first bad demand."""
        if self.bad_A is None:
            return None
        good_A = (self.good.demand_A or 0.0) if self.good else 0.0
        half_A = (self.bad_A - good_A) / 2
        spacing = Cause(
            "spacing of the steps around the knee",
            "rectangular",
            half_A,
            remedy="Use more points, or a smaller up_to_A.",
        )
        step = Uncertain(half_A, {spacing: 1.0})
        if self.good is None:
            return step
        return Terminals(self.bench.board, self.source).current(self.good) + step

    def found(self) -> dict[str, Found]:
        terminals = Terminals(self.bench.board, self.source)
        short = terminals.current(self.short) if self.short else None
        return {
            "current_limit_A": Found(self._limit(), self.limit_reason),
            "short_circuit_current_A": Found(short, self.short_reason),
        }
