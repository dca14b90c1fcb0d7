"""The control step: one conversion in, one decision, at most one DAC write out.

`step` is called once a control period and reads from top to bottom as time passes. The analogue loop holds the
current; this step supervises it, moves its set-point along a ramp and measures. It allocates nothing, and every
intermediate stays below 2**30. A bus error (OSError) leaves `step` and is told to the guard by the loop in main.
"""

from micropython import const

import wire
from chips.adc_ads1115 import LOWEST_COUNTS, NOT_READY
from meter import MOST_STEPS

_VOLTAGE = const(0)
_CURRENT = const(1)
_HEATSINK = const(2)
_FORCE = const(3)

# Sixteen voltage-current pairs, then one slow input, heatsink and force voltage by turns: 206 pairs a second at
# 2.35 ms, and a period that shares no small multiple with 100 or 120 Hz ripple.
_SCHEDULE = bytes([_VOLTAGE, _CURRENT] * 16 + [_HEATSINK] + [_VOLTAGE, _CURRENT] * 16 + [_FORCE])
_TURNS = const(66)

_ZERO_READINGS = const(64)
_SHORT_OF_DEMAND_PAIRS = const(3)
_NO_SOURCE_uV = const(100_000)
_TRIM_PAIRS = const(64)
_TRIM_BITS = const(6)


