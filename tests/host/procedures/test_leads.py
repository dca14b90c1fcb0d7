"""Two-wire leads never turn into a confident false verdict."""

from __future__ import annotations

from tests.host.procedures.carrying_out import SOURCE, Run, within
from tests.support.fake_instrument import FakeSource

LEADS_ohm = 0.1
TEST = (
    '[[test]]\nkind = "load-regulation"\n'
    "accept.load_regulation_percent = { max = 1.5 }\naccept.no_load_voltage_V = { min = 11.0 }\n"
)
TWO_WIRE = SOURCE + 'sense = "two-wire"\n'


def test_without_the_leads_resistance_only_verdicts_that_depend_on_it_are_withheld():
    (test,) = Run(TWO_WIRE + TEST, FakeSource(leads_ohm=LEADS_ohm)).carry_out().tests
    regulation = test.quantities["load_regulation_percent"]
    assert regulation.verdict == "inconclusive"
    assert "lead_resistance_ohm" in regulation.reason
    assert test.quantities["no_load_voltage_V"].verdict == "pass"


def test_a_stated_resistance_is_added_back_with_its_uncertainty_as_a_cause():
    known = TWO_WIRE + "lead_resistance_ohm = 0.1\nlead_resistance_uncertainty_ohm = 0.004\n"
    (test,) = Run(known + TEST, FakeSource(leads_ohm=LEADS_ohm)).carry_out().tests
    resistance = test.quantities["output_resistance_ohm"]
    assert within(resistance, 0.05)
    assert resistance.contributions[0].cause == "lead resistance"
    assert within(test.quantities["full_load_voltage_V"], 11.9)
