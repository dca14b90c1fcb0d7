"""A board that answers at the byte seam by the rules of the wire, so that the host's own codec always runs.

Not a simulation: it has no physics and no firmware, only messages, and ways to lose, repeat and garble them.
The true firmware on the simulated board is tested in tests/system.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from sinkwright_wire import messages as m
from sinkwright_wire.framing import Deframer, Frame, encode_frame
from sinkwright_wire.vocabulary import (
    EventKind,
    Fault,
    LimitField,
    Limiting,
    LimitSet,
    Mode,
    Refusal,
    ResetCause,
    RunEnd,
    Silence,
    State,
)

PERIOD_US = 2350
_NOBODY = 0xFFFFFFFF
BOARD_LIMITS = (4_000_000, 30_000_000, 40_000_000, 85_000, 125_000, 400_000, 3_000)


class FakeBoard:
    """One board. `acted` lists what it carried out, so a test can see that nothing acted twice.

    `lose_requests` and `lose_replies` count down; `answer_with` replaces the reply to a message class.
    """

    def __init__(self, name: str = "fake-1", boot_number: int = 0x1234) -> None:
        self.name = name
        self.boot_number = boot_number
        self.time_us = 0
        self.acted: list[m.Message] = []
        self.heard: list[m.Message] = []
        self.lose_requests = 0
        self.lose_replies = 0
        self.answer_with: dict[type[m.Message], m.Message] = {}
        self.before_reply = b""
        self.reply_twice = False
        self.silent = False
        self.restarts_at_us: int | None = None
        self.state = State.OFF
        self.fault = Fault.NONE
        self.setpoint_uA = 0
        self.limits = BOARD_LIMITS
        self.controller = 0
        self.zero_ready_us = 0
        self.mode = Mode.NONE
        self.run = m.Run(0, State.OFF, RunEnd.NONE, True, Silence.STOP, 0, 0, 0, 0, 0, 1000)
        self._sequence = 0
        self._cached: tuple[int, bytes] | None = None
        self._deframer = Deframer()
        self._heard_us = 0
        self._every_us = 0
        self._due_us = 0
        self._number = 0
        self._events = 0

    def restart(self) -> None:
        """Come up again as after a loss of supply."""
        self.boot_number += 1
        self.state, self.fault, self.mode, self.controller = State.OFF, Fault.NONE, Mode.NONE, 0
        self._cached, self._every_us = None, 0

    def trip(self, fault: Fault, value: int, limit: int) -> bytes:
        """Latch a fault and tell it."""
        self.state, self.fault = State.FAULT, fault
        return self.event(EventKind.FAULT, fault, value, limit)

    def event(self, kind: EventKind, code: int = 0, value: int = 0, limit: int = 0) -> bytes:
        self._events += 1
        return _push(m.Event(self._events, self.time_us, kind, int(code), value, limit))

    def hear(self, data: bytes) -> bytes:
        """Take bytes, answer with bytes."""
        answer = b""
        for item in self._deframer.feed(data):
            if isinstance(item, Frame):
                answer += self._take(m.parse(item.content))
        return answer

    def advance(self, duration_us: int) -> bytes:
        """Let the board's time pass, up to its next output."""
        end_us = self.time_us + duration_us
        if self.restarts_at_us is not None and end_us >= self.restarts_at_us:
            self.restarts_at_us = None
            self.restart()
        if self._every_us and self._due_us <= end_us:
            self.time_us = max(self.time_us, self._due_us)
            self._due_us += self._every_us
            return self._watch_host() + self._telemetry()
        self.time_us = end_us
        return self._watch_host()

    def _take(self, envelope: m.Envelope) -> bytes:
        self.heard.append(envelope.message)
        if self.silent or self.lose_requests:
            self.lose_requests = max(0, self.lose_requests - 1)
            return b""
        if envelope.session == self.controller:
            self._heard_us = self.time_us
        if self._cached and (envelope.session, envelope.sequence) == (self.controller, self._sequence):
            answer = self._cached[1]
        else:
            reply = self._outcome(envelope)
            answer = encode_frame(m.pack(reply, envelope.session, envelope.sequence))
            if envelope.session == self.controller and not _out_of_turn(reply):
                self._sequence, self._cached = envelope.sequence, (envelope.id, answer)
        if self.lose_replies:
            self.lose_replies -= 1
            return b""
        return self.before_reply + answer * (2 if self.reply_twice else 1)

    def _outcome(self, envelope: m.Envelope) -> m.Message:
        message = envelope.message
        if isinstance(message, m.Hello):
            return self._greet(envelope, message)
        free = (
            m.Identify,
            m.GetLimits,
            m.GetStatus,
            m.GetFault,
            m.GetLog,
            m.GetRun,
            m.MarkFetched,
            m.Disable,
        )
        if not isinstance(message, free):
            if envelope.session != self.controller:
                return m.Refused(envelope.id, Refusal.NOT_IN_CONTROL, detail=self.controller)
            if envelope.sequence != (self._sequence + 1) & 0xFFFF:
                return m.Refused(envelope.id, Refusal.OUT_OF_SEQUENCE, detail=self._sequence)
        if type(message) in self.answer_with:
            return self.answer_with[type(message)]
        reply = _ACTIONS[type(message)](self, message)
        if not isinstance(reply, m.Refused):
            self.acted.append(message)
        return reply or m.Done(envelope.id)

    def _greet(self, envelope: m.Envelope, hello: m.Hello) -> m.Message:
        quiet_ms = (self.time_us - self._heard_us) // 1000
        session = envelope.session
        if hello.watch:
            self.controller = 0 if session == self.controller else self.controller
        elif self.controller in (0, session) or quiet_ms > self.limits[6]:
            self.controller, self._sequence, self._heard_us = session, envelope.sequence, self.time_us
        held = self.controller == session
        other_ms = _NOBODY if self.controller in (0, session) else quiet_ms
        return m.HelloReply(
            m.VERSION,
            False,
            0,
            1,
            0,
            self.boot_number,
            b"\x01\x02\x03\x04\x05\x06\x07\x08",
            self.name,
            held,
            other_ms,
        )

    def _limits(self, message: m.GetLimits) -> m.Limits:
        return m.Limits(*(BOARD_LIMITS if message.which == LimitSet.BOARD else self.limits))

    def _set_limits(self, message: m.SetLimits) -> m.Message | None:
        wanted = (
            message.current_uA, message.voltage_uV, message.power_uW, message.heatsink_mC,
            message.junction_mC, message.slew_uA_per_ms, message.silence_ms,
        )  # fmt: skip
        for field, (value, largest) in enumerate(zip(wanted, BOARD_LIMITS, strict=True), 1):
            if value > largest:
                return m.Refused(message.ID, Refusal.BEYOND_BOARD, LimitField(field), largest)
        self.limits = wanted
        return None

    def _set_point(self, message: m.SetPoint) -> m.Message | None:
        if message.mode == Mode.CURRENT and message.value > self.limits[0]:
            return m.Refused(message.ID, Refusal.BEYOND_LIMIT, LimitField.CURRENT, self.limits[0])
        self.mode, self.setpoint_uA = message.mode, message.value
        return None

    def _enable(self, message: m.Enable) -> m.Message | None:
        if self.fault:
            return m.Refused(message.ID, Refusal.FAULT_LATCHED, detail=int(self.fault))
        if not self.mode:
            return m.Refused(message.ID, Refusal.NO_SETPOINT)
        if self.time_us < self.zero_ready_us:
            wait_ms = -(-(self.zero_ready_us - self.time_us) // 1000)
            return m.Refused(message.ID, Refusal.ZERO_NOT_READY, detail=wait_ms)
        self.state = State.SINKING
        alone = message.when_silent == Silence.CONTINUE
        self.run = replace(
            self.run, run=message.run, fetched=not alone, when_silent=message.when_silent,
            started_us=self.time_us,
        )  # fmt: skip
        return None

    def _get_run(self, _: m.Message) -> m.Run:
        return replace(self.run, state=self.state)

    def _mark_fetched(self, message: m.MarkFetched) -> m.Message | None:
        if message.run != self.run.run:
            return m.Refused(message.ID, Refusal.BAD_VALUE)
        self.run = replace(self.run, fetched=True)
        return None

    def _disable(self, _: m.Message) -> None:
        if self.state != State.FAULT:
            self.state = State.OFF

    def _clear(self, _: m.Message) -> None:
        self.state, self.fault = State.OFF, Fault.NONE

    def _ask_telemetry(self, message: m.SetTelemetry) -> None:
        self._every_us = message.every_steps * PERIOD_US
        self._due_us = self.time_us + self._every_us

    def _status(self, _: m.Message) -> m.Status:
        return m.Status(
            self.time_us, self.state, self.mode, Limiting.NONE, self.fault, self.setpoint_uA, 12_000_000,
            self._current_uA(), 11_900_000, 31_000, 32_000, 150, 64, self.controller, 0, 0, 0, 0,
        )  # fmt: skip

    def _fault_report(self, _: m.Message) -> m.FaultReport:
        return m.FaultReport(self.fault, False, 86_000, 85_000, self.time_us)

    def _identity(self, _: m.Message) -> m.Identity:
        return m.Identity(PERIOD_US, 0xABCD, 0, ResetCause.POWER_ON, 4000, "fake interpreter")

    def _log(self, message: m.GetLog) -> m.LogEntries:
        entries = [
            m.LogEntry(at * 1000, 12_000_000, 11_000_000, 13_000_000, 1_000_000, 3100, at) for at in range(10)
        ]
        return m.LogEntries(
            message.first, len(entries), 1000, tuple(entries[message.first : message.first + 4])
        )

    def _restart(self, _: m.Message) -> m.Message | None:
        if self.state == State.SINKING:
            return m.Refused(m.Restart.ID, Refusal.LOAD_IS_ON)
        self.restarts_at_us = self.time_us + 200_000
        return None

    def _beat(self, _: m.Message) -> None:
        """Only to be heard."""

    def _current_uA(self) -> int:
        return self.setpoint_uA if self.state == State.SINKING else 0

    def _watch_host(self) -> bytes:
        silence_ms = (self.time_us - self._heard_us) // 1000
        if self.state == State.SINKING and silence_ms > self.limits[6]:
            return self.trip(Fault.HOST_SILENT, silence_ms, self.limits[6])
        return b""

    def _telemetry(self) -> bytes:
        self._number += 1
        current_uA = self._current_uA()
        frame = m.Telemetry(
            self._number, self.time_us, self.state, self.mode, Limiting.NONE, self.fault, self.setpoint_uA,
            12_000_000, 11_990_000, 12_010_000, current_uA, current_uA, current_uA, 11_900_000,
            31_000, 32_000, 0, 0, 20, 0, 0,
        )  # fmt: skip
        return _push(frame)


def _push(message: m.Message) -> bytes:
    return encode_frame(m.pack(message))


def _out_of_turn(reply: m.Message) -> bool:
    return isinstance(reply, m.Refused) and reply.refusal in (Refusal.OUT_OF_SEQUENCE, Refusal.NOT_IN_CONTROL)


_ACTIONS: dict[type[m.Message], Callable[[FakeBoard, Any], m.Message | None]] = {
    m.Identify: FakeBoard._identity,
    m.GetLimits: FakeBoard._limits,
    m.SetLimits: FakeBoard._set_limits,
    m.SetPoint: FakeBoard._set_point,
    m.Enable: FakeBoard._enable,
    m.Disable: FakeBoard._disable,
    m.GetStatus: FakeBoard._status,
    m.GetFault: FakeBoard._fault_report,
    m.ClearFault: FakeBoard._clear,
    m.SetTelemetry: FakeBoard._ask_telemetry,
    m.GetLog: FakeBoard._log,
    m.Restart: FakeBoard._restart,
    m.Beat: FakeBoard._beat,
    m.SetEnds: FakeBoard._beat,
    m.GetRun: FakeBoard._get_run,
    m.MarkFetched: FakeBoard._mark_fetched,
}
