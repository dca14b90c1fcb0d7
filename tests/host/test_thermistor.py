"""The thermistor's arithmetic against the datasheet's curve.

Outside source: tests/data/ntc_10k_3977.csv (NTCLE100E3, Vishay doc 29049), which says how it was made.
"""

from __future__ import annotations

import csv
import math
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sinkwright import thermistor

DATA = Path(__file__).parent.parent / "data" / "ntc_10k_3977.csv"
CURVE = "NTCLE100E3-3977"


def rows() -> list[tuple[float, float]]:
    lines = DATA.read_text(encoding="utf-8").splitlines()
    return [(float(row["t_degC"]), float(row["r_ohm"])) for row in csv.DictReader(lines[1:])]


@pytest.mark.parametrize(("degC", "ohm"), rows())
def test_the_curve_is_the_datasheets(degC: float, ohm: float) -> None:
    # the file has four figures
    assert thermistor.resistance_ohm(degC, r25_ohm=10_000, curve=CURVE) == pytest.approx(ohm, rel=2e-4)


def test_the_curve_has_the_stated_beta() -> None:
    """B25/85 = 3977 K is in the part's name; the curve itself gives 3976.96."""
    ratio = -math.log(thermistor.curve_ratio(CURVE, 85.0))
    assert ratio / (1 / 298.15 - 1 / 358.15) == pytest.approx(3976.96, abs=0.01)


@pytest.mark.parametrize(("degC", "error_K"), [(-20, 1.71), (0, 0.76), (50, -0.31), (100, 0.39), (125, 1.40)])
def test_the_beta_model_errs_as_computed_elsewhere(degC: float, error_K: float) -> None:
    """Errors computed independently (numpy) from the same curve."""
    ohm = thermistor.resistance_ohm(degC, r25_ohm=10_000, curve=CURVE)
    found = thermistor.temperature_degC(ohm, r25_ohm=10_000, beta_K=3977)
    assert found - degC == pytest.approx(error_K, abs=0.006)


@given(st.floats(-60, 200))
def test_temperature_and_resistance_are_inverse(degC: float) -> None:
    ohm = thermistor.resistance_ohm(degC, r25_ohm=10_000, curve=CURVE)
    assert thermistor.temperature_degC(ohm, r25_ohm=10_000, curve=CURVE) == pytest.approx(degC, abs=1e-5)


@given(st.floats(1.0, 1e6), st.floats(100, 1e6))
def test_a_divider_gives_its_resistance_back(ohm: float, pullup_ohm: float) -> None:
    share = thermistor.divider_share(ohm, pullup_ohm)
    assert thermistor.divider_resistance(share, pullup_ohm) == pytest.approx(ohm, rel=1e-6)


def test_a_thermistor_without_curve_and_beta_is_refused() -> None:
    with pytest.raises(ValueError, match="curve or a beta"):
        thermistor.resistance_ohm(25.0, r25_ohm=10_000)


def test_a_divider_that_is_too_flat_for_a_table_is_refused() -> None:
    with pytest.raises(ValueError, match="less than a count"):
        thermistor.divider_table(300.0, 1e6, r25_ohm=10_000, curve=CURVE, beta_K=None)
