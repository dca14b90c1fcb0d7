"""Results in words: verdicts, ends, values with their uncertainty, moments and lengths of time.

The one place where a report's sentences about a result are made; it knows neither HTML nor records.
"""

from __future__ import annotations

from datetime import UTC, datetime

from sinkwright.results import END_KEYS, Quantity, TestResult, Verdict
from sinkwright.units import QUANTITIES, format_value

VERDICT_WORDS: dict[Verdict, str] = {
    "pass": "PASS",
    "fail": "FAIL",
    "inconclusive": "INCONCLUSIVE",
    "none": "NO VERDICT",
}
_MONTHS = [
    "January",
    "February",
    "March",
    "April",
    "May",
    "June",
    "July",
    "August",
    "September",
    "October",
    "November",
    "December",
]


def verdict_sentence(verdict: Verdict, tests: list[TestResult], state: str, decision: str) -> str:
    """Why the whole has the verdict that it has, in one or two sentences."""
    judged: list[Verdict] = [
        q.verdict for test in tests for q in test.quantities.values() if q.verdict != "none"
    ]
    sentence = {"pass": _passing, "fail": _failing, "inconclusive": _in_doubt, "none": _unbounded}[verdict]
    cut_short = "" if state == "complete" else " The run did not come to its end."
    return sentence(judged, decision) + cut_short


def _passing(judged: list[Verdict], decision: str) -> str:
    how = _BY_VALUE if decision == "simple" else " with the whole of the uncertainty"
    if len(judged) == 1:
        return f"The one quantity that has bounds meets them{how}."
    return f"All {len(judged)} quantities that have bounds meet them{how}."


def _failing(judged: list[Verdict], decision: str) -> str:
    how = _BY_VALUE if decision == "simple" else " by more than the uncertainty"
    failed = judged.count("fail")
    return f"{failed} of {_bounded(judged)} {'lies' if failed == 1 else 'lie'} outside the bounds{how}."


def _in_doubt(judged: list[Verdict], decision: str) -> str:  # noqa: ARG001  one signature for all
    doubtful = judged.count("inconclusive")
    if not doubtful:
        return "Nothing that was measured failed, but not everything was measured."
    return (
        f"Nothing failed, but {doubtful} of {_bounded(judged)} could not be decided: the reasons stand below."
    )


def _unbounded(judged: list[Verdict], decision: str) -> str:  # noqa: ARG001  one signature for all
    return "The plan sets no bounds: the values stand for themselves."


_BY_VALUE = ' by the value alone (the plan asks for decision = "simple")'


def _bounded(judged: list[Verdict]) -> str:
    return f"{len(judged)} {'quantity that has' if len(judged) == 1 else 'quantities that have'} bounds"


def kind_in_words(kind: str) -> str:
    """`load-regulation` as "Load regulation"."""
    return kind.replace("-", " ").capitalize()


def stopped_in_words(stopped_by: str | None) -> str:
    """What ended a test, if anything but its being through."""
    planned = {
        "end_voltage_V": "Ended as planned: the end voltage was reached.",
        "end_charge_Ah": "Ended as planned: the charge was drawn.",
        "end_energy_Wh": "Ended as planned: the energy was drawn.",
        "end_temperature_degC": "Ended as planned: the temperature was reached.",
        "duration_s": "Ended as planned: the time was up.",
    }
    others = {
        None: "",
        "interrupted": "Stopped by the person.",
        "derated": "Stopped, because the load had to draw less than asked to stay cool.",
        "turned-off": "Stopped, because somebody else turned the load off.",
        "link-lost": "Stopped, because the link to the board was lost.",
        "failed": "Stopped by an error.",
    }
    assert set(planned) == set(END_KEYS)
    otherwise = f"Stopped by a protection of the board: {stopped_by}."
    return {**planned, **others}.get(stopped_by, otherwise)


def label_of(name: str) -> str:
    """A quantity's name for people; one that a later version brought is shown as it is written."""
    return QUANTITIES[name].label if name in QUANTITIES else name


def value_in_words(quantity: Quantity) -> str:
    """Value ± expanded uncertainty with the unit, or that there is none."""
    if quantity.value is None:
        return "not found"
    return format_value(quantity.value, quantity.expanded_uncertainty, quantity.unit)


def bounds_in_words(quantity: Quantity) -> str:
    """The bounds of the plan, e.g. "at most 2 %"; empty without any."""
    low, high, unit = quantity.min, quantity.max, quantity.unit
    if low is not None and high is not None:
        return f"{low:g} to {high:g} {unit}"
    if low is not None:
        return f"at least {low:g} {unit}"
    return f"at most {high:g} {unit}" if high is not None else ""


def moment_in_words(moment: datetime) -> str:
    """A date that nobody reads the wrong way round: "1 December 2026, 13:15:02 UTC"."""
    utc = moment.astimezone(UTC)
    return f"{utc.day} {_MONTHS[utc.month - 1]} {utc.year}, {utc:%H:%M:%S} UTC"


def length_in_words(length_s: float) -> str:
    """A length of time as "1 h 05 min 12 s" or "12.3 s"."""
    if length_s < 60:
        return f"{length_s:.1f} s"
    minutes, seconds = divmod(round(length_s), 60)
    hours, minutes = divmod(minutes, 60)
    return f"{hours} h {minutes:02d} min {seconds:02d} s" if hours else f"{minutes} min {seconds:02d} s"
