"""Everything that one record's report says, as plain values in reading order; the template only lays it out.

Decides what stands on page one and what follows. It reads a record and draws figures; it knows no HTML and no
device.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from sinkwright.records.envelope import Bin, Extreme, Extremes
from sinkwright.records.reader import Record, RecordedEvent
from sinkwright.reports import figures
from sinkwright.reports.plan_facts import PlanFacts
from sinkwright.reports.wording import (
    VERDICT_WORDS,
    bounds_in_words,
    kind_in_words,
    label_of,
    length_in_words,
    moment_in_words,
    stopped_in_words,
    value_in_words,
    verdict_sentence,
)
from sinkwright.results import END_KEYS, Contribution, Quantity, TestResult
from sinkwright.units import format_uncertainty

EVENTS_SHOWN = 200
#: Causes with less of the variance than this are told together.
_SHARE_SHOWN = 0.01

CAUTIONS = (
    "The limits that this load's firmware keeps are not a safety function. A fuse rated for direct current "
    "belongs in the source lead, and somebody within reach of it.",
    "Heatsinks of a load get hot enough to burn (above 60 °C), and stay so for minutes after it is off.",
    "Batteries: attended, on a surface that does not burn, each cell with its own voltage and temperature "
    "limit. Never test swollen, damaged or over-discharged cells. Lead-acid batteries give off hydrogen.",
    "Stay below 60 V DC and away from mains circuits. Local codes apply; installation work and mains repair "
    "belong to licensed people.",
)


@dataclass(frozen=True)
class Share:
    """One line of an uncertainty's account. `percent` is of the variance, so that the lines add up to 100."""

    cause: str
    standard: str
    percent: float


@dataclass(frozen=True)
class QuantityView:
    """One quantity in words."""

    label: str
    value: str
    bounds: str
    verdict: str
    verdict_word: str
    reason: str
    remedy: str
    coverage: str
    shares: tuple[Share, ...]
    remedies: tuple[str, ...]

    @classmethod
    def of(cls, quantity: Quantity) -> QuantityView:
        factor = quantity.coverage_factor
        return cls(
            label=label_of(quantity.name),
            value=value_in_words(quantity),
            bounds=bounds_in_words(quantity),
            verdict=quantity.verdict,
            verdict_word=VERDICT_WORDS[quantity.verdict].capitalize(),
            reason=quantity.reason,
            remedy=quantity.remedy if quantity.verdict == "inconclusive" else "",
            coverage=f"{factor:.2f}" if factor else "",
            shares=_shares(quantity),
            remedies=_remedies(quantity),
        )


@dataclass(frozen=True)
class TestView:
    """One test in words, with its characteristic curve if it has one."""

    __test__ = False

    number: int
    title: str
    verdict: str
    verdict_word: str
    stopped: str
    #: Ended as the plan did not ask: page one then tells the notes as well.
    cut_short: bool
    bounded: tuple[QuantityView, ...]
    others: tuple[QuantityView, ...]
    notes: tuple[str, ...]
    not_tested: tuple[str, ...]
    length: str
    curve: str

    @property
    def quantities(self) -> tuple[QuantityView, ...]:
        return self.bounded + self.others

    @classmethod
    def of(cls, number: int, result: TestResult) -> TestView:
        views = [(q, QuantityView.of(q)) for q in result.quantities.values()]
        return cls(
            number=number,
            title=kind_in_words(result.kind),
            verdict=result.verdict,
            verdict_word=VERDICT_WORDS[result.verdict],
            stopped=stopped_in_words(result.stopped_by),
            cut_short=result.stopped_by not in (None, *END_KEYS),
            bounded=tuple(view for quantity, view in views if quantity.verdict != "none"),
            others=tuple(view for quantity, view in views if quantity.verdict == "none"),
            notes=result.notes,
            not_tested=result.not_tested,
            length=length_in_words((result.ended_us - result.started_us) / 1e6),
            curve=_curve(number, result),
        )


