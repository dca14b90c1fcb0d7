"""Current limits of every kind that a supply can have."""

from __future__ import annotations

import pytest

from tests.host.procedures.carrying_out import SOURCE, Run, within
from tests.support.fake_instrument import FakeSource, FLOOR_ohm

PLAN = SOURCE + '[[test]]\nkind = "current-limit"\nup_to_A = 3.0\n'


def result_for(**settings):
    (test,) = Run(PLAN, FakeSource(**settings)).carry_out().tests
    return test


def test_the_knee_of_a_constant_limit_is_found_between_two_steps_of_the_ramp():
    test = result_for(limit_A=2.37)
    limit = test.quantities["current_limit_A"]
    assert limit.value == pytest.approx(2.37, abs=0.005)
    assert within(limit, 2.37)
    assert test.quantities["short_circuit_current_A"].value == pytest.approx(2.37, abs=0.001)


def test_the_short_circuit_is_measured_at_the_floor_of_the_load_with_the_voltage_there():
    test = result_for(limit_A=2.0)
    assert any(f"{2.0 * FLOOR_ohm:.3f} V" in note for note in test.notes)
    assert any(point["voltage_V"] < 0.2 for point in test.points)


def test_a_source_that_folds_back_is_told_in_words():
    test = result_for(limit_A=2.4, limit_kind="foldback", foldback_A=0.8)
    assert test.quantities["current_limit_A"].value == pytest.approx(2.4, abs=0.005)
    assert test.quantities["short_circuit_current_A"].value == pytest.approx(0.8, abs=0.001)
    assert any("folds back" in note and "33 %" in note for note in test.notes)
    assert any("back in its band at 0.750 A" in note for note in test.notes)


def test_a_source_that_switches_off_and_returns_is_told_in_words():
    test = result_for(limit_A=2.4, limit_kind="latch")
    assert test.quantities["current_limit_A"].value == pytest.approx(2.4, abs=0.005)
    assert any("switches off at its limit" in note for note in test.notes)


def test_a_source_that_stays_latched_is_left_alone_after_the_first_knee():
    test = result_for(limit_A=2.4, limit_kind="latch", comes_back=False)
    limit = test.quantities["current_limit_A"]
    assert within(limit, 2.4)
    assert limit.expanded_uncertainty > 0.1
    assert test.quantities["short_circuit_current_A"].value is None
    assert any("latched" in note and "Switch it off and on" in note for note in test.notes)


def test_no_limit_up_to_the_largest_demand_is_said_so():
    test = result_for(limit_A=None)
    limit = test.quantities["current_limit_A"]
    assert limit.value is None
    assert limit.reason == "No limit was found up to 3.000 A."
    assert test.verdict == "none"


def test_without_up_to_the_ramp_goes_to_one_and_a_half_times_the_rating():
    run = Run(SOURCE + '[[test]]\nkind = "current-limit"\npoints = 3\n')
    run.carry_out()
    assert "set 3.000" in run.instrument.calls
