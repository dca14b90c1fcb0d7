"""Commands: who may give them, what they do, and what is answered. One table, one method a command.

A command of the session in control counts once: the next sequence acts, the last one again only gets the
cached reply, anything else is refused. Commands that only ask, and Disable, are taken from anybody, because asking
again does no harm and off must never be refused. A frame reaches this file only after its check sum held.
Runs between control steps and may allocate.
"""

import struct

import states
import wire

_LIMIT_FIELDS = 7
_FIRMWARE = (0, 1, 0)
_HALF_THE_NUMBERS = 0x8000


class Refusal(Exception):
    """A command that is not carried out: refusal code, detail and the field it is about."""

    def __init__(self, code, detail=0, field=0):
        self.code = code
        self.detail = detail
        self.field = field


class Dispatch:
    def __init__(self, board, link, machine, guard, control, meter, timekeeper, telemetry, log):
        self._board = board
        self._link = link
        self._machine = machine
        self._guard = guard
        self._control = control
        self._meter = meter
        self._time = timekeeper
        self._telemetry = telemetry
        self._log = log
        self._controller = 0
        self._sequence = 0
        self._reply = None
        self._mode = 0
        # id: (payload format, who may give it, method). "any": whoever asks; "control": the controlling session.
        self._commands = {
            wire.HELLO: (wire.HELLO_FORMAT, "any", None),
            wire.IDENTIFY: (wire.IDENTIFY_FORMAT, "any", self._identify),
            wire.GET_LIMITS: (wire.GET_LIMITS_FORMAT, "any", self._get_limits),
            wire.GET_STATUS: (wire.GET_STATUS_FORMAT, "any", self._get_status),
            wire.GET_FAULT: (wire.GET_FAULT_FORMAT, "any", self._get_fault),
            wire.GET_LOG: (wire.GET_LOG_FORMAT, "any", self._get_log),
            wire.DISABLE: (wire.DISABLE_FORMAT, "any", self._disable),
            wire.SET_LIMITS: (wire.SET_LIMITS_FORMAT, "control", self._set_limits),
            wire.SET_POINT: (wire.SET_POINT_FORMAT, "control", self._set_point),
            wire.ENABLE: (wire.ENABLE_FORMAT, "control", self._enable),
            wire.CLEAR_FAULT: (wire.CLEAR_FAULT_FORMAT, "control", self._clear_fault),
            wire.SET_TELEMETRY: (wire.SET_TELEMETRY_FORMAT, "control", self._set_telemetry),
            wire.BEAT: (wire.BEAT_FORMAT, "control", self._beat),
        }

    # -- the rules of the conversation --------------------------------------------------------------------------

    def take(self, content):
        """One frame's content, whose check sequence held."""
        version, command, session, sequence, length = struct.unpack_from(wire.HEADER_FORMAT, content)
        payload = content[wire.HEADER_SIZE :]
        if length != len(payload):
            return
        if session == self._controller and session:
            self._guard.quiet_steps = 0
            if self._reply and sequence == self._sequence and command == self._reply[0]:
                self._send(self._reply[1], session, sequence, self._reply[2])
                return
        self._answer(command, session, sequence, *self._outcome(version, command, session, sequence, payload))

    def _outcome(self, version, command, session, sequence, payload):
        """The reply's id and payload."""
        try:
            return self._carry_out(version, command, session, sequence, payload)
        except Refusal as refusal:
            return wire.REFUSED, struct.pack(
                wire.REFUSED_FORMAT, command, refusal.code, refusal.field, refusal.detail
            )

    def _carry_out(self, version, command, session, sequence, payload):
        if command not in self._commands:
            raise Refusal(wire.REFUSAL_UNKNOWN_COMMAND, command)
        layout, who, method = self._commands[command]
        if len(payload) != struct.calcsize(layout):
            raise Refusal(wire.REFUSAL_BAD_LENGTH, struct.calcsize(layout))
        values = struct.unpack(layout, payload)
        if command == wire.HELLO:
            return self._hello(session, sequence, *values)
        if version != wire.VERSION:
            raise Refusal(wire.REFUSAL_WRONG_VERSION, wire.VERSION)
        if who == "control":
            self._check_turn(session, sequence)
        reply = method(*values)
        if reply is None:
            return wire.DONE, struct.pack(wire.DONE_FORMAT, command)
        return command | 0x80, reply

    def _check_turn(self, session, sequence):
        if session == 0 or session != self._controller:
            raise Refusal(wire.REFUSAL_NOT_IN_CONTROL, self._controller)
        if sequence != (self._sequence + 1) & 0xFFFF:
            raise Refusal(wire.REFUSAL_OUT_OF_SEQUENCE, self._sequence)

    def _answer(self, command, session, sequence, reply, payload):
        """Send, and keep for a repetition what the controlling session's next command led to."""
        if session == self._controller and session:
            if sequence == (self._sequence + 1) & 0xFFFF:
                self._sequence = sequence
            if sequence == self._sequence:
                self._reply = (command, reply, payload)
        self._send(reply, session, sequence, payload)

    def _send(self, reply, session, sequence, payload):
        # A reply that finds no room is not waited for: the host asks again and gets the cached one.
        self._link.send(reply, session, sequence, payload)

    # -- hello --------------------------------------------------------------------------------------------------

    def _hello(self, session, sequence, wire_version, watch):
        other_heard_ms = wire.NEVER_HEARD
        if watch:
            if session == self._controller:
                self._controller = 0
        elif session:
            heard_ms = self._guard.heard_ms()
            if self._controller in (0, session) or heard_ms > self._guard.limits.silence_ms:
                # A late repetition of an old hello must not make old commands new again.
                if session != self._controller or (sequence - self._sequence) & 0xFFFF < _HALF_THE_NUMBERS:
                    self._sequence = sequence
                self._controller = session
                self._guard.quiet_steps = 0
        if self._controller not in (0, session):
            other_heard_ms = self._guard.heard_ms()
        board = self._board
        return wire.HELLO_REPLY, struct.pack(
            wire.HELLO_REPLY_FORMAT,
            wire.VERSION,
            board.simulated,
            *_FIRMWARE,
            board.boot_number,
            board.board_id,
            _cut(board.image["name"], 16),
            session != 0 and session == self._controller,
            other_heard_ms,
        )

    # -- questions ----------------------------------------------------------------------------------------------

    def _identify(self):
        image = self._board.image
        return struct.pack(
            wire.IDENTITY_FORMAT,
            image["period_us"],
            image["board_file_crc"],
            0,
            self._board.reset_cause,
            self._log.capacity,
            _cut(self._board.interpreter, 32),
        )

    def _get_limits(self, which):
        if which == wire.LIMIT_SET_IN_FORCE:
            limits = self._guard.limits
        elif which == wire.LIMIT_SET_BOARD:
            limits = self._guard.board_limits
        else:
            raise Refusal(wire.REFUSAL_BAD_VALUE, which)
        return struct.pack(wire.LIMITS_FORMAT, *limits.values())

    def _get_status(self):
        meter = self._meter
        control = self._control
        return struct.pack(
            wire.STATUS_FORMAT,
            self._time.now_us(),
            self._machine.state,
            self._mode,
            control.limiting,
            self._guard.fault,
            control.setpoint_uA,
            meter.voltage_uV,
            meter.current_uA,
            meter.force_uV,
            meter.heatsink_mC,
            control.junction_mC(),
            control.zero_uA,
            control.zero_samples,
            self._controller,
            self._time.overruns,
            self._telemetry.dropped & 0xFFFFFFFF,
            self._link.discarded & 0xFFFFFFFF,
            self._log.entries,
        )

    def _get_fault(self):
        guard = self._guard
        return struct.pack(
            wire.FAULT_REPORT_FORMAT,
            guard.fault,
            guard.fault != wire.FAULT_NONE and guard.standing(),
            guard.value,
            guard.limit,
            guard.seconds * 1_000_000 + guard.micros,
        )

    def _get_log(self, first):
        log = self._log
        entries = b""
        for at in range(first, min(first + wire.MAX_ENTRIES, log.entries)):
            entries += struct.pack(
                wire.LOG_ENTRY_FORMAT,
                log.time_ms[at],
                log.voltage_uV[at],
                log.voltage_min_uV[at],
                log.voltage_max_uV[at],
                log.current_uA[at],
                log.heatsink_cC[at],
                log.charge_mC[at],
            )
        return struct.pack(wire.LOG_ENTRIES_FORMAT, first, log.entries, log.spacing_ms) + entries

    # -- commands -----------------------------------------------------------------------------------------------

    def _set_limits(self, *values):
        board = self._guard.board_limits.values()
        for at in range(_LIMIT_FIELDS):
            if values[at] <= 0:
                raise Refusal(wire.REFUSAL_BAD_VALUE, values[at], at + 1)
            if values[at] > board[at]:
                raise Refusal(wire.REFUSAL_BEYOND_BOARD, board[at], at + 1)
        if self._mode and self._control.setpoint_uA > values[0]:
            raise Refusal(wire.REFUSAL_BEYOND_LIMIT, self._control.setpoint_uA, 1)
        self._guard.apply_values(values)

    def _set_point(self, mode, value):
        if mode in (wire.MODE_POWER, wire.MODE_RESISTANCE, wire.MODE_VOLTAGE):
            raise Refusal(wire.REFUSAL_NOT_OFFERED, mode)
        if mode != wire.MODE_CURRENT or value < 0:
            raise Refusal(wire.REFUSAL_BAD_VALUE, value if mode == wire.MODE_CURRENT else mode)
        if value > self._guard.limits.current_uA:
            raise Refusal(wire.REFUSAL_BEYOND_LIMIT, self._guard.limits.current_uA, 1)
        self._mode = mode
        self._control.ask(value)

    def _enable(self, when_silent):
        if when_silent == wire.SILENCE_CONTINUE:
            raise Refusal(wire.REFUSAL_NOT_OFFERED, when_silent)
        if when_silent != wire.SILENCE_STOP:
            raise Refusal(wire.REFUSAL_BAD_VALUE, when_silent)
        if self._guard.fault:
            raise Refusal(wire.REFUSAL_FAULT_LATCHED, self._guard.fault)
        if not self._mode:
            raise Refusal(wire.REFUSAL_NO_SETPOINT)
        if self._machine.state == wire.STATE_SINKING:
            return
        if not self._control.zero_samples:
            raise Refusal(wire.REFUSAL_ZERO_NOT_READY, self._control.zero_wait_ms())
        if abs(self._control.zero_uA) > self._board.image["zero_budget_uA"]:
            raise Refusal(wire.REFUSAL_ZERO_OUT_OF_BUDGET, self._control.zero_uA)
        self._meter.restart()
        self._log.begin()
        self._control.start()
        self._machine.fire(states.ENABLE)
        self._telemetry.tell(wire.EVENT_ENABLED, self._mode, self._control.setpoint_uA)

    def _disable(self):
        was_sinking = self._machine.state == wire.STATE_SINKING
        self._machine.fire(states.DISABLE)
        self._meter.stop()
        if was_sinking:
            self._telemetry.tell(wire.EVENT_DISABLED)

    def _clear_fault(self):
        fault = self._guard.fault
        if fault and not self._guard.clear():
            raise Refusal(wire.REFUSAL_CAUSE_STANDS, fault)
        if fault:
            self._telemetry.tell(wire.EVENT_CLEARED, fault)

    def _set_telemetry(self, every_steps):
        self._telemetry.ask(every_steps)

    def _beat(self):
        """Only to be heard."""


def _cut(text, size):
    """`text` in UTF-8, cut at a whole character: half of one would make the host discard the reply."""
    while len(text.encode()) > size:
        text = text[:-1]
    return text.encode()
