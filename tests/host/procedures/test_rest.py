"""A rest draws nothing."""

from __future__ import annotations

from tests.host.procedures.carrying_out import Run, within
from tests.support.fake_instrument import FakeSource


def test_a_rest_reports_the_open_voltage_and_never_turns_the_load_on():
    run = Run('[[test]]\nkind = "rest"\nduration_s = 4.0\n', FakeSource(open_V=7.3))
    (test,) = run.carry_out().tests
    assert "on" not in run.instrument.calls
    assert within(test.quantities["open_circuit_voltage_V"], 7.3)
    assert within(test.quantities["duration_s"], 4.0)
    assert test.stopped_by == "duration_s"


def test_a_plan_that_only_rests_needs_no_source():
    (test,) = Run('[[test]]\nkind = "rest"\nduration_s = 1.0\n', FakeSource(open_V=0.0)).carry_out().tests
    assert test.verdict == "none"
