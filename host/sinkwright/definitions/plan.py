"""What a plan may say: the source under test, the limits for this job, and the tests in their order.

Decides which keys exist, their units, defaults and plausible ranges, and what must hold between keys of one
plan. Knows no board: whether a board can do it is the preflight's business.
"""

from __future__ import annotations

from typing import Annotated, Literal

import msgspec

from .keys import KeyMistake, by_program, meaning, quantity, wording
from .plan_tests import (
    END_KEYS,
    KINDS,
    LATER_KINDS,
    SETPOINT_KEYS,
    AnyTest,
    Bounds,
    CurrentLimit,
    Hold,
    LoadRegulation,
    Rest,
    Test,
)

__all__ = [
    "END_KEYS",
    "KINDS",
    "LATER_KINDS",
    "SETPOINT_KEYS",
    "AnyTest",
    "Bounds",
    "CurrentLimit",
    "Hold",
    "LoadRegulation",
    "Plan",
    "PlanLimits",
    "Rest",
    "SourceUnderTest",
    "Test",
]


class SourceUnderTest(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """`[source]`: what is tested, what its maker states, and how it is wired to the load."""

    name: Annotated[str, wording("What the source is called in record and report.")] = ""
    rated_voltage_V: (
        Annotated[float, quantity("V", "Voltage that the maker states.", default="not stated", gt=0, le=1000)]
        | None
    ) = None
    rated_current_A: (
        Annotated[float, quantity("A", "Current that the maker states.", default="not stated", gt=0, le=1000)]
        | None
    ) = None
    rated_power_W: (
        Annotated[float, quantity("W", "Power that the maker states.", default="not stated", gt=0, le=10000)]
        | None
    ) = None
    chemistry: (
        Annotated[str, wording('Of a cell: its chemistry, e.g. "NMC".', default="not stated")] | None
    ) = None
    capacity_Ah: (
        Annotated[
            float, quantity("Ah", "Of a cell: the capacity it states.", default="not stated", gt=0, le=10000)
        ]
        | None
    ) = None
    sense: Annotated[
        Literal["remote", "two-wire"],
        meaning("How the voltage is sensed: by a pair of its own at the source, or over the current leads."),
    ] = "remote"
    lead_resistance_ohm: (
        Annotated[
            float,
            quantity("ohm", "Two-wire: resistance of both leads together.", default="not known", ge=0, le=10),
        ]
        | None
    ) = None
    lead_resistance_uncertainty_ohm: (
        Annotated[
            float,
            quantity(
                "ohm", "Two-wire: by how much it may differ (half-width).", default="not known", ge=0, le=10
            ),
        ]
        | None
    ) = None

    def __post_init__(self) -> None:
        if self.sense == "remote" and self.lead_resistance_ohm is not None:
            raise KeyMistake(
                "lead_resistance_ohm",
                'is given although sense is "remote", where the leads do not matter',
                'write sense = "two-wire", or leave it out',
            )
        if (self.lead_resistance_ohm is None) != (self.lead_resistance_uncertainty_ohm is None):
            missing = (
                "lead_resistance_ohm"
                if self.lead_resistance_ohm is None
                else "lead_resistance_uncertainty_ohm"
            )
            raise KeyMistake(
                missing,
                "is missing: the resistance of the leads helps only together with its uncertainty",
                "give both, or neither",
            )


class PlanLimits(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """`[limits]`: the load's own limits for this job; each may only tighten what the board stands."""

    current_A: (
        Annotated[float, quantity("A", "More than this trips.", default="the board's limit", gt=0, le=1000)]
        | None
    ) = None
    voltage_V: (
        Annotated[float, quantity("V", "More than this trips.", default="the board's limit", gt=0, le=1000)]
        | None
    ) = None
    power_W: (
        Annotated[float, quantity("W", "More than this trips.", default="the board's limit", gt=0, le=10000)]
        | None
    ) = None
    heatsink_degC: (
        Annotated[
            float, quantity("degC", "A hotter heatsink trips.", default="the board's limit", ge=30, le=150)
        ]
        | None
    ) = None


class Plan(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """A whole plan, checked as far as it can be without a board."""

    name: Annotated[str, by_program()] = ""
    text: Annotated[str, by_program()] = ""
    when_host_silent: Annotated[
        Literal["stop", "continue"],
        meaning(
            "What the board does when the host falls silent. For `continue`, every `hold` needs "
            "`end_voltage_V`, and `end_charge_Ah` or `duration_s`."
        ),
    ] = "stop"
    decision: Annotated[
        Literal["guarded", "simple"],
        meaning(
            "`guarded`: a verdict only when the whole uncertainty interval lies on one side of a bound; "
            "`simple`: the value alone decides, and the report says so."
        ),
    ] = "guarded"
    source: Annotated[SourceUnderTest, meaning("The source under test.", default="nothing stated")] = (
        msgspec.field(default_factory=SourceUnderTest)
    )
    limits: Annotated[PlanLimits, meaning("The load's limits for this job.", default="the board's")] = (
        msgspec.field(default_factory=PlanLimits)
    )
    tests: Annotated[
        tuple[AnyTest, ...], msgspec.Meta(min_length=1, description="The tests, in order: `[[test]]` tables.")
    ] = msgspec.field(name="test")

    def __post_init__(self) -> None:
        for number, test in enumerate(self.tests, start=1):
            where = f"test[{number}]"
            if isinstance(test, LoadRegulation):
                self._check_load_regulation(test, where)
            elif (
                isinstance(test, CurrentLimit)
                and test.up_to_A is None
                and self.source.rated_current_A is None
            ):
                raise KeyMistake(
                    f"{where}.up_to_A",
                    "is missing, and the source has no rating to take it from",
                    "give it, or give rated_current_A under [source]",
                )
            elif isinstance(test, Hold):
                self._check_hold(test, where)

    def _check_load_regulation(self, test: LoadRegulation, where: str) -> None:
        full = test.full_load_current_A or self.source.rated_current_A
        if full is None:
            raise KeyMistake(
                f"{where}.full_load_current_A",
                "is missing, and the source has no rating to take it from",
                "give it, or give rated_current_A under [source]",
            )
        if test.no_load_current_A >= full:
            raise KeyMistake(
                f"{where}.no_load_current_A",
                f"{test.no_load_current_A:g} A is not below the full load of {full:g} A",
                "make it smaller, commonly 0",
            )
        self._check_limit(f"{where}.full_load_current_A", full, "current_A", "A")

    def _check_hold(self, test: Hold, where: str) -> None:
        for key, unit in (("current_A", "A"), ("power_W", "W"), ("voltage_V", "V")):
            setpoint = getattr(test, key)
            if setpoint is not None:
                self._check_limit(f"{where}.{key}", setpoint, key, unit)
        timed = test.end_charge_Ah is not None or test.duration_s is not None
        if self.when_host_silent == "continue" and (test.end_voltage_V is None or not timed):
            raise KeyMistake(
                where,
                'cannot go on without a host (when_host_silent = "continue") for want of ends',
                "give end_voltage_V, and end_charge_Ah or duration_s",
            )

    def _check_limit(self, where: str, value: float, key: str, unit: str) -> None:
        limit = getattr(self.limits, key)
        if limit is not None and value > limit:
            raise KeyMistake(
                where,
                f"{value:g} {unit} is beyond the plan's own limits.{key} = {limit:g} {unit}",
                f"ask for at most {limit:g}, or raise that limit",
            )
