"""The load as an instrument: set-points, limits, readings and faults in SI units, over one link.

Turns SI floats into the wire's integers and back, and refuses what is no number before anything is sent. It
must not know plans, records or screens.
"""

from __future__ import annotations

import contextlib
import secrets
from collections.abc import Callable
from typing import Literal, Self, cast

from sinkwright.board_run import BoardEnds, BoardRun, goes_on_alone
from sinkwright.discovery import resolve
from sinkwright.errors import BoardRefused, LinkLost, SinkwrightError
from sinkwright.link import Link, Stop
from sinkwright.readings import (
    BoardIdentity,
    FaultDescription,
    LoadEvent,
    LoadLimits,
    LoadStatus,
    RunLog,
)
from sinkwright.sample import Sample
from sinkwright.transport import open_channel
from sinkwright.wire_units import to_integer
from sinkwright_wire.messages import (
    ClearFault,
    Disable,
    Enable,
    Event,
    FaultReport,
    GetFault,
    GetLimits,
    GetLog,
    GetRun,
    GetStatus,
    Identify,
    Identity,
    Limits,
    LogEntries,
    LogEntry,
    MarkFetched,
    Run,
    SetPoint,
    SetTelemetry,
    Status,
    Telemetry,
)
from sinkwright_wire.vocabulary import LimitSet, Mode, Refusal, Silence

#: How long `on` waits for the current zero before it gives the board's refusal on.
ZERO_PATIENCE_S = 10.0
_MAX_STEPS = 0xFFFF


