"""Resistance of an NTC thermistor against temperature, and back.

Pure arithmetic: used to compile the board's table, by the simulated thermistor, and by the error budget. The
datasheet curve is that of NTCLE100E3 (Vishay doc 29049): R = R25 * exp(A + B/T + C/T^2 + D/T^3).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import lru_cache

ZERO_DEGC_K = 273.15
_T25_K = 298.15

#: A, B (K), C (K^2), D (K^3) by name of the curve; the number in the name is B25/85.
CURVES = {"NTCLE100E3-3977": (-14.6337, 4791.842, -115334.0, -3.730535e6)}

#: Where `temperature_degC` looks; outside it, a thermistor is open or shorted.
COLDEST_DEGC, HOTTEST_DEGC = -80.0, 300.0


def curve_ratio(curve: str, temperature_degC: float) -> float:
    """R/R25 by the datasheet's curve."""
    a, b, c, d = CURVES[curve]
    t = temperature_degC + ZERO_DEGC_K
    return math.exp(a + b / t + c / t**2 + d / t**3)


def beta_ratio(beta_K: float, temperature_degC: float) -> float:
    """R/R25 by the beta model, which errs by about 0.3 K between 25 and 85 degC."""
    return math.exp(beta_K * (1 / (temperature_degC + ZERO_DEGC_K) - 1 / _T25_K))


def resistance_ohm(
    temperature_degC: float, *, r25_ohm: float, curve: str | None = None, beta_K: float | None = None
) -> float:
    """Resistance at a temperature, by the curve if one is named, else by the beta model.

    Raises ValueError when neither is given.
    """
    if curve is not None:
        return r25_ohm * curve_ratio(curve, temperature_degC)
    if beta_K is not None:
        return r25_ohm * beta_ratio(beta_K, temperature_degC)
    raise ValueError("a thermistor needs a curve or a beta")


def temperature_degC(
    resistance: float, *, r25_ohm: float, curve: str | None = None, beta_K: float | None = None
) -> float:
    """Temperature at a resistance in ohm, held within COLDEST_DEGC to HOTTEST_DEGC; good to a microkelvin."""
    return _falling_inverse(
        lambda t: resistance_ohm(t, r25_ohm=r25_ohm, curve=curve, beta_K=beta_K), resistance
    )


def divider_share(resistance: float, pullup_ohm: float) -> float:
    """Voltage at the node of a pull-up and an NTC to ground, as a share of the supply."""
    return resistance / (resistance + pullup_ohm)


def divider_resistance(share: float, pullup_ohm: float) -> float:
    """The NTC's resistance in ohm from that share (0 < share < 1)."""
    return pullup_ohm * share / (1 - share)


def _falling_inverse(function: Callable[[float], float], value: float) -> float:
    low, high = COLDEST_DEGC, HOTTEST_DEGC
    while high - low > 1e-7:
        middle = (low + high) / 2
        if function(middle) > value:
            low = middle
        else:
            high = middle
    return (low + high) / 2


#: Ends of the board's table; a colder reading means an open thermistor, a hotter one a shorted.
TABLE_COLDEST_DEGC, TABLE_HOTTEST_DEGC = -40.0, 150.0
TABLE_POINTS = 64
_GRID_K = 0.1
_TIGHT_DEGC = (-20.0, 125.0)
_TIGHT_ERROR_K, _LOOSE_ERROR_K = 0.035, 0.35
# The firmware multiplies the two spans of a segment; see its scaling.py.
_SEGMENT_COUNTS, _SEGMENT_MC = 1 << 12, 1 << 17


@lru_cache(maxsize=8)
def divider_table(
    counts_at_supply: float, pullup_ohm: float, *, r25_ohm: float, curve: str | None, beta_K: float | None
) -> tuple[tuple[int, int], ...]:
    """The node's counts (rising) against millidegree, to be interpolated linearly with an error below 0.05 K.

    `counts_at_supply` is what the converter would read at the pull-up's supply. The points stand at whole
    counts, so that rounding adds nothing. Raises ValueError when the divider is too flat, or needs too many.
    """

    def counts_at(temperature: float) -> float:
        resistance = resistance_ohm(temperature, r25_ohm=r25_ohm, curve=curve, beta_K=beta_K)
        return counts_at_supply * divider_share(resistance, pullup_ohm)

    steps = round((TABLE_HOTTEST_DEGC - TABLE_COLDEST_DEGC) / _GRID_K)
    grid = [TABLE_HOTTEST_DEGC - _GRID_K * i for i in range(steps + 1)]
    counts = [counts_at(t) for t in grid]
    table: list[tuple[int, int]] = []
    for node in _nodes(grid, counts):
        whole = round(counts[node])
        exact = divider_resistance(whole / counts_at_supply, pullup_ohm)
        degree = temperature_degC(exact, r25_ohm=r25_ohm, curve=curve, beta_K=beta_K)
        if table and whole <= table[-1][0]:
            raise ValueError("the divider changes by less than a count from one point to the next")
        table.append((whole, round(degree * 1000)))
    if len(table) > TABLE_POINTS:
        raise ValueError(f"{len(table)} points are needed, {TABLE_POINTS} fit")
    return tuple(table)


def _nodes(grid: list[float], counts: list[float]) -> list[int]:
    """Indices of the points kept: each segment as long as the allowed error lets it be."""
    kept = [0]
    end = 2
    while end < len(grid):
        if not _straight_enough(grid, counts, kept[-1], end):
            kept.append(end - 1)
        end += 1
    return [*kept, len(grid) - 1]


def _straight_enough(grid: list[float], counts: list[float], first: int, last: int) -> bool:
    span, rise = counts[last] - counts[first], grid[last] - grid[first]
    if span >= _SEGMENT_COUNTS - 1 or -rise * 1000 >= _SEGMENT_MC:
        return False
    slope = rise / span
    for i in range(first + 1, last):
        tight = _TIGHT_DEGC[0] <= grid[i] <= _TIGHT_DEGC[1]
        error = grid[first] + slope * (counts[i] - counts[first]) - grid[i]
        if abs(error) > (_TIGHT_ERROR_K if tight else _LOOSE_ERROR_K):
            return False
    return True
