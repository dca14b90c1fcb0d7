"""Junction temperature, estimated from the sensor's temperature and the power, through Foster stages.

Each stage is one exponential towards `power * resistance` (Zth = sum of Ri * (1 - exp(-t/taui)), the transient
thermal impedance of JESD51-14). The stages reach from the junction to the place where the thermistor sits, so the
heatsink's own slow stage, which the thermistor measures, is not among them. Quick stages move every second
control step, as often as the power is measured; a slow one, whose share of so short a time would vanish in the
rounding, moves at its own slower rate. Allocates nothing after construction.
"""

from array import array

from micropython import const

_TURNS = const(256)
_SHARE_BITS = const(15)
_HALF_BITS = const(14)
_HALF_MASK = const((1 << 14) - 1)
_LARGEST_RISE_uK = const(400_000_000)


class Junction:
    def __init__(self, stages):
        """`stages`, quickest first, each with r_mK_per_W, every_steps (a power of two from 2 to 512) and
        share_x32768, the part of the way that it goes in every_steps control steps."""
        self._resistance_mK_per_W = array("i", [stage["r_mK_per_W"] for stage in stages])
        # All stages together are held below 2**30, whatever power a shorted transistor or a reversed reading
        # shows; the guard has tripped long before.
        self._largest_mW = _LARGEST_RISE_uK // sum([stage["r_mK_per_W"] for stage in stages])
        self._share = array("i", [stage["share_x32768"] for stage in stages])
        self._rise_uK = array("i", [0] * len(stages))
        every_turns = [stage["every_steps"] >> 1 for stage in stages]
        self._quick = every_turns.count(1)
        self._slow_at = _slow_turns(every_turns)
        self._turn = 0
        self._total_uK = 0
        self.rise_mK = 0

    def step(self, power_mW):
        """Two control steps at `power_mW`; `rise_mK` is then the junction's rise above the sensor."""
        if power_mW > self._largest_mW:
            power_mW = self._largest_mW
        elif power_mW < 0:
            power_mW = 0
        self._turn = (self._turn + 1) % _TURNS
        for stage in range(self._quick):
            self._advance(stage, power_mW)
        slow = self._slow_at[self._turn]
        if slow:
            self._advance(slow - 1, power_mW)
        self.rise_mK = self._total_uK // 1000

    def _advance(self, stage, power_mW):
        # In two halves, so that neither product passes 2**30, however far the stage has to go.
        delta_uK = self._resistance_mK_per_W[stage] * power_mW - self._rise_uK[stage]
        change_uK = (delta_uK >> _HALF_BITS) * self._share[stage] >> _SHARE_BITS - _HALF_BITS
        change_uK += (delta_uK & _HALF_MASK) * self._share[stage] >> _SHARE_BITS
        self._rise_uK[stage] += change_uK
        self._total_uK += change_uK


def _slow_turns(every_turns):
    """Which slow stage moves at each turn (its number + 1, or 0): in the middle of its interval where that is free."""
    table = bytearray(_TURNS)
    for stage, every in enumerate(every_turns):
        if every == 1:
            continue
        first = every >> 1
        while table[first]:
            first += 1
        for turn in range(first, _TURNS, every):
            table[turn] = stage + 1
    return bytes(table)
