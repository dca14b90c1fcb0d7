"""Causes of error, values that carry them, and the interval that they add up to.

A value keeps each cause with the sensitivity of the value to it, not a standard deviation: so two readings
that err for the same reason err together, and what cancels in their difference or ratio cancels here.
Sensitivities follow the rules of differentiation (JCGM 100, 5.1.3), to first order: errors of some percent at
most. It must not know boards, readings or bounds.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from sinkwright.results import Contribution
from sinkwright.uncertainty.convolution import half_width

Shape = Literal["normal", "rectangular", "triangular", "t"]

#: Half-width over standard deviation (JCGM 100, 4.3.7 and 4.3.9); a spread given as a deviation is one
#: itself.
_DEVIATION = {"normal": 1.0, "t": 1.0, "rectangular": 1 / math.sqrt(3), "triangular": 1 / math.sqrt(6)}


@dataclass(frozen=True)
class Cause:
    """One independent cause of error. Equal causes are one cause: values that share it are fully correlated.

    `spread` is the standard deviation of a normal, s/sqrt(n) for t, and the half-width of the others, in the
    unit of the input that errs. `dof` counts for t only. `remedy` is a sentence: what a person can do to make
    it smaller. Raises ValueError for a spread that is no size, an unknown shape, or t with less than one
    degree of freedom.
    """

    name: str
    shape: Shape
    spread: float
    dof: float = math.inf
    remedy: str = ""

    def __post_init__(self) -> None:
        if self.shape not in _DEVIATION:
            raise ValueError(f"{self.name}: {self.shape} is no shape; there are {', '.join(_DEVIATION)}")
        if not (math.isfinite(self.spread) and self.spread >= 0):
            raise ValueError(f"{self.name}: a spread of {self.spread} is no size")
        if not self.dof >= 1:
            raise ValueError(f"{self.name}: {self.dof} degrees of freedom tell nothing; one is the least")

    @property
    def standard(self) -> float:
        """Its standard uncertainty (of t: s/sqrt(n), as JCGM 100 has it)."""
        return self.spread * _DEVIATION[self.shape]


@dataclass(frozen=True, eq=False)
class Uncertain:
    """A value and its sensitivities: `parts[cause]` is the change of value per unit of the cause."""

    value: float
    parts: Mapping[Cause, float] = field(default_factory=dict)

    @classmethod
    def exact(cls, value: float) -> Uncertain:
        """A value without error."""
        return cls(float(value))

    @property
    def standard(self) -> float:
        """Standard uncertainty, in the value's unit."""
        return math.hypot(*(sensitivity * cause.standard for cause, sensitivity in self.parts.items()))

    def without(self, remedy: str) -> Uncertain:
        """The same value as if everything that `remedy` cures were gone."""
        return Uncertain(self.value, {c: s for c, s in self.parts.items() if c.remedy != remedy})

    def __add__(self, other: Uncertain | float) -> Uncertain:
        other = _uncertain(other)
        return _combine(self.value + other.value, self, 1.0, other, 1.0)

    def __sub__(self, other: Uncertain | float) -> Uncertain:
        other = _uncertain(other)
        return _combine(self.value - other.value, self, 1.0, other, -1.0)

    def __mul__(self, other: Uncertain | float) -> Uncertain:
        other = _uncertain(other)
        return _combine(self.value * other.value, self, other.value, other, self.value)

    def __truediv__(self, other: Uncertain | float) -> Uncertain:
        """Raises ZeroDivisionError where the divisor's value is zero."""
        other = _uncertain(other)
        quotient = self.value / other.value
        return _combine(quotient, self, 1 / other.value, other, -quotient / other.value)

    def __neg__(self) -> Uncertain:
        return self * -1.0

    def __radd__(self, other: float) -> Uncertain:
        return self + other

    def __rsub__(self, other: float) -> Uncertain:
        return _uncertain(other) - self

    def __rmul__(self, other: float) -> Uncertain:
        return self * other

    def __rtruediv__(self, other: float) -> Uncertain:
        return _uncertain(other) / self


@dataclass(frozen=True)
class Expanded:
    """A value with the half-width of the interval that covers it, and what makes that up, largest first.

    `coverage_factor` is half_width / standard; None for a value without error.
    """

    value: float
    half_width: float
    standard: float
    coverage_factor: float | None
    contributions: tuple[Contribution, ...]


def expand(value: Uncertain, coverage: float = 0.95) -> Expanded:
    """The half-width that covers `coverage` of the causes' combined distribution (see `convolution`)."""
    normals: list[float] = []
    rectangles: list[float] = []
    ts: list[tuple[float, float]] = []
    for cause, sensitivity in value.parts.items():
        width = abs(sensitivity) * cause.spread
        if width == 0.0:
            continue
        if cause.shape == "normal" or (cause.shape == "t" and math.isinf(cause.dof)):
            normals.append(width)
        elif cause.shape == "rectangular":
            rectangles.append(width)
        elif cause.shape == "triangular":
            rectangles += [width / 2, width / 2]
        else:
            ts.append((width, cause.dof))
    standard = value.standard
    half = half_width(tuple(normals), tuple(rectangles), tuple(ts), coverage)
    return Expanded(value.value, half, standard, half / standard if standard else None, _contributions(value))


def _contributions(value: Uncertain) -> tuple[Contribution, ...]:
    shares = [
        Contribution(cause.name, abs(sensitivity) * cause.standard, cause.remedy)
        for cause, sensitivity in value.parts.items()
    ]
    return tuple(sorted((s for s in shares if s.standard > 0), key=lambda s: -s.standard))


def _uncertain(value: Uncertain | float) -> Uncertain:
    return value if isinstance(value, Uncertain) else Uncertain.exact(value)


def _combine(
    value: float, first: Uncertain, first_by: float, second: Uncertain, second_by: float
) -> Uncertain:
    parts = {cause: sensitivity * first_by for cause, sensitivity in first.parts.items()}
    for cause, sensitivity in second.parts.items():
        parts[cause] = parts.get(cause, 0.0) + sensitivity * second_by
    return Uncertain(value, parts)
