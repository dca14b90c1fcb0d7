"""What signals do while a load may be sinking.

SIGINT and SIGTERM ask the run to stop; it turns the load off, and a second one cannot cut that short.
SIGHUP keeps its default, so a closed terminal ends this program and the board's silence policy turns the
load off. SIGTSTP is refused while sinking: a stopped program sends no heartbeat. It knows no instrument.
"""

from __future__ import annotations

import contextlib
import os
import signal
from collections.abc import Callable, Iterator
from types import FrameType

from sinkwright.stopping import StopRequest

Handler = Callable[[int, FrameType | None], None]


@contextlib.contextmanager
def stopping_on_signals(stop: StopRequest, is_sinking: Callable[[], bool]) -> Iterator[None]:
    """Within it Ctrl-C, SIGTERM and Ctrl-Z do as the head of this file says."""
    handlers = _handlers(stop, is_sinking)
    former = {number: signal.signal(number, handler) for number, handler in handlers.items()}
    try:
        yield
    finally:
        for number, handler in former.items():
            signal.signal(number, handler)


def _handlers(stop: StopRequest, is_sinking: Callable[[], bool]) -> dict[int, Handler]:
    def ask_to_stop(_number: int, _frame: FrameType | None) -> None:
        stop.request()
        words = "Stopping: the load is being turned off." if is_sinking() else "Stopping: the load is off."
        # A handler may interrupt a print half-way, so it writes to the descriptor itself.
        os.write(2, f"\n{words}\n".encode())

    def refuse_to_pause(_number: int, _frame: FrameType | None) -> None:
        if is_sinking():
            os.write(2, b"\nNot paused, because the load is sinking. Ctrl-C turns it off.\n")
            return
        # SIGSTOP cannot be caught, so this pauses at once and goes on here when the shell resumes it.
        os.kill(os.getpid(), signal.SIGSTOP)

    handlers: dict[int, Handler] = {signal.SIGINT: ask_to_stop, signal.SIGTERM: ask_to_stop}
    if hasattr(signal, "SIGTSTP"):
        handlers[signal.SIGTSTP] = refuse_to_pause
    return handlers
