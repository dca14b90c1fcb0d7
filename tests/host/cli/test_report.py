"""`sinkwright report`: of one record, of two, and of what is none."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from sinkwright.cli import invoke
from sinkwright.cli.report import report
from tests.host.records.made_up import write_run


def run(*arguments: object) -> Result:
    return CliRunner().invoke(report, [str(a) for a in arguments], catch_exceptions=False)


def test_a_report_lies_beside_its_record_and_says_that_it_was_simulated(tmp_path: Path) -> None:
    result = run(write_run(tmp_path / "r.sqlite"))
    assert result.stdout == f"SIMULATED. Report: {tmp_path / 'r.html'}\n"
    assert (tmp_path / "r.html").read_text(encoding="utf-8").startswith("<!DOCTYPE html>")


def test_with_json_stdout_carries_one_object_alone(tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite", state="open")
    told = json.loads(run(path, "--out", tmp_path / "x.html", "--json").stdout)
    assert told["report"] == str(tmp_path / "x.html")
    assert told["simulated"] is True
    assert told["verdicts"] == ["inconclusive"]
    assert "was not finished" in told["notices"][0]


def test_an_unfinished_record_makes_a_report_with_a_word_of_care(tmp_path: Path) -> None:
    result = run(write_run(tmp_path / "r.sqlite", state="open"))
    assert result.exit_code == 0
    assert "Take care" in result.stderr
    assert "was not finished" in result.stderr


def test_two_records_make_a_comparison_in_the_folder_asked_for(tmp_path: Path) -> None:
    (tmp_path / "out").mkdir()
    result = run(
        write_run(tmp_path / "a.sqlite"), write_run(tmp_path / "b.sqlite"), "--out", tmp_path / "out"
    )
    assert result.stdout == f"SIMULATED. Comparison: {tmp_path / 'out' / 'a_and_b.html'}\n"


def test_a_bare_name_is_looked_for_in_the_usual_folder(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(Path, "home", lambda: tmp_path)
    monkeypatch.chdir(tmp_path)
    write_run(tmp_path / "sinkwright" / "mine.sqlite")
    assert "mine.html" in run("mine").stdout


@pytest.mark.parametrize("arguments", [(), ("a", "b", "c"), ("none.sqlite",), (".",), ("rubbish.sqlite",)])
def test_what_cannot_be_reported_gets_one_paragraph_and_exit_2(
    arguments: tuple[str, ...],
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "rubbish.sqlite").write_text("rubbish")
    assert invoke(["report", *arguments]) == 2
    told = capsys.readouterr()
    assert told.out == ""
    assert told.err.count("\n") == 1
    assert "No load was touched." in told.err
