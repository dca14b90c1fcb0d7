"""Load regulation on a source whose figures are known."""

from __future__ import annotations

import pytest

from tests.host.procedures.carrying_out import SOURCE, Run, within
from tests.support.fake_instrument import FakeSource

PLAN = SOURCE + '[[test]]\nkind = "load-regulation"\n'


def test_load_regulation_and_output_resistance_are_those_of_a_thevenin_source():
    # Reference sheet, section 5: 5.050 V falls to 4.950 V at 2 A: 2.02 % of the full-load voltage, 50 mohm.
    source = FakeSource(open_V=5.05, resistance_ohm=0.05)
    text = PLAN.replace("12.0", "5.0")
    (test,) = Run(text, source).carry_out().tests
    assert test.quantities["load_regulation_percent"].value == pytest.approx(2.0202, abs=0.001)
    assert test.quantities["output_resistance_ohm"].value == pytest.approx(0.05, rel=0.001)
    assert within(test.quantities["no_load_voltage_V"], 5.05)
    assert within(test.quantities["full_load_voltage_V"], 4.95)
    assert any("of the full-load voltage" in note for note in test.notes)


def test_no_load_is_measured_with_the_gate_clamped_and_full_load_at_the_rating():
    run = Run(PLAN)
    run.carry_out()
    settings = [call for call in run.instrument.calls if call.startswith("set")]
    assert settings == ["set 0.500", "set 1.000", "set 1.500", "set 2.000"]
    assert run.instrument.calls[0] == "off"
    assert run.instrument.calls[-1] == "off"


def test_a_source_that_limits_before_full_load_has_no_regulation_and_says_why():
    text = PLAN + "accept.load_regulation_percent = { max = 2.0 }\n"
    (test,) = Run(text, FakeSource(limit_A=1.2)).carry_out().tests
    quantity = test.quantities["load_regulation_percent"]
    assert quantity.value is None
    assert quantity.verdict == "inconclusive"
    assert "limited at 1.200 A" in quantity.reason
    assert test.verdict == "inconclusive"


def test_a_limit_a_hair_below_full_load_is_seen_by_the_collapsed_voltage():
    (test,) = Run(PLAN, FakeSource(limit_A=1.99)).carry_out().tests
    assert test.quantities["full_load_voltage_V"].value is None


def test_a_point_that_never_settles_is_left_out_and_named():
    source = FakeSource(wander=lambda number: 0.2 * (number % 2))
    (test,) = Run(PLAN, source).carry_out().tests
    assert test.quantities["no_load_voltage_V"].value is None
    assert "did not settle" in test.quantities["no_load_voltage_V"].reason
    assert test.points == ()


def test_the_points_for_the_curve_are_kept():
    (test,) = Run(PLAN).carry_out().tests
    assert [round(point["current_A"], 2) for point in test.points] == [0.0, 0.5, 1.0, 1.5, 2.0]
    assert all({"voltage_V", "heatsink_degC"} <= set(point) for point in test.points)
