"""Protection: what trips, at which reading, and what was latched. Decided here and nowhere else.

Every check takes a reading as it arrives and may end in `latch`, which clamps the gate (through the state table)
before it notes anything. The first fault stays until it is cleared, with one exception: current although the
gate is clamped replaces any other, because it is the one that a person must act upon at once. The host's wishes
cannot widen a limit beyond the board's own. Called within the control step: allocates nothing.

Readings trip as raw counts: the counts at which a limit is reached are worked out beforehand, by the nominal and by
the calibrated scale, and the earlier ones count; no calibration can move them past the board image's hard counts.
A voltage too low is no fault: it endangers the source and not the load, a test of a short circuit needs it, and where
a source must be spared it is an end of the run (ends.py).

These limits protect the parts; they are not a safety function.
"""

from micropython import const

import states
import wire
from cooling import TOO_COLD, TOO_WARM, Cooling
from derating import Derating
from leads import Leads
from limits import Limits

#: Conversions in a row that were not ready, before the converter is called dead (a late step may find a few).
_NOT_READY_ALLOWED = const(8)
#: Probes in a row at which a conversion just begun was not under way.
_STUCK_PROBES = const(2)
#: Where the count of quiet steps stops: more than a day, and more than any limit.
_LONG_QUIET_STEPS = const(1 << 26)
#: Control steps after clamping for which a conversion may still have seen current.
_CLAMP_STEPS = const(6)
_LATE_us = const(50_000)
#: Across a short circuit, beyond what its resistance drops: dividers' offsets, and the leads' inductance.
_SHORT_uV = const(500_000)
#: Pairs in a row without the current that was asked for, until a supply that merely begins anew would have done so.
_MISSING_PAIRS = const(5)
_COOLER_mC = const(5_000)
_REVERSED_uV = const(-300_000)
# Limits bind what may be asked; current and power trip a sixteenth above, so that noise at the limit does not.
_SLACK_BITS = const(4)
# The pair that ends with the next voltage has the current from before.
_PAIRS_AFTER = const(2)
# A sum of the power over half a minute of pairs stays a small integer.
_HEAT_BITS = const(10)


