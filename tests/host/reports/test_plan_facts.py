from __future__ import annotations

import pytest

from sinkwright.reports.plan_facts import PlanFacts
from tests.host.records.made_up import PLAN


def test_source_set_points_and_ends_are_told_from_the_text() -> None:
    facts = PlanFacts.of(PLAN)
    assert facts.source_in_words == "bench supply no. 7; rated voltage 12.0 V; rated current 2.0 A"
    assert facts.setpoints_in_words == "test 2 (hold): current 2.0 A"
    assert facts.ends_in_words == "test 2 (hold): duration 60.0 s"
    assert facts.decision == "guarded"


@pytest.mark.parametrize(
    ("source", "words"),
    [
        ("", "remote sense"),
        ('sense = "two-wire"', "resistance is not known"),
        (
            'sense = "two-wire"\nlead_resistance_ohm = 0.04\nlead_resistance_uncertainty_ohm = 0.005',
            "0.04 Ω ± 0.005 Ω",
        ),
    ],
)
def test_how_the_voltage_was_sensed_is_told(source: str, words: str) -> None:
    assert words in PlanFacts.of(f"[source]\n{source}\n").leads_in_words


@pytest.mark.parametrize(
    "text", ["", "no = toml = at all", "source = 7\ntest = 7", "test = [1, 2]", "[[test]]\n"]
)
def test_a_text_that_is_no_plan_has_nothing_stated(text: str) -> None:
    facts = PlanFacts.of(text)
    assert facts.source_in_words == "not stated"
    assert "None" not in facts.setpoints_in_words
