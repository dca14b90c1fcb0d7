"""The control step: one conversion in, one decision, at most one DAC write out.

`step` is called once a control period and reads from top to bottom as time passes. The analogue loop holds the
current; this step supervises it, moves its set-point along a ramp and measures. It allocates nothing, and every
intermediate stays below 2**30. A bus error (OSError) leaves `step` and is told to the guard by the loop in main.
"""

from micropython import const

import wire
from chips import LOWEST_COUNTS, NOT_READY
from laws import FLOOR_uV, Laws
from meter import MOST_STEPS
from slope import Slope

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
#: With this little voltage and current there is no source: a shorted one still drives a current.
_NOTHING_uA = const(5_000)
_NOTHING_BITS = const(6)
#: Voltages in a row within an eighth of each other, 75 ms: contacts bounce for some milliseconds.
_STABLE_PAIRS = const(16)
_STABLE_BITS = const(3)
#: A pair takes this many steps, so it is wholly of one demand when nothing has moved for as long.
_STILL_STEPS = const(4)
_TRIM_PAIRS = const(64)
_TRIM_BITS = const(6)


class Control:
    def __init__(
        self, image, dac, adc, scales, demand, machine, guard, meter, timekeeper, junction, burst, ends
    ):
        self._dac = dac
        self._adc = adc
        self._voltage = scales["voltage"]
        self._current = scales["current"]
        self._force = scales["force"]
        self._thermistor = scales["thermistor"]
        self._demand = demand
        self._machine = machine
        self._guard = guard
        self._meter = meter
        self._time = timekeeper
        self._junction = junction
        self._burst = burst
        self._ends = ends
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
        # A converter that needs no time has no such method.
        self._under_way = getattr(adc, "under_way", None)
        self.using = wire.FAULT_ADC_SILENT
        #: In the unit of the mode: uA, uW, mohm or uV.
        self.mode = wire.MODE_NONE
        self.setpoint = 0
        #: Where the ramp goes; the mode's law decides it.
        self.target_uA = 0
        self.demand_uA = 0
        self._demand_before_uA = 0
        self._steady = False
        self._still_steps = 0
        self.limiting = wire.LIMITING_NONE
        self._short_pairs = 0
        self._stable_pairs = 0
        self._missing_pairs = 0
        self._stable_uV = 0
        self._slope = Slope(image["scales"]["voltage"]["whole"] + 1, (demand.uA_per_code_x64 >> 4) + 1)
        self._laws = Laws(image, guard, self._slope)
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
        if self._burst.recording:
            self._burst.step(self.setpoint)
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
        if self._burst.recording:
            self._burst.put(_SCHEDULE[turn], counts)
        self._taker_at[turn](counts)

    def _missed(self, counts):
        """Not ready: look again a step later. Anything else: ask anew, which also revives a part that was reset."""
        self._guard.on_no_conversion(counts == NOT_READY, self._adc.config_seen)
        if counts != NOT_READY:
            self._begin()

    def _take_current(self, counts):
        worse_uA = self._current.reading(counts)
        current_uA = worse_uA - self.zero_uA
        if self._machine.state == wire.STATE_OFF and self._guard.settled_off():
            self._gather_zero(worse_uA)
        elif self._zero_count:
            self._zero_count = 0
            self._zero_sum = 0
        if self._current.calibrated:
            worse_uA = self._current.nominal(counts)
        if current_uA > worse_uA:
            worse_uA = current_uA
        demand_uA = self.demand_uA
        if self._demand_before_uA > demand_uA:
            demand_uA = self._demand_before_uA
        self._guard.on_current(counts, worse_uA, demand_uA)
        self._demand_before_uA = self.demand_uA
        self._meter.take_current(current_uA)
        if self._meter.voltage_uV < FLOOR_uV:
            self._look_for_source()

    def _take_voltage(self, counts):
        voltage_uV = self._voltage.reading(counts)
        self._guard.on_voltage(counts)
        if voltage_uV < FLOOR_uV:
            self._look_for_source()
        if self._meter.take_voltage(voltage_uV):
            self._guard.on_power(self._meter.power_uW)
            self._ends.check()
            self._judge_pair()

    def _take_heatsink(self, counts):
        heatsink_mC = self._thermistor.reading(counts)
        self._meter.heatsink_mC = heatsink_mC
        self._guard.on_heatsink(counts, heatsink_mC)
        self._probe()

    def _take_force(self, counts):
        force_uV = self._force.reading(counts)
        self._meter.force_uV = force_uV
        self._guard.on_force(counts, force_uV)
        self._probe()

    def _probe(self):
        """The next conversion was begun just before; twice in a schedule that costs one transaction more."""
        if self._under_way is not None:
            self._guard.on_probe(self._under_way(), self._adc.config_seen)

    def _gather_zero(self, reading_uA):
        # 64 readings of less than 2**24 uA each.
        self._zero_sum += reading_uA
        self._zero_count += 1
        if self._zero_count == _ZERO_READINGS:
            self.zero_uA = self._zero_sum // _ZERO_READINGS
            self.zero_samples = _ZERO_READINGS
            self._zero_sum = 0
            self._zero_count = 0

    def zero_wait_ms(self):
        """How long until a zero can be expected; for the refusal that asks for patience."""
        return (_ZERO_READINGS - self._zero_count) * 3 * self._period_us // 1000

    # -- judging: what limits the current, and where it shall go -----------------------------------------------

    def _judge_pair(self):
        if self._machine.state != wire.STATE_SINKING:
            self.limiting = wire.LIMITING_NONE
        elif self._machine.held:
            self._await_source()
        elif self._guard.derated and self._cap_target():
            self.limiting = wire.LIMITING_DERATED
        elif self.demand_uA != self.target_uA:
            if self.mode == wire.MODE_CURRENT:
                self.limiting = wire.LIMITING_RAMPING
            self._short_pairs = 0
        elif self._still_steps >= _STILL_STEPS:
            self._judge_still()

    def _cap_target(self):
        """While hot: no further than the guard allows. Whether that is less than what is asked for."""
        cap_uA = self._guard.current_cap_uA
        if self.mode == wire.MODE_CURRENT:
            self.target_uA = self.setpoint
        if self.target_uA <= cap_uA:
            return False
        self.target_uA = cap_uA
        return True

    def _judge_still(self):
        """A pair that is wholly of the present demand."""
        meter = self._meter
        self._slope.see(meter.pair_uV, meter.current_uA)
        short = meter.current_uA < self.demand_uA - (self.demand_uA >> 4) - (self._margin_uA >> 2)
        if short:
            self._guard.on_shortage(meter.voltage_uV, meter.current_uA)
        if self.mode != wire.MODE_CURRENT:
            self._follow_law(short)
        elif short:
            if self._short_pairs < _SHORT_OF_DEMAND_PAIRS - 1:
                self._short_pairs += 1
            else:
                self.limiting = wire.LIMITING_SOURCE
        else:
            self._short_pairs = 0
            self.limiting = wire.LIMITING_NONE
            self._trim()

    def _follow_law(self, short):
        meter = self._meter
        laws = self._laws
        laws.see(meter.pair_uV, meter.current_uA)
        self.target_uA = laws.next_uA(self.demand_uA, short)
        self.limiting = laws.limiting
        if laws.gave_way:
            laws.gave_way = False
            self._let_go()

    def _look_for_source(self):
        """No voltage, and no current either: clamp, or the amplifiers wind up and the source's return takes tens of
        amperes."""
        # The share of the demand is for a zero that has drifted since it was measured.
        if self._meter.current_uA > _NOTHING_uA + (self.demand_uA >> _NOTHING_BITS):
            return
        if self._machine.state == wire.STATE_SINKING and not self._machine.held:
            self._let_go()
            self._laws.ask(self.setpoint)
            self.limiting = wire.LIMITING_NO_SOURCE

    def _let_go(self):
        self._machine.hold()
        self._stable_pairs = 0
        self._missing_pairs = 0

    def _miss_source(self):
        """A source that gave way is back at once when it is let go; another may come in place of one that is not."""
        self._stable_pairs = 0
        if self._missing_pairs < _STABLE_PAIRS:
            self._missing_pairs += 1
        elif self.limiting != wire.LIMITING_NO_SOURCE:
            self._laws.ask(self.setpoint)
            self.limiting = wire.LIMITING_NO_SOURCE

    def _await_source(self):
        """Begin again from nothing once the voltage has stood still for a while."""
        voltage_uV = self._meter.pair_uV
        change_uV = voltage_uV - self._stable_uV
        if voltage_uV < FLOOR_uV:
            self._miss_source()
            return
        if abs(change_uV) > voltage_uV >> _STABLE_BITS:
            self._stable_uV = voltage_uV
            self._stable_pairs = 0
            return
        self._stable_pairs += 1
        if self._stable_pairs >= _STABLE_PAIRS:
            self._begin_from_nothing()
            self._machine.rearm()

    def _trim(self):
        """Lead the DAC slowly to where the readback wants it: half a code is 1 % of a twentieth of an ampere."""
        self._trim_sum += self.setpoint - self._meter.current_uA
        self._trim_count += 1
        if self._trim_count < _TRIM_PAIRS:
            return
        error_uA = self._trim_sum >> _TRIM_BITS
        self._restart_trim()
        if abs(error_uA) << 6 > self._demand.uA_per_code_x64:
            bound = (self.setpoint >> 4) + (self._margin_uA >> 1)
            self._trim_uA = min(max(self._trim_uA + error_uA, -bound), bound)
            self._steady = False

    def _restart_trim(self):
        self._trim_sum = 0
        self._trim_count = 0

    # -- driving ------------------------------------------------------------------------------------------------

    def obey(self, mode, setpoint):
        """Another mode. From the present demand its law goes straight to its own end, never beyond both."""
        self.mode = mode
        self.target_uA = self.demand_uA
        self._laws.obey(mode)
        self.ask(setpoint)

    def ask(self, setpoint):
        """Another set-point in the mode in force; the ramp takes the demand there."""
        self.setpoint = setpoint
        if self.mode == wire.MODE_CURRENT:
            self.target_uA = setpoint
            self._restart_trim()
        else:
            self._laws.ask(setpoint)

    def start(self):
        """Before the gate is released: with the zero that was just measured."""
        self._trim_uA = 0
        self._laws.ask(self.setpoint)
        self._begin_from_nothing()

    def _begin_from_nothing(self):
        self.demand_uA = 0
        self.target_uA = 0
        self._demand_before_uA = 0
        self._short_pairs = 0
        self._steady = False
        self._slope.begin(self._meter.pair_uV)
        if self.mode == wire.MODE_CURRENT:
            self.target_uA = self.setpoint
            self._restart_trim()

    def _drive(self):
        if self._machine.state != wire.STATE_SINKING or self._machine.held:
            self.demand_uA = 0
            self._still_steps = 0
            self._write(0)
        elif self.demand_uA != self.target_uA or not self._steady:
            self._ramp()
        elif self._still_steps < _STILL_STEPS:
            self._still_steps += 1

    def _ramp(self):
        change = self.target_uA - self.demand_uA
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
            self._guard.dac_silent = False
            self._still_steps = 0
