"""The firmware is found in a wheel and in a checkout, and only its own files are deployed."""

from __future__ import annotations

from pathlib import Path

import pytest

from sinkwright.errors import SinkwrightError
from sinkwright.firmware_files import deployed_files, find_firmware


def make_firmware(folder: Path) -> Path:
    (folder / "chips").mkdir(parents=True)
    (folder / "main.py").write_text("")
    (folder / "chips" / "dac.py").write_text("")
    return folder


def make_package(root: Path) -> Path:
    package = root / "host" / "sinkwright"
    package.mkdir(parents=True)
    return package


def test_package_data_comes_before_the_checkout(tmp_path):
    package = make_package(tmp_path)
    make_firmware(tmp_path / "firmware")
    carried = make_firmware(package / "_firmware")
    assert find_firmware(package) == carried


def test_a_checkout_serves_where_no_package_data_is(tmp_path):
    package = make_package(tmp_path)
    beside = make_firmware(tmp_path / "firmware")
    assert find_firmware(package) == beside


def test_a_missing_firmware_is_told_with_both_places_and_a_remedy(tmp_path):
    with pytest.raises(SinkwrightError) as caught:
        find_firmware(make_package(tmp_path))
    message = str(caught.value)
    assert "_firmware" in message
    assert str(tmp_path / "firmware") in message
    assert "Install sinkwright again" in message


def test_byte_code_and_hidden_files_are_never_deployed(tmp_path):
    firmware = make_firmware(tmp_path / "firmware")
    for left_behind in ("__pycache__/main.cpython-311.pyc", "chips/__pycache__/dac.pyc", ".notes"):
        path = firmware / left_behind
        path.parent.mkdir(exist_ok=True)
        path.write_bytes(b"")
    assert deployed_files(firmware) == (Path("chips/dac.py"), Path("main.py"))


def test_the_firmware_of_this_checkout_is_found_and_is_source_only():
    firmware = find_firmware()
    files = deployed_files(firmware)
    assert Path("main.py") in files
    assert Path("board.py") in files
    assert {path.suffix for path in files} == {".py"}
