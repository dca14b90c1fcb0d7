"""Before anything is drawn: refuses what the board, the source or the plan's own limits do not allow.

A refusal names the largest value that fits. Warnings do not stop a run: bounds that no reading could meet
because 2U is wider than the tolerance, a heatsink that will be hot, a voltage that is not stated. Knows no
device; what only the real source can tell is checked by `check_source` when its open voltage has been read.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from sinkwright.definitions.plan import AnyTest, CurrentLimit, Hold, Rest
from sinkwright.errors import AskedTooMuch, SinkwrightError
from sinkwright.procedures.expectation import Expectation, expect, most_current, spell_time, steps_of
from sinkwright.procedures.hold import ends_on_board
from sinkwright.procedures.resolution import hopeless_bounds
from sinkwright.procedures.setpoint import SetPoint

if TYPE_CHECKING:
    from sinkwright.definitions.board import BoardFile
    from sinkwright.definitions.plan import Plan

_LIMIT_UNITS = {"current_A": "A", "voltage_V": "V", "power_W": "W", "heatsink_degC": "°C"}
#: Below this much voltage there is nothing connected that could be tested (ours: as the firmware's own
#: floor).
NO_SOURCE_V = 0.1
#: Sense pair against force terminals with no current: parts of a few percent cannot differ by more.
SENSE_SHARE = 0.1
SENSE_V = 0.3


@dataclass(frozen=True)
class Preflight:
    """What a plan would do, and what should be known before it."""

    tests: tuple[Expectation, ...]
    warnings: tuple[str, ...]

    @property
    def duration_s(self) -> float:
        return sum(test.duration_s for test in self.tests)

    def to_json(self) -> dict[str, Any]:
        return {
            "tests": [test.to_json() for test in self.tests],
            "duration_s": self.duration_s,
            "warnings": list(self.warnings),
        }

    def sentences(self) -> list[str]:
        """For people, one line a test."""
        return [test.sentence() for test in self.tests]


def preflight(plan: Plan, board: BoardFile) -> Preflight:
    """Check a plan against a board. Raises AskedTooMuch (names the largest that fits), SinkwrightError."""
    _check_policy(plan)
    _check_limits(plan, board)
    expectations = expect(plan, board)
    for number, (test, expectation) in enumerate(zip(plan.tests, expectations, strict=True), start=1):
        where = f"plan {plan.name}, test[{number}] ({test.kind})"
        _check_current(test, expectation, plan, board, where)
        if plan.source.rated_voltage_V is not None:
            check_power(test, plan.source.rated_voltage_V, plan, board, where)
    return Preflight(expectations, tuple(_warnings(plan, board, expectations)))


def check_source(plan: Plan, board: BoardFile, open_V: float, force_V: float) -> list[str]:
    """Check the plan against the source's open voltage; returns warnings. Raises as `preflight` does."""
    if open_V < NO_SOURCE_V and force_V < NO_SOURCE_V and not draws_nothing(plan):
        raise SinkwrightError(
            f"no source is seen: the load reads {open_V:.3f} V",
            load="The load is off.",
            remedy="Connect the source, switch it on, look at its fuse, then run the plan again.",
        )
    if plan.source.sense == "remote" and abs(open_V - force_V) > SENSE_V + SENSE_SHARE * abs(force_V):
        raise SinkwrightError(
            f"the sense pair reads {open_V:.3f} V while the load's terminals see {force_V:.3f} V: the pair "
            "is open or "
            "on something else",
            load="The load is off.",
            remedy='Connect the pair to the source\'s terminals, or write sense = "two-wire" in [source].',
        )
    _check_not_empty(plan, open_V)
    for number, test in enumerate(plan.tests, start=1):
        check_power(test, open_V, plan, board, f"plan {plan.name}, test[{number}] ({test.kind})")
    rated_V = plan.source.rated_voltage_V
    if rated_V is not None and abs(open_V - rated_V) > 0.2 * rated_V:
        return [f"The source gives {open_V:.3f} V, while the plan rates it at {rated_V:g} V."]
    return []


def _check_not_empty(plan: Plan, open_V: float) -> None:
    """A source that is at its end voltage before anything is drawn would be discharged a second time."""
    first = plan.tests[0]
    if isinstance(first, Hold) and first.end_voltage_V is not None and open_V <= first.end_voltage_V:
        raise SinkwrightError(
            f"the source gives {open_V:.3f} V with nothing drawn, and the test ends at {first.end_voltage_V:g} V",
            where=f"plan {plan.name}, test[1] (hold)",
            load="The load is off.",
            remedy="An empty cell must be charged first; for another source correct end_voltage_V.",
        )


def draws_nothing(plan: Plan) -> bool:
    """Whether the whole plan leaves the load off."""
    return all(_draws_nothing(test, plan) for test in plan.tests)


def _draws_nothing(test: AnyTest, plan: Plan) -> bool:
    if isinstance(test, Hold):
        return SetPoint.of(test).value == 0
    return all(step.current_A == 0 for step in steps_of(test, plan.source, 0.0))


def limit_of(key: str, plan: Plan, board: BoardFile) -> tuple[float, str]:
    """The tighter of the plan's and the board's limit, and whose it is."""
    own = getattr(plan.limits, key)
    boards = getattr(board.limits, key)
    if own is not None and own < boards:
        return own, "the plan's own limit"
    return boards, "the board's limit"


