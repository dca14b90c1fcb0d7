from __future__ import annotations

from pathlib import Path

import pytest

from sinkwright.errors import RecordError
from sinkwright.records.listing import list_records
from tests.host.records.made_up import write_run


def test_records_are_listed_oldest_first_and_bad_files_are_named(tmp_path: Path) -> None:
    write_run(tmp_path / "a.sqlite", started_utc="2026-05-01T00:00:00.000000Z", item="cell 2")
    write_run(tmp_path / "b.sqlite", started_utc="2026-04-01T00:00:00.000000Z", item="cell 1", state="open")
    (tmp_path / "bad.sqlite").write_text("rubbish")
    (tmp_path / "notes.txt").write_text("not looked at")
    listed, unreadable = list_records(tmp_path)
    assert [(one.item, one.state, one.samples) for one in listed] == [
        ("cell 1", "open", 700),
        ("cell 2", "complete", 700),
    ]
    assert [error.where for error in unreadable] == [str(tmp_path / "bad.sqlite")]


def test_only_the_records_of_one_item_are_listed_when_asked(tmp_path: Path) -> None:
    write_run(tmp_path / "a.sqlite", item="cell 1")
    write_run(tmp_path / "b.sqlite", item="cell 10")
    listed, _ = list_records(tmp_path, "cell 1")
    assert [one.item for one in listed] == ["cell 1"]


def test_a_folder_that_cannot_be_listed_is_refused_in_words(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("")
    for folder in (tmp_path / "file", tmp_path / "missing"):
        with pytest.raises(RecordError, match="cannot be listed"):
            list_records(folder)
