"""How much power the load may still take as it gets hot: less and less, before anything trips.

Over the last 10 K below a limit the power that is allowed falls linearly from all to nothing. The heatsink is
measured, and that slowly. The junction would follow the power within milliseconds, and a cap that followed the
junction would swing with it; so its line is solved for the power at which junction and cap agree: with the junction
`P * R` above the heatsink, `P = Pmax * (limit - heatsink - P * R) / 10 K` gives
`P = (limit - heatsink) / (10 K / Pmax + R)`. Either way the cap depends on the heatsink alone, which no step of the
load moves quickly: no oscillation, and no hysteresis is needed. Allocates nothing after construction.
"""

from micropython import const

_BAND_mK = const(10_000)
_SMOOTH_BITS = const(2)


class Derating:
    def __init__(self, stages):
        """`stages` as the junction has them: from the junction to where the thermistor sits."""
        self._rise_mK_per_W = sum([stage["r_mK_per_W"] for stage in stages])
        #: Whether less than the whole power is allowed, and how much is.
        self.active = False
        self.power_mW = 0

    def apply(self, limits):
        self._largest_mW = max(limits.power_uW // 1000, 1)
        self._heatsink_mC = limits.heatsink_mC
        self._junction_mC = limits.junction_mC
        self._junction_mK_per_W = self._rise_mK_per_W + _BAND_mK * 1000 // self._largest_mW
        if not self.active:
            self.power_mW = self._largest_mW

    def step(self, heatsink_mC):
        """A new temperature; the products stay below 2**30 for 400 W and any temperature of the table."""
        largest_mW = self._largest_mW
        room_mK = max(self._heatsink_mC - heatsink_mC, 0)
        power_mW = largest_mW
        if room_mK < _BAND_mK:
            power_mW = largest_mW * (room_mK >> 3) // (_BAND_mK >> 3)
        room_mK = max(self._junction_mC - heatsink_mC, 0)
        power_mW = min(power_mW, room_mK * 1000 // self._junction_mK_per_W)
        self.power_mW = power_mW
        self.active = power_mW < largest_mW

    def smoothed_uA(self, before_uA, voltage_uV, limit_uA):
        """The current cap, a quarter of the way from `before_uA` to what the power allows at this voltage."""
        voltage_mV = voltage_uV // 1000
        current_uA = limit_uA
        if voltage_mV > 0:
            # Both in mA, because at a low voltage the power allows more than a small integer of uA holds.
            current_uA = min(self.power_mW * 1000 // voltage_mV, limit_uA // 1000) * 1000
        return before_uA + (current_uA - before_uA >> _SMOOTH_BITS)
