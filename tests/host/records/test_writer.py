from __future__ import annotations

import os
import signal
import sqlite3
import subprocess
import sys
import time
from pathlib import Path
from types import SimpleNamespace

import pytest

from sinkwright.errors import RecordError
from sinkwright.records import RecordWriter, open_record
from sinkwright.results import RunResult
from sinkwright.sample import FIELD_NAMES
from tests.host.records.made_up import BOOT_us, header, hold, regulation, samples, write_run

ROOT = Path(__file__).parents[3]


def test_what_was_written_is_read_back_as_it_was(tmp_path: Path) -> None:
    frames = list(samples([0.0, 1.0, 2.0]))
    result = RunResult("after-repair", "here", True, (regulation(), hold()))
    with RecordWriter.create(tmp_path / "r.sqlite", header()) as writer:
        writer.add_samples(frames)
        writer.add_event(BOOT_us + 1_500_000, "doing", "The load sinks 1 A.", {"current_A": 1.0})
        writer.add_result(regulation())
        writer.add_result(hold())
        writer.finish("complete", result)
    with open_record(tmp_path / "r.sqlite") as record:
        assert list(record.samples()) == frames
        assert record.header == header()
        assert record.results() == [regulation(), hold()]
        assert record.run_result() == result
        (event,) = record.events()
        assert (event.kind, event.data) == ("doing", {"current_A": 1.0})
        assert event.utc == "2026-03-14T09:26:54.500000Z"
        assert record.ended_utc == "2026-03-14T09:26:53.200000Z"


def test_anything_with_the_fields_of_telemetry_is_a_sample(tmp_path: Path) -> None:
    telemetry = SimpleNamespace(**dict.fromkeys(FIELD_NAMES, 7))
    with RecordWriter.create(tmp_path / "r.sqlite", header()) as writer:
        writer.add_samples([telemetry])
    with open_record(tmp_path / "r.sqlite") as record:
        assert next(record.samples()).voltage_uV == 7