class Instrument:
    """One load. Made by `open`; every method may raise LinkLost, BoardRefused and Interrupted."""

    def __init__(self, link: Link, identity: BoardIdentity) -> None:
        self.link = link
        self.identity = identity
        #: Called with each LoadEvent, in the order in which they came, while readings are fetched.
        self.on_event: list[Callable[[LoadEvent], None]] = []
        self._runs_named = 0

    @classmethod
    async def open(
        cls,
        url: str | None = None,
        *,
        watch: bool = False,
        stop: Stop | None = None,
        on_text: Callable[[str], None] | None = None,
    ) -> Self:
        """Open a port URL (None: the only board found) and greet the board there.

        With `watch` nothing but `off` may be commanded, and another program keeps control. `on_text` gets
        lines of text that the board prints. `stop` is looked at wherever something waits.
        """
        channel = open_channel(await resolve(url))
        link = Link(channel, stop=stop, on_text=on_text)
        try:
            hello = await link.open(watch)
            identity = cast(Identity, await link.request(Identify()))
            instrument = cls(link, BoardIdentity.of(hello, identity, channel.url))
            await instrument._leave_lone_run_alone()
            link.silence_s = (await instrument.limits()).silence_s
        except BaseException:
            link.close()
            raise
        return instrument

    async def __aenter__(self) -> Self:
        return self

    async def __aexit__(self, kind: object, error: object, trace: object) -> None:
        failure = await self.close()
        if failure is not None and error is None:
            raise failure

    # -- commands -------------------------------------------------------------------------------------------

    async def set_current(self, current_A: float) -> None:
        """Ask for a constant current. It flows once the load is on; a load that is on ramps to it."""
        value_uA = to_integer(current_A, 1_000_000, "a current", "A")
        await self.link.request(SetPoint(Mode.CURRENT, value_uA))

    async def set_power(self, power_W: float) -> None:
        """Ask for a constant power, on the side where it rises with the current.

        More than the source can give is told by the samples' `limiting`: "unreachable".
        """
        value_uW = to_integer(power_W, 1_000_000, "a power", "W")
        await self.link.request(SetPoint(Mode.POWER, value_uW))

    async def set_resistance(self, resistance_ohm: float) -> None:
        """Ask to be a constant resistance, to a milliohm. Zero is refused by the board."""
        value_mohm = to_integer(resistance_ohm, 1_000, "a resistance", "ohm")
        await self.link.request(SetPoint(Mode.RESISTANCE, value_mohm))

    async def set_voltage(self, voltage_V: float) -> None:
        """Ask to hold the source at a voltage by drawing what that takes, up to the limits in force.

        A source with a hard current limit cannot be held so: `limiting` is then "unsettled".
        """
        value_uV = to_integer(voltage_V, 1_000_000, "a voltage", "V")
        await self.link.request(SetPoint(Mode.VOLTAGE, value_uV))

    async def on(
        self, when_host_silent: Literal["stop", "continue"] = "stop", run: int = 0, *, program: bool = False
    ) -> None:
        """Turn the load on. Waits until the board has measured its current zero with the gate clamped.

        "stop" makes the board turn off by itself when this program falls silent (see `limits().silence_s`);
        "continue" needs ends on the board (`set_ends`), and `mark_fetched` once the run is over. `run`, drawn
        by the caller, is the name by which the run can be told from others afterwards. With `program` the load
        follows the program that was loaded (sinkwright.programs) from the set-point on, and ends with it.
        """
        message = Enable(Silence.CONTINUE if when_host_silent == "continue" else Silence.STOP, run, program)
        patience_s = ZERO_PATIENCE_S
        while True:
            try:
                await self.link.request(message)
                return
            except BoardRefused as refused:
                if refused.refusal == Refusal.FAULT_LATCHED:
                    await self._explain_latched(refused)
                wait_s = max(refused.detail / 1000, 0.01)
                if refused.refusal != Refusal.ZERO_NOT_READY or wait_s > patience_s:
                    raise
                await self.link.pause(wait_s)
                patience_s -= wait_s

    def name_run(self) -> int:
        """A name for a run that is about to begin, by which its record can be found again."""
        # Lock-step runs repeat byte for byte, and nothing outlives them that could be looked for.
        if self.link.channel.lock_step:
            self._runs_named += 1
            return self._runs_named
        return 1 + secrets.randbelow(0xFFFF_FFFF)

    async def set_ends(self, ends: BoardEnds) -> None:
        """Have the board itself end the run that goes on, or else the next one, host or no host."""
        await self.link.request(ends.to_wire())

    async def mark_fetched(self, run: int) -> None:
        """Tell the board that its last run, of this name, is in a record: then it may begin another."""
        with self.link.finishing():
            await self.link.request(MarkFetched(run))

    async def off(self) -> None:
        """Clamp the gate. Taken by the board from anybody, at any time, also after a stop was asked for."""
        with self.link.finishing():
            await self.link.request(Disable())

    async def restart(self, *, maintenance: bool = False) -> None:
        """Have the board start anew, with its gate clamped; refused while the load is on.

        For `maintenance` it starts without a watchdog and does not sink: so files can be copied. Set-points,
        limits and ends are then the board's own again; `identity` is that of the new start. Raises LinkLost
        where the port goes with the board, as a USB port does: open it anew.
        """
        hello = await self.link.restart(maintenance)
        identity = cast(Identity, await self.link.request(Identify()))
        self.identity = BoardIdentity.of(hello, identity, self.link.channel.url)
        self.link.silence_s = (await self.limits()).silence_s

    async def clear(self) -> None:
        """Clear a latched fault; refused while its cause stands."""
        await self.link.request(ClearFault())

    async def set_limits(self, **limits: float) -> LoadLimits:
        """Narrow the limits in force; returns them.

        Keys are those of LoadLimits (`current_A`, `voltage_V`, `power_W`, `heatsink_degC`, `junction_degC`,
        `slew_A_per_s`, `silence_s`); what is not given stays. Beyond the board's own is refused by the board.
        """
        wanted = (await self.limits()).changed(**limits)
        await self.link.request(wanted.to_wire())
        self.link.silence_s = wanted.silence_s
        return wanted

    async def stream(self, interval_s: float) -> None:
        """Have a sample sent every `interval_s`, rounded to whole control steps; 0 ends the stream."""
        steps = 0
        if interval_s != 0:
            interval_us = to_integer(interval_s, 1_000_000, "an interval", "s")
            steps = round(interval_us / (self.identity.control_period_s * 1e6))
            steps = min(max(steps, 1), _MAX_STEPS)
        await self.link.request(SetTelemetry(steps))

    # -- questions ------------------------------------------------------------------------------------------

    async def limits(self, which: Literal["in force", "board"] = "in force") -> LoadLimits:
        """The limits that set-points are checked against, or the board's own, which nothing may exceed."""
        limit_set = LimitSet.BOARD if which == "board" else LimitSet.IN_FORCE
        return LoadLimits.of(cast(Limits, await self.link.request(GetLimits(limit_set))))

    async def status(self) -> LoadStatus:
        """State and newest readings, without telemetry."""
        return LoadStatus.of(cast(Status, await self.link.request(GetStatus())))

    async def fault(self) -> FaultDescription | None:
        """The latched fault in words, or None."""
        report = cast(FaultReport, await self.link.request(GetFault()))
        return FaultDescription.of(report) if report.fault else None

    async def board_run(self) -> BoardRun:
        """The board's run that goes on, or its last one."""
        return BoardRun.of(cast(Run, await self.link.request(GetRun())))

    async def next_sample(self, timeout_s: float) -> Sample | None:
        """The next sample of the stream, or None when none came within `timeout_s` of the channel's clock."""
        until_s = self.link.channel.now_s() + timeout_s
        while True:
            push = await self.link.next_push(max(0.0, until_s - self.link.channel.now_s()))
            if isinstance(push, Telemetry):
                return Sample.of(push)
            if isinstance(push, Event):
                self._tell(LoadEvent.of(push))
            elif push is None and self.link.channel.reached(until_s):
                return None

    async def log(self) -> RunLog:
        """The board's own log of its last run. Read it when the load is off: a full log thins itself out."""
        entries: list[LogEntry] = []
        while True:
            part = cast(LogEntries, await self.link.request(GetLog(len(entries))))
            entries += part.entries
            if not part.entries or len(entries) >= part.total:
                return RunLog(part.spacing_ms / 1000, tuple(entries))

    async def pause(self, duration_s: float) -> None:
        """Let time pass on the channel's clock, with the host heard; samples that come meanwhile are kept."""
        await self.link.pause(duration_s)

    def finishing(self) -> contextlib.AbstractContextManager[None]:
        """Within it a requested stop is not heeded: for what has to be asked after it."""
        return self.link.finishing()

    async def close(self) -> SinkwrightError | None:
        """Turn the load off if this program controls it, and let go of the board.

        Never raises, so that it cannot hide an earlier error; returns what kept it from turning the load off.
        """
        failure = None
        with self.link.finishing():
            try:
                if self.link.in_control:
                    await self.off()
                    # The load is off by now; a board that misses this only keeps the next program waiting.
                    with contextlib.suppress(LinkLost):
                        await self.link.release()
            except (LinkLost, BoardRefused) as error:
                failure = error
            finally:
                self.link.close()
        return failure

    async def _leave_lone_run_alone(self) -> None:
        """Give control back at once when a run goes on without its host: closing would turn it off."""
        if not self.link.in_control:
            return
        run = await self.board_run()
        if run.going and run.alone:
            await self.link.release()
            raise goes_on_alone(self.identity.name, await self.status())

    def _tell(self, event: LoadEvent) -> None:
        for listener in tuple(self.on_event):
            listener(event)

    async def _explain_latched(self, refused: BoardRefused) -> None:
        fault = await self.fault()
        if fault is not None:
            raise BoardRefused(
                f"the load stays off, because a fault is latched: {fault.sentence}",
                refusal=refused.refusal,
                detail=refused.detail,
                where=refused.where,
                load=fault.load_in_words,
                remedy=(
                    "Its cause still stands: remove it, then clear the fault."
                    if fault.standing
                    else "Its cause is gone: clear the fault, then turn the load on again."
                ),
            ) from None
