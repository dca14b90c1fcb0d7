from __future__ import annotations

from pathlib import Path

from sinkwright.records import open_record
from sinkwright.records.schema import SCHEMA_VERSION
from tests.host.records.made_up import BOOT_us, hold, regulation
from tests.host.records.old_records import DATA, restored


def test_there_is_a_kept_record_of_every_version_of_the_schema() -> None:
    assert [path.stem for path in sorted(DATA.glob("version-*.sql"))] == [
        f"version-{version}" for version in range(1, SCHEMA_VERSION + 1)
    ]


def test_a_record_of_version_1_is_read_in_full(tmp_path: Path) -> None:
    with open_record(restored(1, tmp_path)) as record:
        assert (record.header.item, record.state, record.verdict) == (
            "bench supply no. 7",
            "complete",
            "inconclusive",
        )
        assert [sample.number for sample in record.samples()] == list(range(1, 21))
        assert record.results() == [regulation(), hold()]
        assert [event.kind for event in record.events()] == ["doing", "doing"]
        result = record.run_result()
    assert result is not None
    assert result.simulated


def test_a_record_of_version_2_is_read_in_full(tmp_path: Path) -> None:
    with open_record(restored(2, tmp_path)) as record:
        assert (record.state, record.verdict) == ("complete", "inconclusive")
        assert [sample.number for sample in record.samples()] == list(range(1, 11))
        assert record.results() == [regulation(), hold()]
        assert record.board_runs() == [(0x1234ABCD, 2, True)]
        log = record.board_log()
        assert [entry.time_us for entry in log] == [BOOT_us + second * 1_000_000 for second in range(1, 6)]
        assert {(entry.test, entry.missed, entry.spacing_us) for entry in log} == {(2, 1, 1_000_000)}


def test_a_record_of_version_1_has_no_log_of_the_board(tmp_path: Path) -> None:
    with open_record(restored(1, tmp_path)) as record:
        assert (record.board_runs(), record.board_log()) == ([], [])
