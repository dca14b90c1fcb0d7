"""`sinkwright.connect`: the load for scripts and notebooks, without `async`, turned off however it is left.

A thin synchronous face over Instrument. It adds two things of its own: the load is never on without an end,
and the host is heard while a script computes or sleeps.
"""

from __future__ import annotations

import asyncio
import atexit
import contextlib
import math
from collections.abc import Coroutine, Iterator
from typing import Any, Literal, Self, TypeVar

from sinkwright import programs
from sinkwright.errors import AskedTooMuch, LinkLost, ProtectionTripped, SinkwrightError
from sinkwright.instrument import Instrument
from sinkwright.programs import Burst, Program
from sinkwright.readings import BoardIdentity, FaultDescription, LoadLimits, LoadStatus
from sinkwright.runner import Runner
from sinkwright.sample import FAULT, SINKING, Sample

#: A sample is the mean over this time unless another is asked for.
INTERVAL_S = 0.1
#: A sample that has not come this long after it was due is not coming.
PATIENCE_S = 2.0
#: How often the keeper looks whether the load's time is up.
KEEPER_S = 0.05

T = TypeVar("T")


def connect(url: str | None = None) -> Load:
    """Open a load: `with sinkwright.connect("board:bench-1") as load: ...`.

    `url` is a port URL as for `--port`; without one, the only board found. Works inside a running event loop
    (Jupyter) as well as outside. Raises SinkwrightError when there is no such board, or another program has
    it.
    """
    runner = Runner.for_url(url)
    try:
        return Load(runner, runner.run(Instrument.open(url)))
    except BaseException:
        runner.close()
        raise


