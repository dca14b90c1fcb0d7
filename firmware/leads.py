"""Whether the sense pair shows what the terminals carry: told from the difference of the two voltages.

The source's voltage is what the terminals show plus what the leads drop, and the leads drop at most the current
times what the board file allows them. Around that lies the band of both dividers' tolerances. A sense lead that is
open or swapped, or a force lead that is open, takes the difference out of it. The voltages are read at different
times, so the terminals' own is held against those before and after it, and ripple, which makes differences alternate,
is not believed; several of one sign are. Allocates nothing after construction.
"""

from micropython import const

#: Differences in a row, of one sign: half a second, and no beat with mains ripple looks like that.
_CONFIRMED = const(3)
_SHARE_BITS = const(10)
_WHOLE = const(256)


class Leads:
    def __init__(self, entry):
        self._fixed_uV = entry["fixed_uV"]
        self._share_x1024 = entry["share_x1024"]
        self._lead_mohm = entry["lead_mohm"]
        self._sign = 0
        self._times = 0
        self.before_uV = 0
        self.difference_uV = 0
        self.bound_uV = 0
        #: The least share of the power, in 1/256, that lately reached the terminals: the leads kept the rest.
        self.share_x256 = _WHOLE

    def see(self, voltage_uV, force_uV, current_uA):
        """The terminals' own voltage beside that before it, `before_uV`, and that after it, with the current then.

        Only what is wrong beside both is no step of the load.
        """
        sign = self._side(self.before_uV, force_uV, current_uA)
        if sign and sign != self._side(voltage_uV, force_uV, current_uA):
            sign = 0
        self._count(sign)

    def _side(self, voltage_uV, force_uV, current_uA):
        """-1 below the band, 1 above; |uV| below 2**27 and uA below 2**24 keep all below 2**30."""
        higher_uV = voltage_uV if voltage_uV > force_uV else force_uV
        band_uV = self._fixed_uV + (higher_uV >> _SHARE_BITS) * self._share_x1024
        self.difference_uV = voltage_uV - force_uV
        if self.difference_uV < -band_uV:
            self.bound_uV = -band_uV
            return -1
        if current_uA > 0:
            band_uV += current_uA // 1000 * self._lead_mohm
        self.bound_uV = band_uV
        return 1 if self.difference_uV > band_uV else 0

    def _count(self, sign):
        if sign != self._sign:
            self._sign = sign
            self._times = 1
        elif self._times < _CONFIRMED:
            self._times += 1

    def wrong(self):
        """Whether the last differences were all out of the band."""
        return self._sign != 0 and self._times >= _CONFIRMED

    def out_of_band(self):
        """Whether the last one was."""
        return self._sign != 0

    def swapped(self, voltage_uV, force_uV):
        """Whether the pair shows a wrong sign although the terminals do not."""
        return voltage_uV < 0 and force_uV > self._fixed_uV

    def note_share(self, voltage_uV, force_uV):
        """While the load sinks: what part of the source's power arrives. Recovers slowly, so that pulses count."""
        share = self.share_x256
        if 0 < force_uV < voltage_uV:
            seen = (force_uV >> 10) * _WHOLE // ((voltage_uV >> 10) + 1)
            if seen < share:
                self.share_x256 = seen
                return
        if share < _WHOLE:
            self.share_x256 = share + 1