@dataclass(frozen=True)
class Contents:
    """A whole report in words and drawings. `facts` and the like are pairs of a name and a text."""

    title: str
    simulated: bool
    verdict: str
    verdict_word: str
    verdict_sentence: str
    decision: str
    unfinished: str
    facts: tuple[tuple[str, str], ...]
    tests: tuple[TestView, ...]
    not_tested: tuple[str, ...]
    curves: tuple[str, ...]
    readings: tuple[tuple[str, str], ...]
    events: tuple[tuple[str, RecordedEvent], ...]
    events_left_out: int
    board: tuple[tuple[str, str], ...]
    versions: tuple[tuple[str, str], ...]
    plan_text: str
    cautions: tuple[str, ...]

    @classmethod
    def of(cls, record: Record) -> Contents:
        """Work out the contents. Raises RecordError for a damaged record."""
        header, results, events = record.header, record.results(), record.events()
        plan, verdict = PlanFacts.of(header.plan_text), record.verdict
        tests = tuple(TestView.of(number, result) for number, result in enumerate(results, start=1))
        extremes = record.extremes()
        bins = record.envelope(figures.BINS)
        coarse = _kept_by_board(record)
        return cls(
            title=header.item or plan.source.get("name") or header.plan_name,
            simulated=header.simulated,
            verdict=verdict,
            verdict_word=VERDICT_WORDS[verdict],
            verdict_sentence=verdict_sentence(verdict, results, record.state, plan.decision),
            decision=plan.decision,
            unfinished=record.unfinished,
            facts=_facts(record, plan, extremes),
            tests=tests,
            not_tested=_not_tested(tests, plan),
            curves=_curves(bins, results, coarse),
            readings=_readings(extremes) + _coarse_in_words(record, coarse),
            events=tuple((_clock(record, event), event) for event in events[:EVENTS_SHOWN]),
            events_left_out=max(len(events) - EVENTS_SHOWN, 0),
            board=_board(record),
            versions=_versions(record),
            plan_text=header.plan_text,
            cautions=CAUTIONS,
        )


def _shares(quantity: Quantity) -> tuple[Share, ...]:
    """The causes that matter one by one, largest first, and the rest as one line."""
    large, small = _split(quantity)
    shown = [(share.cause, abs(share.standard)) for share in large]
    if small:
        several = f"{len(small)} smaller causes together" if len(small) > 1 else small[0].cause
        shown.append((several, math.hypot(*(share.standard for share in small))))
    total = math.hypot(*(standard for _, standard in shown))
    return tuple(
        Share(
            cause,
            format_uncertainty(standard, quantity.unit),
            100 * (standard / total) ** 2 if total else 0.0,
        )
        for cause, standard in shown
    )


def _remedies(quantity: Quantity) -> tuple[str, ...]:
    """What would make the causes that matter smaller, each remedy once."""
    large, _ = _split(quantity)
    return tuple(dict.fromkeys(share.remedy for share in large if share.remedy))


def _split(quantity: Quantity) -> tuple[list[Contribution], list[Contribution]]:
    ranked = sorted(quantity.contributions, key=lambda share: -abs(share.standard))
    least = _SHARE_SHOWN * sum(share.standard**2 for share in ranked)
    large = [share for share in ranked if share.standard**2 >= least]
    return large, ranked[len(large) :]


def _curve(number: int, result: TestResult) -> str:
    points = [p for p in result.points if "current_A" in p and "voltage_V" in p]
    if len(points) < 2:
        return ""
    return figures.characteristic([figures.Trace("", points)], f"Voltage over current, test {number}")


def _kept_by_board(record: Record) -> list[figures.Coarse]:
    """The stretches of which there is only the board's own log."""
    found: list[figures.Coarse] = []
    for entry in record.board_log():
        if not entry.missed:
            continue
        begin_us = entry.time_us - entry.spacing_us
        # The time between entries is kept to within a few control steps.
        if found and begin_us - found[-1].last_us < entry.spacing_us // 2:
            begin_us = found.pop().first_us
        found.append(figures.Coarse(begin_us, entry.time_us, entry.spacing_us))
    return found


def _coarse_in_words(record: Record, coarse: list[figures.Coarse]) -> tuple[tuple[str, str], ...]:
    return tuple(("Kept by the board alone", _stretch_in_words(record, stretch)) for stretch in coarse)


def _stretch_in_words(record: Record, stretch: figures.Coarse) -> str:
    first, last = record.utc_of(stretch.first_us), record.utc_of(stretch.last_us)
    times = f" from {first:%H:%M:%S} to {last:%H:%M:%S} UTC" if first and last else ""
    return (
        f"{length_in_words((stretch.last_us - stretch.first_us) / 1e6)}{times}, one entry every "
        f"{stretch.spacing_us / 1e6:g} s; each has the voltage's extremes, and only the mean of the current"
    )


