"""Verdicts with a guard band as wide as the uncertainty (JCGM 106, ILAC-G8), by closed examples."""

from __future__ import annotations

import re

import pytest

from sinkwright.uncertainty import remedies
from sinkwright.uncertainty.causes import Cause, Uncertain
from sinkwright.uncertainty.verdict import could_pass, judge


def value_with_U(value: float, U: float) -> Uncertain:
    return Uncertain(value, {Cause("everything", "normal", U / 1.959963984540054): 1.0})


def verdict_of(value: float, U: float, **bounds: float) -> str:
    return judge("full_load_voltage_V", value_with_U(value, U), **bounds).verdict


@pytest.mark.parametrize(
    ("value", "expected"),
    [
        (11.0, "fail"),
        (11.3, "fail"),
        (11.45, "inconclusive"),
        (11.55, "inconclusive"),
        (11.7, "pass"),
        (12.0, "pass"),
        (12.3, "pass"),
        (12.45, "inconclusive"),
        (12.55, "inconclusive"),
        (12.7, "fail"),
    ],
)
def test_the_guard_band_stands_on_both_sides_of_both_bounds(value: float, expected: str) -> None:
    assert verdict_of(value, 0.1, minimum=11.5, maximum=12.5) == expected


def test_an_interval_that_touches_a_bound_from_within_passes() -> None:
    assert verdict_of(11.6, 0.1, minimum=11.5) == "pass"
    assert verdict_of(12.4, 0.1, maximum=12.5) == "pass"


def test_an_interval_that_touches_a_bound_from_outside_does_not_fail() -> None:
    """The bound itself is allowed, and the interval contains it."""
    assert verdict_of(11.4, 0.1, minimum=11.5) == "inconclusive"
    assert verdict_of(12.6, 0.1, maximum=12.5) == "inconclusive"


def test_one_bound_leaves_the_other_side_open() -> None:
    assert verdict_of(-1e6, 0.1, maximum=12.5) == "pass"
    assert verdict_of(1e6, 0.1, minimum=11.5) == "pass"


def test_an_exact_value_at_the_bound_passes() -> None:
    quantity = judge("duration_s", Uncertain.exact(3.0), minimum=3.0, maximum=3.0)
    assert quantity.verdict == "pass"
    assert quantity.coverage_factor is None


def test_bounds_closer_than_the_interval_can_only_be_inconclusive_or_fail() -> None:
    assert verdict_of(12.0, 0.1, minimum=11.95, maximum=12.05) == "inconclusive"
    assert verdict_of(12.3, 0.1, minimum=11.95, maximum=12.05) == "fail"


def test_without_bounds_there_is_an_interval_and_no_verdict() -> None:
    quantity = judge("full_load_voltage_V", value_with_U(12.0, 0.1))
    assert quantity.verdict == "none"
    assert quantity.expanded_uncertainty == pytest.approx(0.1)
    assert quantity.coverage_factor == pytest.approx(1.96, abs=0.001)
    assert (quantity.unit, quantity.reason) == ("V", "")


@pytest.mark.parametrize(
    ("value", "says"),
    [
        (12.0, "12.00 V ± 0.10 V lies with its whole interval within 11.5 to 12.5 V."),
        (11.0, "11.00 V ± 0.10 V lies wholly below the lower bound of 11.5 V."),
        (13.0, "13.00 V ± 0.10 V lies wholly above the upper bound of 12.5 V."),
        (12.45, "12.45 V ± 0.10 V reaches across the upper bound of 12.5 V."),
        (11.55, "11.55 V ± 0.10 V reaches across the lower bound of 11.5 V."),
    ],
)
def test_the_reason_is_a_sentence_with_value_interval_and_bound(value: float, says: str) -> None:
    assert judge("full_load_voltage_V", value_with_U(value, 0.1), minimum=11.5, maximum=12.5).reason == says


def test_a_one_sided_pass_names_its_bound() -> None:
    assert judge("load_regulation_percent", value_with_U(1.0, 0.1), maximum=2).reason == (
        "1.00 % ± 0.10 % lies with its whole interval at or below 2 %."
    )


def test_a_simple_decision_looks_at_the_value_alone_and_says_so() -> None:
    for value, expected in ((12.45, "pass"), (12.5, "pass"), (12.55, "fail")):
        quantity = judge("full_load_voltage_V", value_with_U(value, 0.1), maximum=12.5, decision="simple")
        assert quantity.verdict == expected
        assert 'decision = "simple"' in quantity.reason
        assert "± 0.10 V" in quantity.reason


