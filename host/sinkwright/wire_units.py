"""SI floats to the wire's integers, refusing what is no quantity before anything is sent.

The limits of a load are the board's to keep; this keeps out only what cannot be said on the wire at all.
"""

from __future__ import annotations

import math

from sinkwright.errors import AskedTooMuch

#: The largest signed 32-bit integer: 2147 A in uA, so no real set-point comes near it.
_LARGEST = 0x7FFF_FFFF


def to_integer(value: float, parts: int, what: str, unit: str, largest: int = _LARGEST) -> int:
    """`value` (SI, in `unit`) as a whole number of `parts` per unit. `what` names it in errors: "a current".

    `largest` is what its field can carry. Raises AskedTooMuch for what is no number, not finite, below zero,
    or too large for the wire.
    """
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        raise _refused(f"{what} must be a number of {unit}, not {value!r}", unit)
    if not math.isfinite(value):
        raise _refused(f"{what} of {value} {unit} is no quantity", unit)
    if value < 0:
        raise _refused(f"{what} cannot be negative ({value:g} {unit})", unit)
    if value * parts > largest:
        raise _refused(
            f"{what} of {value:g} {unit} is beyond what any board can be told ({largest / parts:g} {unit})",
            unit,
        )
    return round(value * parts)


def _refused(what: str, unit: str) -> AskedTooMuch:
    return AskedTooMuch(
        what[0].upper() + what[1:],
        load="Nothing was sent to the load.",
        remedy=f"Give a value from 0 upwards, in {unit}.",
    )
