"""The kinds of test that a plan may ask for: keys, units, defaults, and the quantities each can be judged by.

Decides what must hold within one test. What must hold between a test and the rest of its plan is in `plan`.
"""

from __future__ import annotations

import difflib
from typing import Annotated, ClassVar

import msgspec

from .keys import KeyMistake, meaning, quantity, wording

#: Kinds that belong to the plan format and are carried out by a later version.
LATER_KINDS = (
    "transient",
    "efficiency",
    "dropout",
    "drift",
    "battery-capacity",
    "dc-resistance",
    "maximum-power",
    "lead-resistance",
)

SETPOINT_KEYS = ("current_A", "power_W", "resistance_ohm", "voltage_V")
END_KEYS = ("end_voltage_V", "end_charge_Ah", "end_energy_Wh", "end_temperature_degC", "duration_s")

_Settle = Annotated[
    float, quantity("s", "Wait at each point before measuring, for the source to settle.", ge=0, le=3600)
]
_Measure = Annotated[float, quantity("s", "Averaging time at each point.", gt=0, le=3600)]


class Bounds(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """Bounds of one quantity in `accept`; at least one of the two, in the unit of the quantity's name."""

    min: Annotated[float, quantity("as the name", "Least value that passes.", default="no bound")] | None = (
        None
    )
    max: (
        Annotated[float, quantity("as the name", "Largest value that passes.", default="no bound")] | None
    ) = None

    def __post_init__(self) -> None:
        if self.min is None and self.max is None:
            raise KeyMistake("", "has neither min nor max", "give at least one, e.g. { max = 2.0 }")
        if self.min is not None and self.max is not None and self.min > self.max:
            raise KeyMistake(
                "min",
                f"{self.min:g} lies above max = {self.max:g}",
                "exchange the two, or correct one of them",
            )


class Test(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True, tag_field="kind"):
    """One `[[test]]`: what all kinds have in common."""

    __test__: ClassVar[bool] = False  # pytest would otherwise take the name for a test class
    #: Names that `accept` may bound for this kind.
    QUANTITIES: ClassVar[tuple[str, ...]] = ()

    instruction: (
        Annotated[
            str, wording("Shown before the test; the run waits until the person confirms.", default="none")
        ]
        | None
    ) = None
    accept: Annotated[
        dict[str, Bounds], meaning("Bounds, as `quantity = { min = , max = }`.", default="none")
    ] = {}

    @property
    def kind(self) -> str:
        """The kind as written in the plan, e.g. `load-regulation`."""
        return str(type(self).__struct_config__.tag)

    def __post_init__(self) -> None:
        for name in self.accept:
            if name not in self.QUANTITIES:
                close = difflib.get_close_matches(name, self.QUANTITIES, n=1)
                meant = f"did you mean {close[0]}? " if close else ""
                raise KeyMistake(
                    f"accept.{name}",
                    f"is no quantity of {self.kind}",
                    f"{meant}It finds {', '.join(self.QUANTITIES)}",
                )


class LoadRegulation(Test, tag="load-regulation", frozen=True, kw_only=True):
    """Voltage at rising currents from no load to full load: load regulation and output resistance."""

    QUANTITIES: ClassVar[tuple[str, ...]] = (
        "load_regulation_percent",
        "output_resistance_ohm",
        "no_load_voltage_V",
        "full_load_voltage_V",
    )

    no_load_current_A: Annotated[float, quantity("A", "Current of the first point.", ge=0, le=1000)] = 0.0
    full_load_current_A: (
        Annotated[
            float, quantity("A", "Current of the last point.", default="`rated_current_A`", gt=0, le=1000)
        ]
        | None
    ) = None
    points: Annotated[int, quantity("", "Number of points, both ends included.", ge=2, le=200)] = 5
    settle_s: _Settle = 0.3
    measure_s: _Measure = 1.0

    def __post_init__(self) -> None:
        super().__post_init__()
        if self.full_load_current_A is not None and self.no_load_current_A >= self.full_load_current_A:
            raise KeyMistake(
                "no_load_current_A",
                f"{self.no_load_current_A:g} A is not below the full load of {self.full_load_current_A:g} A",
                "make it smaller, commonly 0",
            )


class CurrentLimit(Test, tag="current-limit", frozen=True, kw_only=True):
    """A current ramp to the knee, then as far down as the load can pull, then release."""

    QUANTITIES: ClassVar[tuple[str, ...]] = ("current_limit_A", "short_circuit_current_A")

    up_to_A: (
        Annotated[
            float,
            quantity(
                "A",
                "Where the ramp ends if no knee was met.",
                default="1.5 times `rated_current_A`",
                gt=0,
                le=1000,
            ),
        ]
        | None
    ) = None
    points: Annotated[int, quantity("", "Number of points of the ramp.", ge=3, le=200)] = 12
    settle_s: _Settle = 0.3
    measure_s: _Measure = 0.5
    band_percent: Annotated[
        float,
        quantity("%", "The knee is where the voltage falls by more than this below no load.", gt=0, le=50),
    ] = 5.0


class Hold(Test, tag="hold", frozen=True, kw_only=True):
    """One set-point, held until the first of its ends."""

    QUANTITIES: ClassVar[tuple[str, ...]] = (
        "voltage_V",
        "current_A",
        "power_W",
        "resistance_ohm",
        "capacity_Ah",
        "energy_Wh",
        "duration_s",
    )

    current_A: Annotated[float, quantity("A", "Set-point.", default="none", ge=0, le=1000)] | None = None
    power_W: Annotated[float, quantity("W", "Set-point.", default="none", ge=0, le=10000)] | None = None
    resistance_ohm: Annotated[float, quantity("ohm", "Set-point.", default="none", gt=0, le=1e6)] | None = (
        None
    )
    voltage_V: Annotated[float, quantity("V", "Set-point.", default="none", gt=0, le=1000)] | None = None
    end_voltage_V: (
        Annotated[
            float,
            quantity("V", "Ends when the voltage has fallen to this.", default="no such end", ge=0, le=1000),
        ]
        | None
    ) = None
    end_charge_Ah: (
        Annotated[
            float, quantity("Ah", "Ends when this charge was drawn.", default="no such end", gt=0, le=10000)
        ]
        | None
    ) = None
    end_energy_Wh: (
        Annotated[
            float, quantity("Wh", "Ends when this energy was drawn.", default="no such end", gt=0, le=1e6)
        ]
        | None
    ) = None
    end_temperature_degC: (
        Annotated[
            float,
            quantity("degC", "Ends when the heatsink has reached this.", default="no such end", gt=0, le=150),
        ]
        | None
    ) = None
    duration_s: (
        Annotated[float, quantity("s", "Ends after this time.", default="no such end", gt=0, le=3.2e7)] | None
    ) = None

    def __post_init__(self) -> None:
        super().__post_init__()
        setpoints = [key for key in SETPOINT_KEYS if getattr(self, key) is not None]
        if not setpoints:
            raise KeyMistake("", "has no set-point", f"give one of {', '.join(SETPOINT_KEYS)}")
        if len(setpoints) > 1:
            raise KeyMistake(
                setpoints[1],
                f"is a second set-point beside {setpoints[0]}",
                "keep one of them: a load obeys one law",
            )
        if all(getattr(self, key) is None for key in END_KEYS):
            raise KeyMistake("", "would never end", f"give at least one of {', '.join(END_KEYS)}")


class Rest(Test, tag="rest", frozen=True, kw_only=True):
    """The gate clamped, nothing drawn, the source watched."""

    QUANTITIES: ClassVar[tuple[str, ...]] = ("open_circuit_voltage_V", "duration_s")

    duration_s: Annotated[float, quantity("s", "How long.", gt=0, le=3.2e7)]


AnyTest = LoadRegulation | CurrentLimit | Hold | Rest
KINDS: dict[str, type[Test]] = {
    str(kind.__struct_config__.tag): kind for kind in (LoadRegulation, CurrentLimit, Hold, Rest)
}
