"""What is known of the load when the way to it is gone: its last state, how old that is, what it does by
itself.

It notes what passes over the link and makes the sentence for errors. It must not send or wait.
"""

from __future__ import annotations

from sinkwright.readings import NOT_STOPPED_BY_OFF
from sinkwright_wire.messages import Disable, Enable, Event, Status, Telemetry
from sinkwright_wire.vocabulary import EventKind, Fault, Silence, State


class LastKnown:
    """The newest state of the load that this host has heard of. Times are the channel's `now_s`."""

    def __init__(self) -> None:
        self._state: State | None = None
        self._current_uA: int | None = None
        self._voltage_uV: int | None = None
        self._fault: int = Fault.NONE
        self._at_s = 0.0
        self._board_us = 0
        #: Whether "on" was asked for and not answered: then it must not be called off.
        self._may_be_on = False
        #: Whether the load was last told to go on without its host.
        self._alone = False

    def note_push(self, push: object, now_s: float) -> None:
        """Take in what the board says by itself."""
        if isinstance(push, Telemetry):
            self._note_reading(push, now_s)
        elif isinstance(push, Event):
            state = _STATE_AFTER.get(push.kind)
            if state is not None:
                self._note_state(state, now_s)
                self._fault = push.code if push.kind == EventKind.FAULT else Fault.NONE

    def shows_restart(self, push: object) -> bool:
        """Whether a push tells of a start later than what was heard before.

        The first start of all may be told late, after the greeting: then nothing older was heard.
        """
        return isinstance(push, Event) and push.kind == EventKind.BOOT and push.time_us < self._board_us

    def note_request(self, request: object) -> None:
        """Take in what is about to be asked."""
        if isinstance(request, Enable):
            self._may_be_on = True
            self._alone = request.when_silent == Silence.CONTINUE

    def note_refusal(self, request: object) -> None:
        """Take in that `request` was answered, and not carried out."""
        self._may_be_on = self._may_be_on and not isinstance(request, Enable)

    def note_reply(self, request: object, reply: object, now_s: float) -> None:
        """Take in what a request that was carried out led to."""
        if isinstance(reply, Status):
            self._note_reading(reply, now_s)
        elif isinstance(request, Enable):
            self._note_state(State.SINKING, now_s)
        elif isinstance(request, Disable):
            self._note_state(State.OFF, now_s)

    def sentence(self, now_s: float, silence_s: float) -> str:
        """State of the load, its age, and what the board will do without this host."""
        by_itself = f"the board turns it off by itself {silence_s:g} s after the last command that reached it"
        if self._alone:
            by_itself = "the board goes on to the ends of the run and keeps its curve for `sinkwright resume`"
        if self._may_be_on:
            return f"The load may be on: it was told so and did not answer. Without this program {by_itself}"
        if self._state is None:
            return "What the load is doing is not known"
        age = f"when it was last heard, {max(0.0, now_s - self._at_s):.1f} s ago"
        if self._fault in NOT_STOPPED_BY_OFF:
            return (
                f"The board reported current that turning off cannot stop ({age}): pull the source lead now"
            )
        if self._state != State.SINKING:
            return f"The load was off {age}, and nothing turns it on by itself"
        return f"The load was sinking{self._reading()} {age}; without this program {by_itself}"

    def _reading(self) -> str:
        if self._current_uA is None or self._voltage_uV is None:
            return ""
        return f" {self._current_uA / 1e6:.3f} A at {self._voltage_uV / 1e6:.3f} V"

    def _note_reading(self, reading: Telemetry | Status, now_s: float) -> None:
        self._state = reading.state
        self._fault = reading.fault
        self._current_uA = reading.current_uA
        self._voltage_uV = reading.voltage_uV
        self._board_us = reading.time_us
        self._may_be_on = False
        self._at_s = now_s

    def _note_state(self, state: State, now_s: float) -> None:
        self._state = state
        self._current_uA = self._voltage_uV = None
        self._may_be_on = False
        self._at_s = now_s


_STATE_AFTER = {
    EventKind.BOOT: State.OFF,
    EventKind.ENABLED: State.SINKING,
    EventKind.DISABLED: State.OFF,
    EventKind.ENDED: State.ENDED,
    EventKind.FAULT: State.FAULT,
    EventKind.CLEARED: State.OFF,
}
