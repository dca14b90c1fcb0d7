"""The mean of repeated readings, and how far it may lie from the mean of endless ones.

Neighbouring readings of a source that drifts or beats are alike, and tell less than as many independent ones.
The number of readings that count is found from their autocorrelation, summed up to the first lag without any
(the initial positive sequence of Geyer, Statistical Science 7, 1992; from memory). Few readings cannot show a
drift that is slower than they last: that is what waiting until they settle is for. It must not know what was
read.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

#: Correlations beyond half of the series rest on too few products.
_LONGEST_LAG_SHARE = 2


@dataclass(frozen=True)
class Averaged:
    """A mean with the standard deviation of that mean, both in the reading's unit.

    `n` is how many independent readings it is worth; one tells nothing of scatter, and has a deviation of
    zero. `label` names the scatter as a cause: means that share a label share their scatter.
    """

    mean: float
    std_of_mean: float
    n: int
    label: str


def average(values: Sequence[float], label: str) -> Averaged:
    """The mean of readings taken evenly in time. Raises ValueError for none, or one that is no number."""
    if not values:
        raise ValueError("there is no mean of no readings")
    count = len(values)
    mean = math.fsum(values) / count
    if not math.isfinite(mean):
        raise ValueError("a reading is no number")
    if count == 1:
        return Averaged(mean, 0.0, 1, label)
    deviations = [value - mean for value in values]
    squares = math.fsum(d * d for d in deviations)
    if squares == 0.0:
        return Averaged(mean, 0.0, count, label)
    worth = max(2.0, count / _correlation_time(deviations, squares))
    # The scatter about their own mean is too small where readings are alike: expectation (n - n/worth)/n of
    # it.
    variance = squares / (count - count / worth)
    return Averaged(mean, math.sqrt(variance / worth), int(worth), label)


def _correlation_time(deviations: Sequence[float], squares: float) -> float:
    """How many neighbouring readings are worth one independent reading; one at least."""
    count = len(deviations)
    total = 1.0
    for lag in range(1, count // _LONGEST_LAG_SHARE + 1):
        products = math.fsum(a * b for a, b in zip(deviations, deviations[lag:], strict=False))
        correlation = products / squares
        if correlation <= 0:
            break
        total += 2 * (1 - lag / count) * correlation
    return total
