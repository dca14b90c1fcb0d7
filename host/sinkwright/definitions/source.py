"""What a simulated source may be: a supply, a cell, or a static curve, with its leads.

Decides keys, units, defaults and physical plausibility. The physics is the simulator's business.
"""

from __future__ import annotations

from itertools import pairwise
from typing import Annotated, Literal

import msgspec

from .keys import KeyMistake, by_program, meaning, quantity


class Source(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True, tag_field="kind"):
    """What every simulated source has: the leads to the load, and how the voltage is sensed."""

    text: Annotated[str, by_program()] = ""
    leads_ohm: Annotated[float, quantity("ohm", "Resistance of both leads together.", ge=0, le=100)] = 0.0
    leads_inductance_H: Annotated[
        float, quantity("H", "Inductance of both leads together.", ge=0, le=1e-3)
    ] = 0.0
    remote_sense: Annotated[
        bool,
        meaning(
            "Whether the sense pair is at the source's terminals; if not, the board sees the leads' drop."
        ),
    ] = True

    @property
    def kind(self) -> str:
        """The kind as written in the file, e.g. `supply`."""
        return str(type(self).__struct_config__.tag)


class SupplySource(Source, tag="supply", frozen=True, kw_only=True):
    """A regulated supply: a voltage behind a resistance, with a current limit."""

    voltage_V: Annotated[float, quantity("V", "Voltage at no load.", gt=0, le=1000)]
    resistance_ohm: Annotated[float, quantity("ohm", "Output resistance.", gt=0, le=1e6)]
    inductance_H: Annotated[float, quantity("H", "Output inductance.", ge=0, le=1)] = 0.0
    capacitance_F: Annotated[float, quantity("F", "Capacitance across its output.", ge=0, le=10)] = 0.0
    limit_A: Annotated[float, quantity("A", "Current limit.", default="none", gt=0, le=1000)] | None = None
    limit_kind: Annotated[
        Literal["constant", "foldback", "latch"],
        meaning(
            "`constant`: the current stays at the limit; `foldback`: it falls with the voltage; "
            "`latch`: no output until the current has been zero for 1 s. Matters only with `limit_A`."
        ),
    ] = "constant"
    foldback_A: (
        Annotated[
            float,
            quantity(
                "A",
                "The limit at 0 V; at V it is `foldback_A + (limit_A - foldback_A) * V / voltage_V`.",
                default="required by `foldback`",
                ge=0,
                le=1000,
            ),
        ]
        | None
    ) = None
    recovery_s: Annotated[
        float, quantity("s", "Time constant of the recovery after a load step.", ge=0, le=10)
    ] = 0.0
    ripple_V: Annotated[float, quantity("V", "Ripple, peak to peak.", ge=0, le=100)] = 0.0
    ripple_Hz: (
        Annotated[
            float, quantity("Hz", "Frequency of the ripple.", default="required by `ripple_V`", gt=0, le=1e6)
        ]
        | None
    ) = None

    def __post_init__(self) -> None:
        self._check_limit()
        if self.ripple_V and self.ripple_Hz is None:
            raise KeyMistake("ripple_Hz", "is missing beside ripple_V", "give it, e.g. 100.0")
        if self.ripple_V > 2 * self.voltage_V:
            raise KeyMistake(
                "ripple_V",
                f"{self.ripple_V:g} V peak to peak would reverse a source of {self.voltage_V:g} V",
                f"write at most {2 * self.voltage_V:g}",
            )

    def _check_limit(self) -> None:
        if self.limit_kind != "constant" and self.limit_A is None:
            raise KeyMistake(
                "limit_A", f'is missing although limit_kind is "{self.limit_kind}"', "give the limit"
            )
        if self.limit_kind != "foldback" and self.foldback_A is not None:
            raise KeyMistake(
                "foldback_A",
                f'is given although limit_kind is "{self.limit_kind}"',
                'write limit_kind = "foldback", or leave it out',
            )
        if self.limit_kind == "foldback":
            if self.foldback_A is None:
                raise KeyMistake(
                    "foldback_A", 'is missing although limit_kind is "foldback"', "give the limit at 0 V"
                )
            if self.limit_A is not None and self.foldback_A >= self.limit_A:
                raise KeyMistake(
                    "foldback_A",
                    f"{self.foldback_A:g} A is not below limit_A = {self.limit_A:g} A",
                    "a limit that folds back is smaller at 0 V",
                )


