"""Whether a value meets its bounds, given how far it may be wrong; and the sentence that says so.

The guard band is as wide as the expanded uncertainty (w = U; JCGM 106, 8.3, and ILAC-G8): pass needs the
whole interval within the bounds, fail the whole interval beyond one of them, and anything else is
inconclusive. An interval that just touches a bound from within passes, since the bound itself is allowed.
`decision = "simple"` lets the value alone decide, and the reason says so. It must not know plans or how a
value came about.
"""

from __future__ import annotations

import math
from typing import Literal

from sinkwright.results import Quantity, Verdict
from sinkwright.uncertainty.causes import Expanded, Uncertain, expand
from sinkwright.uncertainty.remedies import cost
from sinkwright.units import QUANTITIES, format_uncertainty, format_value, two_figures

Decision = Literal["guarded", "simple"]

#: A remedy is worth trying for its cost only where its causes make up this share of the largest one's.
_WORTH_TRYING = 0.5


def judge(
    name: str,
    value: Uncertain | None,
    *,
    minimum: float | None = None,
    maximum: float | None = None,
    decision: Decision = "guarded",
    reason_if_none: str = "",
    unresolved: str = "",
) -> Quantity:
    """The quantity `name` with interval, verdict, reason and remedy; bounds in the quantity's own unit.

    `value` None (with its reason) and `unresolved` (a reason why the interval does not hold) are inconclusive
    where there are bounds. Raises KeyError for a name that is no quantity, ValueError for an unknown
    decision.
    """
    if decision not in ("guarded", "simple"):
        raise ValueError(f"{decision} is no way to decide; there are guarded and simple")
    unit = QUANTITIES[name].symbol
    bounded = minimum is not None or maximum is not None
    doubt: Verdict = "inconclusive" if bounded else "none"
    if value is None or not math.isfinite(value.value):
        reason = reason_if_none or "It was not measured."
        return Quantity(name, None, unit, None, min=minimum, max=maximum, verdict=doubt, reason=reason)
    found = expand(value)
    verdict, reason, remedy = doubt, unresolved, ""
    if bounded and not unresolved:
        verdict, reason = _decide(found, unit, minimum, maximum, decision)
        if verdict == "inconclusive":
            remedy = _remedy(value, found, unit, minimum, maximum)
    return Quantity(
        name,
        found.value,
        unit,
        found.half_width,
        coverage_factor=found.coverage_factor,
        min=minimum,
        max=maximum,
        verdict=verdict,
        reason=reason,
        remedy=remedy,
        contributions=found.contributions,
    )


def could_pass(expected_U: float, minimum: float | None, maximum: float | None) -> str | None:
    """A sentence when no reading could pass: the interval, 2U wide, does not fit the bounds. Else None.

    With one bound there is always room.
    """
    if minimum is None or maximum is None or not _exceeds(2 * expected_U, maximum - minimum):
        return None
    return (
        f"no reading could pass, because the bounds are only {maximum - minimum:.4g} apart and the "
        f"uncertainty to be expected is ± {two_figures(expected_U)}. Set the bounds clearly more than "
        f"{two_figures(2 * expected_U)} apart, or make the uncertainty smaller: calibrate the board."
    )


def _decide(
    found: Expanded, unit: str, minimum: float | None, maximum: float | None, decision: Decision
) -> tuple[Verdict, str]:
    written = format_value(found.value, found.half_width, unit)
    if decision == "simple":
        return _decide_simply(found.value, written, unit, minimum, maximum)
    low, high = found.value - found.half_width, found.value + found.half_width
    if maximum is not None and _exceeds(low, maximum):
        return "fail", f"{written} lies wholly above the upper bound of {maximum:g} {unit}."
    if minimum is not None and _exceeds(minimum, high):
        return "fail", f"{written} lies wholly below the lower bound of {minimum:g} {unit}."
    crossed = []
    if minimum is not None and _exceeds(minimum, low):
        crossed.append(f"the lower bound of {minimum:g} {unit}")
    if maximum is not None and _exceeds(high, maximum):
        crossed.append(f"the upper bound of {maximum:g} {unit}")
    if crossed:
        return "inconclusive", f"{written} reaches across {' and '.join(crossed)}."
    return "pass", f"{written} lies with its whole interval {_within(minimum, maximum, unit)}."


def _decide_simply(
    value: float, written: str, unit: str, minimum: float | None, maximum: float | None
) -> tuple[Verdict, str]:
    inside = (minimum is None or not _exceeds(minimum, value)) and (
        maximum is None or not _exceeds(value, maximum)
    )
    place = _within(minimum, maximum, unit)
    is_in = "lies" if inside else "does not lie"
    return (
        "pass" if inside else "fail",
        f'{written}: the value {is_in} {place}. Decided by the value alone (decision = "simple"), '
        "without regard to its uncertainty.",
    )


def _within(minimum: float | None, maximum: float | None, unit: str) -> str:
    if minimum is None:
        return f"at or below {maximum:g} {unit}"
    if maximum is None:
        return f"at or above {minimum:g} {unit}"
    return f"within {minimum:g} to {maximum:g} {unit}"


def _exceeds(first: float, second: float) -> bool:
    """More than, and not by mere rounding of binary fractions."""
    return first > second and not math.isclose(first, second, rel_tol=1e-9, abs_tol=1e-15)


def _remedy(
    value: Uncertain, found: Expanded, unit: str, minimum: float | None, maximum: float | None
) -> str:
    """The largest contribution, and the cheapest remedy: one that could decide, else the largest's own."""
    if not found.contributions:
        return ""
    largest = found.contributions[0]
    share = (largest.standard / found.standard) ** 2 * 100
    start = f"The largest contribution is {largest.cause} ({share:.0f} % of the variance)."
    shares: dict[str, float] = {}
    for contribution in found.contributions:
        if contribution.remedy:
            shares[contribution.remedy] = shares.get(contribution.remedy, 0.0) + contribution.standard**2
    if not shares:
        return start
    enough = (_WORTH_TRYING * largest.standard) ** 2
    worthwhile = sorted((r for r, variance in shares.items() if variance >= enough), key=cost)
    left = {remedy: expand(value.without(remedy)).half_width for remedy in worthwhile}
    for remedy in worthwhile:
        if _would_decide(found.value, left[remedy], minimum, maximum):
            at_best = format_uncertainty(left[remedy], unit)
            return f"{start} {remedy} At best ± {at_best} would be left, which would decide."
    best = min(worthwhile or shares, key=lambda r: left.get(r, found.half_width))
    return f"{start} {best} That alone may not decide: the value lies close to the bound."


def _would_decide(value: float, half_width: float, minimum: float | None, maximum: float | None) -> bool:
    """Whether an interval this wide about the value would lie on one side of each bound."""
    bounds = [bound for bound in (minimum, maximum) if bound is not None]
    return all(abs(value - bound) > half_width for bound in bounds)
