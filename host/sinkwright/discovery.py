"""Which boards are connected: by USB identity first, then by a greeting; nothing unidentified is ever opened.

Opening a port resets many other devices (a serial line that drives a reset pin), so only ports whose USB
vendor and product are those of a microcontroller that can be our board are greeted, and only as a watcher.
Simulated boards are never found: they are asked for by name.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from sinkwright.errors import LinkLost, SinkwrightError
from sinkwright.link import Link
from sinkwright.transport.urls import BoardUrl, open_channel, parse_url
from sinkwright_wire.messages import HelloReply

#: USB vendor and product of the microcontrollers that may be a board of ours. MicroPython gives all of its
#: RP2 ports one identity (vendor 0x2E8A, product 0x0005: from memory), so the greeting has to tell them
#: apart.
KNOWN_BOARDS = {(0x2E8A, 0x0005): "RP2040 under MicroPython"}

_GREETING_TRIES = 2


@dataclass(frozen=True)
class SerialDevice:
    """A serial port of this machine, as its USB descriptors describe it; nothing was opened."""

    device: str
    description: str = ""
    vendor: int | None = None
    product: int | None = None
    serial_number: str = ""

    @property
    def known(self) -> bool:
        """Whether it may be a board of ours, so that it may be opened."""
        return (self.vendor, self.product) in KNOWN_BOARDS

    @property
    def usb(self) -> str:
        """Vendor and product as they are usually written ("2E8A:0005"), or ""."""
        if self.vendor is None or self.product is None:
            return ""
        return f"{self.vendor:04X}:{self.product:04X}"


@dataclass(frozen=True)
class Finding:
    """One serial port and who answered there. `note` says why nobody did."""

    device: SerialDevice
    board: HelloReply | None = None
    note: str = ""

    @property
    def opened(self) -> bool:
        return self.device.known

    def to_json(self) -> dict[str, Any]:
        return {
            "port": self.device.device,
            "usb": self.device.usb,
            "serial_number": self.device.serial_number,
            "description": self.device.description,
            "opened": self.opened,
            "board": _board_json(self.board) if self.board else None,
            "note": self.note,
        }


def list_serial_devices() -> list[SerialDevice]:
    """Every serial port of this machine, without opening one."""
    from serial.tools import list_ports

    return [
        SerialDevice(
            port.device,
            "" if port.description in (None, "n/a") else port.description,
            port.vid,
            port.pid,
            port.serial_number or "",
        )
        for port in sorted(list_ports.comports())
    ]


async def survey(devices: Iterable[SerialDevice] | None = None) -> list[Finding]:
    """Greet every port that may be a board of ours; list the others unopened."""
    found = list_serial_devices() if devices is None else devices
    return [await _greet(device) for device in found]


async def find_boards(devices: Iterable[SerialDevice] | None = None) -> list[Finding]:
    """The ports where a board of ours answered."""
    return [finding for finding in await survey(devices) if finding.board is not None]


async def resolve(url: str | None, devices: Iterable[SerialDevice] | None = None) -> str:
    """The URL to open: `url` itself, where `board:NAME` was found, or for None the only board found.

    Raises SinkwrightError when none or several answer to that.
    """
    if url is None:
        return _only(await survey(devices))
    parsed = parse_url(url)
    if isinstance(parsed, BoardUrl):
        return _named(parsed, await survey(devices))
    return url


async def _greet(device: SerialDevice) -> Finding:
    if not device.known:
        return Finding(device, note="not opened: not known as a board, and opening could reset it")
    try:
        link = Link(open_channel(device.device))
    except SinkwrightError as error:
        return Finding(device, note=error.what)
    try:
        return Finding(device, await link.open(watch=True, tries=_GREETING_TRIES))
    except SinkwrightError as error:
        return Finding(device, note=error.what)
    finally:
        link.close()


def _only(findings: list[Finding]) -> str:
    boards = [finding for finding in findings if finding.board]
    if len(boards) == 1:
        return boards[0].device.device
    if not boards:
        tried = "".join(
            f" {finding.device.device}: {finding.note}." for finding in findings if finding.opened
        )
        raise LinkLost(
            f"no board was found.{tried}" if tried else "no board was found",
            remedy="Connect one, name its port with --port, or use a simulated board with --port sim:.",
        )
    raise LinkLost(
        f"{len(boards)} boards were found: {_names(boards)}",
        remedy="Say which with --port board:NAME.",
    )


def _named(url: BoardUrl, findings: list[Finding]) -> str:
    boards = [finding for finding in findings if finding.board]
    matches = [finding for finding in boards if finding.board and finding.board.name == url.name]
    if len(matches) == 1:
        return matches[0].device.device
    if matches:
        ports = ", ".join(finding.device.device for finding in matches)
        raise LinkLost(
            f"{len(matches)} boards are named {url.name}", remedy=f"Say which by its port: {ports}."
        )
    others = f"; found: {_names(boards)}" if boards else "; no board was found at all"
    raise LinkLost(
        f"no board is named {url.name}{others}", remedy="List what is there with `sinkwright ports`."
    )


def _names(boards: list[Finding]) -> str:
    return ", ".join(
        f"{finding.board.name} on {finding.device.device}" for finding in boards if finding.board
    )


def _board_json(board: HelloReply) -> dict[str, Any]:
    return {
        "name": board.name,
        "board_id": board.board_id.hex(),
        "firmware_version": f"{board.firmware_major}.{board.firmware_minor}.{board.firmware_patch}",
        "simulated": bool(board.simulated),
    }
