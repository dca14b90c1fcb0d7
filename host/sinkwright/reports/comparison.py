"""Two runs side by side: first what differs between them besides the results, then the results.

A difference of results means little before one knows what else differed, so that comes first. It reads two
records; it knows no HTML and no device.
"""

from __future__ import annotations

import math
import zlib
from dataclasses import dataclass
from itertools import zip_longest

from sinkwright.records.reader import Record
from sinkwright.reports import figures
from sinkwright.reports.contents import CAUTIONS
from sinkwright.reports.plan_facts import PlanFacts
from sinkwright.reports.wording import (
    VERDICT_WORDS,
    kind_in_words,
    label_of,
    moment_in_words,
    value_in_words,
)
from sinkwright.results import Quantity, TestResult
from sinkwright.units import format_value

#: Temperatures nearer to each other than this count as the same: the thermistor's own tolerance (ours).
SAME_TEMPERATURE_K = 2.0


@dataclass(frozen=True)
class Difference:
    """One circumstance of both runs, and whether it differs."""

    what: str
    first: str
    second: str
    differs: bool


@dataclass(frozen=True)
class Pair:
    """One quantity of both runs. `judgement` says whether the uncertainties leave a difference."""

    label: str
    first: str
    second: str
    change: str
    judgement: str


@dataclass(frozen=True)
class TestPair:
    """One test of both runs, or of one of them."""

    __test__ = False

    title: str
    verdicts: tuple[str, str]
    pairs: tuple[Pair, ...]
    curve: str


@dataclass(frozen=True)
class Comparison:
    """A whole comparison in words and drawings."""

    titles: tuple[str, str]
    simulated: bool
    runs: tuple[tuple[tuple[str, str], ...], ...]
    notices: tuple[str, ...]
    differences: tuple[Difference, ...]
    tests: tuple[TestPair, ...]
    charge_curve: str
    cautions: tuple[str, ...]

    @classmethod
    def of(cls, first: Record, second: Record) -> Comparison:
        """Work out the comparison. Raises RecordError for a damaged record."""
        records = (first, second)
        return cls(
            titles=(_title(first), _title(second)),
            simulated=any(record.header.simulated for record in records),
            runs=tuple(_run(record) for record in records),
            notices=tuple(f"{r.path.name}: {r.unfinished}." for r in records if r.unfinished),
            differences=_differences(first, second),
            tests=tuple(
                _test_pair(number, a, b)
                for number, (a, b) in enumerate(zip_longest(first.results(), second.results()), start=1)
            ),
            charge_curve=_charge_curve(records),
            cautions=CAUTIONS,
        )

    @property
    def differing(self) -> tuple[str, ...]:
        """The names of what differs, for the sentence that leads the page."""
        return tuple(one.what.lower() for one in self.differences if one.differs)


def _title(record: Record) -> str:
    return record.header.item or record.header.plan_name


def _run(record: Record) -> tuple[tuple[str, str], ...]:
    header = record.header
    return (
        ("Item", header.item or "no label was given"),
        ("Date", moment_in_words(header.started)),
        ("Operator", header.operator or "nobody was named"),
        ("Verdict", VERDICT_WORDS[record.verdict]),
        ("Run", record.state_in_words),
        ("Record", record.path.name),
    )


def _differences(first: Record, second: Record) -> tuple[Difference, ...]:
    plans = PlanFacts.of(first.header.plan_text), PlanFacts.of(second.header.plan_text)
    headers = first.header, second.header
    told = [
        ("Current", [plan.setpoints_in_words for plan in plans]),
        ("End", [plan.ends_in_words for plan in plans]),
    ]
    leads = ("Leads", [plan.leads_in_words for plan in plans])
    rest = [
        ("Board", [f"{h.board_name} ({h.board.get('board_id', 'no serial number')})" for h in headers]),
        ("Calibration", [h.calibration for h in headers]),
        ("Board file, check sum", [f"{zlib.crc32(h.board_file.encode()):08x}" for h in headers]),
        ("Simulated", ["SIMULATED" if h.simulated else "real" for h in headers]),
        ("Source, as stated", [plan.source_in_words for plan in plans]),
        ("Decision rule", [plan.decision for plan in plans]),
        ("Firmware", [str(h.board.get("firmware_version", "not stated")) for h in headers]),
        ("Software", [h.software_version for h in headers]),
    ]
    rows = [Difference(what, a, b, a != b) for what, (a, b) in (*told, leads, *rest)]
    return (*rows[:2], *_temperatures(first, second), *rows[2:])


