"""Whether a result that was read from a file has numbers where numbers belong, so that whoever shows it may
rely on it.

A record may come from anywhere. Only types are looked at, never whether the figures make sense.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import get_args

from sinkwright.results import Quantity, TestResult, Verdict

_TEXTS = ("name", "unit", "reason", "remedy")
_NUMBERS = ("value", "expanded_uncertainty", "coverage_factor", "min", "max")


def checked(result: TestResult) -> TestResult:
    """The same result. Raises TypeError for one that is made of other things than it must be."""
    _need_text(result.kind, *result.notes, *result.not_tested)
    _need_number(result.started_us, result.ended_us)
    if result.stopped_by is not None:
        _need_text(result.stopped_by)
    for point in result.points:
        _need_number(*point.values())
    verdicts = [result.verdict, *(_checked_quantity(quantity) for quantity in result.quantities.values())]
    unknown = [verdict for verdict in verdicts if verdict not in get_args(Verdict)]
    if unknown:
        raise TypeError(f"{unknown[0]!r} is no verdict")
    return result


def _checked_quantity(quantity: Quantity) -> Verdict:
    _need_text(*(getattr(quantity, name) for name in _TEXTS))
    _need_number(*_present(getattr(quantity, name) for name in _NUMBERS))
    for share in quantity.contributions:
        _need_text(share.cause, share.remedy)
        _need_number(share.standard)
    return quantity.verdict


def _present(values: Iterable[object]) -> list[object]:
    return [value for value in values if value is not None]


def _need_text(*values: object) -> None:
    for value in values:
        if not isinstance(value, str):
            raise TypeError(f"{value!r} is no text")


def _need_number(*values: object) -> None:
    for value in values:
        if not isinstance(value, int | float) or isinstance(value, bool):
            raise TypeError(f"{value!r} is no number")
