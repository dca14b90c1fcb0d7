from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import pytest

from sinkwright.records import RecordWriter, open_record
from sinkwright.records.envelope import Bin
from sinkwright.reports.figures import (
    BINS,
    Span,
    Trace,
    characteristic,
    stretches,
    temperatures,
    voltage_and_current,
)
from sinkwright.sample import Sample
from tests.benchmarks.report_from_many_samples import STANDS_OUT, strokes
from tests.host.records.made_up import BOOT_us, INTERVAL_us, header, samples

POINTS = [{"current_A": i / 4, "voltage_V": 12.1 - 0.045 * i / 4} for i in range(5)]


def bins_of(tmp_path: Path, frames: list[Sample]) -> list[Bin]:
    with RecordWriter.create(tmp_path / "r.sqlite", header()) as writer:
        writer.add_samples(frames)
    with open_record(tmp_path / "r.sqlite") as record:
        return record.envelope(BINS)


def test_the_same_readings_give_the_same_bytes(tmp_path: Path) -> None:
    bins = bins_of(tmp_path, list(samples([0.0] * 50 + [2.0] * 50)))
    spans = [Span("test 1", BOOT_us, BOOT_us + 50 * INTERVAL_us)]
    assert voltage_and_current(bins, spans) == voltage_and_current(bins, spans)
    assert temperatures(bins, spans) == temperatures(bins, spans)
    assert characteristic([Trace("", POINTS)], "V") == characteristic([Trace("", POINTS)], "V")


def test_a_spike_of_one_reading_stands_out_of_the_drawn_curve(tmp_path: Path) -> None:
    frames = list(samples([2.0] * 20_000))
    frames[12_345] = replace(frames[12_345], voltage_max_uV=14_000_000)
    tops = sorted(top for top, _ in strokes(voltage_and_current(bins_of(tmp_path, frames), []), "voltage"))
    assert len(tops) <= BINS
    assert tops[1] - tops[0] > STANDS_OUT


def test_a_figure_stands_within_html_with_a_name_and_nothing_from_outside(tmp_path: Path) -> None:
    svg = voltage_and_current(bins_of(tmp_path, list(samples([1.0] * 10))), [])
    assert svg.startswith('<svg role="img" aria-label="Voltage and current over time"')
    assert not re.search(r'(?:href|src)="(?!#)', svg)
    assert "<?xml" not in svg
    assert "metadata" not in svg


def test_ids_within_one_page_point_where_they_should(tmp_path: Path) -> None:
    svg = temperatures(bins_of(tmp_path, list(samples([1.0] * 10))), [])
    ids = re.findall(r' id="([^"]*)"', svg)
    assert len(ids) == len(set(ids))
    assert set(re.findall(r'(?:url\(|href=")#([^")]+)', svg)) <= set(ids)


@pytest.mark.parametrize("pause_us", [0, 150_000, 600_000_000])
def test_a_pause_without_readings_is_a_gap_in_the_line(pause_us: int, tmp_path: Path) -> None:
    frames = list(samples([1.0] * 200))
    frames[100:] = [replace(frame, time_us=frame.time_us + pause_us) for frame in frames[100:]]
    bins = bins_of(tmp_path, frames)
    assert len(stretches(bins)) == (2 if pause_us > 300_000 else 1)
    assert sum(len(bins[part]) for part in stretches(bins)) == len(bins)


def test_hostile_labels_are_neither_markup_nor_mathematics() -> None:
    svg = characteristic([Trace("<script>$\\frac</script>", POINTS), Trace("b", POINTS)], "V")
    assert "<script>" not in svg


def test_a_single_reading_and_a_single_moment_can_be_drawn(tmp_path: Path) -> None:
    assert "<svg" in voltage_and_current(bins_of(tmp_path, list(samples([1.0]))), [Span("test 1", 0, 0)])


def test_a_test_without_readings_of_its_own_is_left_out_of_the_drawing(tmp_path: Path) -> None:
    bins = bins_of(tmp_path, list(samples([1.0] * 20)))
    beyond = [Span("never", 10**9, 2 * 10**9), Span("seen", 0, 10**12)]
    drawn = voltage_and_current(bins, beyond)
    assert (">seen<" in drawn, ">never<" in drawn) == (True, False)