def _curves(bins: list[Bin], results: list[TestResult], coarse: list[figures.Coarse]) -> tuple[str, ...]:
    if not bins:
        return ()
    spans = [figures.Span(str(n), r.started_us, r.ended_us) for n, r in enumerate(results, start=1)]
    return figures.voltage_and_current(bins, spans, coarse), figures.temperatures(bins, spans, coarse)


def _facts(record: Record, plan: PlanFacts, extremes: Extremes | None) -> tuple[tuple[str, str], ...]:
    header = record.header
    length = (
        f", {length_in_words((extremes.last_us - extremes.first_us) / 1e6)} of readings" if extremes else ""
    )
    return (
        ("Item", header.item or "no label was given"),
        ("Source, as stated", plan.source_in_words),
        ("Operator", header.operator or "nobody was named"),
        ("Date", moment_in_words(header.started) + length),
        ("Plan", header.plan_name),
        ("Run", record.state_in_words),
        ("Voltage sensing", plan.leads_in_words),
        ("Board", f"{header.board_name or 'unnamed'}{' (SIMULATED)' if header.simulated else ''}"),
        ("Calibration", header.calibration),
    )


def _not_tested(tests: tuple[TestView, ...], plan: PlanFacts) -> tuple[str, ...]:
    """Each sentence once, with the tests that it belongs to; and the tests that were never reached."""
    sentences = dict.fromkeys(sentence for test in tests for sentence in test.not_tested)
    never = plan.tests[len(tests) :] if not any("not carried out" in s for s in sentences) else ()
    named = (f"{kind_in_words(str(test.get('kind', 'a test')))}: not carried out." for test in never)
    return (*sentences, *named)


def _readings(extremes: Extremes | None) -> tuple[tuple[str, str], ...]:
    if extremes is None:
        return (("Samples", "none"),)

    def told(extreme: Extreme, unit: str, digits: int) -> str:
        return f"{extreme.value:.{digits}f} {unit} at {(extreme.time_us - extremes.first_us) / 1e6:.1f} s"

    start, missing = extremes.heatsink_first_degC, extremes.missing
    return (
        ("Lowest voltage of any single reading", told(extremes.voltage_min_V, "V", 4)),
        ("Highest voltage of any single reading", told(extremes.voltage_max_V, "V", 4)),
        ("Highest current of any single reading", told(extremes.current_max_A, "A", 4)),
        ("Heatsink", f"{start:.1f} °C at the start, at most {told(extremes.heatsink_max_degC, '°C', 1)}"),
        ("Transistor junction, estimated", f"at most {told(extremes.junction_max_degC, '°C', 1)}"),
        ("Samples", f"{extremes.count}; {missing} more were numbered by the board and did not arrive"),
        ("Control steps that came late", str(extremes.overruns)),
    )


def _clock(record: Record, event: RecordedEvent) -> str:
    """The time of day; the date stands on page one."""
    utc = record.utc_of(event.time_us) if event.time_us else None
    return f"{utc:%H:%M:%S}" if utc else event.utc[11:19]


_BOARD_WORDS = {
    "name": "Name",
    "board_id": "Serial number",
    "firmware_version": "Firmware",
    "interpreter": "Interpreter",
    "control_period_s": "Control period",
    "boot_number": "Boot number",
    "board_file_crc": "Check sum of its board file",
    "calibration_number": "Calibrations stored",
}


def _board(record: Record) -> tuple[tuple[str, str], ...]:
    board: dict[str, Any] = dict(record.header.board)
    told = {key: board.get(key) for key in _BOARD_WORDS if board.get(key) is not None}
    period_s, crc = told.get("control_period_s"), told.get("board_file_crc")
    if isinstance(period_s, int | float):
        told["control_period_s"] = f"{period_s * 1e3:g} ms"
    if isinstance(crc, int):
        told["board_file_crc"] = f"{crc:08x}"
    return (*((_BOARD_WORDS[key], str(value)) for key, value in told.items()), ("Port", record.header.url))


def _versions(record: Record) -> tuple[tuple[str, str], ...]:
    return (
        ("Sinkwright", record.header.software_version),
        ("Calibration in force", record.header.calibration),
        ("Record", record.path.name),
        ("Record opened", record.header.started_utc),
        ("Record closed", record.ended_utc or "never"),
    )
