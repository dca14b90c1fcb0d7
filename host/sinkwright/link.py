"""Requests and their answers over one channel: retries, heartbeats, what came unasked, and what to say on
failure.

A retry repeats the same bytes, so the board acts once (wire rules: sinkwright_wire.conversation, which this
file feeds and times). Time-outs count `channel.now_s()`. It must not know volts, procedures or screens, and
it awaits nothing but the channel, so on a lock-step channel none of it ever suspends.
"""

from __future__ import annotations

import asyncio
import contextlib
from collections.abc import AsyncIterator, Callable, Iterator
from typing import Protocol

from sinkwright import link_failures as failures
from sinkwright.errors import LOAD_UNTOUCHED, Interrupted
from sinkwright.refusals import refused
from sinkwright.stopping import StopRequest
from sinkwright.traffic import LinkCounters, Traffic
from sinkwright.transport.channel import Channel
from sinkwright_wire.messages import Beat, Disable, HelloReply, Message, Refused, Request, Restart
from sinkwright_wire.vocabulary import Refusal

#: A reply takes one control step and two USB frames, about 5 ms (estimate); the rest is for a busy machine.
REPLY_TIMEOUT_S = 0.5
TRIES = 3
#: Some boards restart when their port is opened and answer nothing meanwhile.
HELLO_TRIES = 5
#: A board restarts within half a second (estimate); its converters and its store may take another.
RESTART_PATIENCE_S = 5.0
#: How often to ask again for a board that another program controlled.
CONTROL_POLL_S = 0.5
#: How long after one push the next may wait for company, on a real board. Below a run's frame interval (0.1
#: s).
GATHER_S = 0.05


class Stop(Protocol):
    """What can say that the person asked to stop."""

    @property
    def requested(self) -> bool: ...


