"""The worked example of DEVELOPERS.md, carried out: one file, one line, and the load sinks through the new part."""

from __future__ import annotations

import json
import re
import shutil
from pathlib import Path

import pytest

from sinkwright.board_image import compile_board
from sinkwright.definitions import parts
from sinkwright.definitions.loading import load_board
from sinkwright.errors import FileError
from sinkwright.templates import template
from tests.support.micropython import FIRMWARE, run_micropython

ROOT = Path(__file__).resolve().parents[2]
STAND_IN = ROOT / "tests" / "firmware" / "stand_in"
SECTION = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8").partition("## Adding a chip")[2]
ADDRESS = 0x4C

SINK = """
import json, struct
import stand_in_board
stand_in_board.DAC = {address}
session = stand_in_board.Session(**json.loads({image!r}))
session.sink(1_000_000)
control = session.firmware.control
dac = session.firmware.dac
import selftest
print(json.dumps([type(dac).__name__, session.board.bus.code, session.firmware.guard.fault,
                  selftest.check_dac(dac, session.board.clock)]))
"""


def block(language: str) -> str:
    found = re.search(rf"```{language}\n(.*?)```", SECTION, flags=re.DOTALL)
    assert found, language
    return found[1]


@pytest.fixture
def firmware(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A copy of the firmware's folder, taken for the shipped one."""
    copy = Path(
        shutil.copytree(FIRMWARE, tmp_path / "firmware", ignore=shutil.ignore_patterns("__pycache__"))
    )
    monkeypatch.setattr(parts, "find_firmware", lambda: copy)
    return copy


def board_file(folder: Path) -> Path:
    """The shipped board with the page's one line in place of the DAC's, and the new part's address."""
    text, changed = re.subn(r'^part = "MCP4725".*\n', block("toml"), template("board"), flags=re.MULTILINE)
    assert changed == 1
    path = folder / "board.toml"
    path.write_text(text.replace("address = 0x60", f"address = {ADDRESS:#x}"), encoding="utf-8")
    return path


def test_without_its_file_the_part_is_refused_by_name(firmware: Path, tmp_path: Path) -> None:
    with pytest.raises(FileError, match='no driver for "DAC7571"'):
        load_board(board_file(tmp_path))


def test_with_its_file_and_one_line_the_load_sinks_through_the_new_part(
    firmware: Path, tmp_path: Path
) -> None:
    (firmware / "chips" / "dac_dac7571.py").write_text(block("python"), encoding="utf-8")
    image = compile_board(load_board(board_file(tmp_path)))
    script = SINK.format(address=ADDRESS, image=json.dumps({"dac": image["dac"]}))
    printed = run_micropython(script, extra_path=[STAND_IN, firmware])
    part, code, fault, wrong = json.loads(printed.splitlines()[-1])
    assert part == "DAC7571"
    # 0.1 V pedestal and 0.625 V/A of 3.3 V in 4096 codes.
    assert code == round((0.1 + 0.625) / 3.3 * 4096)
    assert (fault, wrong) == (0, "")
