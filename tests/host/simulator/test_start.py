"""start.py as a process: the first line, the pipe, the ends; by MicroPython and by CPython."""

from __future__ import annotations

import json
import struct
import subprocess
import sys
from pathlib import Path

import pytest

from tests.support.micropython import micropython_command

from .board_side import BOARD_SIDE, check

START = str(BOARD_SIDE / "start.py")
INTERPRETERS = {
    "micropython": micropython_command(START),
    "cpython": [sys.executable, "-I", "-S", "-B", START],
}

ECHO = """
import gc
from micropython import const
_PERIOD = const(2350)

def run(board):
    gc.threshold(16384)
    print("awake")
    buffer = bytearray(16)
    word = bytearray(2)
    at = 0
    while True:
        at = board.clock.add(at, _PERIOD)
        board.clock.wait_until(at)
        board.bus.writeto_mem(0x48, 1, b"\\xd3\\xe3")
        count = board.stream.read_into(buffer)
        if count:
            board.bus.readfrom_mem_into(0x48, 0, word)
            board.stream.write(memoryview(buffer)[:count])
            board.stream.write(word)
        if buffer[0] == 33:
            raise ValueError("told to fail")
"""


@pytest.fixture(scope="module")
def setup() -> dict[str, object]:
    printed = check("""
import json
from nominal_board import IMAGE
base = plant()
base["adc"]["noise_counts"] = 20.0
print(json.dumps({"image": IMAGE, "plant": base, "seed": 5, "board_id": "0011223344556677",
                  "source": {"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1}}))
""")
    return json.loads(printed)


def converse(
    command: list[str], first_line: bytes, requests: list[tuple[int, bytes]]
) -> tuple[list[tuple[int, bytes]], int, str]:
    """Everything is written at once and the input closed; the answers, the exit code, the complaints."""
    data = first_line + b"".join(struct.pack("<IH", us, len(sent)) + sent for us, sent in requests)
    finished = subprocess.run(command, input=data, capture_output=True, check=False, timeout=60)
    answers, rest = [], finished.stdout
    while rest:
        time_us, count = struct.unpack_from("<QH", rest)
        answers.append((time_us, rest[10 : 10 + count]))
        rest = rest[10 + count :]
    return answers, finished.returncode, finished.stderr.decode()


@pytest.mark.parametrize("interpreter", INTERPRETERS)
def test_a_board_answers_every_grant_and_leaves_when_its_host_does(
    interpreter: str, setup: dict[str, object], tmp_path: Path
) -> None:
    (tmp_path / "main.py").write_text(ECHO)
    line = json.dumps({**setup, "firmware": str(tmp_path)}).encode() + b"\n"
    requests = [(100_000, b""), (100_000, b""), (100_000, b"hello"), (50_000, b"")]
    answers, code, complaints = converse(INTERPRETERS[interpreter], line, requests)
    assert code == 0, complaints
    assert answers[0] == (0, b"awake\n")
    assert answers[1][1] == b"" and 100_000 <= answers[1][0] < 101_000
    assert answers[2][1][:5] == b"hello"


def test_the_same_seed_gives_the_same_bytes_whichever_interpreter_runs(
    setup: dict[str, object], tmp_path: Path
) -> None:
    (tmp_path / "main.py").write_text(ECHO)
    requests = [(100_000, b"?")] * 20
    seen = {}
    for seed in (5, 6):
        line = json.dumps({**setup, "seed": seed, "firmware": str(tmp_path)}).encode() + b"\n"
        runs = [
            converse(command, line, requests) for command in (*INTERPRETERS.values(), *INTERPRETERS.values())
        ]
        assert all(run == runs[0] for run in runs)
        seen[seed] = runs[0][0]
    assert seen[5] != seen[6]


@pytest.mark.parametrize("interpreter", INTERPRETERS)
def test_an_exception_that_leaves_the_firmware_is_told_on_the_standard_error(
    interpreter: str, setup: dict[str, object], tmp_path: Path
) -> None:
    (tmp_path / "main.py").write_text(ECHO)
    line = json.dumps({**setup, "firmware": str(tmp_path)}).encode() + b"\n"
    _, code, complaints = converse(INTERPRETERS[interpreter], line, [(100_000, b"!"), (100_000, b"")] * 3)
    assert code == 1
    assert "told to fail" in complaints and "main.py" in complaints


@pytest.mark.parametrize("interpreter", INTERPRETERS)
@pytest.mark.parametrize("line", [b"\n", b"{}\n", b"rubbish\n", b"[]\n", b'{"image": 1}\n'])
def test_a_first_line_that_is_no_good_is_told_in_one(interpreter: str, line: bytes) -> None:
    answers, code, complaints = converse(INTERPRETERS[interpreter], line, [])
    assert code == 3 and not answers
    assert complaints.startswith("simulated board: ") and complaints.count("\n") == 1
