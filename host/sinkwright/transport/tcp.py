"""A board behind a plain TCP socket, such as a simulated one served by `simulate --listen tcp:PORT`.

Only connecting, reading and writing; it must not know what travels.
"""

from __future__ import annotations

import select
import socket

from sinkwright.errors import LOAD_UNTOUCHED, LinkLost
from sinkwright.transport.reader_thread import READ_TIMEOUT_S, WRITE_TIMEOUT_S, ThreadedChannel, WallClock

CONNECT_TIMEOUT_S = 3.0


class SocketPort(WallClock):
    """A connected socket for the reader thread."""

    failures = (OSError,)

    def __init__(self, connection: socket.socket) -> None:
        self._socket = connection

    def read(self) -> bytes:
        # Waiting by select leaves the socket's own time-out to the writes.
        readable, _, _ = select.select([self._socket], [], [], READ_TIMEOUT_S)
        if not readable:
            return b""
        data = self._socket.recv(4096)
        if not data:
            raise ConnectionError("the other end closed it")
        return data

    def write(self, data: bytes) -> None:
        self._socket.sendall(data)

    def close(self) -> None:
        self._socket.close()


def open_tcp(url: str, host: str, port: int) -> ThreadedChannel:
    """Connect to a board served at `host`:`port`. Raises LinkLost when nobody serves there."""
    try:
        connection = socket.create_connection((host, port), CONNECT_TIMEOUT_S)
    except OSError as error:
        raise LinkLost(
            f"nobody serves a board at {host} port {port} ({error})",
            where=url,
            load=LOAD_UNTOUCHED,
            remedy="Start the server first (`sinkwright simulate --listen tcp:PORT` prints its URL).",
        ) from error
    connection.settimeout(WRITE_TIMEOUT_S)
    # Requests are small and each waits for its answer, which Nagle's algorithm would delay.
    connection.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
    return ThreadedChannel(url, SocketPort(connection))
