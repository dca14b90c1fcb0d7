"""Whether 95 % means 95 %: 400 invented boards, whose true values are known, against the intervals stated.

Source: the number of intervals that contain the truth is binomial; its 99 % region is summed exactly.
"""

from __future__ import annotations

from math import comb

import pytest

from sinkwright.definitions.loading import load_board
from sinkwright.uncertainty.causes import Uncertain, expand
from sinkwright.uncertainty.parts import PartsModel, average

from .boards import InventedBoard

BOARDS = 400
OPEN_V, SOURCE_ohm, FULL_A = 12.1, 0.045, 2.0
FULL_V = OPEN_V - SOURCE_ohm * FULL_A

TRUE = {
    "voltage": OPEN_V,
    "current": FULL_A,
    "load_regulation_percent": (OPEN_V - FULL_V) / FULL_V * 100,
    "output_resistance": SOURCE_ohm,
    "power": FULL_V * FULL_A,
    "resistance": FULL_V / FULL_A,
}


def binomial_region(count: int, chance: float, outside: float) -> range:
    """Counts that are neither among the lowest nor the highest `outside`/2 of the distribution."""
    mass = [comb(count, k) * chance**k * (1 - chance) ** (count - k) for k in range(count + 1)]
    low = next(k for k in range(count + 1) if sum(mass[: k + 1]) > outside / 2)
    high = next(k for k in range(count, -1, -1) if sum(mass[k:]) > outside / 2)
    return range(low, high + 1)


def measured(seed: int) -> dict[str, Uncertain]:
    board = load_board(None)
    model, invented = PartsModel(board), InventedBoard(board, seed)
    no_load = model.voltage(average(invented.volts(OPEN_V), "open"))
    full_load = model.voltage(average(invented.volts(FULL_V), "loaded"))
    current = model.current(average(invented.amperes(FULL_A), "current"))
    return {
        "voltage": no_load,
        "current": current,
        "load_regulation_percent": (no_load - full_load) / full_load * 100,
        "output_resistance": (no_load - full_load) / current,
        "power": full_load * current,
        "resistance": full_load / current,
    }


@pytest.fixture(scope="module")
def covered() -> dict[str, int]:
    """How many boards' intervals contain the truth, by quantity."""
    counts = dict.fromkeys(TRUE, 0)
    for seed in range(BOARDS):
        for name, value in measured(seed).items():
            counts[name] += abs(value.value - TRUE[name]) <= expand(value).half_width
    return counts


@pytest.mark.parametrize("name", TRUE)
def test_ninety_five_of_a_hundred_intervals_contain_the_truth(name: str, covered: dict[str, int]) -> None:
    assert covered[name] in binomial_region(BOARDS, 0.95, 0.01)


def test_the_region_is_narrow_enough_to_notice_a_wrong_interval() -> None:
    """Intervals that cover 98 %, or 90 %, would fall out of it."""
    region = binomial_region(BOARDS, 0.95, 0.01)
    assert 0.98 * BOARDS not in region
    assert 0.90 * BOARDS not in region
    assert (region[0], region[-1]) == (368, 390)
