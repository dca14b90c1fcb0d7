"""What a simulated board remembers: counted, whole, and its own."""

from __future__ import annotations

import pytest

from sinkwright.errors import FileError
from sinkwright.simulator.memory import FORMAT, take_out

_OTHER = b'{"format": "other", "seed": 3, "starts": 1, "slots": ["", ""]}'
_NO_OCTETS = b'{"format": "%s", "seed": 3, "starts": 1, "slots": ["0g", ""]}' % FORMAT.encode()


def test_every_start_is_counted(tmp_path):
    assert [take_out(tmp_path / "board.json", 3).starts for _ in range(3)] == [1, 2, 3]


def test_nothing_but_the_memory_is_left_behind(tmp_path):
    take_out(tmp_path / "board.json", 3)
    take_out(tmp_path / "board.json", 3)
    assert [path.name for path in tmp_path.iterdir()] == ["board.json"]


def test_another_boards_memory_is_refused_with_the_seed_it_belongs_to(tmp_path):
    take_out(tmp_path / "board.json", 3)
    with pytest.raises(FileError, match=r"seed 3, whose parts differ from those of seed 4.*Use seed=3"):
        take_out(tmp_path / "board.json", 4)


@pytest.mark.parametrize("content", [b"", b"\xff\x00", b"[]", _OTHER, _NO_OCTETS])
def test_a_file_that_is_no_memory_is_refused_and_left_alone(tmp_path, content):
    path = tmp_path / "board.json"
    path.write_bytes(content)
    with pytest.raises(FileError, match="is not the memory of a simulated board"):
        take_out(path, 3)
    assert path.read_bytes() == content


def test_a_folder_that_is_missing_is_told(tmp_path):
    with pytest.raises(FileError, match="cannot be written: No such file or directory"):
        take_out(tmp_path / "missing" / "board.json", 3)


def test_a_folder_in_its_place_is_told(tmp_path):
    with pytest.raises(FileError, match="cannot be read: Is a directory"):
        take_out(tmp_path, 3)
