"""A burst: every conversion around a trigger, one slot a control step, in a ring that was made at boot.

Raw counts are kept and turned into units when they are fetched. A control step whose conversion was not ready
keeps its slot, marked as missed, so that a reading's number always tells its time. A reading is collected in the
control step after the one in which its conversion began: the trigger comes exactly as the conversion of
reading number `before` begins. `step` and `put` are called within the control step and allocate nothing.
"""

from array import array

from micropython import const

import wire

#: 4.8 s at the usual period, in 6 KB. A power of two.
SIZE = const(2048)
_MASK = const(SIZE - 1)
_NOT_SINKING = const(-1)
_WAITING = const(-1)


class Burst:
    def __init__(self, scales, guard, machine, timekeeper):
        # In the order of wire.READING_KIND_*.
        self._scales = [scales[name] for name in ("voltage", "current", "thermistor", "force")]
        self._guard = guard
        self._machine = machine
        self._time = timekeeper
        self._counts = array("h", bytes(2 * SIZE))
        self._kinds = bytearray(SIZE)
        #: While this holds, the control step calls `step` and `put`.
        self.recording = False
        self._trigger = wire.BURST_TRIGGER_NOW
        self._wanted = 0
        self._seen = 0
        self._watched = 0
        self._at = 0
        self._left = _WAITING
        self._first = 0
        #: Readings from before the trigger, and all of them; 0 until the capture is complete.
        self.before = 0
        self.total = 0
        self.seconds = 0
        self.micros = 0

    def arm(self, before, trigger, setpoint):
        """Begin to capture; `before` (less than SIZE) readings are kept from before the trigger."""
        self.total = 0
        self._wanted = before
        self._trigger = trigger
        self._watched = self._look(setpoint)
        self._seen = 0
        self._left = _WAITING
        self.recording = True

    def step(self, setpoint):
        """One control step begins: its slot is empty until `put` fills it."""
        if not self._left:
            self._complete()
            return
        at = (self._at + 1) & _MASK
        self._at = at
        self._kinds[at] = wire.READING_KIND_MISSED
        if self._left > 0:
            self._left -= 1
            return
        if self._seen < SIZE:
            self._seen += 1
        if self._is_triggered(setpoint):
            self._take_trigger()

    def put(self, kind, counts):
        """What the conversion gave that was collected in this control step."""
        at = self._at
        self._kinds[at] = kind
        self._counts[at] = counts

    def _look(self, setpoint):
        if self._trigger == wire.BURST_TRIGGER_FAULT:
            return self._guard.fault
        return setpoint if self._machine.state == wire.STATE_SINKING else _NOT_SINKING

    def _is_triggered(self, setpoint):
        if self._trigger == wire.BURST_TRIGGER_NOW:
            return True
        seen = self._look(setpoint)
        if seen == self._watched:
            return False
        self._watched = seen
        # A fault that was cleared is no trigger; the next one is.
        return self._trigger != wire.BURST_TRIGGER_FAULT or seen != wire.FAULT_NONE

    def _take_trigger(self):
        before = self._wanted if self._wanted < self._seen else self._seen
        self.before = before
        self._first = (self._at + 1 - before) & _MASK
        self._left = SIZE - self._wanted
        self.seconds = self._time.seconds
        self.micros = self._time.micros

    def _complete(self):
        self.total = SIZE - self._wanted + self.before
        self.recording = False

    # -- fetching, between control steps ------------------------------------------------------------------------

    def reading(self, number, zero_uA):
        """(kind, value) of reading `number`, the current less its zero."""
        at = (self._first + number) & _MASK
        kind = self._kinds[at]
        if kind == wire.READING_KIND_MISSED:
            return kind, 0
        value = self._scales[kind].reading(self._counts[at])
        return kind, value - zero_uA if kind == wire.READING_KIND_CURRENT else value

    def started_us(self, period_us):
        """When the first reading's conversion began, 0 without a capture; may be a big integer."""
        if not self.total:
            return 0
        return self.seconds * 1_000_000 + self.micros - self.before * period_us
