"""A plain set-point and its ends."""

from __future__ import annotations

import pytest

from sinkwright_wire.messages import Fault
from tests.host.procedures.carrying_out import SOURCE, Run, within
from tests.support.fake_instrument import FakeSource


def held(settings: str, source: FakeSource | None = None):
    (test,) = (
        Run(SOURCE + f'[[test]]\nkind = "hold"\ncurrent_A = 2.0\n{settings}\n', source).carry_out().tests
    )
    return test


def test_a_hold_reports_the_means_of_its_last_tenth():
    # Falls by 1 mV a frame: over 300 frames the mean of the last tenth is 285 mV below the start.
    source = FakeSource(resistance_ohm=0.0, wander=lambda number: -0.001 * number)
    test = held("duration_s = 30.0", source)
    start_V = 12.0 - 0.3
    assert test.stopped_by == "duration_s"
    assert test.quantities["voltage_V"].value == pytest.approx(start_V, abs=0.03)
    assert within(test.quantities["current_A"], 2.0)
    assert test.quantities["power_W"].value == pytest.approx(2.0 * start_V, rel=0.005)
    assert test.quantities["resistance_ohm"].value == pytest.approx(start_V / 2.0, rel=0.005)


def test_charge_and_energy_are_those_of_the_boards_meters():
    test = held("duration_s = 36.0")
    assert test.quantities["capacity_Ah"].value == pytest.approx(2.0 * 36 / 3600, rel=0.01)
    assert test.quantities["energy_Wh"].value == pytest.approx(2.0 * 11.9 * 36 / 3600, rel=0.01)
    assert within(test.quantities["duration_s"], 36.0)


@pytest.mark.parametrize(
    ("settings", "end"),
    [
        ("end_charge_Ah = 0.005\nduration_s = 100.0", "end_charge_Ah"),
        ("end_energy_Wh = 0.05\nduration_s = 100.0", "end_energy_Wh"),
        ("end_temperature_degC = 30.0\nduration_s = 100.0", "end_temperature_degC"),
        ("end_voltage_V = 11.95\nduration_s = 100.0", "end_voltage_V"),
        ("end_voltage_V = 5.0\nduration_s = 5.0", "duration_s"),
    ],
)
def test_the_first_end_that_is_reached_ends_the_hold(settings, end):
    assert held(settings).stopped_by == end


def test_the_end_voltage_is_that_of_the_source_when_the_leads_are_known():
    leads = (
        SOURCE + 'sense = "two-wire"\nlead_resistance_ohm = 0.1\nlead_resistance_uncertainty_ohm = 0.005\n'
    )
    text = leads + '[[test]]\nkind = "hold"\ncurrent_A = 2.0\nend_voltage_V = 11.8\nduration_s = 3.0\n'
    # The source gives 11.9 V, of which 11.7 V arrive: the end has not come.
    (test,) = Run(text, FakeSource(leads_ohm=0.1)).carry_out().tests
    assert test.stopped_by == "duration_s"
    assert within(test.quantities["voltage_V"], 11.9)


def test_a_source_that_limits_during_a_hold_is_told():
    test = held("duration_s = 5.0", FakeSource(limit_A=1.5))
    assert any("it gave 1.500 A of the 2.000 A" in note for note in test.notes)


def test_a_hold_that_was_stopped_gives_what_it_measured_but_no_verdict():
    text = (
        SOURCE
        + '[[test]]\nkind = "hold"\ncurrent_A = 2.0\nduration_s = 60.0\naccept.voltage_V = { min = 11.0 }\n'
    )
    (test,) = Run(text, at_frame={40: lambda load: load.trip(Fault.OVER_POWER)}).carry_out().tests
    assert within(test.quantities["voltage_V"], 11.9)
    assert test.quantities["voltage_V"].verdict == "inconclusive"
