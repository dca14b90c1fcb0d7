"""`sinkwright records`: what it lists, and how it names what it cannot read."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from sinkwright.cli.records import records
from tests.host.records.made_up import write_run


def run(*arguments: str) -> Result:
    return CliRunner().invoke(records, arguments, catch_exceptions=False)


@pytest.fixture(autouse=True)
def home(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setattr(Path, "home", lambda: tmp_path)
    return tmp_path / "sinkwright"


def test_the_usual_folder_is_listed_with_what_was_simulated_and_what_is_unreadable(home: Path) -> None:
    write_run(home / "a.sqlite")
    write_run(home / "b.sqlite", state="open", simulated=False, item="cell 3")
    (home / "bad.sqlite").write_text("rubbish")
    result = run()
    assert result.exit_code == 0
    assert "SIMULATED  bench supply no. 7, plan after-repair" in result.stdout
    assert "cell 3" in result.stdout
    assert "(not finished)" in result.stdout
    assert "bad.sqlite: is not a record" in result.stderr


def test_with_json_stdout_carries_one_object_alone(home: Path) -> None:
    write_run(home / "a.sqlite")
    (home / "bad.sqlite").write_text("rubbish")
    told = json.loads(run("--json").stdout)
    assert told["records"][0]["item"] == "bench supply no. 7"
    assert told["records"][0]["verdict"] == "inconclusive"
    assert told["records"][0]["simulated"] is True
    assert told["unreadable"][0]["where"].endswith("bad.sqlite")


def test_an_item_without_records_and_a_folder_that_is_not_there_yet_are_no_errors(home: Path) -> None:
    assert "No record" in run().stdout
    write_run(home / "a.sqlite")
    assert "No record of item 'cell 9'" in run("--item", "cell 9").stdout
    assert json.loads(run("--item", "cell 9", "--json").stdout)["records"] == []
