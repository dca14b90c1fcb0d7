"""The reader thread: bytes cross into the event loop, failures reach whoever waits, closing is orderly."""

from __future__ import annotations

import asyncio
import threading
import time

import pytest

from sinkwright.errors import LinkLost
from sinkwright.transport.reader_thread import MAX_WAITING_CHUNKS, ThreadedChannel, WallClock


class ScriptedPort(WallClock):
    """A port that hands out what a test puts into `incoming`; an exception in there is raised."""

    failures = (OSError,)

    def __init__(self, *incoming: bytes | Exception) -> None:
        self.incoming: list[bytes | Exception] = list(incoming)
        self.written = b""
        self.closed_while_reading = False
        self.closed = False
        self.reading = False

    def read(self) -> bytes:
        self.reading = True
        time.sleep(0.001)
        self.reading = False
        if not self.incoming:
            return b""
        item = self.incoming.pop(0)
        if isinstance(item, Exception):
            raise item
        return item

    def write(self, data: bytes) -> None:
        if self.closed:
            raise OSError("closed")
        self.written += data

    def close(self) -> None:
        self.closed_while_reading = self.reading
        self.closed = True


async def _until(channel: ThreadedChannel, length: int) -> bytes:
    data = b""
    while len(data) < length:
        data += await channel.receive(2)
    return data


def test_bytes_arrive_in_order_and_whole() -> None:
    channel = ThreadedChannel("test:", ScriptedPort(b"ab", b"", b"c", b"def"))
    assert asyncio.run(_until(channel, 6)) == b"abcdef"
    channel.close()


def test_a_silent_port_gives_nothing_after_the_time_out() -> None:
    channel = ThreadedChannel("test:", ScriptedPort())
    began_s = time.monotonic()
    assert asyncio.run(channel.receive(0.05)) == b""
    assert time.monotonic() - began_s >= 0.05
    channel.close()


def test_bytes_that_came_before_an_event_loop_ran_are_kept() -> None:
    channel = ThreadedChannel("test:", ScriptedPort(b"early"))
    time.sleep(0.05)
    assert asyncio.run(channel.receive(0)) == b"early"
    channel.close()


def test_waking_ends_a_wait_at_once() -> None:
    channel = ThreadedChannel("test:", ScriptedPort())
    threading.Timer(0.05, channel.wake).start()
    began_s = time.monotonic()
    assert asyncio.run(channel.receive(10)) == b""
    assert time.monotonic() - began_s < 5
    channel.close()


def test_a_wake_before_the_wait_is_not_lost() -> None:
    channel = ThreadedChannel("test:", ScriptedPort())
    channel.wake()
    began_s = time.monotonic()
    assert asyncio.run(channel.receive(10)) == b""
    assert time.monotonic() - began_s < 5
    channel.close()


def test_what_came_before_a_failure_is_handed_over_first_and_the_failure_stays() -> None:
    channel = ThreadedChannel("/dev/x", ScriptedPort(b"last words", OSError("unplugged")))

    async def scenario() -> None:
        assert await _until(channel, 10) == b"last words"
        for _ in range(2):
            with pytest.raises(LinkLost, match=r"/dev/x: the connection to the board broke \(unplugged\)"):
                await channel.receive(2)

    asyncio.run(scenario())
    with pytest.raises(LinkLost):
        channel.send(b"x")
    channel.close()


def test_a_fault_of_this_program_in_the_thread_reaches_whoever_waits() -> None:
    channel = ThreadedChannel("test:", ScriptedPort(ZeroDivisionError("a slip")))
    with pytest.raises(ZeroDivisionError, match="a slip"):
        asyncio.run(channel.receive(2))
    channel.close()


def test_a_failed_write_is_a_lost_link() -> None:
    port = ScriptedPort()
    channel = ThreadedChannel("test:", port)
    channel.send(b"ok")
    assert port.written == b"ok"
    port.closed = True
    with pytest.raises(LinkLost, match="broke"):
        channel.send(b"x")
    channel.close()


def test_closing_waits_for_the_thread_and_may_happen_twice() -> None:
    port = ScriptedPort()
    channel = ThreadedChannel("a closing port", port)
    channel.close()
    channel.close()
    assert port.closed
    assert not port.closed_while_reading
    assert not [thread for thread in threading.enumerate() if "a closing port" in thread.name]


def test_a_closed_channel_says_so() -> None:
    channel = ThreadedChannel("test:", ScriptedPort())
    channel.close()
    with pytest.raises(LinkLost, match="closed by this program"):
        asyncio.run(channel.receive(0))


def test_a_host_that_does_not_read_keeps_the_newest_chunks() -> None:
    port = ScriptedPort()
    channel = ThreadedChannel("test:", port)
    channel._chunks.extend(b"%04d" % at for at in range(MAX_WAITING_CHUNKS + 10))
    data = asyncio.run(channel.receive(0))
    assert data[:4] == b"0010"
    assert len(data) == 4 * MAX_WAITING_CHUNKS
    channel.close()