def test_a_value_that_was_not_found_is_inconclusive_and_says_why() -> None:
    quantity = judge("current_limit_A", None, maximum=3.0, reason_if_none="No limit was found up to 3 A.")
    assert (quantity.verdict, quantity.value) == ("inconclusive", None)
    assert quantity.reason == "No limit was found up to 3 A."
    assert judge("current_limit_A", None).verdict == "none"
    assert judge("current_limit_A", None).reason == "It was not measured."


def test_a_value_that_is_no_number_counts_as_not_found() -> None:
    assert judge("current_limit_A", Uncertain.exact(float("nan")), maximum=3.0).value is None


def test_what_is_unresolved_is_inconclusive_however_far_from_the_bounds() -> None:
    quantity = judge(
        "load_regulation_percent", value_with_U(0.1, 0.01), maximum=50, unresolved="The leads are unknown."
    )
    assert (quantity.verdict, quantity.reason) == ("inconclusive", "The leads are unknown.")
    assert quantity.value == 0.1


def test_an_unresolved_value_passes_no_simple_decision_either() -> None:
    quantity = judge(
        "load_regulation_percent",
        value_with_U(0.1, 0.01),
        maximum=50,
        decision="simple",
        unresolved="The leads are unknown.",
    )
    assert quantity.verdict == "inconclusive"


SCATTER = Cause("scatter", "normal", 0.03, remedy=remedies.MEASURE_LONGER)
GAIN = Cause("gain", "rectangular", 0.06, remedy=remedies.CALIBRATE)
LEADS = Cause("lead resistance", "rectangular", 0.01, remedy="Use the sense pair.")


def test_the_remedy_names_the_largest_contribution_and_the_cheapest_cure_that_decides() -> None:
    """59 mV are left without scatter, 61 mV without the gain's error: both clear a bound 65 mV away."""
    value = Uncertain(12.0, {SCATTER: 1.0, GAIN: 1.0, LEADS: 1.0})
    remedy = judge("voltage_V", value, maximum=12.065).remedy
    assert remedy.startswith("The largest contribution is gain (56 % of the variance). Measure for longer")
    assert remedy.endswith("At best ± 59 mV would be left, which would decide.")


def test_a_dearer_remedy_is_named_where_the_cheaper_would_not_decide() -> None:
    gain = Cause("gain", "rectangular", 0.1, remedy=remedies.CALIBRATE)
    value = Uncertain(12.0, {SCATTER: 1.0, gain: 1.0})
    assert remedies.CALIBRATE in judge("voltage_V", value, maximum=12.07).remedy


def test_a_remedy_that_cannot_decide_alone_says_so() -> None:
    value = Uncertain(12.0, {SCATTER: 1.0, GAIN: 1.0})
    assert judge("voltage_V", value, maximum=12.001).remedy.endswith(
        "That alone may not decide: the value lies close to the bound."
    )


def test_a_cause_without_remedy_is_still_named() -> None:
    remedy = judge("voltage_V", value_with_U(12.0, 0.1), maximum=12.05).remedy
    assert remedy == "The largest contribution is everything (100 % of the variance)."


def test_no_remedy_is_offered_where_a_verdict_was_reached() -> None:
    assert judge("voltage_V", Uncertain(12.0, {GAIN: 1.0}), maximum=20).remedy == ""
    assert judge("voltage_V", Uncertain(12.0, {GAIN: 1.0})).remedy == ""


@pytest.mark.parametrize("U", [0.0123456, 0.0996, 9.96e-5, 0.35281])
def test_no_sentence_shows_more_than_two_figures_of_the_uncertainty(U: float) -> None:
    reason = judge("voltage_V", value_with_U(12.0, U), maximum=12.0).reason
    shown = re.search(r"± ([\d.]+)", reason)
    assert shown
    assert len(shown[1].replace(".", "").lstrip("0")) <= 2


def test_an_unknown_way_to_decide_is_refused() -> None:
    with pytest.raises(ValueError, match="guarded and simple"):
        judge("voltage_V", None, decision="lenient")


def test_bounds_narrower_than_the_interval_are_told_before_measuring() -> None:
    sentence = could_pass(0.0761, 12.0, 12.1)
    assert sentence is not None
    assert "no reading could pass" in sentence
    assert "only 0.1 apart" in sentence
    assert "± 0.076" in sentence


def test_bounds_that_just_fit_the_interval_could_be_passed() -> None:
    assert could_pass(0.05, 12.0, 12.1) is None
    assert verdict_of(12.05, 0.05, minimum=12.0, maximum=12.1) == "pass"


def test_a_single_bound_can_always_be_passed() -> None:
    assert could_pass(100.0, None, 1.0) is None
    assert could_pass(100.0, 1.0, None) is None