def test_samples_belong_to_the_test_that_is_not_concluded_yet(tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite")
    with open_record(path) as record:
        tests = [test for _, test, *_ in record.sample_rows()]
    assert (tests.count(1), tests.count(2)) == (100, 600)


def test_a_gap_in_the_numbers_stays_visible(tmp_path: Path) -> None:
    with RecordWriter.create(tmp_path / "r.sqlite", header()) as writer:
        writer.add_samples(list(samples([1.0, 1.0])))
        writer.add_samples(list(samples([1.0], first=10)))
    with open_record(tmp_path / "r.sqlite") as record:
        assert [sample.number for sample in record.samples()] == [1, 2, 10]
        extremes = record.extremes()
    assert extremes is not None
    assert extremes.missing == 7


def test_without_an_anchor_the_first_sample_ties_the_clocks_together(tmp_path: Path) -> None:
    with RecordWriter.create(tmp_path / "r.sqlite", header(anchor=None)) as writer:
        writer.add_event(0, "doing", "Before any reading.")
        writer.add_samples(list(samples([1.0])))
    with open_record(tmp_path / "r.sqlite") as record:
        utc = record.utc_of(BOOT_us)
    assert utc is not None
    assert abs(utc.timestamp() - time.time()) < 60


def test_a_finished_record_is_a_single_file(tmp_path: Path) -> None:
    write_run(tmp_path / "r.sqlite")
    assert [path.name for path in tmp_path.iterdir()] == ["r.sqlite"]


def test_a_finished_record_can_be_read_by_plain_sqlite(tmp_path: Path) -> None:
    write_run(tmp_path / "r.sqlite")
    connection = sqlite3.connect(tmp_path / "r.sqlite")
    assert connection.execute("SELECT count(*) FROM sample").fetchone() == (700,)
    assert connection.execute("SELECT value FROM run WHERE key = 'state'").fetchone() == ("complete",)
    assert connection.execute("PRAGMA integrity_check").fetchone() == ("ok",)
    connection.close()


def test_another_process_reads_while_it_is_written_and_the_end_is_not_held_up(tmp_path: Path) -> None:
    writer = RecordWriter.create(tmp_path / "r.sqlite", header())
    writer.add_samples(list(samples([1.0] * 50)))
    writer.commit()
    script = (
        "import sys, sinkwright.records as r; print(sum(1 for _ in r.open_record(sys.argv[1]).samples()))"
    )
    told = subprocess.run(
        [sys.executable, "-c", script, str(writer.path)],
        capture_output=True,
        text=True,
        check=True,
        env=_env(),
    )
    assert told.stdout == "50\n"
    with open_record(writer.path) as reader:
        started_s = time.monotonic()
        writer.finish("complete")
        assert time.monotonic() - started_s < 2
        assert reader.sample_count == 50


def test_nothing_is_written_over(tmp_path: Path) -> None:
    path = write_run(tmp_path / "r.sqlite")
    with pytest.raises(RecordError, match="never written over"):
        RecordWriter.create(path, header())


def test_a_state_must_be_one_of_the_documented(tmp_path: Path) -> None:
    with (
        RecordWriter.create(tmp_path / "r.sqlite", header()) as writer,
        pytest.raises(ValueError, match="no state"),
    ):
        writer.finish("splendid")


def test_samples_are_committed_with_the_first_that_comes_half_a_second_later(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    now_s = [100.0]
    monkeypatch.setattr(time, "monotonic", lambda: now_s[0])
    with RecordWriter.create(tmp_path / "r.sqlite", header()) as writer:
        first, second, third = samples([1.0, 1.0, 1.0])
        writer.add_samples([first])
        writer.add_samples([second])
        waiting = writer.committed
        now_s[0] += 0.5
        writer.add_samples([third])
        assert (waiting, writer.committed) == (0, 3)


_WRITE_FOR_EVER = """
import itertools, sys
from pathlib import Path
from sinkwright.records import RecordWriter
from tests.host.records.made_up import header, samples
writer = RecordWriter.create(Path(sys.argv[1]), header())
frame = list(samples([1.0]))
for _ in itertools.count():
    before = writer.committed
    writer.add_samples(frame * 7)
    if writer.committed != before:
        print(writer.committed, flush=True)
"""


@pytest.mark.parametrize("commits", [1, 2, 5, 12, 30])
def test_after_kill_9_every_committed_sample_is_there(commits: int, tmp_path: Path) -> None:
    path = tmp_path / "r.sqlite"
    child = subprocess.Popen(
        [sys.executable, "-c", _WRITE_FOR_EVER, str(path)], stdout=subprocess.PIPE, text=True, env=_env()
    )
    assert child.stdout is not None
    for _ in range(commits):
        acknowledged = int(child.stdout.readline())
    child.send_signal(signal.SIGKILL)
    rest = [int(line) for line in child.stdout.read().splitlines() if line]
    child.wait()
    child.stdout.close()
    acknowledged = max([acknowledged, *rest])
    with open_record(path) as record:
        assert sum(1 for _ in record.samples()) >= acknowledged
        assert "not finished" in record.unfinished


def test_a_full_disk_is_told_once_and_the_record_still_opens(tmp_path: Path) -> None:
    writer = RecordWriter.create(tmp_path / "r.sqlite", header())
    writer._connection.execute("PRAGMA max_page_count = 30")
    with pytest.raises(RecordError, match="the disk is full") as full:
        for frame in samples([1.0] * 5000):
            writer.add_samples([frame])
    assert "turns its load off" in str(full.value)
    writer.add_event(0, "doing", "The load is off.")
    writer.add_samples(list(samples([0.0])))
    writer.finish("failed")
    with open_record(tmp_path / "r.sqlite") as record:
        assert sum(1 for _ in record.samples()) == writer.committed
        assert record.state == "failed"


def _env() -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": os.pathsep.join([str(ROOT), *sys.path])}