class Control:
    def __init__(
        self, image, dac, adc, scales, thermistor, demand, machine, guard, meter, timekeeper, junction
    ):
        self._dac = dac
        self._adc = adc
        self._voltage = scales["voltage"]
        self._current = scales["current"]
        self._force = scales["force"]
        self._thermistor = thermistor
        self._demand = demand
        self._machine = machine
        self._guard = guard
        self._meter = meter
        self._time = timekeeper
        self._junction = junction
        # What each turn of the schedule converts, and who takes its result.
        inputs = [image["adc"]["inputs"][name] for name in ("voltage", "current", "heatsink", "force")]
        takers = (self._take_voltage, self._take_current, self._take_heatsink, self._take_force)
        self._input_at = bytes([inputs[kind] for kind in _SCHEDULE])
        self._taker_at = [takers[kind] for kind in _SCHEDULE]
        self._margin_uA = image["demand_margin_uA"]
        self._period_us = image["period_us"]
        self._turn = 0
        self._odd = False
        self._converting = False
        self.using = wire.FAULT_ADC_SILENT
        self.setpoint_uA = 0
        self.demand_uA = 0
        self._demand_before_uA = 0
        self._steady = False
        self.limiting = wire.LIMITING_NONE
        self._short_pairs = 0
        self.zero_uA = 0
        self.zero_samples = 0
        self._zero_sum = 0
        self._zero_count = 0
        self._trim_uA = 0
        self._trim_sum = 0
        self._trim_count = 0
        self._code = -1

    def step(self):
        self._guard.step(self._time.tick())
        if self._meter.steps < MOST_STEPS:
            self._meter.steps += 1
        self.using = wire.FAULT_ADC_SILENT
        if self._converting:
            self._collect()
        else:
            self._begin()
        self._odd = not self._odd
        if self._odd:
            self._estimate_junction()
        self.using = wire.FAULT_DAC_SILENT
        self._drive()

    def _estimate_junction(self):
        self._junction.step(self._meter.power_uW // 1000)
        self._guard.on_junction(self.junction_mC())

    def junction_mC(self):
        return self._meter.heatsink_mC + self._junction.rise_mK

    # -- reading ------------------------------------------------------------------------------------------------

    def _begin(self):
        self._adc.begin(self._input_at[self._turn])
        self._converting = True

    def _collect(self):
        counts = self._adc.finish()
        if counts < LOWEST_COUNTS:
            self._missed(counts)
            return
        self._guard.not_ready = 0
        turn = self._turn
        self._turn = (turn + 1) % _TURNS
        # The next conversion gets the whole rest of the period.
        self._adc.begin(self._input_at[self._turn])
        self._taker_at[turn](counts)

    def _missed(self, counts):
        """Not ready: look again a step later. Anything else: ask anew, which also revives a part that was reset."""
        self._guard.on_no_conversion(counts == NOT_READY, self._adc.config_seen)
        if counts != NOT_READY:
            self._begin()

    def _take_current(self, counts):
        nominal_uA = self._current.reading(counts)
        current_uA = nominal_uA - self.zero_uA
        demand_uA = self.demand_uA
        if self._demand_before_uA > demand_uA:
            demand_uA = self._demand_before_uA
        self._guard.on_current(nominal_uA, current_uA, demand_uA)
        self._demand_before_uA = self.demand_uA
        self._meter.take_current(current_uA)
        if self._machine.state == wire.STATE_OFF and self._guard.settled_off():
            self._gather_zero(nominal_uA)
        elif self._zero_count:
            self._zero_count = 0
            self._zero_sum = 0

    def _take_voltage(self, counts):
        voltage_uV = self._voltage.reading(counts)
        self._guard.on_voltage(voltage_uV)
        if self._meter.take_voltage(voltage_uV):
            self._guard.on_power(self._meter.power_uW)
            self._judge_pair()

    def _take_heatsink(self, counts):
        heatsink_mC = self._thermistor.reading(counts)
        self._meter.heatsink_mC = heatsink_mC
        self._guard.on_heatsink(counts, heatsink_mC)

    def _take_force(self, counts):
        self._meter.force_uV = self._force.reading(counts)

    def _gather_zero(self, nominal_uA):
        # 64 readings of less than 2**24 uA each.
        self._zero_sum += nominal_uA
        self._zero_count += 1
        if self._zero_count == _ZERO_READINGS:
            self.zero_uA = self._zero_sum // _ZERO_READINGS
            self.zero_samples = _ZERO_READINGS
            self._zero_sum = 0
            self._zero_count = 0

    def zero_wait_ms(self):
        """How long until a zero can be expected; for the refusal that asks for patience."""
        return (_ZERO_READINGS - self._zero_count) * 3 * self._period_us // 1000

    def _judge_pair(self):
        """Say what limits the current, and trim the set-point where nothing does."""
        if self._machine.state != wire.STATE_SINKING:
            self.limiting = wire.LIMITING_NONE
        elif self.demand_uA != self.setpoint_uA:
            self.limiting = wire.LIMITING_RAMPING
            self._short_pairs = 0
        elif self._meter.current_uA < self.demand_uA - (self.demand_uA >> 4) - (self._margin_uA >> 2):
            self._judge_shortage()
        else:
            self._short_pairs = 0
            self.limiting = wire.LIMITING_NONE
            self._trim()

    def _judge_shortage(self):
        if self._short_pairs < _SHORT_OF_DEMAND_PAIRS - 1:
            self._short_pairs += 1
            return
        nothing_there = self._meter.voltage_uV < _NO_SOURCE_uV and self._meter.current_uA < self._margin_uA
        self.limiting = wire.LIMITING_NO_SOURCE if nothing_there else wire.LIMITING_SOURCE

    def _trim(self):
        """Lead the DAC slowly to where the readback wants it: half a code is 1 % of a twentieth of an ampere."""
        self._trim_sum += self.setpoint_uA - self._meter.current_uA
        self._trim_count += 1
        if self._trim_count < _TRIM_PAIRS:
            return
        error_uA = self._trim_sum >> _TRIM_BITS
        self._restart_trim()
        if abs(error_uA) << 6 > self._demand.uA_per_code_x64:
            bound = (self.setpoint_uA >> 4) + (self._margin_uA >> 1)
            self._trim_uA = min(max(self._trim_uA + error_uA, -bound), bound)
            self._steady = False

    def _restart_trim(self):
        self._trim_sum = 0
        self._trim_count = 0

    # -- driving ------------------------------------------------------------------------------------------------

    def ask(self, setpoint_uA):
        """A new set-point; the ramp takes the demand there."""
        self.setpoint_uA = setpoint_uA
        self._restart_trim()

    def start(self):
        """Before the gate is released: the demand begins at nothing, with the zero that was just measured."""
        self.demand_uA = 0
        self._demand_before_uA = 0
        self._trim_uA = 0
        self._short_pairs = 0
        self._steady = False
        self._restart_trim()

    def _drive(self):
        if self._machine.state != wire.STATE_SINKING:
            self.demand_uA = 0
            self._write(0)
        elif self.demand_uA != self.setpoint_uA or not self._steady:
            self._ramp()

    def _ramp(self):
        change = self.setpoint_uA - self.demand_uA
        slew_uA = self._guard.slew_uA_per_step
        if change > slew_uA:
            change = slew_uA
        elif change < -slew_uA:
            change = -slew_uA
        self.demand_uA += change
        self._steady = True
        # The zero in force is the sense amplifier's error at nothing, so the demand must be raised by it.
        self._write(self._demand.code(self.demand_uA + self.zero_uA + self._trim_uA))

    def _write(self, code):
        if code != self._code:
            self._dac.write(code)
            self._code = code
