"""Values as people write them: two figures of the uncertainty, the value to the same decimal."""

from __future__ import annotations

import math

import pytest

from sinkwright.definitions.plan_tests import KINDS
from sinkwright.units import QUANTITIES, format_uncertainty, format_value, two_figures


@pytest.mark.parametrize(
    ("value", "uncertainty", "unit", "written"),
    [
        (12.0521, 0.0372, "V", "12.052 V ± 0.037 V"),
        (12.0521, 0.372, "V", "12.05 V ± 0.37 V"),
        (12.0521, 3.72, "V", "12.1 V ± 3.7 V"),
        (0.0451, 0.00312, "ohm", "45.1 mΩ ± 3.1 mΩ"),
        (0.0451, 0.00312, "Ω", "45.1 mΩ ± 3.1 mΩ"),
        (0.85, 0.011, "A", "0.850 A ± 0.011 A"),
        (0.0000451, 0.0000031, "A", "45.1 µA ± 3.1 µA"),
        (2.02, 0.0996, "percent", "2.02 % ± 0.10 %"),
        (0.012, 0.021, "%", "0.012 % ± 0.021 %"),
        (15321.0, 1234.0, "s", "15300 s ± 1200 s"),
        (1532.0, 12.34, "Ω", "1.532 kΩ ± 0.012 kΩ"),
        (-0.0004, 0.021, "A", "0 mA ± 21 mA"),
        (-3.0, 0.5, "A", "-3.00 A ± 0.50 A"),
        (60.0, 0.756, "degC", "60.00 °C ± 0.76 °C"),
    ],
)
def test_a_value_with_its_uncertainty(value: float, uncertainty: float, unit: str, written: str) -> None:
    """Source: JCGM 100, 7.2.6: at most two significant digits of the uncertainty."""
    assert format_value(value, uncertainty, unit) == written


@pytest.mark.parametrize("uncertainty", [None, 0.0])
def test_a_value_without_uncertainty_has_five_figures(uncertainty: float | None) -> None:
    assert format_value(12.0521234, uncertainty, "V") == "12.052 V"
    assert format_value(0.0, uncertainty, "A") == "0 A"


def test_what_is_no_number_is_called_so() -> None:
    assert format_value(math.nan, 0.1, "V") == "not a number"
    assert format_value(1.0, math.inf, "V") == "not a number"
    assert format_uncertainty(math.inf, "V") == "not a number"


def test_an_uncertainty_by_itself() -> None:
    assert format_uncertainty(0.0372, "V") == "37 mV"
    assert format_uncertainty(0.372, "ohm") == "0.37 Ω"


@pytest.mark.parametrize(
    ("number", "written"), [(0.0996, "0.10"), (0.0994, "0.099"), (152.0, "150"), (1.25, "1.2"), (0.0, "0")]
)
def test_two_figures_without_an_exponent(number: float, written: str) -> None:
    assert two_figures(number) == written


def test_every_quantity_that_a_plan_can_judge_is_known() -> None:
    names = {name for kind in KINDS.values() for name in kind.QUANTITIES}
    assert names <= set(QUANTITIES)


def test_the_unit_of_a_quantity_is_the_end_of_its_name() -> None:
    for name, kind in QUANTITIES.items():
        assert name.endswith(f"_{kind.key}")
        assert kind.symbol
        assert kind.label[0].isupper()
    assert QUANTITIES["output_resistance_ohm"].symbol == "Ω"
    assert QUANTITIES["load_regulation_percent"].symbol == "%"
