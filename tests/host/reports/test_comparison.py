from __future__ import annotations

from pathlib import Path

import pytest

from sinkwright.records import RecordWriter, open_record
from sinkwright.reports import write_comparison
from sinkwright.reports.comparison import Comparison
from tests.host.records.made_up import BOARD, PLAN, header, hold, samples, write_run
from tests.host.reports.test_report import text_of


def compared(first: Path, second: Path) -> Comparison:
    with open_record(first) as one, open_record(second) as other:
        return Comparison.of(one, other)


def test_two_runs_alike_differ_in_nothing(tmp_path: Path) -> None:
    runs = compared(write_run(tmp_path / "a.sqlite"), write_run(tmp_path / "b.sqlite"))
    assert runs.differing == ()
    assert {pair.judgement for test in runs.tests for pair in test.pairs} == {"within the uncertainties"}


@pytest.mark.parametrize(
    ("changes", "what"),
    [
        ({"plan_text": PLAN.replace("current_A = 2.0\nduration", "current_A = 1.0\nduration")}, "current"),
        ({"plan_text": PLAN.replace("60.0", "120.0")}, "end"),
        ({"plan_text": PLAN.replace("[source]", '[source]\nsense = "two-wire"')}, "leads"),
        ({"board": {**BOARD, "board_id": "ffff"}}, "board"),
        ({"calibration": "calibrated on 1 March 2026"}, "calibration"),
        ({"board_file": "other"}, "board file, check sum"),
        ({"simulated": False}, "simulated"),
    ],
)
def test_each_circumstance_that_differs_is_named(
    changes: dict[str, object], what: str, tmp_path: Path
) -> None:
    runs = compared(write_run(tmp_path / "a.sqlite"), write_run(tmp_path / "b.sqlite", **changes))
    assert runs.differing == (what,)


def test_a_warmer_start_is_named_first_of_all_results(tmp_path: Path) -> None:
    with RecordWriter.create(tmp_path / "b.sqlite", header()) as writer:
        frames = list(samples([2.0] * 2000))[1500:]
        writer.add_samples(frames)
        writer.add_result(hold())
        writer.finish("complete")
    first = write_run(tmp_path / "a.sqlite")
    assert "temperature at the start" in compared(first, writer.path).differing
    text = text_of(write_comparison(first, writer.path).read_text(encoding="utf-8"))
    assert text.index("temperature at the start") < text.index("Results side by side")
    assert "which do not compare" in text


def test_a_change_beyond_both_uncertainties_is_told_apart_from_one_within(tmp_path: Path) -> None:
    first = write_run(tmp_path / "a.sqlite", seen_percent=0.700)
    near = compared(first, write_run(tmp_path / "b.sqlite", seen_percent=0.755)).tests[0].pairs[0]
    far = compared(first, write_run(tmp_path / "c.sqlite", seen_percent=0.765)).tests[0].pairs[0]
    # U = 0.043 % in both: the root of the sum of the squares is 0.0608 %.
    assert (near.judgement, near.change) == ("within the uncertainties", "0.055 % ± 0.061 %")
    assert (far.judgement, far.change) == ("differs by more than the uncertainties", "0.065 % ± 0.061 %")


def test_a_comparison_with_something_simulated_says_so(tmp_path: Path) -> None:
    page = write_comparison(
        write_run(tmp_path / "a.sqlite", simulated=False),
        write_run(tmp_path / "b.sqlite"),
        tmp_path / "c.html",
    ).read_text(encoding="utf-8")
    assert "<title>SIMULATED: " in page
    assert page.count("<svg") == 2


def test_an_unfinished_and_an_empty_run_can_be_compared(tmp_path: Path) -> None:
    with RecordWriter.create(tmp_path / "b.sqlite", header()) as empty:
        pass
    page = write_comparison(write_run(tmp_path / "a.sqlite", state="open"), empty.path)
    text = text_of(page.read_text(encoding="utf-8"))
    assert "not carried out" in text
    assert text.count("was not finished") == 2
