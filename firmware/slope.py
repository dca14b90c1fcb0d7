"""The source's resistance as the load can see it: how far the voltage falls when the current rises.

A chord between two settled voltage-current pairs says no more than an interval, because each voltage may be off by
a count: the estimate is moved no further than into that interval, and begins at its upper end, which makes the laws
that use it slower, never unstable. Nothing is assumed of the source but this. Called within the control step:
allocates nothing, and every intermediate stays below 2**30.
"""

from micropython import const

#: A source of more than this is followed as if it had this.
UNKNOWN_mohm = const(1_000_000)
#: Below this the wires between source and load decide, and the laws would only amplify noise.
_LEAST_mohm = const(4)
#: A pair older than so many others is no end of a chord any more: a cell has moved on meanwhile.
_OLD_PAIRS = const(64)
_FINE_uV = const(1_000_000)
_COARSE_BITS = const(7)


class Slope:
    def __init__(self, voltage_step_uV, least_change_uA):
        """One count of the voltage, and the smallest change of current worth looking at."""
        self._doubt_uV = 3 * voltage_step_uV
        self._least_uA = least_change_uA
        self.begin(0)

    def begin(self, open_uV):
        """Another source may be there now, with this voltage at no current."""
        self.mohm = UNKNOWN_mohm
        self.known = False
        self._note(open_uV, 0)

    def see(self, voltage_uV, current_uA):
        """A pair read while nothing had moved for its whole length."""
        change_uA = current_uA - self._current_uA
        if change_uA >= self._least_uA:
            self._narrow(self._voltage_uV - voltage_uV, change_uA)
            self._note(voltage_uV, current_uA)
        elif change_uA <= -self._least_uA:
            self._narrow(voltage_uV - self._voltage_uV, -change_uA)
            self._note(voltage_uV, current_uA)
        else:
            self._age += 1
            if self._age > _OLD_PAIRS:
                self._note(voltage_uV, current_uA)

    def _note(self, voltage_uV, current_uA):
        self._voltage_uV = voltage_uV
        self._current_uA = current_uA
        self._age = 0

    def _narrow(self, drop_uV, rise_uA):
        least = _mohm(drop_uV - self._doubt_uV, rise_uA)
        most = _mohm(drop_uV + self._doubt_uV, rise_uA)
        if most < _LEAST_mohm:
            most = _LEAST_mohm
        if self.mohm < least:
            self.mohm = least if least < UNKNOWN_mohm else UNKNOWN_mohm
        elif self.mohm > most:
            self.mohm = most
        self.known = True


def _mohm(drop_uV, rise_uA):
    if drop_uV <= 0:
        return 0
    if drop_uV < _FINE_uV:
        return drop_uV * 1000 // rise_uA
    return (drop_uV >> _COARSE_BITS) * 1000 // ((rise_uA >> _COARSE_BITS) + 1)
