"""The rules of the conversation: who may give a command, that it counts once, and what is answered.

A command of the session in control counts once: the next sequence acts, the last one again only gets the
cached reply, anything else is refused. Commands that only ask, and Disable, are taken from anybody, because asking
again does no harm and off must never be refused. A frame reaches this file only after its check sum held. What
each command does stands in commands.py. Runs between control steps and may allocate.
"""

import struct

import wire
from commands import cut
from refusal import Refusal

_FIRMWARE = (0, 1, 0)
_HALF_THE_NUMBERS = 0x8000


class Dispatch:
    def __init__(self, board, link, guard, commands):
        self._board = board
        self._link = link
        self._guard = guard
        self._commands = commands
        self._table = commands.table
        self._sequence = 0
        self._reply = None

    def take(self, content):
        """One frame's content, whose check sequence held."""
        version, command, session, sequence, length = struct.unpack_from(wire.HEADER_FORMAT, content)
        payload = content[wire.HEADER_SIZE :]
        if length != len(payload):
            return
        if session == self._commands.controller and session:
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
        if command == wire.HELLO:
            return self._hello(session, sequence, *_unpack(wire.HELLO_FORMAT, None, payload))
        if command not in self._table:
            raise Refusal(wire.REFUSAL_UNKNOWN_COMMAND, command)
        layout, entry, who, method = self._table[command]
        values = _unpack(layout, entry, payload)
        if version != wire.VERSION:
            raise Refusal(wire.REFUSAL_WRONG_VERSION, wire.VERSION)
        if who == "control":
            self._check_turn(session, sequence)
        reply = method(*values)
        if reply is None:
            return wire.DONE, struct.pack(wire.DONE_FORMAT, command)
        return command | 0x80, reply

    def _check_turn(self, session, sequence):
        if session == 0 or session != self._commands.controller:
            raise Refusal(wire.REFUSAL_NOT_IN_CONTROL, self._commands.controller)
        if sequence != (self._sequence + 1) & 0xFFFF:
            raise Refusal(wire.REFUSAL_OUT_OF_SEQUENCE, self._sequence)

    def _answer(self, command, session, sequence, reply, payload):
        """Send, and keep for a repetition what the controlling session's next command led to."""
        if session == self._commands.controller and session:
            if sequence == (self._sequence + 1) & 0xFFFF:
                self._sequence = sequence
            if sequence == self._sequence:
                self._reply = (command, reply, payload)
        self._send(reply, session, sequence, payload)

    def _send(self, reply, session, sequence, payload):
        # A reply that finds no room is not waited for: the host asks again and gets the cached one.
        self._link.send(reply, session, sequence, payload)

    def _hello(self, session, sequence, wire_version, watch):
        if watch:
            if session == self._commands.controller:
                self._commands.controller = 0
        elif session:
            self._let_control(session, sequence)
        board = self._board
        return wire.HELLO_REPLY, struct.pack(
            wire.HELLO_REPLY_FORMAT,
            wire.VERSION,
            board.simulated,
            *_FIRMWARE,
            board.boot_number,
            board.board_id,
            cut(board.image["name"], 16),
            session != 0 and session == self._commands.controller,
            self._other_heard_ms(session),
        )

    def _let_control(self, session, sequence):
        """Give control to `session`, unless another one was heard lately."""
        controller = self._commands.controller
        if controller not in (0, session) and self._guard.heard_ms() <= self._guard.limits.silence_ms:
            return
        # A late repetition of an old hello must not make old commands new again.
        if session != controller or (sequence - self._sequence) & 0xFFFF < _HALF_THE_NUMBERS:
            self._sequence = sequence
        self._commands.controller = session
        self._guard.quiet_steps = 0

    def _other_heard_ms(self, session):
        if self._commands.controller in (0, session):
            return wire.NEVER_HEARD
        return self._guard.heard_ms()


def _unpack(layout, entry, payload):
    """The fields of a payload; those of the entries in its tail, if it may have one, follow as a list of tuples."""
    size = struct.calcsize(layout)
    surplus = len(payload) - size
    if surplus < 0 or surplus % (struct.calcsize(entry) if entry else surplus + 1):
        raise Refusal(wire.REFUSAL_BAD_LENGTH, size)
    values = struct.unpack_from(layout, payload)
    if not entry:
        return values
    step = struct.calcsize(entry)
    return values + ([struct.unpack_from(entry, payload, at) for at in range(size, len(payload), step)],)
