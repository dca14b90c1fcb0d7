"""Runs coroutines for code that is not asynchronous: without an event loop where nothing suspends, else in
its own.

One decision for the synchronous facade and the command line. On a lock-step channel no coroutine ever
suspends, so it is driven step by step in the caller's thread: that works inside a running event loop and
costs no thread hop a frame. Otherwise a private event loop runs in a background thread.
"""

from __future__ import annotations

import asyncio
import concurrent.futures
import contextlib
import signal
import threading
from collections.abc import Coroutine, Iterator
from types import FrameType
from typing import Any, TypeVar

from sinkwright.transport.urls import is_lock_step

T = TypeVar("T")

#: How long an interrupted coroutine may take to put things away before it is left behind.
CANCEL_PATIENCE_S = 2.0
#: How soon a wait notices an interruption at the latest.
INTERRUPTIBLE_S = 0.2


class Runner:
    """Runs coroutines to their end, one after another. `close` it when done."""

    def __init__(self, lock_step: bool) -> None:
        self.lock_step = lock_step
        self._loop: asyncio.AbstractEventLoop | None = None
        self._thread: threading.Thread | None = None

    @classmethod
    def for_url(cls, url: str | None) -> Runner:
        """The runner that suits the channel that `url` opens."""
        return cls(url is not None and is_lock_step(url))

    def __enter__(self) -> Runner:
        return self

    def __exit__(self, *error: object) -> None:
        self.close()

    def run(self, coroutine: Coroutine[Any, Any, T]) -> T:
        """Run `coroutine` to its end and return its result, or raise what it raises.

        An interrupted wait (Ctrl-C) cancels the coroutine, and is raised once that has ended.
        """
        if self.lock_step:
            with _interrupt_deferred():
                return drive(coroutine)
        future = asyncio.run_coroutine_threadsafe(coroutine, self._running_loop())
        try:
            # In slices: a wait without end does not see Ctrl-C on Windows, nor one that another thread took.
            while not future.done():
                concurrent.futures.wait([future], INTERRUPTIBLE_S)
            return future.result()
        except BaseException:
            if not future.done():
                future.cancel()
                # The future counts as cancelled at once; what the coroutine still puts away is waited for
                # here.
                asyncio.run_coroutine_threadsafe(_others_done(), self._running_loop()).result(
                    CANCEL_PATIENCE_S
                )
            raise

    def start(self, coroutine: Coroutine[Any, Any, None]) -> concurrent.futures.Future[None]:
        """Run `coroutine` beside others; only with a loop, because nothing runs beside a lock-step one."""
        return asyncio.run_coroutine_threadsafe(coroutine, self._running_loop())

    def close(self) -> None:
        """End the private event loop, if one was started. May be called twice."""
        loop, self._loop = self._loop, None
        if loop is None or self._thread is None:
            return
        with contextlib.suppress(concurrent.futures.TimeoutError):
            asyncio.run_coroutine_threadsafe(_cancel_others(), loop).result(CANCEL_PATIENCE_S)
        loop.call_soon_threadsafe(loop.stop)
        self._thread.join()
        loop.close()

    def _running_loop(self) -> asyncio.AbstractEventLoop:
        if self._loop is None:
            self._loop = asyncio.new_event_loop()
            self._thread = threading.Thread(
                target=self._loop.run_forever, name="sinkwright loop", daemon=True
            )
            self._thread.start()
        return self._loop


def drive(coroutine: Coroutine[Any, Any, T]) -> T:
    """Run a coroutine that never waits for an event loop; a bare yield is passed over."""
    while True:
        try:
            awaited = coroutine.send(None)
        except StopIteration as done:
            return done.value
        if awaited is not None:
            coroutine.close()
            raise RuntimeError(f"a coroutine on a lock-step channel waited for {awaited!r}")


async def _others_done() -> None:
    others = asyncio.all_tasks() - {asyncio.current_task()}
    cancelled = {task for task in others if task.cancelling()}
    if cancelled:
        await asyncio.wait(cancelled)


async def _cancel_others() -> None:
    others = asyncio.all_tasks() - {asyncio.current_task()}
    for task in others:
        task.cancel()
    await asyncio.gather(*others, return_exceptions=True)


@contextlib.contextmanager
def _interrupt_deferred() -> Iterator[None]:
    """Hold a first Ctrl-C back until the coroutine has ended.

    An exchange with a simulated board that is cut in two leaves its pipe out of step, and then nothing could
    turn the load off. A second Ctrl-C cuts all the same. Programs with a handler of their own keep it.
    """
    in_main = threading.current_thread() is threading.main_thread()
    if not in_main or signal.getsignal(signal.SIGINT) is not signal.default_int_handler:
        yield
        return
    held: list[int] = []

    def hold(number: int, frame: FrameType | None) -> None:
        if held:
            signal.default_int_handler(number, frame)
        held.append(number)

    signal.signal(signal.SIGINT, hold)
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, signal.default_int_handler)
    if held:
        raise KeyboardInterrupt
