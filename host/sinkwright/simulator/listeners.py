"""Where other programs reach a served board: a pseudo-terminal, or a TCP port.

Decides how clients come, go and fall behind. A client that does not read never holds anything up: the
board's bytes leave as far as there is room, and what finds no room is dropped a whole chunk at a time, so
that frames stay whole. Several clients share a board as they would share a serial line: each sees all that
it says. Must not know the board, its time or frames.
"""

from __future__ import annotations

import contextlib
import ipaddress
import os
import selectors
import socket
import time
from abc import ABC, abstractmethod
from typing import Protocol

from sinkwright.errors import SinkwrightError

_READ_BYTES = 4096
_SEND_BYTES = 16384
_LOOPBACK = "127.0.0.1"


class Line(Protocol):
    """A non-blocking way to one client: b"" from `receive` says that it has gone."""

    def fileno(self) -> int: ...

    def receive(self, count: int) -> bytes: ...

    def send(self, data: bytes) -> int: ...

    def close(self) -> None: ...


class Client:
    """One line, with the rest of a chunk that found no room."""

    def __init__(self, line: Line) -> None:
        self.line = line
        self.unsent = b""
        self.stuck_since_s = 0.0

    def offer(self, chunk: bytes) -> None:
        """Send `chunk` as far as there is room, or drop it whole while an older one still waits."""
        if not self.unsent:
            self.unsent = chunk
            self.stuck_since_s = time.monotonic()
            self.flush()

    def flush(self) -> None:
        try:
            sent = self.line.send(self.unsent)
        except BlockingIOError:
            return
        if sent:
            self.stuck_since_s = time.monotonic()
            self.unsent = self.unsent[sent:]


class Listener(ABC):
    """What a server needs: a URL to give away, bytes in, bytes out. `note` warns about who may connect."""

    url: str
    note: str = ""

    def __init__(self) -> None:
        self._selector = selectors.DefaultSelector()
        self._clients: dict[int, Client] = {}

    def receive(self, timeout_s: float | None) -> bytes:
        """Wait for anything to happen, at most `timeout_s`; bytes that came, perhaps none."""
        arrived = b""
        for key, events in self._selector.select(timeout_s):
            client = self._clients.get(key.fd)
            if client is None:
                self._admit()
            else:
                arrived += self._serve(client, events)
        return arrived

    def send(self, chunk: bytes) -> None:
        """Offer a chunk of whole frames to every client; never waits."""
        for client in tuple(self._clients.values()):
            with self._gone_closes(client):
                client.offer(chunk)
                self._watch(client)

    def stuck_for_s(self) -> float:
        """How long the slowest client has left bytes unread that the board has already sent; 0 when none
        has."""
        stuck = [client.stuck_since_s for client in self._clients.values() if client.unsent]
        return time.monotonic() - min(stuck) if stuck else 0.0

    def close(self) -> None:
        """Let every client go."""
        for client in tuple(self._clients.values()):
            self._drop(client)
        self._selector.close()

    @abstractmethod
    def _admit(self) -> None:
        """A new client knocks."""

    def _add(self, line: Line) -> None:
        self._clients[line.fileno()] = Client(line)
        self._selector.register(line.fileno(), selectors.EVENT_READ)

    def _serve(self, client: Client, events: int) -> bytes:
        with self._gone_closes(client):
            if events & selectors.EVENT_WRITE:
                client.flush()
                self._watch(client)
            if events & selectors.EVENT_READ:
                data = client.line.receive(_READ_BYTES)
                if not data:
                    self._drop(client)
                return data
        return b""

    def _watch(self, client: Client) -> None:
        writes = selectors.EVENT_WRITE if client.unsent else 0
        self._selector.modify(client.line.fileno(), selectors.EVENT_READ | writes)

    @contextlib.contextmanager
    def _gone_closes(self, client: Client):
        try:
            yield
        except BlockingIOError:
            pass
        except OSError:
            self._drop(client)

    def _drop(self, client: Client) -> None:
        number = client.line.fileno()
        del self._clients[number]
        self._selector.unregister(number)
        client.line.close()


