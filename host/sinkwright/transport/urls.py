"""What a port URL means, and which channel serves it.

Decides how `--port` is read (a device path, any URL of pyserial's `serial_for_url`, `tcp:HOST:PORT`,
`board:NAME`, `sim:...`). It must not know what travels over the channel; finding a board by its name needs a
handshake, so `board:NAME` is resolved above, in `sinkwright.discovery`.
"""

from __future__ import annotations

import difflib
import math
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sinkwright.errors import LOAD_UNTOUCHED, LinkLost, SinkwrightError
from sinkwright.transport.channel import Channel


@dataclass(frozen=True)
class SerialUrl:
    """A device path or a URL that pyserial understands."""

    text: str


@dataclass(frozen=True)
class TcpUrl:
    """A plain TCP socket, as `simulate --listen tcp:PORT` serves it."""

    text: str
    host: str
    port: int


@dataclass(frozen=True)
class BoardUrl:
    """A board by the name that it carries."""

    text: str
    name: str


@dataclass(frozen=True)
class SimulatedUrl:
    """A simulated board; None is the demo source or the shipped board, infinite speed is `max`."""

    text: str
    source: Path | None = None
    board: Path | None = None
    store: Path | None = None
    speed: float = 1.0
    seed: int = 1


PortUrl = SerialUrl | TcpUrl | BoardUrl | SimulatedUrl


def parse_url(text: str) -> PortUrl:
    """The meaning of a port URL. Raises SinkwrightError for one that cannot mean anything."""
    if not text.strip():
        raise _bad(text, "an empty port URL names no board", "Leave --port out to use the only board found.")
    scheme, colon, rest = text.partition(":")
    if colon and scheme == "sim":
        return _parse_simulated(text, rest)
    if colon and scheme == "tcp":
        return _parse_tcp(text, rest)
    if colon and scheme == "socket" and "?" not in rest:
        # pyserial's own socket:// tells only whether a byte waits, so it would be read byte by byte.
        return _parse_tcp(text, rest.removeprefix("//").rstrip("/"))
    if colon and scheme == "board":
        if not rest:
            raise _bad(text, "board: needs the name of a board", "`sinkwright ports` lists the names.")
        return BoardUrl(text, rest)
    return SerialUrl(text)


def is_lock_step(url: str) -> bool:
    """Whether time advances only while somebody receives there: a simulated board at `speed=max`."""
    parsed = parse_url(url)
    return isinstance(parsed, SimulatedUrl) and parsed.speed == math.inf


def open_channel(url: str) -> Channel:
    """Open the way to a board. Raises LinkLost (nobody there, busy) and SinkwrightError (bad URL)."""
    parsed = parse_url(url)
    if isinstance(parsed, SimulatedUrl):
        from sinkwright.transport.simulated import open_simulated

        return open_simulated(parsed)
    if isinstance(parsed, TcpUrl):
        from sinkwright.transport.tcp import open_tcp

        return open_tcp(parsed.text, parsed.host, parsed.port)
    if isinstance(parsed, BoardUrl):
        raise LinkLost(
            f"the board named {parsed.name} has to be found first",
            where=url,
            load=LOAD_UNTOUCHED,
            remedy="Open it through Instrument.open or connect, which look for it.",
        )
    from sinkwright.transport.serial_port import open_serial

    return open_serial(parsed.text)


def _parse_tcp(text: str, rest: str) -> TcpUrl:
    host, _, port = rest.rpartition(":")
    if not port.isdigit() or not 0 < int(port) < 65536:
        raise _bad(text, "a TCP URL needs a host and a port number", "Write it as tcp:127.0.0.1:7411.")
    return TcpUrl(text, host.strip("[]") or "127.0.0.1", int(port))


def _parse_simulated(text: str, rest: str) -> SimulatedUrl:
    parts = rest.split(",")
    values: dict[str, Any] = {}
    if "=" not in parts[0]:
        first = parts.pop(0).strip()
        if first:
            values["source"] = Path(first).expanduser()
    for part in parts:
        key, equals, value = part.strip().partition("=")
        if not equals or not value or key not in _SIMULATED_OPTIONS:
            raise _unknown_option(text, key)
        if key in values:
            raise _bad(text, f"the option {key} stands there twice", "Give each option once.")
        try:
            values[key] = _SIMULATED_OPTIONS[key](value)
        except ValueError as error:
            raise _bad(
                text, f"{key}={value} is not usable: {error}", "Example: sim:,speed=max,seed=1."
            ) from None
    return SimulatedUrl(text, **values)


def _unknown_option(text: str, key: str) -> SinkwrightError:
    near = difflib.get_close_matches(key, _SIMULATED_OPTIONS, n=1)
    guess = f"Did you mean {near[0]}=? " if near else ""
    known = ", ".join(f"{name}=" for name in _SIMULATED_OPTIONS)
    return _bad(text, f"a simulated board has no option '{key}'", f"{guess}The options are {known}.")


def _speed(value: str) -> float:
    if value == "max":
        return math.inf
    speed = float(value)
    if not 0 < speed < math.inf:
        raise ValueError("a speed is `max` or a number above 0, where 1 is real time")
    return speed


def _seed(value: str) -> int:
    if not value.isdigit() or int(value) >= 1 << 32:
        raise ValueError("a seed is a whole number from 0 to 4294967295")
    return int(value)


def _path(value: str) -> Path:
    return Path(value).expanduser()


_SIMULATED_OPTIONS: dict[str, Callable[[str], Any]] = {
    "speed": _speed,
    "seed": _seed,
    "board": _path,
    "store": _path,
}


def _bad(text: str, what: str, remedy: str) -> SinkwrightError:
    return SinkwrightError(what, where=f"port {text!r}", load=LOAD_UNTOUCHED, remedy=remedy)
