from __future__ import annotations

import os
import random
import shutil
import sqlite3
from pathlib import Path

import pytest

from sinkwright.errors import RecordError
from sinkwright.records import RecordWriter, open_record
from sinkwright.records.schema import SCHEMA_VERSION
from tests.host.records.made_up import header, samples, write_run


def damage(path: Path, sql: str) -> None:
    connection = sqlite3.connect(path)
    connection.execute(sql)
    connection.commit()
    connection.close()


def read_everything(path: Path) -> None:
    with open_record(path) as record:
        list(record.samples())
        record.events()
        record.results()
        record.run_result()
        record.extremes()
        record.envelope(10)


@pytest.mark.parametrize(
    ("content", "sentence"),
    [
        (b"", "is empty"),
        (b"kind = 'hold'\n", "no SQLite database"),
        (bytes(range(256)) * 64, "no SQLite database"),
        (b"SQLite format 3\x00", "not a record, or a damaged one"),
        (b"SQLite format 3\x00" + bytes(5000), "not a record, or a damaged one"),
    ],
)
def test_what_is_no_record_is_refused_in_words(content: bytes, sentence: str, tmp_path: Path) -> None:
    path = tmp_path / "r.sqlite"
    path.write_bytes(content)
    with pytest.raises(RecordError, match=sentence) as refused:
        open_record(path)
    assert str(path) in str(refused.value)


def test_a_missing_file_and_a_folder_are_refused_in_words(tmp_path: Path) -> None:
    with pytest.raises(RecordError, match="there is no such record"):
        open_record(tmp_path / "none.sqlite")
    with pytest.raises(RecordError, match="is a folder"):
        open_record(tmp_path)
    with pytest.raises(RecordError, match=r"cannot be read|no such record"):
        open_record("nul\0byte")


def test_the_database_of_another_program_is_refused(tmp_path: Path) -> None:
    damage(tmp_path / "r.sqlite", "CREATE TABLE bookmarks (url TEXT)")
    with pytest.raises(RecordError, match="database of another program"):
        open_record(tmp_path / "r.sqlite")


def test_a_record_of_a_later_version_is_refused_with_both_versions(tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite")
    damage(path, f"PRAGMA user_version = {SCHEMA_VERSION + 1}")
    with pytest.raises(RecordError, match=f"version {SCHEMA_VERSION + 1}, and this program reads version"):
        open_record(path)


@pytest.mark.parametrize("share", [0.2, 0.5, 0.9, 0.999])
def test_a_record_that_is_cut_short_is_refused(share: float, tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite")
    os.truncate(path, int(path.stat().st_size * share))
    with pytest.raises(RecordError, match="cut short"):
        open_record(path)


def test_a_run_that_was_not_finished_opens_and_says_so(tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite", state="open")
    with open_record(path) as record:
        assert "was not finished" in record.unfinished
        assert "700 samples" in record.unfinished
        assert record.verdict == "inconclusive"


@pytest.mark.parametrize(
    "sql",
    [
        "DELETE FROM run",
        "DELETE FROM run WHERE key = 'board'",
        "UPDATE run SET value = '[1]' WHERE key = 'board'",
        "UPDATE run SET value = 'yesterday' WHERE key = 'started_utc'",
        "UPDATE run SET value = '12.5 s' WHERE key = 'anchor_time_us'",
        "UPDATE sample SET voltage_uV = 'twelve' WHERE row = 300",
        "UPDATE sample SET voltage_uV = 1.5 WHERE row = 300",
        "UPDATE event SET data = '{'",
        "UPDATE result SET json = '[]'",
        "UPDATE result SET json = '{}'",
        "UPDATE run_result SET json = 'null'",
        "DROP TABLE event",
        "DROP TABLE run",
        "ALTER TABLE sample RENAME COLUMN pairs TO couples",
    ],
)
def test_a_record_whose_contents_were_damaged_is_refused_in_words(sql: str, tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite")
    damage(path, sql)
    with pytest.raises(RecordError, match="damaged record"):
        read_everything(path)


def test_no_flipped_bytes_make_anything_but_a_record_error(tmp_path: Path) -> None:
    whole = write_run(tmp_path / "r.sqlite").read_bytes()
    chance = random.Random(1)
    path = tmp_path / "flipped.sqlite"
    for _ in range(150):
        content = bytearray(whole)
        for _ in range(chance.choice((1, 10, 200))):
            content[chance.randrange(len(content))] = chance.randrange(256)
        path.write_bytes(content)
        try:
            read_everything(path)
        except RecordError:
            continue


def test_a_name_with_every_sort_of_character_opens(tmp_path: Path) -> None:
    path = write_run(tmp_path / "a ?b#c%20d&mode=rw.sqlite")
    with open_record(path) as record:
        assert record.sample_count == 700


def test_a_copy_made_together_with_its_wal_opens(tmp_path: Path) -> None:
    writer = RecordWriter.create(tmp_path / "r.sqlite", header())
    writer.add_samples(list(samples([1.0] * 10)))
    writer.commit()
    copy = tmp_path / "copy.sqlite"
    shutil.copy(writer.path, copy)
    shutil.copy(f"{writer.path}-wal", f"{copy}-wal")
    writer.close()
    with open_record(copy) as record:
        assert record.sample_count == 10


def test_reading_changes_no_byte(tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite")
    before = path.read_bytes()
    read_everything(path)
    assert path.read_bytes() == before
    assert [p.name for p in tmp_path.iterdir()] == ["r.sqlite"]
