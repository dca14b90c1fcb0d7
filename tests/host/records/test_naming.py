from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sinkwright.errors import RecordError
from sinkwright.records import RecordWriter
from sinkwright.records.naming import default_folder, name_of, reserve_path, safe_label
from tests.host.records.made_up import header


def test_a_record_is_named_after_time_board_item_and_plan() -> None:
    assert name_of(header()) == "20260314T092653Z_perfboard-4A_bench-supply-no.-7_after-repair"


@pytest.mark.parametrize(
    ("label", "safe"),
    [
        ("../../etc/passwd", "etc-passwd"),
        ("C:\\x\\y", "C-x-y"),
        ("a\x00b\nc", "a-b-c"),
        (".hidden", "hidden"),
        ("cell_12", "cell-12"),
        ("Zelle Nr. 3 ä", "Zelle-Nr.-3-ä"),
        ("", "otherwise"),
        ("..", "otherwise"),
        ("///", "otherwise"),
    ],
)
def test_a_label_becomes_a_harmless_part_of_a_name(label: str, safe: str) -> None:
    assert safe_label(label, "otherwise") == safe


@given(item=st.text(), board=st.text(), plan=st.text())
def test_no_label_leads_out_of_the_folder_or_makes_a_name_too_long(item: str, board: str, plan: str) -> None:
    name = name_of(header(item=item, board={"name": board}, plan_name=plan))
    assert Path(name).name == name
    assert len(name.encode()) < 220
    assert not set(name) & set('/\\:*?"<>|\0')


def test_a_name_that_is_taken_gets_a_counter(tmp_path: Path) -> None:
    names = [reserve_path(tmp_path / "new", header()).stem for _ in range(3)]
    assert [name.removeprefix(names[0]) for name in names] == ["", "_2", "_3"]


def test_two_runs_in_the_same_second_keep_two_records(tmp_path: Path) -> None:
    with RecordWriter.create_in(tmp_path, header()) as one, RecordWriter.create_in(tmp_path, header()) as two:
        assert one.path != two.path


@pytest.mark.parametrize("folder", ["file", "file/below", "/proc/no-such-place"])
def test_a_folder_that_cannot_be_written_is_refused_in_words(folder: str, tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way")
    with pytest.raises(RecordError, match="Name a folder that can be written") as refused:
        RecordWriter.create_in(tmp_path / folder, header())
    assert "No load was touched" in str(refused.value)
    assert str(tmp_path / folder) in str(refused.value)


def test_without_a_home_folder_one_has_to_be_named(monkeypatch: pytest.MonkeyPatch) -> None:
    def homeless() -> Path:
        raise RuntimeError

    monkeypatch.setattr(Path, "home", homeless)
    with pytest.raises(RecordError, match="Name a folder"):
        default_folder()
