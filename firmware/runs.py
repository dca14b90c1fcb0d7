"""The run that goes on, or the last one: its name, when it began and ended, what ended it, whether it was fetched.

A run lasts from Enable to whatever takes the load out of SINKING. One that may go on without its host is kept from
being overwritten until somebody says that it is in a record. Everything here happens between control steps.
"""

import wire


class Runs:
    def __init__(self, machine, guard, ends, timekeeper, telemetry):
        self._machine = machine
        self._guard = guard
        self._ends = ends
        self._time = timekeeper
        self._telemetry = telemetry
        self.run = 0
        self.when_silent = wire.SILENCE_STOP
        self.ended_by = wire.RUN_END_NONE
        self.started_us = 0
        self.ended_us = 0
        self.going = False
        self.fetched = True

    @property
    def alone(self):
        """Whether the run that goes on may do so without its host."""
        return self.going and self.when_silent == wire.SILENCE_CONTINUE

    def begin(self, run, when_silent):
        """A run begins; the gate is released right after this."""
        self.run = run
        self.when_silent = when_silent
        self.ended_by = wire.RUN_END_NONE
        self.started_us = self._time.now_us()
        self.ended_us = 0
        self.fetched = when_silent == wire.SILENCE_STOP
        self._guard.alone = not self.fetched
        self._ends.begin()
        self.going = True

    def note_end(self):
        """The load has left SINKING: what `going` is for whoever looks after each control step."""
        self.going = False
        self.ended_us = self._time.now_us()
        self.ended_by = self._what_ended_it()
        self._guard.alone = False
        self._ends.watching = False
        self._ends.forget()
        if self._ends.reached:
            self._telemetry.tell(wire.EVENT_ENDED, self.ended_by)

    def _what_ended_it(self):
        if self._ends.reached:
            return self._ends.reached
        return wire.RUN_END_FAULT if self._guard.fault else wire.RUN_END_DISABLED
