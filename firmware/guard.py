"""Protection: what trips, at which reading, and what was latched. Decided here and nowhere else.

Every check takes a reading as it arrives and may end in `latch`, which clamps the gate (through the state table)
before it notes anything. The first fault stays until it is cleared, with one exception: current although the
gate is clamped replaces any other, because it is the one that a person must act upon at once. The host's wishes
cannot widen a limit beyond the board's own. Called within the control step: allocates nothing.

These limits protect the parts; they are not a safety function.
"""

from micropython import const

import states
import wire

#: Conversions in a row that were not ready, before the converter is called dead (a late step may find a few).
_NOT_READY_ALLOWED = const(8)
#: Control steps after clamping for which a conversion may still have seen current.
_CLAMP_STEPS = const(6)
#: Where the count of quiet steps stops: more than a day, and more than any limit.
_LONG_QUIET_STEPS = const(1 << 26)
_LATE_us = const(50_000)
_COOLER_mC = const(5_000)
_REVERSED_uV = const(-300_000)
# Limits bind what may be asked; current and power trip a sixteenth above, so that noise at the limit does not.
_SLACK_BITS = const(4)


class Limits:
    """What trips, in integers; the names are those of the wire's Limits message."""

    FIELDS = (
        "current_uA",
        "voltage_uV",
        "power_uW",
        "heatsink_mC",
        "junction_mC",
        "slew_uA_per_ms",
        "silence_ms",
    )

    def __init__(self, values):
        for name in self.FIELDS:
            setattr(self, name, values[name])

    def values(self):
        return [getattr(self, name) for name in self.FIELDS]


class Guard:
    def __init__(self, image, machine, meter, timekeeper):
        self._machine = machine
        self._meter = meter
        self._time = timekeeper
        self._thermistor = image["thermistor"]
        self._off_current_uA = image["off_current_uA"]
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
        self.clamped_steps = 0
        #: Conversions in a row without a result; whoever gets one sets it back.
        self.not_ready = 0
        self._off_readings = 0
        self._thermistor_counts = 0
        self._junction_mC = 0

    def apply(self, limits):
        """Put `limits` in force; the caller has checked that none is wider than the board's."""
        self.limits = limits
        self._current_trip_uA = limits.current_uA + (limits.current_uA >> _SLACK_BITS) + self._margin_uA
        self._power_trip_uW = limits.power_uW + (limits.power_uW >> _SLACK_BITS)
        self._silence_steps = limits.silence_ms * 1000 // self._period_us
        self.slew_uA_per_step = max(limits.slew_uA_per_ms * self._period_us // 1000, 1)

    def apply_values(self, values):
        self.apply(Limits(dict(zip(Limits.FIELDS, values))))

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
        self.fault = wire.FAULT_NONE
        self._machine.fire(states.CLEAR)
        return True

    def step(self, late_us):
        """Once a control step: lateness and the host's silence."""
        if self.quiet_steps < _LONG_QUIET_STEPS:
            self.quiet_steps += 1
        if late_us > _LATE_us:
            self.latch(wire.FAULT_LOOP_LATE, late_us, _LATE_us)
            self._time.start_afresh()
        if self._machine.state == wire.STATE_SINKING:
            self.clamped_steps = 0
            if self.quiet_steps > self._silence_steps:
                self.latch(wire.FAULT_HOST_SILENT, self.limits.silence_ms, self.limits.silence_ms)
        elif self.clamped_steps < _CLAMP_STEPS:
            self.clamped_steps += 1

    def settled_off(self):
        """Whether the gate has been clamped long enough for conversions to show nothing of before."""
        return self.clamped_steps >= _CLAMP_STEPS

    def on_current(self, nominal_uA, current_uA, demand_uA):
        """`nominal_uA` is scaled by the parts' values alone; the worse of the two counts."""
        worse = nominal_uA if nominal_uA > current_uA else current_uA
        if worse > self._current_trip_uA:
            self.latch(wire.FAULT_OVER_CURRENT, worse, self._current_trip_uA)
        if self._machine.state == wire.STATE_SINKING:
            allowed = demand_uA + (demand_uA >> _SLACK_BITS) + self._margin_uA
            if worse > allowed:
                self.latch(wire.FAULT_CURRENT_ABOVE_DEMAND, worse, allowed)
        elif self.settled_off():
            self._on_current_off(nominal_uA)

    def _on_current_off(self, current_uA):
        if current_uA <= self._off_current_uA:
            self._off_readings = 0
            return
        if not self._off_readings:
            self._off_readings = 1
        else:
            self.latch(wire.FAULT_CURRENT_ALTHOUGH_OFF, current_uA, self._off_current_uA)

    def on_voltage(self, voltage_uV):
        if voltage_uV > self.limits.voltage_uV:
            self.latch(wire.FAULT_OVER_VOLTAGE, voltage_uV, self.limits.voltage_uV)
        if voltage_uV < _REVERSED_uV:
            self.latch(wire.FAULT_REVERSED_SOURCE, voltage_uV, _REVERSED_uV)

    def on_power(self, power_uW):
        if power_uW > self._power_trip_uW:
            self.latch(wire.FAULT_OVER_POWER, power_uW, self._power_trip_uW)

    def on_heatsink(self, counts, heatsink_mC):
        self._thermistor_counts = counts
        if counts >= self._thermistor["open_counts"]:
            self.latch(wire.FAULT_THERMISTOR_OPEN, counts, self._thermistor["open_counts"])
        elif counts <= self._thermistor["short_counts"]:
            self.latch(wire.FAULT_THERMISTOR_SHORT, counts, self._thermistor["short_counts"])
        elif heatsink_mC > self.limits.heatsink_mC:
            self.latch(wire.FAULT_HEATSINK_HOT, heatsink_mC, self.limits.heatsink_mC)

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

    def on_bus_error(self, fault, error_number):
        self.not_ready = 1
        self.latch(fault, error_number, 0)

    def standing(self):
        """Whether what tripped would trip again, with some distance for the temperatures."""
        fault = self.fault
        if fault == wire.FAULT_HEATSINK_HOT:
            return self._meter.heatsink_mC > self.limits.heatsink_mC - _COOLER_mC
        if fault == wire.FAULT_JUNCTION_HOT:
            return self._junction_mC > self.limits.junction_mC - _COOLER_mC
        if fault == wire.FAULT_OVER_VOLTAGE:
            return self._meter.voltage_uV > self.limits.voltage_uV
        if fault == wire.FAULT_REVERSED_SOURCE:
            return self._meter.voltage_uV < _REVERSED_uV
        if fault == wire.FAULT_CURRENT_ALTHOUGH_OFF:
            return self._off_readings > 0
        if fault == wire.FAULT_THERMISTOR_OPEN:
            return self._thermistor_counts >= self._thermistor["open_counts"]
        if fault == wire.FAULT_THERMISTOR_SHORT:
            return self._thermistor_counts <= self._thermistor["short_counts"]
        return self.not_ready > 0
