"""Finding boards: only what USB identifies is opened, and never a simulated board."""

from __future__ import annotations

import asyncio
import json
from typing import Any

import pytest
from click.testing import CliRunner

from sinkwright import discovery
from sinkwright.cli.ports import ports
from sinkwright.discovery import SerialDevice, find_boards, resolve, survey
from sinkwright.errors import LinkLost, SinkwrightError
from tests.support.fake_board import FakeBoard
from tests.support.fake_channels import LockStepFake

PICO = (0x2E8A, 0x0005)
STRANGER = SerialDevice("/dev/ttyUSB0", "somebody's plotter", 0x1A86, 0x7523)
UNKNOWN = SerialDevice("/dev/ttyS0")


def _pico(device: str) -> SerialDevice:
    return SerialDevice(device, "Board in FS mode", *PICO, serial_number="e6614c311b7e6a35")


@pytest.fixture
def plugged(monkeypatch: pytest.MonkeyPatch) -> dict[str, Any]:
    """What answers on each device; a test fills it. `opened` lists what was opened."""
    answers: dict[str, Any] = {}
    opened: list[str] = []

    def open_channel(url: str) -> LockStepFake:
        opened.append(url)
        answer = answers[url]
        if isinstance(answer, Exception):
            raise answer
        return LockStepFake(answer)

    monkeypatch.setattr(discovery, "open_channel", open_channel)
    answers["opened"] = opened
    return answers


def test_only_known_usb_identities_are_opened(plugged: dict[str, Any]) -> None:
    plugged["/dev/ttyACM0"] = FakeBoard(name="bench-1")
    findings = asyncio.run(survey([STRANGER, UNKNOWN, _pico("/dev/ttyACM0")]))
    assert plugged["opened"] == ["/dev/ttyACM0"]
    assert [finding.opened for finding in findings] == [False, False, True]
    assert findings[0].note == "not opened: not known as a board, and opening could reset it"
    assert findings[2].board is not None
    assert findings[2].board.name == "bench-1"


def test_a_greeting_takes_no_control(plugged: dict[str, Any]) -> None:
    board = FakeBoard()
    board.controller = 77
    plugged["/dev/ttyACM0"] = board
    asyncio.run(find_boards([_pico("/dev/ttyACM0")]))
    assert board.controller == 77


def test_a_known_device_without_our_firmware_is_told_as_such(plugged: dict[str, Any]) -> None:
    plugged["/dev/ttyACM0"] = lambda data: b"\r\n>>> "
    (finding,) = asyncio.run(survey([_pico("/dev/ttyACM0")]))
    assert finding.board is None
    assert "a MicroPython prompt" in finding.note


def test_a_held_port_is_told_as_held(plugged: dict[str, Any]) -> None:
    plugged["/dev/ttyACM0"] = LinkLost("another program holds this port")
    (finding,) = asyncio.run(survey([_pico("/dev/ttyACM0")]))
    assert finding.note == "another program holds this port"


def test_without_a_url_the_only_board_is_used(plugged: dict[str, Any]) -> None:
    plugged["/dev/ttyACM0"] = FakeBoard()
    assert asyncio.run(resolve(None, [STRANGER, _pico("/dev/ttyACM0")])) == "/dev/ttyACM0"


def test_without_a_url_and_without_a_board_the_simulated_one_is_offered_but_not_used() -> None:
    with pytest.raises(LinkLost, match=r"no board was found.*--port sim:"):
        asyncio.run(resolve(None, [STRANGER]))


def test_without_a_url_several_boards_are_an_error_that_names_them(plugged: dict[str, Any]) -> None:
    plugged["/dev/ttyACM0"], plugged["/dev/ttyACM1"] = FakeBoard(name="bench-1"), FakeBoard(name="bench-2")
    with pytest.raises(
        LinkLost, match=r"2 boards were found: bench-1 on /dev/ttyACM0, bench-2 on /dev/ttyACM1"
    ):
        asyncio.run(resolve(None, [_pico("/dev/ttyACM0"), _pico("/dev/ttyACM1")]))


def test_a_board_is_found_by_its_name(plugged: dict[str, Any]) -> None:
    plugged["/dev/ttyACM0"], plugged["/dev/ttyACM1"] = FakeBoard(name="bench-1"), FakeBoard(name="bench-2")
    devices = [_pico("/dev/ttyACM0"), _pico("/dev/ttyACM1")]
    assert asyncio.run(resolve("board:bench-2", devices)) == "/dev/ttyACM1"
    with pytest.raises(LinkLost, match="no board is named bench-3; found: bench-1 on"):
        asyncio.run(resolve("board:bench-3", devices))


def test_two_boards_of_one_name_have_to_be_told_apart_by_port(plugged: dict[str, Any]) -> None:
    plugged["/dev/ttyACM0"], plugged["/dev/ttyACM1"] = FakeBoard(name="twin"), FakeBoard(name="twin")
    with pytest.raises(LinkLost, match="2 boards are named twin"):
        asyncio.run(resolve("board:twin", [_pico("/dev/ttyACM0"), _pico("/dev/ttyACM1")]))


def test_any_other_url_is_left_as_it_is() -> None:
    assert asyncio.run(resolve("sim:,speed=max", [])) == "sim:,speed=max"


def test_a_bad_url_is_refused_here_too() -> None:
    with pytest.raises(SinkwrightError):
        asyncio.run(resolve("sim:,sped=1", []))


def test_ports_lists_boards_and_what_was_left_alone(
    plugged: dict[str, Any], monkeypatch: pytest.MonkeyPatch
) -> None:
    plugged["/dev/ttyACM0"] = FakeBoard(name="bench-1")
    monkeypatch.setattr(discovery, "list_serial_devices", lambda: [STRANGER, _pico("/dev/ttyACM0")])
    told = CliRunner().invoke(ports, [])
    assert told.exit_code == 0
    assert "/dev/ttyUSB0 [1A86:7523]  not opened" in told.output
    assert "bench-1, board 0102030405060708, firmware 0.1.0; use --port board:bench-1" in told.output


def test_ports_as_json_is_one_object(plugged: dict[str, Any], monkeypatch: pytest.MonkeyPatch) -> None:
    plugged["/dev/ttyACM0"] = FakeBoard(name="bench-1")
    monkeypatch.setattr(discovery, "list_serial_devices", lambda: [_pico("/dev/ttyACM0"), STRANGER])
    told = json.loads(CliRunner().invoke(ports, ["--json"]).output)
    assert [port["opened"] for port in told["ports"]] == [True, False]
    assert told["ports"][0]["board"] == {
        "name": "bench-1",
        "board_id": "0102030405060708",
        "firmware_version": "0.1.0",
        "simulated": False,
    }


def test_ports_without_a_board_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(discovery, "list_serial_devices", lambda: [])
    assert "No board was found" in CliRunner().invoke(ports, []).output
