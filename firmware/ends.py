"""When a run ends by itself: voltage, charge, energy, time or temperature, whichever comes first, host or no host.

`check` looks once a voltage-current pair and clamps the gate through the state table. Charge and energy are compared
with what the meter sums, in its own limbs, so that a week loses nothing. Ends hold for the run that goes on, or else
for the next one, and are forgotten when it ends: none can surprise a later run. `check` is called within the control
step: it allocates nothing and stays below 2**30.
"""

from micropython import const

import states
import wire
from meter import LIMB_BITS, LIMB_MASK

#: Pairs in a row at or below the end voltage: 39 ms, nearly four periods of rectified mains ripple.
_LOW_PAIRS = const(8)
_FAR = const(0x3FFFFFFF)
_SECOND_us = const(1_000_000)


class Ends:
    def __init__(self, machine, meter, timekeeper, period_us):
        self._machine = machine
        self._meter = meter
        self._time = timekeeper
        self._period_us = period_us
        #: RunEnd of the run that goes on or the last one, as far as the board itself ended it.
        self.reached = wire.RUN_END_NONE
        self.watching = False
        self._low_pairs = 0
        self._begun_s = 0
        self._begun_us = 0
        self.forget()

    # -- between control steps ------------------------------------------------------------------------------------

    def forget(self):
        self.ask(0, 0, 0, 0, 0)

    def ask(self, voltage_uV, charge_mC, energy_mJ, duration_ms, temperature_mC):
        """Put ends in force; 0 is none."""
        self._sufficient = bool(voltage_uV and (charge_mC or duration_ms))
        #: Whether there is any.
        self.some = bool(voltage_uV or charge_mC or energy_mJ or duration_ms or temperature_mC)
        self._voltage_uV = min(voltage_uV, _FAR) if voltage_uV else -_FAR
        self._temperature_mC = min(temperature_mC, _FAR) if temperature_mC else _FAR
        self._charge_high, self._charge_low = self._in_limbs(charge_mC)
        self._energy_high, self._energy_low = self._in_limbs(energy_mJ)
        self._duration_ms = duration_ms
        self._set_deadline()

    def suffice(self):
        """Whether a run with these ends may go on without a host."""
        return self._sufficient

    def begin(self):
        """A run begins now."""
        self.reached = wire.RUN_END_NONE
        self._low_pairs = 0
        self._begun_s = self._time.seconds
        self._begun_us = self._time.micros
        self._set_deadline()
        self.watching = True

    def _in_limbs(self, milli):
        """Thousandths of a coulomb or joule as the meter counts them: in millionths, a control step each."""
        if not milli:
            return _FAR, 0
        total = -(-milli * 1000 * _SECOND_us // self._period_us)
        return min(total >> LIMB_BITS, _FAR), total & LIMB_MASK

    def _set_deadline(self):
        if not self._duration_ms:
            self._end_s = _FAR
            self._end_us = 0
            return
        seconds, milli = divmod(self._duration_ms, 1000)
        micros = self._begun_us + milli * 1000
        self._end_s = self._begun_s + seconds + micros // _SECOND_us
        self._end_us = micros % _SECOND_us

    # -- within the control step ----------------------------------------------------------------------------------

    def check(self):
        """Once a pair."""
        if not self.watching:
            return
        meter = self._meter
        if meter.voltage_uV > self._voltage_uV:
            self._low_pairs = 0
        else:
            self._on_low_voltage()
        if meter.charge.high >= self._charge_high:
            self._on_charge(meter.charge)
        if meter.energy.high >= self._energy_high:
            self._on_energy(meter.energy)
        if self._time.seconds >= self._end_s:
            self._on_last_second()
        if meter.heatsink_mC >= self._temperature_mC:
            self.end(wire.RUN_END_TEMPERATURE)

    def _on_low_voltage(self):
        self._low_pairs += 1
        if self._low_pairs >= _LOW_PAIRS:
            self.end(wire.RUN_END_VOLTAGE)

    def _on_charge(self, charge):
        if charge.high > self._charge_high or charge.low >= self._charge_low:
            self.end(wire.RUN_END_CHARGE)

    def _on_energy(self, energy):
        if energy.high > self._energy_high or energy.low >= self._energy_low:
            self.end(wire.RUN_END_ENERGY)

    def _on_last_second(self):
        if self._time.seconds > self._end_s or self._time.micros >= self._end_us:
            self.end(wire.RUN_END_DURATION)

    def end(self, reason):
        """End the run: the gate first. The first reason stands; without a run nothing happens."""
        if not self.watching:
            return
        if self._machine.fire(states.END):
            self._meter.stop()
            self.reached = reason
        self.watching = False
