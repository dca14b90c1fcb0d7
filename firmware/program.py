"""A program: a list of set-points that the board follows by itself, timed in control steps.

Each step of the list goes to its value at once or along a ramp, and may hold the trigger output high while it
lasts. What a duration leaves over of a whole control step is carried on to the next, so that a pulse train of any
length stays within one control step of its nominal times. Values are in the unit of the mode in force; who may load a
program and which values the limits allow is not decided here. `step` is called once a control period: it allocates
nothing, and every intermediate stays below 2**30.
"""

from array import array

from micropython import const

import wire

MOST_STEPS = const(100)
#: A control step more is carried over at most, and the ramp's remainder reaches twice this.
_MOST_CONTROL_STEPS = const((1 << 29) - 2)
_LARGEST_VALUE = const((1 << 30) - 1)
_RAMP = const(1)
_TRIGGER = const(2)


class Program:
    def __init__(self, period_us, control, machine, ends, trigger):
        """`trigger` is the board's output pin: `trigger.set(level)`."""
        self._period_us = period_us
        self._control = control
        self._machine = machine
        self._ends = ends
        self._trigger = trigger
        self._steps = array("i", [0] * MOST_STEPS)
        self._rest_us = array("i", [0] * MOST_STEPS)
        self._values = array("i", [0] * MOST_STEPS)
        self._flags = bytearray(MOST_STEPS)
        self.running = False
        self.value = 0
        self._at = 0
        self._left = 0
        self._carry_us = 0
        self._rounds_left = 0
        self._ramping = False
        self._whole = 0
        self._part = 0
        self._parts = 0
        self._sum = 0
        self.forget()

    # -- loading, between control steps -------------------------------------------------------------------------

    def forget(self, total=0, repeats=1):
        """Make room for a list of `total` steps; `repeats` 0 runs until something else ends the run."""
        self.total = total
        self.repeats = repeats
        self.count = 0

    def add(self, duration_ms, value, shape, trigger):
        """Append one step; return whether it can be followed."""
        steps = duration_ms * 1000 // self._period_us
        possible = (
            self.count < self.total
            and 1 <= steps <= _MOST_CONTROL_STEPS
            and 0 <= value <= _LARGEST_VALUE
            and shape in (wire.SHAPE_STEP, wire.SHAPE_RAMP)
            and trigger in (0, 1)
        )
        if possible:
            at = self.count
            self._steps[at] = steps
            self._rest_us[at] = duration_ms * 1000 - steps * self._period_us
            self._values[at] = value
            self._flags[at] = (_RAMP if shape == wire.SHAPE_RAMP else 0) | (_TRIGGER if trigger else 0)
            self.count = at + 1
        return possible

    def complete(self):
        return self.total > 0 and self.count == self.total

    def value_at(self, number):
        return self._values[number]

    # -- following ----------------------------------------------------------------------------------------------

    def begin(self, value):
        """From the next control step on; a first ramp goes from `value`."""
        self.value = value
        self._at = -1
        self._left = 0
        self._carry_us = 0
        self._rounds_left = self.repeats
        self.running = True

    def stop(self):
        self.running = False
        self._trigger.set(0)

    def step(self):
        """One control step: ask for the value that is due in it."""
        if self._machine.state != wire.STATE_SINKING:
            self.stop()
            return
        if not self._left:
            self._go_on()
            if not self.running:
                return
        self._left -= 1
        if self._ramping:
            self._climb()

    def _go_on(self):
        at = self._at + 1
        if at == self.count:
            at = 0
            if self.repeats:
                self._rounds_left -= 1
                if not self._rounds_left:
                    self.stop()
                    self._ends.end(wire.RUN_END_PROGRAM)
                    return
        self._at = at
        self._left = self._length(at)
        self._enter(self._flags[at], self._values[at])

    def _length(self, at):
        """How many control steps it lasts this time."""
        carry_us = self._carry_us + self._rest_us[at]
        steps = self._steps[at]
        if carry_us >= self._period_us:
            carry_us -= self._period_us
            steps += 1
        self._carry_us = carry_us
        return steps

    def _enter(self, flags, value):
        self._trigger.set(flags & _TRIGGER)
        self._ramping = flags & _RAMP
        if self._ramping:
            self._aim(value - self.value)
        else:
            self.value = value
            self._control.ask(value)

    def _aim(self, change):
        """A ramp moves by whole units, and by one more whenever the remainders add up to one."""
        parts = self._left
        self._whole = change // parts
        self._part = change % parts
        self._parts = parts
        self._sum = 0

    def _climb(self):
        value = self.value + self._whole
        remainder = self._sum + self._part
        if remainder >= self._parts:
            remainder -= self._parts
            value += 1
        self._sum = remainder
        self.value = value
        self._control.ask(value)
