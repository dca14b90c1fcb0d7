"""Whether the heatsink's temperature fits the power: a thermistor fallen off, or cooling weaker than expected.

How warm the air is nobody measures. Slow models bound the sink's rise above it from both sides: `most`, with the
weakest cooling that a healthy board has, and `least`, with the best. A sink of heat capacity C behind a resistance R
obeys C * dx/dt = P - x / R (one stage of a Foster chain); with the largest R, the smallest C while warming and the
largest while cooling, a model stays above every healthy board's rise, whatever the power does, and with the opposites
below it. So the air lies between `temperature - most` and `temperature - least`, now and, but for a slow drift, at all
earlier times. Where no air fits all readings, the board is not healthy: the sink is warmer than any air explains, or
colder. Nor can a sink cool faster than the best cooling in the coldest air lets it, which is how a thermistor that
falls off is noticed at once. At power-up the sink may still be warm, and below the fan's temperature the fan may rest.

Called with every reading of the heatsink. Allocates nothing after construction; every intermediate below 2**30.
"""

from micropython import const

from fan import ON_mC

FITS = const(0)
TOO_WARM = const(1)
TOO_COLD = const(2)

_HALF_BITS = const(15)
_HALF_MASK = const((1 << 15) - 1)
_LARGEST_RISE_uK = const(250_000_000)
_CONFIRMED = const(4)
#: A bound moves by an eighth of the way, so that one odd reading cannot spoil it.
_FOLLOW_BITS = const(3)
#: The fan is told now and then, and a reading has its noise.
_FAN_SURE_mC = const(1_000)


class Stage:
    """One cooling: the rise goes a share of its way in each step, another share when it falls than when it grows."""

    def __init__(self, entry):
        """Each share is `[part below 2**13, shift]`, for part / 2**(15 + shift)."""
        self._mK_per_W = entry["r_mK_per_W"]
        self._largest_mW = _LARGEST_RISE_uK // entry["r_mK_per_W"]
        self._warm_part, self._warm_shift = entry["warm"]
        self._cool_part, self._cool_shift = entry["cool"]

    def change_uK(self, power_mW, rise_uK):
        if power_mW > self._largest_mW:
            power_mW = self._largest_mW
        delta_uK = power_mW * self._mK_per_W - rise_uK
        if delta_uK > 0:
            return _share(delta_uK, self._warm_part) >> self._warm_shift
        return _share(delta_uK, self._cool_part) >> self._cool_shift


def _share(delta_uK, part):
    """`delta_uK * part / 2**15`, in two halves."""
    return (delta_uK >> _HALF_BITS) * part + ((delta_uK & _HALF_MASK) * part >> _HALF_BITS)


class Cooling:
    def __init__(self, entry):
        self._blown = Stage(entry["most"])
        self._still = Stage(entry["still"])
        self._best = Stage(entry["least"])
        self._drift_uK = entry["drift_uK"]
        self._allowance_uK = entry["allowance_mK"] * 1000
        self._coldest_uK = entry["coldest_mC"] * 1000
        self._begun = False
        self._most_uK = 0
        self._least_uK = 0
        # How far above the coldest air the sink must still be.
        self._floor_uK = 0
        self._air_low_uK = 0
        self._air_high_uK = 0
        self._times = 0
        #: What the last reading alone says, and the temperature that it should not have passed.
        self.seen = FITS
        self.bound_mC = 0

    def step(self, heatsink_mC, power_mW, least_power_mW):
        """One reading, with the mean power since the last one and what of it reached the sink at least."""
        if not self._begun:
            self._begin(heatsink_mC * 1000)
        self._rise_most(heatsink_mC, power_mW)
        self._rise_least(least_power_mW)
        heatsink_mC *= 1000
        self._judge(heatsink_mC)
        self._narrow_low(heatsink_mC)
        self._narrow_high(heatsink_mC)

    def accept(self, heatsink_mC):
        """Believe the present reading: the air has changed, or what did not fit was put right."""
        self._restart(heatsink_mC * 1000)
        self.seen = FITS

    def confirmed(self):
        """What the last readings all say."""
        return self.seen if self._times >= _CONFIRMED - 1 else FITS

    def _begin(self, heatsink_uK):
        self._begun = True
        self._most_uK = max(heatsink_uK - self._coldest_uK, 0)
        self._restart(heatsink_uK)

    def _restart(self, heatsink_uK):
        self._air_low_uK = heatsink_uK - self._most_uK
        self._air_high_uK = heatsink_uK - self._least_uK
        self._floor_uK = heatsink_uK - self._coldest_uK

    def _rise_most(self, heatsink_mC, power_mW):
        stage = self._blown if heatsink_mC > ON_mC + _FAN_SURE_mC else self._still
        self._most_uK += stage.change_uK(power_mW, self._most_uK)

    def _rise_least(self, least_power_mW):
        self._least_uK += self._best.change_uK(least_power_mW, self._least_uK)
        self._floor_uK += self._best.change_uK(least_power_mW, self._floor_uK)

    def _narrow_low(self, heatsink_uK):
        """The air is where all readings so far leave it, give or take its drift."""
        low_uK = self._air_low_uK - self._drift_uK
        change_uK = heatsink_uK - self._most_uK - low_uK
        if change_uK > 0:
            low_uK += change_uK >> _FOLLOW_BITS
        self._air_low_uK = low_uK
        change_uK = heatsink_uK - self._coldest_uK - self._floor_uK
        if change_uK > 0:
            self._floor_uK += change_uK >> _FOLLOW_BITS

    def _narrow_high(self, heatsink_uK):
        high_uK = self._air_high_uK + self._drift_uK
        change_uK = heatsink_uK - self._least_uK - high_uK
        if change_uK < 0:
            high_uK += change_uK >> _FOLLOW_BITS
        self._air_high_uK = high_uK

    def _judge(self, heatsink_uK):
        warmest_uK = self._air_high_uK + self._most_uK + self._allowance_uK
        coldest_uK = self._air_low_uK + self._least_uK
        floor_uK = self._coldest_uK + self._floor_uK
        if floor_uK > coldest_uK:
            coldest_uK = floor_uK
        coldest_uK -= self._allowance_uK
        if heatsink_uK > warmest_uK:
            self._see(TOO_WARM, warmest_uK)
        elif heatsink_uK < coldest_uK:
            self._see(TOO_COLD, coldest_uK)
        else:
            self.seen = FITS

    def _see(self, seen, bound_uK):
        if seen != self.seen:
            self._times = 0
        elif self._times < _CONFIRMED:
            self._times += 1
        self.seen = seen
        self.bound_mC = bound_uK // 1000
