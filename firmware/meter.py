"""Voltage, current, power, charge and energy, from alternating conversions, without loss of resolution.

A pair is a current conversion between two voltage conversions: power is that current times the mean of the two
voltages, which cancels the time between them to first order. Charge and energy are kept in microampere-steps
and microwatt-steps as two limbs, so that a week at the smallest current loses nothing. Windows gather means and
extremes for whoever reads them. Everything called within the control step allocates nothing and stays below 2**30.
"""

from micropython import const

LIMB_BITS = const(26)
LIMB_MASK = const((1 << 26) - 1)
_FAR = const(0x3FFFFFFF)
#: What the scales may give at most (main checks it at boot), so that a product of the two stays a small integer.
LARGEST_VOLTAGE_uV = const(80_000_000)
LARGEST_CURRENT_uA = const(12_000_000)
#: A pair stands for the two or three steps since the one before, and for no more than these after a stall.
MOST_STEPS = const(8)
#: A window that nobody restarts begins anew after these, some days; its high limb then holds less than 2**28.
_MOST_PAIRS = const(1 << 26)


class Limbs:
    """A sum that never overflows: `high * 2**26 + low`; an amount may reach 2**30 - 2**26."""

    def __init__(self):
        self.clear()

    def clear(self):
        self.high = 0
        self.low = 0

    def add(self, amount):
        low = self.low + amount
        self.high += low >> LIMB_BITS
        self.low = low & LIMB_MASK

    def total(self):
        return (self.high << LIMB_BITS) + self.low


class Window:
    """Means and extremes of the pairs since `restart`."""

    def __init__(self):
        self.restart()

    def restart(self):
        self.pairs = 0
        self._voltage_high = 0
        self._voltage_low = 0
        self._current_high = 0
        self._current_low = 0
        self.voltage_min_uV = _FAR
        self.voltage_max_uV = -_FAR
        self.current_min_uA = _FAR
        self.current_max_uA = -_FAR

    def see_voltage(self, voltage_uV):
        if voltage_uV < self.voltage_min_uV:
            self.voltage_min_uV = voltage_uV
        if voltage_uV > self.voltage_max_uV:
            self.voltage_max_uV = voltage_uV

    def add(self, seen_uV, mean_uV, current_uA):
        """A pair: the voltage that completed it, for the extremes, and its mean voltage and current."""
        if self.pairs >= _MOST_PAIRS:
            self.restart()
        self.pairs += 1
        # As `see_voltage` does, without the call: nothing else is done as often.
        if seen_uV < self.voltage_min_uV:
            self.voltage_min_uV = seen_uV
        if seen_uV > self.voltage_max_uV:
            self.voltage_max_uV = seen_uV
        low = self._voltage_low + mean_uV
        self._voltage_high += low >> LIMB_BITS
        self._voltage_low = low & LIMB_MASK
        low = self._current_low + current_uA
        self._current_high += low >> LIMB_BITS
        self._current_low = low & LIMB_MASK
        if current_uA < self.current_min_uA:
            self.current_min_uA = current_uA
        if current_uA > self.current_max_uA:
            self.current_max_uA = current_uA

    def voltage_uV(self):
        return ((self._voltage_high << LIMB_BITS) + self._voltage_low) // self.pairs

    def current_uA(self):
        return ((self._current_high << LIMB_BITS) + self._current_low) // self.pairs


def power_uW(voltage_uV, current_uA):
    """Product to within 2 uW, every intermediate below 2**30 for readings within the meter's bounds."""
    voltage_mV = voltage_uV // 1000
    current_mA = current_uA // 1000
    small = voltage_mV * (current_uA - current_mA * 1000) + (voltage_uV - voltage_mV * 1000) * current_mA
    return voltage_mV * current_mA + small // 1000


class Meter:
    def __init__(self, period_us):
        self._period_us = period_us
        self._current_is_fresh = False
        #: Control steps since the last pair; the control step counts them up to MOST_STEPS.
        self.steps = 0
        self.counting = False
        self.voltage_uV = 0
        #: The mean of the two voltages around `current_uA`, as of the last pair.
        self.pair_uV = 0
        self.current_uA = 0
        self.power_uW = 0
        self.force_uV = 0
        self.heatsink_mC = 0
        self.charge = Limbs()
        self.energy = Limbs()
        self.telemetry = Window()
        self.log = Window()

    def take_current(self, current_uA):
        # A zero out of its budget moves a reading beyond what the scale gives.
        if not -LARGEST_CURRENT_uA <= current_uA <= LARGEST_CURRENT_uA:
            current_uA = LARGEST_CURRENT_uA if current_uA > 0 else -LARGEST_CURRENT_uA
        self.current_uA = current_uA
        self._current_is_fresh = True

    def take_voltage(self, voltage_uV):
        """Return whether this voltage completed a pair."""
        before = self.voltage_uV
        self.voltage_uV = voltage_uV
        if self._current_is_fresh:
            self._current_is_fresh = False
            self._pair((before + voltage_uV) >> 1)
            return True
        self.telemetry.see_voltage(voltage_uV)
        if self.counting:
            self.log.see_voltage(voltage_uV)
        return False

    def _pair(self, mean_uV):
        current_uA = self.current_uA
        power = power_uW(mean_uV, current_uA)
        self.power_uW = power
        self.pair_uV = mean_uV
        self.telemetry.add(self.voltage_uV, mean_uV, current_uA)
        if self.counting:
            self.log.add(self.voltage_uV, mean_uV, current_uA)
            self._count(current_uA, power)
        self.steps = 0

    def _count(self, current_uA, power):
        steps = self.steps
        self.charge.add(current_uA * steps)
        if -_FAR // MOST_STEPS < power < _FAR // MOST_STEPS:
            self.energy.add(power * steps)
            return
        # The product would pass 2**30.
        for _ in range(steps):
            self.energy.add(power)

    def restart(self):
        """A run begins: charge and energy count from nothing."""
        self.charge.clear()
        self.energy.clear()
        self.counting = True

    def stop(self):
        self.counting = False

    def charge_uC(self):
        return self.charge.total() * self._period_us // 1_000_000

    def energy_uJ(self):
        return self.energy.total() * self._period_us // 1_000_000