def check_power(test: AnyTest, voltage_V: float, plan: Plan, board: BoardFile, where: str) -> None:
    """Refuse a test that would turn more power into heat than fits at `voltage_V`."""
    steps = steps_of(test, plan.source, most_current(plan, board))
    asked = (
        SetPoint.of(test)
        if isinstance(test, Hold)
        else SetPoint("current_A", max(s.current_A for s in steps))
    )
    power_W = max(step.power_at(voltage_V) for step in steps)
    # A constant voltage takes what it gets: the load itself stays within its power.
    limit_W, whose = limit_of("power_W", plan, board)
    if power_W > limit_W and asked.key != "voltage_V":
        raise AskedTooMuch(
            f"{_asking(asked, voltage_V)} {power_W:.1f} W, more than {whose} of {limit_W:g} W",
            where=where,
            remedy=asked.within(limit_W, voltage_V),
        )
    rated_W = plan.source.rated_power_W
    if rated_W is not None and not isinstance(test, CurrentLimit) and power_W > rated_W * 1.001:
        raise AskedTooMuch(
            f"{_asking(asked, voltage_V)} {power_W:.1f} W, more than the source's rated power of {rated_W:g} W",
            where=where,
            remedy=asked.within(rated_W, voltage_V),
        )


def _asking(asked: SetPoint, voltage_V: float) -> str:
    """How a power comes about: the beginning of a sentence that goes on with it."""
    unit = asked.key.rpartition("_")[2]
    return f"{asked.value:.3f} {unit} at {voltage_V:.3f} V are" if unit != "W" else "The plan asks for"


def _check_policy(plan: Plan) -> None:
    """A board that is to go on alone must be able to keep every end: raises AskedTooMuch for one it cannot."""
    if plan.when_host_silent != "continue":
        return
    for number, test in enumerate(plan.tests, start=1):
        if isinstance(test, Hold):
            try:
                ends_on_board(test, plan.source).to_wire()
            except AskedTooMuch as error:
                error.where = f"plan {plan.name}, test[{number}] ({test.kind})"
                raise


def _check_limits(plan: Plan, board: BoardFile) -> None:
    for key, unit in _LIMIT_UNITS.items():
        own, boards = getattr(plan.limits, key), getattr(board.limits, key)
        if own is not None and own > boards:
            raise AskedTooMuch(
                f"{own:g} {unit} is more than this board stands",
                where=f"plan {plan.name}, limits.{key}",
                remedy=f"The largest that fits is {boards:g} {unit}.",
            )
    if plan.source.sense == "remote" and not board.voltage_sense.pair:
        raise SinkwrightError(
            f"the board {board.name} has no sense pair",
            where=f"plan {plan.name}, source.sense",
            remedy='Write sense = "two-wire", with lead_resistance_ohm and lead_resistance_uncertainty_ohm.',
        )
    rated_V = plan.source.rated_voltage_V
    limit_V, whose = limit_of("voltage_V", plan, board)
    if rated_V is not None and rated_V > limit_V:
        raise AskedTooMuch(
            f"a source of {rated_V:g} V is beyond {whose} of {limit_V:g} V",
            where=f"plan {plan.name}, source.rated_voltage_V",
            remedy=f"The largest that fits is {limit_V:g} V.",
        )


def _check_current(test: AnyTest, expected: Expectation, plan: Plan, board: BoardFile, where: str) -> None:
    limit_A, whose = limit_of("current_A", plan, board)
    if expected.current_A > limit_A:
        raise AskedTooMuch(
            f"{expected.current_A:.3f} A is beyond {whose} of {limit_A:g} A",
            where=where,
            remedy=_remedy(test, limit_A, plan),
        )
    rated_A = plan.source.rated_current_A
    # Looking for a current limit is the one job that goes beyond the rating by design.
    if rated_A is not None and not isinstance(test, CurrentLimit) and expected.current_A > rated_A * 1.001:
        raise AskedTooMuch(
            f"{expected.current_A:.3f} A is more than the source's rated {rated_A:g} A",
            where=where,
            remedy=_remedy(test, rated_A, plan) + " Or correct rated_current_A in [source].",
        )


def _remedy(test: AnyTest, limit_A: float, plan: Plan) -> str:
    """What to ask for so that no more than `limit_A` flows."""
    if not isinstance(test, Hold):
        return f"The largest that fits is {limit_A:g} A."
    return SetPoint.of(test).drawing(limit_A, plan.source.rated_voltage_V)


def _warnings(plan: Plan, board: BoardFile, expectations: tuple[Expectation, ...]) -> list[str]:
    found = []
    if plan.source.rated_voltage_V is None and any(e.current_A for e in expectations):
        found.append(
            "rated_voltage_V is not stated in [source], so power and heat cannot be told before the source "
            "is seen."
        )
    found += _bound_to_host(plan)
    limit_degC, _ = limit_of("heatsink_degC", plan, board)
    for number, expected in enumerate(expectations, start=1):
        if expected.current_A and (expected.heatsink_degC or 0.0) > limit_degC:
            found.append(
                f"Test {number} ({expected.kind}) would heat the heatsink to about "
                f"{expected.heatsink_degC:.0f} °C in "
                f"{spell_time(expected.duration_s)}; the load protects itself at {limit_degC:g} °C, so it "
                "may not get "
                "through."
            )
    return found + hopeless_bounds(plan, board)


def _bound_to_host(plan: Plan) -> list[str]:
    """Which tests of a plan that is to go on alone cannot, because their steps are this program's."""
    if plan.when_host_silent != "continue":
        return []
    bound = [f"{n} ({t.kind})" for n, t in enumerate(plan.tests, start=1) if not isinstance(t, Hold | Rest)]
    found = (
        [f"Test {', '.join(bound)} needs this program for each step: without it the board stops."]
        if bound
        else []
    )
    if len(plan.tests) > 1:
        found.append("Without this program the board ends the test that goes on, and begins none after it.")
    return found


def _down(value: float) -> str:
    """A value to three decimals, never rounded up: what is named must fit."""
    return f"{int(value * 1000) / 1000:.3f}"
