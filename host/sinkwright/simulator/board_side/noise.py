"""Gaussian noise from a seed: a table made once, read in an order that a congruential generator draws.

The same seed gives the same noise on every run; integers only once the table is made, so drawing costs
little and allocates nothing.
"""

import math

_SIZE = 4096
_SHIFT = 20
_MASK = 0xFFFFFFFF
# Numerical Recipes' quick generator modulo 2**32; only its upper bits are used, the lower ones are not
# random.
_FACTOR = 1664525
_TERM = 1013904223


class Noise:
    """`table` holds normal deviates of standard deviation `scale`, as integers; see `draw`."""

    def __init__(self, seed, scale):
        self._state = (seed * 2654435761 + 12345) & _MASK
        self.table = [0] * _SIZE
        for k in range(0, _SIZE, 2):
            # Box and Muller's pair of normal deviates.
            radius = scale * math.sqrt(-2.0 * math.log(self._uniform()))
            angle = 2.0 * math.pi * self._uniform()
            self.table[k] = int(radius * math.cos(angle))
            self.table[k + 1] = int(radius * math.sin(angle))

    def _uniform(self):
        self._state = (self._state * _FACTOR + _TERM) & _MASK
        return ((self._state >> 8) + 1) / 16777217.0

    def draw(self):
        self._state = state = (self._state * _FACTOR + _TERM) & _MASK
        return self.table[state >> _SHIFT]
