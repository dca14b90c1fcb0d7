from __future__ import annotations

from datetime import UTC, datetime, timedelta, timezone

import pytest

from sinkwright.reports.wording import (
    bounds_in_words,
    kind_in_words,
    label_of,
    length_in_words,
    moment_in_words,
    stopped_in_words,
    value_in_words,
    verdict_sentence,
)
from sinkwright.results import Quantity, TestResult, Verdict


def with_verdicts(*verdicts: Verdict) -> list[TestResult]:
    quantities = {str(n): Quantity("voltage_V", 1.0, "V", 0.1, verdict=v) for n, v in enumerate(verdicts)}
    return [TestResult("hold", "none", quantities)]


@pytest.mark.parametrize(
    ("verdict", "quantities", "sentence"),
    [
        ("pass", ("pass",), "The one quantity that has bounds meets them"),
        ("pass", ("pass", "pass", "none"), "All 2 quantities that have bounds meet them"),
        ("fail", ("fail", "pass"), "1 of 2 quantities that have bounds lies outside"),
        ("fail", ("fail", "fail", "pass"), "2 of 3 quantities that have bounds lie outside"),
        (
            "inconclusive",
            ("inconclusive",),
            "1 of 1 quantity that has bounds could not be decided",
        ),
        ("inconclusive", (), "not everything was measured"),
        ("none", ("none",), "The plan sets no bounds"),
    ],
)
def test_the_verdict_says_how_many_quantities_it_rests_on(
    verdict: Verdict, quantities: tuple[Verdict, ...], sentence: str
) -> None:
    assert sentence in verdict_sentence(verdict, with_verdicts(*quantities), "complete", "guarded")


def test_a_run_that_was_cut_short_says_so_in_its_verdict() -> None:
    assert "did not come to its end" in verdict_sentence("inconclusive", with_verdicts(), "fault", "guarded")


def test_a_verdict_by_the_value_alone_says_so() -> None:
    assert 'decision = "simple"' in verdict_sentence("pass", with_verdicts("pass"), "complete", "simple")


def test_an_end_of_the_plan_and_a_protection_read_differently() -> None:
    assert stopped_in_words("end_voltage_V").startswith("Ended as planned")
    assert "protection of the board: heatsink-hot" in stopped_in_words("heatsink-hot")
    assert stopped_in_words(None) == ""


def test_quantities_of_a_later_version_are_shown_as_written() -> None:
    assert (label_of("no_load_voltage_V"), label_of("odour_nV")) == ("No-load voltage", "odour_nV")


def test_a_quantity_without_value_is_not_found() -> None:
    assert value_in_words(Quantity("voltage_V", None, "V", None)) == "not found"
    assert "±" in value_in_words(Quantity("voltage_V", 12.0, "V", 0.1))


@pytest.mark.parametrize(
    ("low", "high", "words"),
    [(None, 2.0, "at most 2 V"), (1.5, None, "at least 1.5 V"), (1.0, 2.0, "1 to 2 V"), (None, None, "")],
)
def test_bounds_read_as_sentences(low: float | None, high: float | None, words: str) -> None:
    assert bounds_in_words(Quantity("voltage_V", 1.0, "V", 0.1, min=low, max=high)) == words


def test_a_moment_is_told_in_utc_with_the_month_in_letters() -> None:
    summer = timezone(timedelta(hours=2))
    assert moment_in_words(datetime(2026, 7, 4, 1, 5, 9, tzinfo=summer)) == "3 July 2026, 23:05:09 UTC"
    assert moment_in_words(datetime(2026, 1, 2, tzinfo=UTC)).startswith("2 January 2026")


@pytest.mark.parametrize(
    ("length_s", "words"),
    [(0.0, "0.0 s"), (59.94, "59.9 s"), (61.0, "1 min 01 s"), (86400.4, "24 h 00 min 00 s")],
)
def test_lengths_read_as_people_say_them(length_s: float, words: str) -> None:
    assert length_in_words(length_s) == words


def test_kinds_read_as_titles() -> None:
    assert kind_in_words("load-regulation") == "Load regulation"