class Load:
    """A load in hand, turned off whenever the `with` block is left. Set-points in A, W, ohm or V, times in s."""

    def __init__(self, runner: Runner, instrument: Instrument) -> None:
        self.instrument = instrument
        self._runner = runner
        self._off_at_s: float | None = None
        self._closed = False
        self._keeper = None if runner.lock_step else runner.start(self._keep())
        # Whoever forgets to close it gets the load turned off at the program's end all the same.
        atexit.register(self.close)

    def __enter__(self) -> Self:
        return self

    def __exit__(self, kind: object, error: object, trace: object) -> None:
        failure = self._put_away()
        if failure is not None and error is None:
            raise failure

    @property
    def identity(self) -> BoardIdentity:
        """Which board this is."""
        return self.instrument.identity

    def set_current(self, current_A: float) -> None:
        """Ask for a constant current, in A. It flows once the load is on."""
        self._run(self.instrument.set_current(current_A))

    def set_power(self, power_W: float) -> None:
        """Ask for a constant power, in W; a sample's `limiting_name` says "unreachable" where it is too much."""
        self._run(self.instrument.set_power(power_W))

    def set_resistance(self, resistance_ohm: float) -> None:
        """Ask to be a constant resistance, in ohm."""
        self._run(self.instrument.set_resistance(resistance_ohm))

    def set_voltage(self, voltage_V: float) -> None:
        """Ask to hold the source at a voltage, in V; it may take as much as the limits allow."""
        self._run(self.instrument.set_voltage(voltage_V))

    def on(self, *, for_s: float | None = None) -> None:
        """Turn the load on, and return at once; it turns off after `for_s`.

        `for_s` counts on the load's clock: a simulated board at `speed=max` lets time pass only in `wait`,
        `measure` and `samples`. This program keeps that time. If it dies, the board turns off by itself after
        its silence limit (`limits().silence_s`).
        """
        if for_s is None or not math.isfinite(for_s) or for_s <= 0:
            raise AskedTooMuch(
                "the load stays off, because nothing says when it shall turn off again",
                load="Nothing was sent to the load.",
                remedy="Say for how long: load.on(for_s=10).",
            )
        self._run(self._on(for_s))

    def follow(self, program: Program) -> None:
        """Turn the load on and return at once; the board follows `program` (values in A) and turns off with its end.

        Raises AskedTooMuch for a program without an end, BoardRefused for one that the board cannot follow.
        """
        if not math.isfinite(program.duration_s):
            raise AskedTooMuch(
                "the load stays off, because the program repeats without end",
                load="Nothing was sent to the load.",
                remedy="Say how often: repeats=100.",
            )
        self._run(self._follow(program))

    def arm_burst(self, trigger: Literal["now", "set-point", "fault"] = "now", *, before: int = 0) -> None:
        """Have the board capture every conversion around `trigger`: see sinkwright.programs.arm_burst."""
        self._run(programs.arm_burst(self.instrument, trigger, before=before))

    def burst(self) -> Burst | None:
        """What was captured, or None while it is not complete."""
        return self._run(programs.fetch_burst(self.instrument))

    def off(self) -> None:
        """Turn the load off."""
        self._off_at_s = None
        self._run(self.instrument.off())

    def measure(self, interval_s: float = INTERVAL_S) -> Sample:
        """One fresh sample, the mean over `interval_s` from now on.

        Raises ProtectionTripped when a fault is latched.
        """
        return self._run(self._measure(interval_s))

    def samples(self, for_s: float | None = None, interval_s: float = INTERVAL_S) -> Iterator[Sample]:
        """Samples as they come, for `for_s`, or without it until the load turns off.

        Ends early when the load turns off. Raises ProtectionTripped when the board stops by itself.
        """
        if for_s is None and self._off_at_s is None:
            raise AskedTooMuch(
                "samples without an end, although the load is off",
                remedy="Say for how long: load.samples(for_s=10), or turn the load on first.",
            )
        return self._samples(for_s, interval_s)

    def wait(self, duration_s: float) -> None:
        """Let time pass on the load's clock. With a simulated board at `speed=max` it takes no time."""
        self._run(self._wait(duration_s))

    def status(self) -> LoadStatus:
        """State and newest readings."""
        return self._run(self.instrument.status())

    def limits(self, which: Literal["in force", "board"] = "in force") -> LoadLimits:
        """The limits in force, or the board's own."""
        return self._run(self.instrument.limits(which))

    def set_limits(self, **limits: float) -> LoadLimits:
        """Narrow the limits in force, by name: set_limits(current_A=1.0, heatsink_degC=60)."""
        return self._run(self.instrument.set_limits(**limits))

    def fault(self) -> FaultDescription | None:
        """The latched fault, or None."""
        return self._run(self.instrument.fault())

    def clear(self) -> None:
        """Clear a latched fault whose cause is gone."""
        self._run(self.instrument.clear())

    def close(self) -> None:
        """Turn the load off and let go of the board. May be called twice; never raises."""
        self._put_away()

    def _run(self, coroutine: Coroutine[Any, Any, T]) -> T:
        if self._closed:
            coroutine.close()
            raise LinkLost("this load was closed", load="It was turned off then.", remedy="Connect again.")
        return self._runner.run(self._within_time(coroutine))

    async def _within_time(self, coroutine: Coroutine[Any, Any, T]) -> T:
        result = await coroutine
        await self._turn_off_in_time()
        return result

    async def _follow(self, program: Program) -> None:
        await self.instrument.set_current(program.steps[0].value if program.steps else 0.0)
        await programs.load_program(self.instrument, program)
        await self._on(program.duration_s + PATIENCE_S, program=True)

    async def _on(self, for_s: float, *, program: bool = False) -> None:
        # Set before it is on: an interruption in between must still end with the load turned off.
        self._off_at_s = self._now_s() + for_s
        try:
            await self.instrument.on(program=program)
        except SinkwrightError:
            self._off_at_s = None
            raise
        self._off_at_s = self._now_s() + for_s

    async def _measure(self, interval_s: float) -> Sample:
        while await self.instrument.next_sample(0) is not None:
            pass  # left over from an earlier stream
        await self.instrument.stream(interval_s)
        try:
            return await self._next(interval_s + PATIENCE_S)
        finally:
            await self.instrument.stream(0)

    def _samples(self, for_s: float | None, interval_s: float) -> Iterator[Sample]:
        self._run(self.instrument.stream(interval_s))
        try:
            end_us = math.inf
            was_sinking = False
            while True:
                sample = self._run(self._next(interval_s + PATIENCE_S))
                if end_us == math.inf and for_s is not None:
                    end_us = sample.time_us + (for_s - interval_s) * 1e6
                yield sample
                if sample.time_us >= end_us or (was_sinking and sample.state != SINKING):
                    return
                if for_s is None and self._off_at_s is None:
                    return
                was_sinking = sample.state == SINKING
        finally:
            if not self._closed:
                with contextlib.suppress(LinkLost):
                    self._run(self.instrument.stream(0))

    async def _next(self, patience_s: float) -> Sample:
        until_s = self._now_s() + patience_s
        while not self._reached(until_s):
            await self._turn_off_in_time()
            left_s = until_s - self._now_s()
            sample = await self.instrument.next_sample(min(left_s, self._time_left_s()))
            if sample is not None:
                return await self._checked(sample)
        raise LinkLost(
            f"the board has sent no sample for {patience_s:g} s, although it answers",
            where=self.identity.name,
            load="The load is turned off when the program leaves it.",
            remedy="Look whether another program takes the samples.",
        )

    async def _checked(self, sample: Sample) -> Sample:
        if sample.state != FAULT:
            return sample
        fault = await self.instrument.fault()
        self._off_at_s = None
        if fault is None:
            return sample
        raise ProtectionTripped(
            fault.sentence,
            fault=fault.name,
            where=self.identity.name,
            load=fault.load_in_words,
            remedy="Remove the cause, then clear the fault with load.clear().",
        )

    async def _wait(self, duration_s: float) -> None:
        until_s = self._now_s() + duration_s
        while not self._reached(until_s):
            await self.instrument.pause(min(until_s - self._now_s(), self._time_left_s()))
            await self._turn_off_in_time()

    async def _keep(self) -> None:
        """Beside the script: turn the load off in time, and let the board hear that the host lives."""
        with contextlib.suppress(SinkwrightError):  # the script's next call meets it too, and can be told
            while True:
                await asyncio.sleep(min(KEEPER_S, self._time_left_s()))
                await self._turn_off_in_time()
                if not self.instrument.link.busy:
                    await self.instrument.link.beat_if_due()

    async def _turn_off_in_time(self) -> None:
        if self._off_at_s is not None and self._reached(self._off_at_s):
            self._off_at_s = None
            await self.instrument.off()

    def _time_left_s(self) -> float:
        return math.inf if self._off_at_s is None else max(0.0, self._off_at_s - self._now_s())

    def _reached(self, deadline_s: float) -> bool:
        return self.instrument.link.channel.reached(deadline_s)

    def _now_s(self) -> float:
        return self.instrument.link.channel.now_s()

    def _put_away(self) -> SinkwrightError | None:
        if self._closed:
            return None
        self._closed = True
        atexit.unregister(self.close)
        if self._keeper is not None:
            self._keeper.cancel()
        try:
            return self._runner.run(self.instrument.close())
        finally:
            self._runner.close()
