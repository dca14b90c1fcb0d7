"""What a plan may not ask, said before anything is drawn."""

from __future__ import annotations

import pytest

from sinkwright.definitions.loading import load_board, parse_plan
from sinkwright.errors import AskedTooMuch, SinkwrightError
from sinkwright.procedures.preflight import preflight
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


def test_going_on_without_a_host_is_refused_by_this_version():
    text = 'when_host_silent = "continue"\n' + SOURCE + HOLD + "current_A = 1.0\nend_voltage_V = 10.0\n"
    with pytest.raises(SinkwrightError, match="no ends of its own"):
        checked(text)


def test_a_set_point_other_than_current_is_refused_by_this_version():
    with pytest.raises(SinkwrightError, match="constant current only"):
        checked(SOURCE + HOLD + "power_W = 10.0\n")


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