class Link:
    """One conversation with one board, once `open` has returned."""

    def __init__(
        self,
        channel: Channel,
        *,
        stop: Stop | None = None,
        on_text: Callable[[str], None] | None = None,
        session: int | None = None,
    ) -> None:
        self.channel = channel
        self.in_control = False
        self._traffic = Traffic(channel, on_text, session)
        self._stop = stop
        if isinstance(stop, StopRequest):
            stop.on_request(channel.wake)
        self._turn = asyncio.Lock()
        self._finishing = 0
        #: Whether a request was abandoned, so that the board's idea of the sequence may differ.
        self._in_doubt = False

    @property
    def hello(self) -> HelloReply:
        """The board's greeting."""
        if self._traffic.hello is None:
            raise RuntimeError("this link was not opened")
        return self._traffic.hello

    @property
    def counters(self) -> LinkCounters:
        """What went wrong on the way and was mended."""
        return self._traffic.counters

    @property
    def silence_s(self) -> float:
        """The board's silence limit; the heart beats four times as often."""
        return self._traffic.silence_s

    @silence_s.setter
    def silence_s(self, silence_s: float) -> None:
        self._traffic.silence_s = silence_s

    async def open(self, watch: bool = False, tries: int = HELLO_TRIES) -> HelloReply:
        """Greet the board; take control of it unless `watch`.

        Raises LinkLost when no board of ours answers, and BoardRefused when another program keeps control.
        """
        async with self._taking_turn():
            reply = await self._greet(watch, tries)
            self._traffic.pushes.clear()
        if not watch and not self.in_control:
            await self._gain_control(reply)
        return self.hello

    async def request(
        self, message: Request, timeout_s: float = REPLY_TIMEOUT_S, tries: int = TRIES
    ) -> Message:
        """Send `message`, repeat it while nothing answers, and return the reply.

        Raises BoardRefused, LinkLost, and Interrupted before anything is sent if a stop was asked for. Once
        sent, a request is seen through even then: an abandoned one leaves in doubt whether the board acted.
        """
        async with self._taking_turn():
            self._heed_stop()
            return await self._ask(message, timeout_s, tries)

    async def next_push(self, timeout_s: float) -> Message | None:
        """The next message that the board sent by itself, or None. Beats the heart meanwhile."""
        until_s = self.channel.now_s() + timeout_s
        pushes = self._traffic.pushes
        while not pushes:
            await self._let_gather(until_s)
            async with self._taking_turn():
                await self._wait(until_s)
            if self.channel.reached(until_s):
                break
        return pushes.popleft() if pushes else None

    async def pause(self, duration_s: float) -> None:
        """Let `duration_s` pass on the channel's clock; what comes meanwhile is kept. Beats the heart."""
        until_s = self.channel.now_s() + duration_s
        while not self.channel.reached(until_s):
            async with self._taking_turn():
                await self._wait(until_s)

    @property
    def busy(self) -> bool:
        """Whether somebody talks or listens now, and so beats the heart as well."""
        return self._turn.locked()

    async def beat_if_due(self) -> None:
        """Let the board hear this host, if it has been quiet for a quarter of the silence limit."""
        async with self._taking_turn():
            await self._wait(self.channel.now_s())

    @contextlib.contextmanager
    def finishing(self) -> Iterator[None]:
        """Within it a stop is not heeded: for turning off and putting away after one was."""
        self._finishing += 1
        try:
            yield
        finally:
            self._finishing -= 1

    async def restart(self, maintenance: bool = False) -> HelloReply:
        """Have the board start anew, and take control of it once it is back.

        Raises BoardRefused while the load is on, and LinkLost when the board does not come back on this
        channel. A USB port goes with its board: it has to be opened anew.
        """
        before = self.hello.boot_number
        await self.request(Restart(maintenance))
        until_s = self.channel.now_s() + RESTART_PATIENCE_S
        while True:
            self._traffic.expect_restart()
            hello = await self.open()
            if hello.boot_number != before:
                return hello
            if self.channel.reached(until_s):
                raise failures.not_restarted(self._traffic.where())
            await self._traffic.receive(self.channel.now_s() + CONTROL_POLL_S)

    async def release(self) -> None:
        """Give up control, so that the next program need not wait for the silence limit."""
        if self.in_control:
            async with self._taking_turn():
                await self._greet(watch=True, tries=1)

    def close(self) -> None:
        """Let go of the channel. Turns nothing off: see Instrument.close."""
        self.in_control = False
        if isinstance(self._stop, StopRequest):
            self._stop.forget(self.channel.wake)
        self.channel.close()

    # -- one request -------------------------------------------------------------------------------------

    async def _ask(self, message: Request, timeout_s: float, tries: int) -> Message:
        # Off is taken from anybody at any sequence, so it never waits for a greeting.
        if self._in_doubt and self._traffic.hello and not isinstance(message, Disable):
            await self._greet_again()
        self._traffic.conversation.abandon()
        self._traffic.last_known.note_request(message)
        reply = await self._converse(self._traffic.conversation.request(message), timeout_s, tries)
        if isinstance(reply, Refused) and reply.refusal == Refusal.OUT_OF_SEQUENCE:
            # Refused means not acted upon; after a new greeting both sides agree on the sequence again.
            await self._greet_again()
            reply = await self._converse(self._traffic.conversation.request(message), timeout_s, tries)
        if isinstance(reply, Refused):
            self._traffic.last_known.note_refusal(message)
            await self._look_for_restart(reply)
            raise refused(message, reply, self._traffic.where(), self._traffic.state_of_load())
        self._traffic.last_known.note_reply(message, reply, self.channel.now_s())
        return reply

    async def _converse(self, data: bytes, timeout_s: float, tries: int) -> Message:
        self._in_doubt = True
        for attempt in range(tries):
            if attempt:
                if self._traffic.hello is None:
                    self._heed_stop()
                self.counters.retries += 1
                data = self._traffic.conversation.repeat()
            self._traffic.send(data)
            reply = await self._reply_by(self.channel.now_s() + timeout_s)
            if reply is not None:
                self._in_doubt = False
                return reply
        raise self._traffic.unanswered(data, timeout_s * tries)

    async def _reply_by(self, until_s: float) -> Message | None:
        while True:
            reply = await self._traffic.receive(until_s)
            if reply is not None:
                return reply
            if self.channel.reached(until_s):
                return None

    # -- greetings ---------------------------------------------------------------------------------------

    async def _greet(self, watch: bool, tries: int) -> HelloReply:
        reply = await self._converse(self._traffic.conversation.hello(watch), REPLY_TIMEOUT_S, tries)
        if isinstance(reply, Refused):
            raise refused(None, reply, self._traffic.where(), LOAD_UNTOUCHED)
        assert isinstance(reply, HelloReply)
        self.in_control = reply.in_control
        self._traffic.hello = reply
        return reply

    async def _greet_again(self) -> None:
        held = self.in_control
        reply = await self._greet(watch=not held, tries=TRIES)
        if held and not reply.in_control:
            raise failures.held_by_another(self._traffic.where(), reply.other_heard_ms)

    async def _gain_control(self, reply: HelloReply) -> None:
        # A program that died still counts until the silence limit has passed; one that lives is heard again.
        while not self.in_control:
            heard_ms = reply.other_heard_ms
            await self.pause(CONTROL_POLL_S)
            async with self._taking_turn():
                reply = await self._greet(watch=False, tries=TRIES)
            if not self.in_control and reply.other_heard_ms < heard_ms:
                raise failures.held_by_another(self._traffic.where(), reply.other_heard_ms)

    async def _look_for_restart(self, reply: Refused) -> None:
        if self.in_control and reply.refusal in (Refusal.NOT_IN_CONTROL, Refusal.NO_SESSION):
            await self._greet(watch=False, tries=TRIES)

    # -- waiting -----------------------------------------------------------------------------------------

    async def _wait(self, until_s: float) -> None:
        """One receive of what comes unasked, with a heartbeat first if one is due."""
        self._heed_stop()
        if self.in_control:
            beat_s = self._traffic.spoke_s + self.silence_s / 4
            if self.channel.reached(beat_s):
                await self._ask(Beat(), REPLY_TIMEOUT_S, TRIES)
                return
            until_s = min(until_s, beat_s)
        await self._traffic.receive(until_s)
        self._heed_stop()

    async def _let_gather(self, until_s: float) -> None:
        """Let fast telemetry gather: waking the event loop costs more than taking in a frame."""
        now_s = self.channel.now_s()
        rest_s = min(self._traffic.pushed_s + GATHER_S, until_s) - now_s
        if rest_s > 0 and not self.channel.simulated and not self.channel.lock_step:
            await asyncio.sleep(rest_s)

    def _heed_stop(self) -> None:
        if self._stop is not None and self._stop.requested and not self._finishing:
            raise Interrupted("stopped on request", load=self._traffic.state_of_load())

    @contextlib.asynccontextmanager
    async def _taking_turn(self) -> AsyncIterator[None]:
        # Whoever only waits for pushes is woken, so that a request does not queue behind a quiet board.
        if self._turn.locked():
            self.channel.wake()
        async with self._turn:
            yield