def _temperatures(first: Record, second: Record) -> list[Difference]:
    """The heatsink at the start is the nearest to the room's temperature that a record knows."""
    ends = first.extremes(), second.extremes()
    rows = []
    for what, of in (
        ("Temperature at the start", lambda e: e.heatsink_first_degC),
        ("Highest temperature", lambda e: e.heatsink_max_degC.value),
    ):
        values = [of(e) if e else math.nan for e in ends]
        texts = ["no reading" if math.isnan(v) else f"heatsink {v:.1f} °C" for v in values]
        rows.append(
            Difference(what, texts[0], texts[1], not abs(values[0] - values[1]) <= SAME_TEMPERATURE_K)
        )
    return rows


def _test_pair(number: int, first: TestResult | None, second: TestResult | None) -> TestPair:
    present = [result for result in (first, second) if result]
    kinds = list(dict.fromkeys(kind_in_words(result.kind) for result in present))
    if len(kinds) > 1:
        return TestPair(f"Test {number}: {kinds[0]} against {kinds[1].lower()}, which do not compare",
                        _verdicts(first, second), (), "")  # fmt: skip
    names = dict.fromkeys(name for result in present for name in result.quantities)
    pairs = tuple(
        _pair(
            name,
            first.quantities.get(name) if first else None,
            second.quantities.get(name) if second else None,
        )
        for name in names
    )
    return TestPair(
        f"Test {number}: {kinds[0]}", _verdicts(first, second), pairs, _curve(number, first, second)
    )


def _verdicts(first: TestResult | None, second: TestResult | None) -> tuple[str, str]:
    words = [VERDICT_WORDS[result.verdict] if result else "not carried out" for result in (first, second)]
    return words[0], words[1]


def _pair(name: str, first: Quantity | None, second: Quantity | None) -> Pair:
    texts = [value_in_words(q) if q else "not measured" for q in (first, second)]
    change, judgement = "", "cannot be compared"
    if first and second and first.value is not None and second.value is not None:
        change, judgement = _change(first, second)
    return Pair(label_of(name), texts[0], texts[1], change, judgement)


def _change(first: Quantity, second: Quantity) -> tuple[str, str]:
    """Second less first. Both uncertainties count in full: errors that one board has in common are not set
    off.
    """
    assert first.value is not None and second.value is not None
    difference = second.value - first.value
    if first.expanded_uncertainty is None or second.expanded_uncertainty is None:
        return format_value(difference, None, first.unit), "no uncertainty is known, so nothing can be said"
    together = math.hypot(first.expanded_uncertainty, second.expanded_uncertainty)
    differs = abs(difference) > together
    words = "differs by more than the uncertainties" if differs else "within the uncertainties"
    return format_value(difference, together, first.unit), words


def _curve(number: int, first: TestResult | None, second: TestResult | None) -> str:
    traces = [
        figures.Trace(label, [p for p in result.points if "current_A" in p and "voltage_V" in p])
        for label, result in (("first", first), ("second", second))
        if result
    ]
    if sum(len(trace.points) > 1 for trace in traces) < 2:
        return ""
    return figures.characteristic(traces, f"Voltage over current, test {number}, both runs")


def _charge_curve(records: tuple[Record, Record]) -> str:
    runs = [
        (label, record.envelope(figures.BINS))
        for label, record in zip(("first", "second"), records, strict=True)
    ]
    return figures.voltage_over_charge(runs) if all(bins for _, bins in runs) else ""