class PtyListener(Listener):
    """A pseudo-terminal in raw mode: opened like a serial port, by one program after the other."""

    def __init__(self) -> None:
        super().__init__()
        try:
            import pty
            import tty
        except ImportError:
            raise SinkwrightError(
                "this system has no pseudo-terminals",
                where="--listen pty",
                remedy="Use --listen tcp:7411 and open the URL that it prints.",
            ) from None
        controller, terminal = pty.openpty()
        tty.setraw(terminal)
        os.set_blocking(controller, False)
        self.url = os.ttyname(terminal)
        # The terminal's side stays open here: without any opener, reading the controller fails at once and
        # for ever.
        self._terminal = terminal
        self._add(_PtyLine(controller))

    def close(self) -> None:
        super().close()
        os.close(self._terminal)

    def _admit(self) -> None:
        raise AssertionError("a pseudo-terminal has one line, which is there from the start")


class _PtyLine:
    def __init__(self, controller: int) -> None:
        self._controller = controller

    def fileno(self) -> int:
        return self._controller

    def receive(self, count: int) -> bytes:
        return os.read(self._controller, count)

    def send(self, data: bytes) -> int:
        return os.write(self._controller, data)

    def close(self) -> None:
        os.close(self._controller)


class TcpListener(Listener):
    """A TCP port; port 0 takes a free one."""

    def __init__(self, host: str, port: int) -> None:
        super().__init__()
        try:
            family, _, _, _, address = socket.getaddrinfo(host, port, type=socket.SOCK_STREAM)[0]
            self._socket = socket.create_server(address[:2], family=family)
        except OSError as error:
            raise SinkwrightError(
                f"port {port} of {host} cannot be listened on ({error.strerror or error})",
                where=f"--listen tcp:{host}:{port}",
                remedy="Choose another port, or tcp:0 for a free one.",
            ) from error
        self._socket.setblocking(False)
        self._selector.register(self._socket.fileno(), selectors.EVENT_READ)
        bound, taken = self._socket.getsockname()[:2]
        shown = f"[{bound}]" if ":" in bound else bound
        self.url = f"socket://{shown}:{taken}"
        if not ipaddress.ip_address(bound).is_loopback:
            self.note = (
                f"Anyone who can reach {shown} port {taken} can operate this simulated board: "
                "there is no authentication."
            )

    def close(self) -> None:
        super().close()
        self._socket.close()

    def _admit(self) -> None:
        with contextlib.suppress(OSError):  # it has gone again
            connection, _ = self._socket.accept()
            self._add(_TcpLine(connection))


class _TcpLine:
    def __init__(self, connection: socket.socket) -> None:
        connection.setblocking(False)
        # Frames are small and each is waited for, which Nagle's algorithm would delay.
        connection.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        # Megabytes of telemetry would wait in the system's own buffer, and a slow client would read the past.
        connection.setsockopt(socket.SOL_SOCKET, socket.SO_SNDBUF, _SEND_BYTES)
        self._connection = connection

    def fileno(self) -> int:
        return self._connection.fileno()

    def receive(self, count: int) -> bytes:
        return self._connection.recv(count)

    def send(self, data: bytes) -> int:
        return self._connection.send(data)

    def close(self) -> None:
        self._connection.close()


def open_listener(text: str) -> Listener:
    """What `--listen` names: `pty`, `tcp:PORT` (loopback) or `tcp:HOST:PORT`. Raises SinkwrightError."""
    if text == "pty":
        return PtyListener()
    scheme, _, rest = text.partition(":")
    host, _, port = rest.rpartition(":")
    if scheme != "tcp" or not port.isdecimal() or int(port) > 0xFFFF:
        raise SinkwrightError(
            f"{text!r} is no place to listen",
            where="--listen",
            remedy="Write pty, tcp:PORT (for this machine alone) or tcp:HOST:PORT.",
        )
    return TcpListener(host.strip("[]") or _LOOPBACK, int(port))
