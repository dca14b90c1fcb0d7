"""Running coroutines without `async`: no event loop where nothing suspends, a private one elsewhere."""

from __future__ import annotations

import asyncio
import signal
import threading
from collections.abc import Generator

import pytest

from sinkwright.runner import Runner, drive


async def _thread_name() -> str:
    return threading.current_thread().name


async def _pause() -> str:
    await asyncio.sleep(0.01)
    return await _thread_name()


def test_a_lock_step_coroutine_runs_in_the_callers_thread_without_an_event_loop() -> None:
    with Runner(lock_step=True) as runner:
        assert runner.run(_thread_name()) == threading.current_thread().name


def test_a_bare_yield_is_passed_over() -> None:
    async def yields() -> int:
        await asyncio.sleep(0)
        return 3

    assert drive(yields()) == 3


def test_a_lock_step_coroutine_that_waits_for_a_loop_is_an_error() -> None:
    async def waits() -> None:
        await Forever()

    with pytest.raises(RuntimeError, match="on a lock-step channel waited for"):
        drive(waits())


class Forever:
    def __await__(self) -> Generator[str, None, None]:
        yield "something"


def test_other_coroutines_run_in_a_private_loop_and_its_thread_ends() -> None:
    runner = Runner(lock_step=False)
    assert runner.run(_pause()) == "sinkwright loop"
    runner.close()
    runner.close()
    assert "sinkwright loop" not in [thread.name for thread in threading.enumerate()]


@pytest.mark.parametrize("lock_step", [True, False])
def test_both_work_inside_a_running_event_loop(lock_step: bool) -> None:
    async def notebook_cell() -> str:
        with Runner(lock_step) as runner:
            return runner.run(_thread_name() if lock_step else _pause())

    assert asyncio.run(notebook_cell())


@pytest.mark.parametrize("lock_step", [True, False])
def test_what_a_coroutine_raises_is_raised(lock_step: bool) -> None:
    async def fails() -> None:
        raise LookupError("no such thing")

    with Runner(lock_step) as runner, pytest.raises(LookupError, match="no such thing"):
        runner.run(fails())


def test_ctrl_c_while_waiting_cancels_the_coroutine_and_lets_it_put_things_away() -> None:
    ended = []

    async def waits() -> None:
        try:
            await asyncio.sleep(30)
        finally:
            await asyncio.sleep(0.01)
            ended.append(True)

    with Runner(lock_step=False) as runner:
        threading.Timer(0.1, signal.raise_signal, [signal.SIGINT]).start()
        with pytest.raises(KeyboardInterrupt):
            runner.run(waits())
        assert ended == [True]


def test_ctrl_c_in_a_lock_step_coroutine_is_held_back_until_it_has_ended() -> None:
    ended = []

    async def works() -> None:
        signal.raise_signal(signal.SIGINT)
        ended.append(True)

    with Runner(lock_step=True) as runner, pytest.raises(KeyboardInterrupt):
        runner.run(works())
    assert ended == [True]
    assert signal.getsignal(signal.SIGINT) is signal.default_int_handler


def test_a_second_ctrl_c_cuts_a_lock_step_coroutine_short() -> None:
    async def hangs() -> None:
        signal.raise_signal(signal.SIGINT)
        signal.raise_signal(signal.SIGINT)
        pytest.fail("the second one was held back too")

    with Runner(lock_step=True) as runner, pytest.raises(KeyboardInterrupt):
        runner.run(hangs())


def test_a_handler_of_the_programs_own_is_left_alone() -> None:
    seen = []
    former = signal.signal(signal.SIGINT, lambda number, frame: seen.append(number))
    try:

        async def works() -> None:
            signal.raise_signal(signal.SIGINT)

        with Runner(lock_step=True) as runner:
            runner.run(works())
    finally:
        signal.signal(signal.SIGINT, former)
    assert seen == [signal.SIGINT]
