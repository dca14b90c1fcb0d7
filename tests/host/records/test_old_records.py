from __future__ import annotations

from pathlib import Path

from sinkwright.records import open_record
from sinkwright.records.schema import SCHEMA_VERSION
from tests.host.records.made_up import hold, regulation
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