class Guard:
    def __init__(self, image, scales, machine, meter, timekeeper):
        self._current = scales["current"]
        self._voltage = scales["voltage"]
        self._force = scales["force"]
        self._hard_counts = image["hard_counts"]
        self._hard_heatsink_counts = image["hard_counts"]["heatsink"]
        self._hard_force_counts = image["hard_counts"]["force"]
        self._derating = Derating(image["thermal"]["stages"])
        self._leads = Leads(image["sense"])
        self._cooling = Cooling(image["cooling"])
        self._machine = machine
        self._meter = meter
        self._time = timekeeper
        self._thermistor = image["thermistor"]
        self._off_current_uA = image["off_current_uA"]
        self._off_counts = self._current.highest_counts(self._off_current_uA)
        self._margin_uA = image["demand_margin_uA"]
        self._period_us = image["period_us"]
        self.board_limits = Limits(image["limits"])
        self.apply(Limits(image["limits"]))
        self.fault = wire.FAULT_NONE
        self.value = 0
        self.limit = 0
        self.seconds = 0
        self.micros = 0
        self.news = False
        self.quiet_steps = 0
        #: Whether the run that goes on may do so without its host; runs.py decides it.
        self.alone = False
        self.clamped_steps = 0
        #: Conversions in a row without a result; whoever gets one sets it back.
        self.not_ready = 0
        self._off_readings = 0
        self._short_mohm = image["sense"]["short_mohm"]
        self._missing_pairs = 0
        self._thermistor_counts = 0
        self._junction_mC = 0
        self._heat_sum = 0
        self._heat_pairs = 0
        #: Whether `current_cap_uA` is less than the limit, or was when the heatsink was read before.
        self.derated = False
        self._probes_missed = 0
        self._leads_due = 0
        #: Whether the DAC did not answer last; whoever reaches it sets it back.
        self.dac_silent = False
        self._stands = self._causes()

    def apply(self, limits):
        """Put `limits` in force; the caller has checked that none is wider than the board's."""
        self.limits = limits
        self._current_trip_uA = limits.current_uA + (limits.current_uA >> _SLACK_BITS) + self._margin_uA
        self._power_trip_uW = limits.power_uW + (limits.power_uW >> _SLACK_BITS)
        hard = self._hard_counts
        self._over_current_counts = min(self._current.highest_counts(self._current_trip_uA), hard["current"])
        self._over_voltage_counts = min(self._voltage.highest_counts(limits.voltage_uV), hard["voltage"])
        self._reversed_counts = self._voltage.lowest_counts(_REVERSED_uV)
        self._derating.apply(limits)
        #: The most that control may ask for: the limit, or less while the load is hot.
        self.current_cap_uA = limits.current_uA
        self._silence_steps = limits.silence_ms * 1000 // self._period_us
        self.slew_uA_per_step = max(limits.slew_uA_per_ms * self._period_us // 1000, 1)

    def apply_values(self, values):
        """What the host or the store wants; nobody gets a limit wider than the board's own."""
        least = [min(pair) for pair in zip(values, self.board_limits.values())]
        self.apply(Limits(dict(zip(Limits.FIELDS, least))))

    def heard_ms(self):
        """How long the controlling session has been quiet."""
        return self.quiet_steps * self._period_us // 1000

    def latch(self, fault, value, limit):
        """Trip: the gate first, then the note of what happened."""
        self._machine.fire(states.TRIP)
        self._meter.stop()
        if self.fault != wire.FAULT_NONE and fault != wire.FAULT_CURRENT_ALTHOUGH_OFF or fault == self.fault:
            return
        self.fault = fault
        self.value = value
        self.limit = limit
        self.seconds = self._time.seconds
        self.micros = self._time.micros
        self.news = True

    def clear(self):
        """Unlatch; return False, changing nothing, while the cause stands."""
        if self.standing():
            return False
        if self.fault == wire.FAULT_COOLING_WEAK or self.fault == wire.FAULT_THERMISTOR_LOOSE:
            self._cooling.accept(self._meter.heatsink_mC)
        self.fault = wire.FAULT_NONE
        self._machine.fire(states.CLEAR)
        return True

    def before_sinking(self):
        """The run is about to begin: what is no fault while cables are being connected is one now."""
        if self._leads.wrong():
            self._latch_leads()

    def step(self, late_us):
        """Once a control step: lateness and the host's silence."""
        if self.quiet_steps < _LONG_QUIET_STEPS:
            self.quiet_steps += 1
        if late_us > _LATE_us:
            self.latch(wire.FAULT_LOOP_LATE, late_us, _LATE_us)
            self._time.start_afresh()
        if self._machine.state == wire.STATE_SINKING:
            self.clamped_steps = 0
            if self.quiet_steps > self._silence_steps and not self.alone:
                self.latch(wire.FAULT_HOST_SILENT, self.limits.silence_ms, self.limits.silence_ms)
        elif self.clamped_steps < _CLAMP_STEPS:
            self.clamped_steps += 1

    def settled_off(self):
        """Whether the gate has been clamped long enough for conversions to show nothing of before."""
        return self.clamped_steps >= _CLAMP_STEPS

    def on_current(self, counts, worse_uA, demand_uA):
        """`worse_uA` is the higher of what the parts' values alone and what calibration and zero say."""
        if counts > self._over_current_counts:
            self.latch(wire.FAULT_OVER_CURRENT, self._current.higher(counts), self._current_trip_uA)
        if self._machine.state == wire.STATE_SINKING:
            demand_uA += (demand_uA >> _SLACK_BITS) + self._margin_uA
            if worse_uA > demand_uA:
                self._latch_above_demand(worse_uA, demand_uA)
        elif self.settled_off():
            self._on_current_off(counts)

    def _latch_above_demand(self, current_uA, allowed_uA):
        self.latch(wire.FAULT_CURRENT_ABOVE_DEMAND, current_uA, allowed_uA)

    def _on_current_off(self, counts):
        if counts <= self._off_counts:
            self._off_readings = 0
        elif not self._off_readings:
            self._off_readings = 1
        else:
            self.latch(wire.FAULT_CURRENT_ALTHOUGH_OFF, self._current.higher(counts), self._off_current_uA)

    def on_voltage(self, counts):
        if counts > self._over_voltage_counts:
            self.latch(wire.FAULT_OVER_VOLTAGE, self._voltage.higher(counts), self.limits.voltage_uV)
        elif counts < self._reversed_counts:
            self.latch(wire.FAULT_REVERSED_SOURCE, self._voltage.lower(counts), _REVERSED_uV)

    def on_force(self, counts, force_uV):
        """The terminals' own voltage: too high although the sense pair is silent, or not what that pair shows."""
        if counts > self._hard_force_counts:
            self.latch(wire.FAULT_OVER_VOLTAGE, force_uV, self._force.reading(self._hard_force_counts))
        self._leads.before_uV = self._meter.voltage_uV
        self._leads_due = _PAIRS_AFTER

    def _judge_leads(self):
        """Once voltage and current have been read after the terminals' own voltage."""
        self._leads_due -= 1
        if self._leads_due:
            return
        meter = self._meter
        self._leads.see(meter.voltage_uV, meter.force_uV, meter.current_uA)
        if self._machine.state == wire.STATE_SINKING:
            self._leads.note_share(meter.voltage_uV, meter.force_uV)
            if self._leads.wrong():
                self._latch_leads()
        elif self.fault == wire.FAULT_REVERSED_SOURCE:
            self._correct_reversed(meter.force_uV)

    def _correct_reversed(self, force_uV):
        """Only the pair is reversed, when the terminals are not: that was not known at once."""
        if self._leads.swapped(self._meter.voltage_uV, force_uV):
            self.fault = wire.FAULT_NONE
            self._latch_leads()

    def _latch_leads(self):
        self.latch(wire.FAULT_SENSE_LEAD, self._leads.difference_uV, self._leads.bound_uV)

    def on_shortage(self, voltage_uV, current_uA):
        """Less current than was asked for: a source that limits is pulled down to what a short circuit leaves."""
        if voltage_uV < _SHORT_uV + (current_uA // 1000) * self._short_mohm:
            self._missing_pairs = 0
        elif self._missing_pairs < _MISSING_PAIRS:
            self._missing_pairs += 1
        else:
            self._missing_pairs = 0
            self.latch(wire.FAULT_CURRENT_MISSING, current_uA, 0)

    def on_power(self, power_uW):
        if power_uW > self._power_trip_uW:
            self.latch(wire.FAULT_OVER_POWER, power_uW, self._power_trip_uW)
        if self._leads_due:
            self._judge_leads()
        self._heat_sum += power_uW >> _HEAT_BITS
        self._heat_pairs += 1
        if self.derated and self._derating.active:
            self.current_cap_uA = self._derating.smoothed_uA(
                self.current_cap_uA, self._meter.voltage_uV, self.limits.current_uA
            )

    def on_heatsink(self, counts, heatsink_mC):
        self._thermistor_counts = counts
        power_mW = self._mean_power_mW()
        if counts >= self._thermistor["open_counts"]:
            self.latch(wire.FAULT_THERMISTOR_OPEN, counts, self._thermistor["open_counts"])
        elif counts <= self._thermistor["short_counts"]:
            self.latch(wire.FAULT_THERMISTOR_SHORT, counts, self._thermistor["short_counts"])
        else:
            self._on_temperature(counts, heatsink_mC)
            self._judge_cooling(heatsink_mC, power_mW)

    def _on_temperature(self, counts, heatsink_mC):
        if heatsink_mC > self.limits.heatsink_mC or counts < self._hard_heatsink_counts:
            self.latch(wire.FAULT_HEATSINK_HOT, heatsink_mC, self.limits.heatsink_mC)
        self._derate(heatsink_mC)

    def _judge_cooling(self, heatsink_mC, power_mW):
        # The leads keep what does not reach the terminals.
        self._cooling.step(heatsink_mC, power_mW, power_mW * self._leads.share_x256 >> 8)
        if self._cooling.seen:
            self._on_misfit(heatsink_mC)

    def _derate(self, heatsink_mC):
        derating = self._derating
        before = derating.active
        derating.step(heatsink_mC)
        if not derating.active:
            self.current_cap_uA = self.limits.current_uA
        # Once more after the last, so that control follows the cap back to the limit.
        self.derated = before or derating.active

    def _mean_power_mW(self):
        """Since the last reading of the heatsink."""
        pairs = self._heat_pairs
        if not pairs:
            return 0
        mean = self._heat_sum // pairs
        self._heat_sum = 0
        self._heat_pairs = 0
        return max(mean << _HEAT_BITS, 0) // 1000

    def _on_misfit(self, heatsink_mC):
        """The temperature does not fit the power. While nothing is drawn, that is only a change of the air."""
        state = self._machine.state
        if state == wire.STATE_SINKING:
            found = self._cooling.confirmed()
            if found == TOO_WARM:
                self.latch(wire.FAULT_COOLING_WEAK, heatsink_mC, self._cooling.bound_mC)
            elif found == TOO_COLD:
                self.latch(wire.FAULT_THERMISTOR_LOOSE, heatsink_mC, self._cooling.bound_mC)
        elif state != wire.STATE_FAULT:
            self._cooling.accept(heatsink_mC)

    def on_junction(self, junction_mC):
        self._junction_mC = junction_mC
        if junction_mC > self.limits.junction_mC:
            self.latch(wire.FAULT_JUNCTION_HOT, junction_mC, self.limits.junction_mC)

    def on_no_conversion(self, not_ready, config_seen):
        """The converter answered without a result: at once a fault when it converts something else."""
        if self.not_ready <= _NOT_READY_ALLOWED:
            self.not_ready += 1
        if not not_ready or self.not_ready > _NOT_READY_ALLOWED:
            self.latch(wire.FAULT_ADC_NOT_CONVERTING, config_seen, 0)

    def on_probe(self, under_way, config_seen):
        """A conversion was begun just before: a part that says at once that it is not converting never began it."""
        if under_way:
            self._probes_missed = 0
        elif self._probes_missed < _STUCK_PROBES - 1:
            self._probes_missed += 1
        else:
            self.latch(wire.FAULT_CONVERTER_STUCK, config_seen, 0)

    def on_bus_error(self, fault, error_number):
        if fault == wire.FAULT_DAC_SILENT:
            self.dac_silent = True
        else:
            self.not_ready = 1
        self.latch(fault, error_number, 0)

    # -- between control steps ----------------------------------------------------------------------------------------

    def standing(self):
        """Whether what tripped would trip again, with some distance for the temperatures.

        A reading is only worth something while the converter gives any, whatever tripped.
        """
        return self.not_ready > 0 or self._probes_missed > 0 or self._stands[self.fault]()

    def _causes(self):
        """Of every fault, how its cause is looked for."""
        meter = self._meter
        return {
            wire.FAULT_NONE: lambda: False,
            wire.FAULT_HEATSINK_HOT: lambda: meter.heatsink_mC > self.limits.heatsink_mC - _COOLER_mC,
            wire.FAULT_JUNCTION_HOT: lambda: self._junction_mC > self.limits.junction_mC - _COOLER_mC,
            wire.FAULT_OVER_CURRENT: self._current_flows,
            wire.FAULT_OVER_VOLTAGE: self._voltage_too_high,
            wire.FAULT_OVER_POWER: self._current_flows,
            wire.FAULT_CURRENT_ALTHOUGH_OFF: self._current_flows,
            wire.FAULT_HOST_SILENT: lambda: self.quiet_steps > self._silence_steps,
            wire.FAULT_ADC_SILENT: lambda: False,  # told by not_ready
            wire.FAULT_DAC_SILENT: lambda: self.dac_silent,
            wire.FAULT_ADC_NOT_CONVERTING: lambda: False,  # told by not_ready
            wire.FAULT_THERMISTOR_OPEN: lambda: self._thermistor_counts >= self._thermistor["open_counts"],
            wire.FAULT_THERMISTOR_SHORT: lambda: self._thermistor_counts <= self._thermistor["short_counts"],
            wire.FAULT_CURRENT_ABOVE_DEMAND: self._current_flows,
            wire.FAULT_REVERSED_SOURCE: lambda: meter.voltage_uV < _REVERSED_uV,
            wire.FAULT_LOOP_LATE: lambda: self._time.late_us > _LATE_us,
            wire.FAULT_EXCEPTION: lambda: True,  # until the next start
            wire.FAULT_SELF_TEST: lambda: True,  # until the next start
            wire.FAULT_SENSE_LEAD: self._leads.out_of_band,
            wire.FAULT_THERMISTOR_LOOSE: lambda: self._cooling.seen == TOO_COLD,
            wire.FAULT_COOLING_WEAK: lambda: self._cooling.seen == TOO_WARM,
            wire.FAULT_CONVERTER_STUCK: lambda: False,  # told by the probes
            wire.FAULT_CURRENT_MISSING: lambda: False,  # told by the next attempt
        }

    def _current_flows(self):
        return self._off_readings > 0

    def _voltage_too_high(self):
        limit_uV = self.limits.voltage_uV
        return self._meter.voltage_uV > limit_uV or self._meter.force_uV > self._force.reading(
            self._hard_force_counts
        )
