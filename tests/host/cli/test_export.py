"""`sinkwright export`: CSV and Parquet from the command line."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from sinkwright.cli import invoke
from sinkwright.cli.export import export
from tests.host.records.made_up import write_run


def run(*arguments: object) -> Result:
    return CliRunner().invoke(export, [str(a) for a in arguments], catch_exceptions=False)


@pytest.mark.parametrize("name", ["out.csv", "out.parquet", "OUT.CSV"])
def test_samples_go_into_the_format_that_the_name_asks_for(name: str, tmp_path: Path) -> None:
    result = run(write_run(tmp_path / "r.sqlite"), "--to", tmp_path / name)
    assert result.stdout == f"SIMULATED. 700 samples: {tmp_path / name}\n"
    assert (tmp_path / name).read_bytes().startswith(b"PAR1" if "parquet" in name else b"utc,time_s")


def test_with_json_stdout_carries_one_object_alone(tmp_path: Path) -> None:
    told = json.loads(run(write_run(tmp_path / "r.sqlite"), "--to", tmp_path / "o.csv", "--json").stdout)
    assert told["samples"] == 700
    assert told["simulated"] is True
    assert told["notices"] == []


@pytest.mark.parametrize("name", ["out.ods", "r.sqlite", "r.sqlite/out.csv"])
def test_what_cannot_be_exported_gets_one_paragraph_and_exit_2(
    name: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = write_run(tmp_path / "r.sqlite")
    before = path.read_bytes()
    assert invoke(["export", str(path), "--to", str(tmp_path / name)]) == 2
    told = capsys.readouterr()
    assert told.out == ""
    assert "No load was touched." in told.err
    assert "Something went wrong that should not have" not in told.err
    assert path.read_bytes() == before
