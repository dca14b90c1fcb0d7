"""The generated files follow from the layouts, and stale ones are noticed."""

from __future__ import annotations

import re

import pytest

from sinkwright_wire import generate
from sinkwright_wire.mapping import struct_format
from sinkwright_wire.messages import MESSAGES
from sinkwright_wire.vocabulary import Fault, Refusal
from tests.support.micropython import run_micropython


def test_the_generated_files_are_up_to_date():
    assert generate.stale_files() == [], "run `python -m sinkwright_wire.generate`"


@pytest.fixture
def elsewhere(tmp_path, monkeypatch):
    """A repository with the two folders and nothing in them."""
    for folder in ("firmware", "protocol"):
        (tmp_path / folder).mkdir()
    monkeypatch.setattr(generate, "REPOSITORY", tmp_path)
    return tmp_path


def test_a_stale_file_is_named_and_then_written(elsewhere, capsys):
    assert generate.main([]) == 0
    assert generate.main(["--check"]) == 0
    stale = elsewhere / "firmware" / "wire.py"
    stale.write_text(stale.read_text(encoding="utf-8") + "EXTRA = 1\n", encoding="utf-8")
    capsys.readouterr()

    assert generate.main(["--check"]) == 1
    assert re.match(r"firmware.wire\.py is stale", capsys.readouterr().err)
    assert generate.main([]) == 0
    assert generate.main(["--check"]) == 0


def test_a_missing_file_is_stale(elsewhere):
    assert len(generate.stale_files()) == 2


def test_no_name_on_the_board_is_given_twice():
    names = re.findall(r"^([A-Z]\w*) = ", generate.render_wire(), re.MULTILINE)

    assert len(names) == len(set(names))


def test_the_board_reads_the_same_ids_sizes_and_codes():
    script = (
        "import struct, wire\n"
        "for name in dir(wire):\n"
        "    value = getattr(wire, name)\n"
        "    if name.isupper():\n"
        "        print(name, struct.calcsize(value) if name.endswith('_FORMAT') else value)\n"
    )

    board = {
        name: int(value) for name, value in (line.split() for line in run_micropython(script).splitlines())
    }

    assert board["VERSION"] == 1
    assert board["MAX_PAYLOAD"] == 112
    assert board["HEADER_SIZE"] == board["HEADER_FORMAT"] == 7
    assert board["TELEMETRY"] == 0x40
    assert board["HELLO_REPLY_FORMAT"] == 38
    assert board["LOG_ENTRIES_FORMAT"] + 4 * board["LOG_ENTRY_FORMAT"] == 112
    assert board["EVENT_BOOT"] == 1
    assert board["RESET_WATCHDOG"] == 2
    assert board["SILENCE_CONTINUE"] == 1
    assert board["LIMIT_SET_BOARD"] == 1
    assert {f"FAULT_{fault.name}": int(fault) for fault in Fault}.items() <= board.items()
    assert {f"REFUSAL_{refusal.name}": int(refusal) for refusal in Refusal}.items() <= board.items()


@pytest.mark.parametrize("message_id", sorted(MESSAGES))
def test_the_reference_shows_every_message_with_every_field(message_id):
    message = MESSAGES[message_id]
    section = (
        generate.render_reference().split(f"### {message_id:02X} {message.__name__}\n")[1].split("\n##")[0]
    )

    assert re.findall(r"`(\w+)`", section) == [field.name for field in message.LAYOUT.subcons]


def test_formats_have_no_padding():
    assert all(struct_format(message.LAYOUT).startswith("<") for message in MESSAGES.values())
