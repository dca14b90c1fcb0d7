"""How the load's state is shown by one lamp, so that it can be told without telling colours apart.

Off blinks shortly every two and a half seconds, which says that the board lives; sinking shines; ended blinks slowly;
fault blinks fast. The state is shown at once when it changes; only the blinking waits for `turn`.
"""

from micropython import const

import wire

# What follows counts calls of `turn`, which the loop makes every 16 steps: 38 ms with the usual period.
_SHORT_MASK = const(0x3F)  # lit once in 64
_SLOW_BIT = const(0x10)  # 16 lit, 16 dark: 1.2 s
_FAST_BIT = const(0x02)  # 2 lit, 2 dark: 0.15 s


class Lamp:
    def __init__(self, led):
        self._led = led
        self._state = wire.STATE_OFF
        self._count = 0
        self._lit = True

    def show(self, state):
        """A new state. May be called within the control step: allocates nothing."""
        self._state = state
        self._count = 0
        self._lit = True
        self._led.show(state, True)

    def turn(self):
        """The next moment of the blinking."""
        self._count = (self._count + 1) & _SHORT_MASK
        lit = lit_at(self._state, self._count)
        if lit != self._lit:
            self._lit = lit
            self._led.show(self._state, lit)


def lit_at(state, count):
    """Whether the lamp is lit at `count`; every pattern begins lit."""
    if state == wire.STATE_SINKING:
        return True
    if state == wire.STATE_ENDED:
        return not count & _SLOW_BIT
    if state == wire.STATE_FAULT:
        return not count & _FAST_BIT
    return not count
