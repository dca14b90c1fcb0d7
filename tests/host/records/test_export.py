from __future__ import annotations

import builtins
import csv
from pathlib import Path
from typing import Any

import pytest

from sinkwright.errors import RecordError
from sinkwright.records import open_record
from sinkwright.records.export import COLUMNS, export, guarded, to_csv, to_parquet
from tests.host.records.made_up import write_run
from tests.host.records.old_records import restored


def exported(tmp_path: Path, **changes: object) -> list[dict[str, str]]:
    with open_record(write_run(tmp_path / "r.sqlite", **changes)) as record:
        assert to_csv(record, tmp_path / "out.csv") == 700
    with (tmp_path / "out.csv").open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


def test_csv_has_a_header_with_units_and_a_row_for_each_sample(tmp_path: Path) -> None:
    rows = exported(tmp_path)
    assert tuple(rows[0]) == COLUMNS
    assert len(rows) == 700
    last = rows[-1]
    assert last["utc"] == "2026-03-14T09:28:02.900000Z"
    assert float(last["current_A"]) == 2.0
    assert float(last["voltage_V"]) == pytest.approx(12.1 - 0.045 * 2.0, abs=0.001)
    assert (last["state"], last["setpoint"], last["setpoint_unit"]) == ("sinking", "2.0", "A")


def test_every_exported_row_says_that_it_was_simulated(tmp_path: Path) -> None:
    assert {row["simulated"] for row in exported(tmp_path)} == {"true"}


def test_a_label_cannot_become_a_formula(tmp_path: Path) -> None:
    rows = exported(tmp_path, item='=HYPERLINK("http://x","y")')
    assert rows[0]["item"] == '\'=HYPERLINK("http://x","y")'


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r"])
def test_each_start_of_a_formula_is_guarded(start: str) -> None:
    """The list of OWASP's page on CSV injection, from memory."""
    assert guarded(f"{start}1") == f"'{start}1"
    assert guarded("cell 1") == "cell 1"


def test_parquet_holds_the_same_as_csv_with_true_times(tmp_path: Path) -> None:
    import pyarrow.parquet

    rows = exported(tmp_path)
    with open_record(tmp_path / "r.sqlite") as record:
        assert to_parquet(record, tmp_path / "out.parquet") == 700
    table = pyarrow.parquet.read_table(tmp_path / "out.parquet")
    assert tuple(table.column_names) == COLUMNS
    first = table.to_pylist()[300]
    assert first["utc"].isoformat(timespec="microseconds") == rows[300]["utc"].replace("Z", "+00:00")
    assert first["voltage_V"] == float(rows[300]["voltage_V"])
    assert first["simulated"] is True
    assert table.schema.metadata[b"operator"] == b"A. Tester"


def test_without_its_package_parquet_names_the_extra(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    real_import = builtins.__import__

    def without_pyarrow(name: str, *rest: Any) -> Any:
        if name.startswith("pyarrow"):
            raise ImportError(name)
        return real_import(name, *rest)

    with open_record(write_run(tmp_path / "r.sqlite")) as record:
        monkeypatch.setattr(builtins, "__import__", without_pyarrow)
        with pytest.raises(RecordError, match=r"sinkwright\[export\]"):
            to_parquet(record, tmp_path / "out.parquet")


@pytest.mark.parametrize("name", ["out.xlsx", "out", "out.csv.gz"])
def test_another_format_is_refused_with_those_there_are(name: str, tmp_path: Path) -> None:
    with (
        open_record(write_run(tmp_path / "r.sqlite")) as record,
        pytest.raises(RecordError, match=r"\.csv or \.parquet"),
    ):
        export(record, tmp_path / name)


@pytest.mark.parametrize("name", ["file/out.csv", "/proc/out.csv", "file/out.parquet"])
def test_a_place_that_cannot_be_written_is_told_in_words(name: str, tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way")
    with (
        open_record(write_run(tmp_path / "r.sqlite")) as record,
        pytest.raises(RecordError, match="cannot be written"),
    ):
        export(record, tmp_path / name)


def test_the_record_itself_is_never_written_over(tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.csv")
    before = path.read_bytes()
    with open_record(path) as record, pytest.raises(RecordError, match="the record itself"):
        to_csv(record, path)
    assert path.read_bytes() == before


def test_a_failed_export_leaves_nothing_behind_and_the_older_file_as_it_was(tmp_path: Path) -> None:
    (tmp_path / "out.csv").write_text("older")

    def fail(count: int) -> None:
        raise OSError(28, "No space left on device")

    with (
        open_record(write_run(tmp_path / "r.sqlite")) as record,
        pytest.raises(RecordError, match="No space"),
    ):
        to_csv(record, tmp_path / "out.csv", fail)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["out.csv", "r.sqlite"]
    assert (tmp_path / "out.csv").read_text() == "older"


@pytest.mark.parametrize("suffix", [".csv", ".parquet"])
def test_the_stretch_that_only_the_board_kept_follows_without_numbers(suffix: str, tmp_path: Path) -> None:
    out = tmp_path / f"out{suffix}"
    with open_record(restored(2, tmp_path)) as record:
        assert export(record, out) == 15
    rows = _rows_in(out)
    assert [row["number"] or None for row in rows[10:]] == [None] * 5
    last = rows[-1]
    assert float(last["voltage_V"]) == pytest.approx(12.0095)
    assert float(last["charge_C"]) == pytest.approx(10.0)
    assert (last["state"], last["junction_degC"] or None, last["current_min_A"] or None) == (
        "sinking",
        None,
        None,
    )


def _rows_in(path: Path) -> list[dict[str, Any]]:
    if path.suffix == ".parquet":
        import pyarrow.parquet

        return pyarrow.parquet.read_table(path).to_pylist()
    with path.open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))
