"""When each control step is due, how late it came, and what time it is on the board.

Steps are never skipped: a late one is counted and the following ones catch up. Board time is two small integers
(seconds, microseconds), which never wrap within a person's life; the clock object alone knows where the port's
tick counter wraps. `tick` is called within the control step and allocates nothing.
"""

from micropython import const

_SECOND_us = const(1_000_000)


class Timekeeper:
    def __init__(self, clock, period_us):
        self._clock = clock
        self._period_us = period_us
        self._deadline = clock.ticks_us()
        self.late_us = 0
        self.overruns = 0
        self.seconds = 0
        self.micros = 0

    def begin(self):
        """The first period begins now: what came before was no control step."""
        self._deadline = self._clock.ticks_us()

    def wait(self):
        """Idle until the next step is due."""
        self._deadline = self._clock.add(self._deadline, self._period_us)
        self._clock.wait_until(self._deadline)

    def tick(self):
        """Note the start of a step; return how late it is in microseconds."""
        late = self._clock.since(self._deadline)
        self.micros += self._period_us + late - self.late_us
        self.late_us = late
        while self.micros >= _SECOND_us:
            self.micros -= _SECOND_us
            self.seconds += 1
        if late > self._period_us:
            self.overruns = (self.overruns + 1) & 0xFFFF
        return late

    def start_afresh(self):
        """After a stall: the missed steps are given up, time is not."""
        self._deadline = self._clock.add(self._deadline, self.late_us)
        self.late_us = 0

    def now_us(self):
        """Board time as one integer; may be a big one, so not for use within the step."""
        return self.seconds * _SECOND_us + self.micros
