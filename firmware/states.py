"""The state of the load, as one table, and the gate that follows it.

`Machine` is the only code that releases the gate: it does so on entering SINKING and clamps it on entering
anything else. While the load sinks but its source has vanished, the gate is held clamped. An event that the table
does not foresee leaves the state as it is; nothing here can fail, because a fault must be able to end in FAULT from
anywhere. Called within the control step: allocates nothing.
"""

from micropython import const

import wire

ENABLE = const(0)
DISABLE = const(1)
TRIP = const(2)
CLEAR = const(3)
END = const(4)
_EVENTS = const(5)

# One row a state, one column an event (ENABLE, DISABLE, TRIP, CLEAR, END). Only CLEAR leaves FAULT.
_NEXT = bytes((
    wire.STATE_SINKING, wire.STATE_OFF, wire.STATE_FAULT, wire.STATE_OFF, wire.STATE_OFF,  # OFF
    wire.STATE_SINKING, wire.STATE_OFF, wire.STATE_FAULT, wire.STATE_SINKING, wire.STATE_ENDED,  # SINKING
    wire.STATE_SINKING, wire.STATE_OFF, wire.STATE_FAULT, wire.STATE_ENDED, wire.STATE_ENDED,  # ENDED
    wire.STATE_FAULT, wire.STATE_FAULT, wire.STATE_FAULT, wire.STATE_OFF, wire.STATE_FAULT,  # FAULT
))  # fmt: skip


class Machine:
    def __init__(self, gate, led):
        self._gate = gate
        self._led = led
        self.state = wire.STATE_OFF
        #: Sinking, but clamped until the source is back.
        self.held = False
        gate.clamp()
        led.show(wire.STATE_OFF)

    def fire(self, event):
        """Take `event`; return whether the state changed. The gate is set before anything else is told."""
        state = _NEXT[self.state * _EVENTS + event]
        changed = state != self.state
        if state != wire.STATE_SINKING:
            self._gate.clamp()
            self.held = False
        elif not self.held:
            self._gate.release()
        self.state = state
        if changed:
            self._led.show(state)
        return changed

    def hold(self):
        """The source has vanished: clamp until `rearm`, or until the state changes."""
        self._gate.clamp()
        self.held = True

    def rearm(self):
        """The source is back."""
        if self.held:
            self.held = False
            self._gate.release()
