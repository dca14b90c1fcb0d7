from __future__ import annotations

from dataclasses import replace
from itertools import pairwise
from pathlib import Path

import pytest

from sinkwright.records import RecordWriter, open_record
from sinkwright.sample import Sample
from tests.host.records.made_up import header, samples


def record_of(path: Path, frames: list[Sample]) -> Path:
    with RecordWriter.create(path, header()) as writer:
        writer.add_samples(frames)
        writer.finish("complete")
    return path


@pytest.mark.parametrize("bins", [1, 7, 100, 1200])
@pytest.mark.parametrize("place", [0, 1, 2500, 4998, 4999])
def test_a_spike_in_one_reading_is_never_lost(bins: int, place: int, tmp_path: Path) -> None:
    frames = list(samples([2.0] * 5000))
    frames[place] = replace(frames[place], voltage_max_uV=13_131_313, current_min_uA=-4_242)
    with open_record(record_of(tmp_path / "r.sqlite", frames)) as record:
        envelope = record.envelope(bins)
        extremes = record.extremes()
    assert len(envelope) <= bins
    assert max(b.voltage_max_V for b in envelope) == pytest.approx(13.131313, abs=1e-9)
    assert min(b.current_min_A for b in envelope) == pytest.approx(-0.004242, abs=1e-9)
    assert extremes is not None
    assert extremes.voltage_max_V == (13.131313, frames[place].time_us)


def test_every_sample_is_in_exactly_one_bin_and_bins_are_in_order(tmp_path: Path) -> None:
    with open_record(record_of(tmp_path / "r.sqlite", list(samples([1.0] * 999)))) as record:
        envelope = record.envelope(50)
    assert sum(b.samples for b in envelope) == 999
    assert all(a.last_us < b.first_us for a, b in pairwise(envelope))


def test_a_bin_holds_what_python_finds_in_the_same_samples(tmp_path: Path) -> None:
    frames = list(samples([0.0] * 50 + [2.0] * 50))
    with open_record(record_of(tmp_path / "r.sqlite", frames)) as record:
        (one,) = record.envelope(1)
    assert one.voltage_V == pytest.approx(sum(f.voltage_V for f in frames) / 100)
    assert one.voltage_min_V == pytest.approx(min(f.voltage_min_V for f in frames))
    assert one.current_max_A == pytest.approx(max(f.current_max_A for f in frames))
    assert one.heatsink_max_degC == pytest.approx(max(f.heatsink_degC for f in frames))
    assert one.charge_C == pytest.approx(frames[-1].charge_C)


def test_a_record_without_samples_has_neither_envelope_nor_extremes(tmp_path: Path) -> None:
    with open_record(record_of(tmp_path / "r.sqlite", [])) as record:
        assert (record.envelope(10), record.extremes()) == ([], None)


def test_a_single_sample_makes_one_bin(tmp_path: Path) -> None:
    with open_record(record_of(tmp_path / "r.sqlite", list(samples([1.0])))) as record:
        assert [b.samples for b in record.envelope(10)] == [1]
