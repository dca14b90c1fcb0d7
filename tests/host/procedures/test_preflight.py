"""What a plan may not ask, said before anything is drawn."""

from __future__ import annotations

import pytest

from sinkwright.definitions.loading import load_board, parse_plan
from sinkwright.errors import AskedTooMuch, SinkwrightError
from sinkwright.procedures.preflight import check_source, preflight
from tests.host.procedures.carrying_out import SOURCE

HOLD = '[[test]]\nkind = "hold"\nduration_s = 10.0\n'


def checked(text: str):
    return preflight(parse_plan(text, "plan"), load_board())


@pytest.mark.parametrize(
    ("text", "largest"),
    [
        (SOURCE + "[limits]\ncurrent_A = 5.0\n" + HOLD + "current_A = 1.0\n", "largest that fits is 4 A"),
        (SOURCE + "[limits]\npower_W = 100.0\n" + HOLD + "current_A = 1.0\n", "largest that fits is 40 W"),
        (SOURCE.replace("2.0", "9.0") + HOLD + "current_A = 4.5\n", "largest that fits is 4 A"),
        (SOURCE.replace("12.0", "48.0") + HOLD + "current_A = 0.5\n", "largest that fits is 30 V"),
        (SOURCE.replace("12.0", "24.0") + HOLD + "current_A = 2.0\n", "at most 1.666 A"),
        (SOURCE + '[[test]]\nkind = "current-limit"\nup_to_A = 3.5\n', "at most 3.333 A"),
    ],
)
def test_what_is_beyond_the_board_is_refused_with_the_largest_that_fits(text, largest):
    with pytest.raises(AskedTooMuch) as refusal:
        checked(text)
    assert largest in str(refusal.value)
    assert "No load was touched." in str(refusal.value)


def test_more_than_the_sources_rating_is_refused():
    with pytest.raises(AskedTooMuch, match="rated 2 A"):
        checked(SOURCE + HOLD + "current_A = 2.5\n")


def test_more_than_the_sources_rated_power_is_refused():
    with pytest.raises(AskedTooMuch, match="rated power of 20 W"):
        checked(SOURCE + "rated_power_W = 20.0\n" + HOLD + "current_A = 2.0\n")


ALONE = 'when_host_silent = "continue"\n'


def test_a_hold_with_its_ends_may_go_on_without_a_host():
    assert checked(ALONE + SOURCE + HOLD + "current_A = 1.0\nend_voltage_V = 10.0\n").warnings == ()


def test_an_end_that_a_board_cannot_be_told_is_refused_for_a_run_that_is_to_go_on_alone():
    text = SOURCE + HOLD.replace("10.0", "2e7") + "current_A = 0.5\nend_voltage_V = 10.0\n"
    with pytest.raises(AskedTooMuch, match=r"test\[1\] \(hold\): A duration of 2e\+07 s is beyond"):
        checked(ALONE + text)
    assert checked(text)


def test_tests_that_need_their_host_are_named_when_the_plan_is_to_go_on_alone():
    text = '[[test]]\nkind = "load-regulation"\n' + HOLD + "current_A = 1.0\nend_voltage_V = 10.0\n"
    first, second = checked(ALONE + SOURCE + text).warnings
    assert first.startswith("Test 1 (load-regulation) needs this program for each step")
    assert "begins none after it" in second


def test_a_source_that_is_empty_already_is_not_discharged():
    plan = parse_plan(SOURCE + HOLD + "current_A = 1.0\nend_voltage_V = 10.0\n", "plan")
    assert check_source(plan, load_board(), 12.0, 12.0) == []
    with pytest.raises(SinkwrightError, match="must be charged first"):
        check_source(plan, load_board(), 9.9, 9.9)


@pytest.mark.parametrize(
    ("setpoint", "current_A", "power_W", "words"),
    [
        ("power_W = 18.0\n", 1.5, 18.0, "draws a constant 18.000 W"),
        # The current is largest at the end: 18 W at 9 V.
        ("power_W = 18.0\nend_voltage_V = 9.0\n", 2.0, 18.0, "draws a constant 18.000 W"),
        ("resistance_ohm = 8.0\n", 1.5, 18.0, "is a resistance of 8.000 ohm"),
        ("voltage_V = 11.0\n", 2.0, 22.0, "holds the source at 11.000 V"),
    ],
)
def test_what_another_set_point_draws_follows_from_the_rated_voltage(setpoint, current_A, power_W, words):
    (test,) = checked(SOURCE + "[limits]\ncurrent_A = 2.0\n" + HOLD + setpoint).tests
    assert (test.current_A, test.power_W) == (pytest.approx(current_A), pytest.approx(power_W))
    assert words in test.sentence()


@pytest.mark.parametrize(
    ("text", "remedy"),
    [
        (SOURCE.replace("12.0", "28.0") + HOLD + "power_W = 50.0\n", "at most 40 W"),
        (
            SOURCE.replace("12.0", "28.0") + HOLD + "resistance_ohm = 19.0\n",
            "at least 19.600 ohm at this volt",
        ),
        (SOURCE + HOLD + "resistance_ohm = 5.0\n", "at least 6.000 ohm at 12 V"),
        (SOURCE + HOLD + "power_W = 20.0\nend_voltage_V = 8.0\n", "2 A is the most"),
        (SOURCE + HOLD + "voltage_V = 11.0\n", r"current_A = 2 in \[limits\]"),
    ],
)
def test_another_set_point_beyond_what_fits_is_refused_in_its_own_unit(text, remedy):
    with pytest.raises(AskedTooMuch, match=remedy):
        checked(text)


def test_a_constant_power_without_a_stated_voltage_is_no_load_that_stays_off():
    (test,) = checked(HOLD + "power_W = 10.0\n").tests
    assert test.sentence() == "hold: draws a constant 10.000 W, with a current that depends on the source"


def test_bounds_that_no_reading_could_meet_are_warned_about():
    text = (
        SOURCE
        + '[[test]]\nkind = "load-regulation"\naccept.no_load_voltage_V = { min = 11.999, max = 12.001 }\n'
    )
    (warning,) = checked(text).warnings
    assert warning.startswith("Test 1 (load-regulation), no_load_voltage_V: ")


def test_the_expectation_tells_what_is_drawn_heated_and_taken():
    (test,) = checked(SOURCE + HOLD.replace("10.0", "3600.0") + "current_A = 2.0\n").tests
    assert test.power_W == 24.0
    assert test.charge_Ah == pytest.approx(2.0)
    # An hour is twenty time constants of the shipped heatsink: the rise is power times thermal resistance.
    assert test.heatsink_degC == pytest.approx(25 + 24 * load_board().heatsink.K_per_W, abs=0.1)
    assert "draws up to 2.000 A (24.0 W), 2.000 Ah in about 60 min" in test.sentence()


def test_an_unstated_voltage_is_warned_about():
    expected = checked(HOLD + "current_A = 1.0\n")
    assert expected.tests[0].power_W is None
    assert "rated_voltage_V is not stated" in expected.warnings[0]
