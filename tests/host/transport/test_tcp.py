"""Plain sockets: bytes both ways, and what is said when nobody serves or the other end leaves."""

from __future__ import annotations

import asyncio
import socket
from collections.abc import Iterator

import pytest

from sinkwright.errors import LinkLost
from sinkwright.transport import open_channel


@pytest.fixture
def server() -> Iterator[socket.socket]:
    with socket.create_server(("127.0.0.1", 0)) as listening:
        yield listening


def _url(server: socket.socket, scheme: str = "tcp:") -> str:
    return f"{scheme}127.0.0.1:{server.getsockname()[1]}"


@pytest.mark.parametrize("scheme", ["tcp:", "socket://"])
def test_bytes_go_both_ways(server: socket.socket, scheme: str) -> None:
    channel = open_channel(_url(server, scheme))
    far, _ = server.accept()
    channel.send(b"to the board")
    assert far.recv(100) == b"to the board"
    far.sendall(b"from the board")
    assert asyncio.run(channel.receive(2)) == b"from the board"
    channel.close()
    far.close()


def test_the_other_end_leaving_is_a_lost_link(server: socket.socket) -> None:
    channel = open_channel(_url(server))
    far, _ = server.accept()
    far.close()
    with pytest.raises(LinkLost, match="the other end closed it"):
        asyncio.run(channel.receive(2))
    channel.close()


def test_nobody_serving_says_how_to_start_a_server() -> None:
    with socket.create_server(("127.0.0.1", 0)) as free:
        port = free.getsockname()[1]
    with pytest.raises(LinkLost, match=r"nobody serves a board.*simulate --listen"):
        open_channel(f"tcp:127.0.0.1:{port}")
