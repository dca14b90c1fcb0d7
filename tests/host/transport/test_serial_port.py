"""Serial ports, tried on pseudo-terminals: what is said when one is missing, held, forbidden or unplugged."""

from __future__ import annotations

import asyncio
import errno
import os
import sys
import time
from collections.abc import Iterator

import pytest
import serial

from sinkwright.errors import LinkLost, SinkwrightError
from sinkwright.transport import open_channel
from sinkwright.transport.serial_port import open_serial

if sys.platform == "win32":
    pytest.skip("pseudo-terminals are a POSIX thing", allow_module_level=True)

import tty


@pytest.fixture
def terminal() -> Iterator[tuple[int, str]]:
    """The far end's descriptor, and the path of the near end."""
    master, slave = os.openpty()
    tty.setraw(slave)
    path = os.ttyname(slave)
    os.close(slave)
    yield master, path
    try:
        os.close(master)
    except OSError as error:
        assert error.errno == errno.EBADF  # a test closed it, to unplug


def test_bytes_go_both_ways(terminal: tuple[int, str]) -> None:
    master, path = terminal
    channel = open_channel(path)
    channel.send(b"to the board")
    assert os.read(master, 100) == b"to the board"
    os.write(master, b"from the board")
    assert asyncio.run(channel.receive(2)) == b"from the board"
    channel.close()


def test_a_waiting_byte_is_not_held_up_by_the_read_time_out(terminal: tuple[int, str]) -> None:
    master, path = terminal
    channel = open_serial(path)
    taken_s = []
    for _ in range(5):
        time.sleep(0.02)
        began_s = time.monotonic()
        os.write(master, b"0123456789")
        assert asyncio.run(channel.receive(2))
        taken_s.append(time.monotonic() - began_s)
    assert min(taken_s) < 0.05
    channel.close()


def test_unplugging_while_somebody_waits_is_a_lost_link(terminal: tuple[int, str]) -> None:
    master, path = terminal
    channel = open_serial(path)
    os.close(master)

    async def scenario() -> None:
        for _ in range(50):
            await channel.receive(0.1)

    with pytest.raises(LinkLost, match="the connection to the board broke"):
        asyncio.run(scenario())
    with pytest.raises(LinkLost):
        channel.send(b"x")
    channel.close()


def test_a_port_that_another_program_holds_is_named_as_held(terminal: tuple[int, str]) -> None:
    _, path = terminal
    channel = open_serial(path)
    with pytest.raises(LinkLost) as caught:
        open_serial(path)
    assert f"{path}: another program holds this port." in str(caught.value)
    assert "No load was touched." in str(caught.value)
    channel.close()


def test_a_missing_port_is_named_as_missing() -> None:
    with pytest.raises(LinkLost, match=r"there is no such port.*sinkwright ports"):
        open_channel("/dev/no-such-port")


def test_a_forbidden_port_names_the_group_that_may_open_it(monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*args: object, **options: object) -> None:
        raise serial.SerialException(errno.EACCES, "Permission denied")

    monkeypatch.setattr(serial, "serial_for_url", refuse)
    with pytest.raises(LinkLost, match=r"may not open this port.*dialout"):
        open_serial("/dev/ttyACM0")


def test_a_url_that_pyserial_does_not_know_is_no_port() -> None:
    with pytest.raises(SinkwrightError, match="this is no port"):
        open_channel("carrier-pigeon://loft")