class CellSource(Source, tag="cell", frozen=True, kw_only=True):
    """A cell or battery: an open-circuit voltage that falls with the charge, a resistance, slow RC pairs."""

    capacity_Ah: Annotated[float, quantity("Ah", "Charge from full to empty.", gt=0, le=10000)]
    state_of_charge: Annotated[float, quantity("1", "Where it begins: 1 full, 0 empty.", ge=0, le=1)] = 1.0
    ocv: Annotated[
        tuple[tuple[float, float], ...],
        meaning("Open-circuit voltage as `[state of charge, V]` points from 0 to 1, interpolated."),
    ]
    r0_ohm: Annotated[float, quantity("ohm", "Resistance that acts at once.", gt=0, le=1000)]
    rc: Annotated[
        tuple[tuple[float, float], ...],
        meaning("Slow resistances as `[ohm, farad]` pairs in series.", default="none"),
    ] = ()

    def __post_init__(self) -> None:
        _check_axis("ocv", self.ocv, "states of charge")
        if self.ocv[0][0] != 0.0 or self.ocv[-1][0] != 1.0:
            raise KeyMistake(
                "ocv",
                f"goes from {self.ocv[0][0]:g} to {self.ocv[-1][0]:g}",
                "begin at 0.0 (empty), end at 1.0 (full)",
            )
        for number, (low, high) in enumerate(pairwise(self.ocv), start=2):
            if high[1] < low[1]:
                raise KeyMistake(
                    f"ocv[{number}]",
                    f"{high[1]:g} V is below the {low[1]:g} V of the point before it",
                    "a fuller cell never has the lower open-circuit voltage",
                )
        if self.ocv[0][1] < 0 or self.ocv[-1][1] <= 0:
            raise KeyMistake(
                "ocv[1]", "has a negative voltage", "write the cell's voltages as positive numbers"
            )
        for number, (resistance, capacitance) in enumerate(self.rc, start=1):
            if resistance <= 0 or capacitance <= 0:
                raise KeyMistake(f"rc[{number}]", "must be two positive numbers", "write [ohm, farad]")


class CurveSource(Source, tag="curve", frozen=True, kw_only=True):
    """A static characteristic, such as a solar cell's."""

    points: Annotated[
        tuple[tuple[float, float], ...],
        meaning(
            "`[V, A]` points with rising voltage and never rising current, interpolated. "
            "The last has 0 A: the open-circuit voltage."
        ),
    ]

    def __post_init__(self) -> None:
        _check_axis("points", self.points, "voltages")
        for number, (volt, ampere) in enumerate(self.points, start=1):
            if volt < 0 or ampere < 0:
                raise KeyMistake(
                    f"points[{number}]",
                    "has a negative number",
                    "a sink sees the first quadrant only: V and A from 0 up",
                )
        for number, (low, high) in enumerate(pairwise(self.points), start=2):
            if high[1] > low[1]:
                raise KeyMistake(
                    f"points[{number}]",
                    f"the current rises from {low[1]:g} A to {high[1]:g} A as the voltage rises",
                    "a source never gives more current at more voltage: sort the points, and check this one",
                )
        if self.points[-1][1] != 0.0:
            raise KeyMistake(
                f"points[{len(self.points)}]",
                f"the last point still has {self.points[-1][1]:g} A",
                "add a last point with 0.0 A at the open-circuit voltage",
            )


SourceFile = SupplySource | CellSource | CurveSource
KINDS: dict[str, type[Source]] = {
    str(kind.__struct_config__.tag): kind for kind in (SupplySource, CellSource, CurveSource)
}


def _check_axis(key: str, points: tuple[tuple[float, float], ...], axis: str) -> None:
    if len(points) < 2:
        raise KeyMistake(key, f"has {len(points)} point(s)", "give at least two")
    for number, (low, high) in enumerate(pairwise(points), start=2):
        if high[0] <= low[0]:
            raise KeyMistake(
                f"{key}[{number}]",
                f"the {axis} must rise, but {high[0]:g} follows {low[0]:g}",
                "sort the points, and leave out doubles",
            )
