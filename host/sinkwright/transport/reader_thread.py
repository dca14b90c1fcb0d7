"""A blocking port behind an asynchronous channel: one thread reads, whoever waits is woken in its event loop.

pyserial cannot be read without blocking on every system (measured: asyncio's own readers gain nothing), so
one thread blocks instead. It must not know what the bytes mean. Bytes cross by a deque, which both sides may
touch without a lock: `wake` has to work inside a signal handler, where waiting for a lock could wait for
ever.
"""

from __future__ import annotations

import asyncio
import contextlib
import threading
import time
from collections import deque
from typing import Protocol

from sinkwright.errors import LinkLost
from sinkwright.transport.channel import Channel

#: Chunks kept for a host that does not read. The oldest go first; the gap shows in the numbers of telemetry.
MAX_WAITING_CHUNKS = 4096

#: A reader looks at its stop flag at least this often, so this also bounds how long `close` takes.
READ_TIMEOUT_S = 0.1

#: How long a write may be stuck before the board counts as lost.
WRITE_TIMEOUT_S = 1.0


class BlockingPort(Protocol):
    """What the thread needs of a port. `failures` are the exceptions that mean that the board is gone."""

    @property
    def failures(self) -> tuple[type[BaseException], ...]: ...

    @property
    def simulated(self) -> bool: ...

    @property
    def speed(self) -> float:
        """Seconds of `now_s` per second of the wall clock."""
        ...

    def read(self) -> bytes:
        """Bytes, or b"" after at most READ_TIMEOUT_S."""
        ...

    def write(self, data: bytes) -> None: ...

    def now_s(self) -> float: ...

    def close(self) -> None: ...


class WallClock:
    """The clock of a port to a real board."""

    simulated = False
    speed = 1.0

    def now_s(self) -> float:
        return time.monotonic()


class ThreadedChannel(Channel):
    """A channel over a BlockingPort. The thread starts at once, and ends before the port is closed."""

    def __init__(self, url: str, port: BlockingPort) -> None:
        self.url = url
        self.simulated = port.simulated
        self._port = port
        self._chunks: deque[bytes] = deque(maxlen=MAX_WAITING_CHUNKS)
        self._failure: Exception | None = None
        self._waiter: tuple[asyncio.AbstractEventLoop, asyncio.Future[None]] | None = None
        self._woken = False
        self._closing = False
        self._write_lock = threading.Lock()
        self._thread = threading.Thread(target=self._read_on, name=f"reader of {url}", daemon=True)
        self._thread.start()

    async def receive(self, timeout_s: float) -> bytes:
        if self._chunks or timeout_s <= 0:
            return self._take()
        loop = asyncio.get_running_loop()
        ready: asyncio.Future[None] = loop.create_future()
        # The waiter stands before the checks: what arrives after them finds it and wakes it.
        self._waiter = (loop, ready)
        timer = loop.call_later(timeout_s / self._port.speed, _finish, ready)
        try:
            if not (self._chunks or self._failure or self._woken):
                await ready
        finally:
            timer.cancel()
            self._waiter = None
            self._woken = False
        return self._take()

    def send(self, data: bytes) -> None:
        if self._failure is not None:
            raise self._failure
        try:
            with self._write_lock:
                self._port.write(data)
        except self._port.failures as error:
            self._failure = _lost(self.url, error)
            raise self._failure from error

    def now_s(self) -> float:
        return self._port.now_s()

    def wake(self) -> None:
        self._woken = True
        self._notify()

    def close(self) -> None:
        if self._closing:
            return
        self._closing = True
        if self._failure is None:
            self._failure = LinkLost("the port was closed by this program", where=self.url)
        self._notify()
        # Closing a port that is being read can crash the interpreter on Windows (pyserial issue 219).
        self._thread.join(timeout=WRITE_TIMEOUT_S + READ_TIMEOUT_S)
        with contextlib.suppress(*self._port.failures):
            self._port.close()

    def _take(self) -> bytes:
        if self._chunks:
            data = bytearray()
            while self._chunks:
                data += self._chunks.popleft()
            return bytes(data)
        if self._failure is not None:
            raise self._failure
        return b""

    def _read_on(self) -> None:
        try:
            while not self._closing:
                data = self._port.read()
                if data:
                    self._chunks.append(data)
                    self._notify()
        except self._port.failures as error:
            self._fail(_lost(self.url, error))
        except (
            Exception
        ) as error:  # a fault of this program must reach whoever waits, not die with the thread
            self._fail(error)

    def _fail(self, error: Exception) -> None:
        if self._failure is None:
            self._failure = error
        self._notify()

    def _notify(self) -> None:
        waiter = self._waiter
        if waiter is not None:
            loop, ready = waiter
            with contextlib.suppress(RuntimeError):  # that loop is closed, so nobody waits in it
                loop.call_soon_threadsafe(_finish, ready)


def _finish(ready: asyncio.Future[None]) -> None:
    if not ready.done():
        ready.set_result(None)


def _lost(url: str, error: BaseException) -> LinkLost:
    if isinstance(error, LinkLost):
        return error
    return LinkLost(f"the connection to the board broke ({error})", where=url)
