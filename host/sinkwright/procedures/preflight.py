"""Before anything is drawn: refuses what the board, the source or the plan's own limits do not allow.

A refusal names the largest value that fits. Warnings do not stop a run: bounds that no reading could meet
because 2U is wider than the tolerance, a heatsink that will be hot, a voltage that is not stated. Knows no
device; what only the real source can tell is checked by `check_source` when its open voltage has been read.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from sinkwright.definitions.plan import AnyTest, CurrentLimit, Hold
from sinkwright.errors import AskedTooMuch, SinkwrightError
from sinkwright.procedures.expectation import Expectation, expect, spell_time, steps_of
from sinkwright.procedures.resolution import hopeless_bounds

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
        _check_mode(test, where)
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
    for number, test in enumerate(plan.tests, start=1):
        check_power(test, open_V, plan, board, f"plan {plan.name}, test[{number}] ({test.kind})")
    rated_V = plan.source.rated_voltage_V
    if rated_V is not None and abs(open_V - rated_V) > 0.2 * rated_V:
        return [f"The source gives {open_V:.3f} V, while the plan rates it at {rated_V:g} V."]
    return []


def draws_nothing(plan: Plan) -> bool:
    """Whether the whole plan leaves the load off."""
    return all(step.current_A == 0 for test in plan.tests for step in steps_of(test, plan.source))


def limit_of(key: str, plan: Plan, board: BoardFile) -> tuple[float, str]:
    """The tighter of the plan's and the board's limit, and whose it is."""
    own = getattr(plan.limits, key)
    boards = getattr(board.limits, key)
    if own is not None and own < boards:
        return own, "the plan's own limit"
    return boards, "the board's limit"


def check_power(test: AnyTest, voltage_V: float, plan: Plan, board: BoardFile, where: str) -> None:
    """Refuse a test that would turn more power into heat than fits at `voltage_V`."""
    current_A = max(step.current_A for step in steps_of(test, plan.source))
    limit_W, whose = limit_of("power_W", plan, board)
    if current_A * voltage_V > limit_W:
        raise AskedTooMuch(
            f"{current_A:.3f} A at {voltage_V:.3f} V are {current_A * voltage_V:.1f} W, more than {whose} of "
            f"{limit_W:g} W",
            where=where,
            remedy=f"Ask for at most {_down(limit_W / voltage_V)} A at this voltage.",
        )
    rated_W = plan.source.rated_power_W
    if rated_W is not None and not isinstance(test, CurrentLimit) and current_A * voltage_V > rated_W * 1.001:
        raise AskedTooMuch(
            f"{current_A:.3f} A at {voltage_V:.3f} V are more than the source's rated power of {rated_W:g} W",
            where=where,
            remedy=f"Ask for at most {_down(rated_W / voltage_V)} A.",
        )


def _check_policy(plan: Plan) -> None:
    if plan.when_host_silent == "continue":
        raise SinkwrightError(
            "this firmware has no ends of its own yet, so it cannot go on without a host",
            where=f"plan {plan.name}, when_host_silent",
            remedy='Write when_host_silent = "stop", and leave the computer on until the run is through.',
        )


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


def _check_mode(test: AnyTest, where: str) -> None:
    if isinstance(test, Hold) and test.current_A is None:
        raise SinkwrightError(
            "this version holds a constant current only; constant power, resistance and voltage come later",
            where=where,
            remedy="Give current_A instead.",
        )


def _check_current(test: AnyTest, expected: Expectation, plan: Plan, board: BoardFile, where: str) -> None:
    limit_A, whose = limit_of("current_A", plan, board)
    if expected.current_A > limit_A:
        raise AskedTooMuch(
            f"{expected.current_A:.3f} A is beyond {whose} of {limit_A:g} A",
            where=where,
            remedy=f"The largest that fits is {limit_A:g} A.",
        )
    rated_A = plan.source.rated_current_A
    # Looking for a current limit is the one job that goes beyond the rating by design.
    if rated_A is not None and not isinstance(test, CurrentLimit) and expected.current_A > rated_A * 1.001:
        raise AskedTooMuch(
            f"{expected.current_A:.3f} A is more than the source's rated {rated_A:g} A",
            where=where,
            remedy=f"Ask for at most {rated_A:g} A, or correct rated_current_A in [source].",
        )


def _warnings(plan: Plan, board: BoardFile, expectations: tuple[Expectation, ...]) -> list[str]:
    found = []
    if plan.source.rated_voltage_V is None and any(e.current_A for e in expectations):
        found.append(
            "rated_voltage_V is not stated in [source], so power and heat cannot be told before the source "
            "is seen."
        )
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


def _down(value: float) -> str:
    """A value to three decimals, never rounded up: what is named must fit."""
    return f"{int(value * 1000) / 1000:.3f}"
