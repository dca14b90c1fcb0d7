"""The world behind the chips: source, leads, the sink's analogue loop, front-end amplifiers, heat, its time.

Time is `now`, in whole microseconds since power-up; the bus and the clock move it on and call `catch_up`
once it reaches `due`. While nothing moves, the pins' levels stand and `due` is far off: that is what makes a
control step cheap. After anything changes (DAC, gate, source) the state is integrated in steps that begin at
a microsecond and grow until all is settled. Nothing here knows the firmware, the chips' registers or the
host.

The sink: a first-order closed loop whose amplifier winds up towards its rail while the current cannot
follow, and the transistor's on-resistance as the floor of the voltage.
"""

import math

import defects
from front_end import FrontEnd
from heat import HeatChain, SenseResistor, Thermistor
from sources import open_source

FAR = 1 << 60
# While all is at rest: how often heat, charge and drift are followed.
_SLOW_us = 80_000
_FIRST_us = 1
_FIRST_SMALL_us = 250
_LARGEST_us = 250
_SETTLED_FROM_us = 32
_SETTLED_A = 2e-6
# The same where the whole current is microamperes: through what is left of a lifted sense resistor.
_SETTLED_OPEN_A = 1e-9
_SETTLED_V = 2e-6
_SETTLED_RAIL_A = 1e-3
# A demand that changes by less is over before the finest steps could show it.
_SMALL_A = 0.02
# More than this between two slow steps is no drift any more.
_DRIFT_V = 2e-4
_SHORTED_A = 1e6
# What the transistor's body diode takes; its slope is counted to the sense resistor's side.
_DIODE_V = 0.7


class Plant:
    def __init__(self, plant, source):
        self.now = 0
        self.due = _SLOW_us
        self.adc = None
        self.source = open_source(source)
        self.heat = HeatChain(plant)
        self.sense = SenseResistor(plant["current"])
        self.thermistor = Thermistor(plant["thermistor"])
        remote = source.get("remote_sense", True) and plant.get("sense_pair", True)
        self.front = FrontEnd(plant, remote, self.source)
        self.pins = self.front.pins
        self.ripple = self.front.ripple
        self.has_ripple = False

        self._tau_s = 1.0 / (2.0 * math.pi * plant["loop"]["bandwidth_Hz"])
        self._decays = [math.exp(-us * 1e-6 / self._tau_s) for us in range(_LARGEST_us + 1)]
        self._rail_A = plant["loop"]["rail_A"]
        self._leads_ohm = source.get("leads_ohm") or 0.0
        self._leads_H = (source.get("leads_inductance_H") or 0.0) + self.source.lead_inductance_H
        self._on_ohm = plant["transistor"]["on_resistance_ohm"]

        self._dac_V = -1.0  # not yet known: the DAC tells at power-up
        self._clamped = True
        self._clamp_asked = True
        self._clamp_broken = False
        self.shorted = False
        self._contact = ""  # or how the source is missing: "disconnected", "reversed"
        self._settled_A = _SETTLED_A
        self._events = defects.schedule(plant.get("defects") or ())
        self.on_defect = None
        self._next_event = FAR

        self.demand_A = 0.0
        self.drive_A = 0.0  # what the amplifier asks of the transistor
        self.current_A = 0.0
        self.source_V = self.source.voltage_V
        self.terminal_V = self.source.voltage_V
        self._regulating = False
        self._settled = True

        self.moving = False
        self._at = 0  # the time the state above is valid for
        self._step_us = _FIRST_us
        self._energy_J = 0.0
        self._heat_at = 0
        # The conversion window's sums up to `window_from`, in V*us and A*us.
        self.window_from = 0
        self._sum_source = 0.0
        self._sum_terminal = 0.0
        self._sum_current = 0.0
        self._follow_heat()
        self._publish()

    def arm(self, on_defect):
        """From now on the defects happen; `on_defect(kind, begins)` is told those of chips and bus."""
        self.on_defect = on_defect
        self._next_event = self._events[0][0] if self._events else FAR
        self.catch_up()

    # -- what the board does --------------------------------------------------------------------------------

    def set_dac(self, volt):
        """The DAC's output was set."""
        if volt == self._dac_V:
            return
        self._dac_V = volt
        demand = self.front.demand_A(volt, self.sense.ohm)
        small = abs(demand - self.demand_A) < _SMALL_A and self._regulating
        self.disturb(_FIRST_SMALL_us if small else _FIRST_us)
        self.demand_A = demand

    def set_gate(self, clamped):
        self._clamp_asked = clamped
        if self._clamp_broken:
            clamped = False
        if clamped != self._clamped:
            self.disturb(_FIRST_us)
            self._clamped = clamped

    def disturb(self, first_us):
        """Something is about to change: bring the state to now, and look closely from here on."""
        self.catch_up()
        if not self.moving:
            self._wake(self.now, first_us)
        elif first_us < self._step_us:
            self._step_us = first_us
        # A small change leaves the power as it was; heat then goes on being followed now and then.
        if first_us == _FIRST_us or self._at - self._heat_at >= _SLOW_us:
            self._follow_heat()
        self._plan()

    def look(self):
        """Pin levels of this very moment, for a converter without a window."""
        self.catch_up()
        self._publish()

    def _wake(self, at, first_us):
        """From rest: the state brought to `at`, and what a foretold conversion has seen up to there."""
        if at > self._at:
            self._advance(at - self._at)
            self._at = at
        self._hold_window(at)
        self.moving = True
        self._step_us = first_us

    # -- time -----------------------------------------------------------------------------------------------

    def catch_up(self):
        """Bring the state to `now`, through every event on the way."""
        while True:
            until = min(self.now, self._next_event)
            while self._at < until:
                if self.moving:
                    self._integrate(until)
                elif until - self._at >= self._pause_us():
                    self._slow_step(self._at + self._pause_us())
                else:
                    break
            if until < self._next_event:
                break
            self._happen(until)
        self._plan()

    def _pause_us(self):
        """How long a world at rest may be left alone."""
        wait_s = self.source.wait_s
        return _SLOW_us if wait_s > 1.0 else min(_SLOW_us, int(wait_s * 1e6) + 1)

    def _plan(self):
        """When to look again."""
        if self.moving:
            window = self.adc.busy_until if self.adc else 0
            due = window if window > self._at else self._at + _SLOW_us
        else:
            due = self._at + self._pause_us()
        self.due = min(due, self._next_event)

    def _integrate(self, until):
        """Growing steps until all is settled or `until` is reached."""
        window = self.adc.busy_until if self.adc else 0
        while self._at < until:
            step = self._step_us
            end = min(self._at + step, until)
            if self._at < window < end:
                end = window
            self._advance(end - self._at)
            self._at = end
            if end == window:
                self._close_window()
            if self._settled and step >= _SETTLED_FROM_us:
                self._come_to_rest()
                return
            self._step_us = min(step + (step >> 2) + 1, _LARGEST_us)
        if self._at - self._heat_at >= _SLOW_us:
            self._follow_heat()

    def _come_to_rest(self):
        self.moving = False
        if self.adc and self.adc.busy_until > self._at:
            # Nothing will change until the window ends, unless something disturbs: then `_hold_window` takes
            # over.
            self._finish_window(self._at)
        self._publish()

    def _slow_step(self, until):
        """All was at rest: one step for what drifts."""
        before = self.source_V
        regulated = self._regulating
        self._advance(until - self._at)
        self._at = until
        self._follow_heat()
        self._publish()
        if self.source.moving or abs(self.source_V - before) > _DRIFT_V or self._regulating != regulated:
            self._hold_window(until)
            self.moving = True
            self._step_us = _FIRST_us

    # -- one step -------------------------------------------------------------------------------------------

    def _advance(self, us):
        """All states by `us` microseconds, everything outside being constant."""
        h = us * 1e-6
        source = self.source
        target = self.demand_A
        drive = self.drive_A
        current = self.current_A
        mean = -1.0
        if self._regulating:
            decay = self._decays[us] if us <= _LARGEST_us else 0.0
            excess = drive - target
            drive = target + excess * decay
            mean = target + excess * (1.0 - decay) * self._tau_s / h
        else:
            drive += (target - current) * h / self._tau_s
            if drive < target < current:
                drive = target
        if drive < 0.0:
            drive = 0.0
        elif drive > self._rail_A:
            drive = self._rail_A
            mean = -1.0
        wanted = drive
        if self.shorted:
            wanted = _SHORTED_A
        elif self._clamped:
            wanted = 0.0
        path = self._leads_ohm + self._on_ohm + self.sense.ohm
        henry = self._leads_H
        if self._contact:
            load, volt, terminal = self._without_contact(h)
        else:
            if henry:
                z = h / henry
                n = 1.0 / (1.0 + z * path)
                source.step(h, wanted, current * n, z * n)
            else:
                source.step(h, wanted, 0.0, 1.0 / path)
            load = source.current_A
            volt = source.voltage_V
            terminal = volt - self._leads_ohm * load - henry * (load - current) / h
        self._regulating = load >= wanted and not self._clamped and not self.shorted and not self._contact
        if mean < 0.0 or not self._regulating:
            mean = load
        if self._regulating:
            restless = abs(drive - target) if drive > 0.0 or target > 0.0 else 0.0
            self._settled = restless < self._settled_A
        else:
            self._settled = abs(drive - self.drive_A) < _SETTLED_RAIL_A
        if abs(load - current) > self._settled_A or abs(volt - self.source_V) > _SETTLED_V or source.moving:
            self._settled = False
        self.drive_A = drive
        self.current_A = load
        self.source_V = volt
        self.terminal_V = terminal
        self._energy_J += terminal * mean * h
        if self.moving:
            clip = self.front.clip_A
            self._sum_source += volt * us
            self._sum_terminal += terminal * us
            self._sum_current += (mean if mean < clip else clip) * us

    def _without_contact(self, h):
        """Load current, source's and terminals' voltage while the source is away, or the wrong way round.

        Reversed, it finds the body diode, which no gate can close.
        """
        source = self.source
        if self._contact == "disconnected" or source.voltage_V <= _DIODE_V:
            source.step(h, 0.0, 0.0, 1.0)
            return 0.0, 0.0, 0.0
        ohm = self._leads_ohm + self.sense.ohm
        source.step(h, _SHORTED_A, -_DIODE_V / ohm, 1.0 / ohm)
        load = source.current_A
        return -load, -source.voltage_V, self._leads_ohm * load - source.voltage_V

    def _follow_heat(self):
        """Temperatures up to now, and what drifts with them."""
        elapsed = self._at - self._heat_at
        if elapsed > 0:
            h = elapsed * 1e-6
            self.heat.step(self._energy_J / h, h)
            self.sense.step(self.current_A, h)
            self._energy_J = 0.0
            self._heat_at = self._at
            self.demand_A = self.front.demand_A(self._dac_V, self.sense.ohm)
        self.front.set_heatsink(self.thermistor.pin_V(self.heat.sensor_degC), self.sense.ohm)

    def _publish(self):
        self.front.publish(self.source_V, self.terminal_V, self.current_A)
        self.has_ripple = self.front.set_ripple(self.source.ripple_V if not self._contact else 0.0)

    # -- the conversion window ------------------------------------------------------------------------------

    def open_window(self, now):
        """A conversion begins while things move: its sums are gathered as the state advances."""
        self._sum_source = self._sum_terminal = self._sum_current = 0.0
        self.window_from = now
        self._plan()

    def _hold_window(self, until):
        """A window that was foretold is disturbed: keep what belongs to the time before."""
        adc = self.adc
        if not adc or adc.busy_until <= until:
            return
        start = adc.busy_until - adc.window_us
        if self.window_from <= start:
            self.window_from = start
            self._sum_source = self._sum_terminal = self._sum_current = 0.0
        self._add_rest(until)

    def _add_rest(self, until):
        us = until - self.window_from
        self._sum_source += self.source_V * us
        self._sum_terminal += self.terminal_V * us
        self._sum_current += min(self.current_A, self.front.clip_A) * us
        self.window_from = until

    def _finish_window(self, at):
        """At rest within a window: foretell its mean, and keep the sums in case something still disturbs
        it.
        """
        sums = (self._sum_source, self._sum_terminal, self._sum_current)
        self.window_from = at
        self._add_rest(self.adc.busy_until)
        self._close_window()
        self.window_from = at
        self._sum_source, self._sum_terminal, self._sum_current = sums

    def _close_window(self):
        us = self.adc.window_us
        self.front.publish(self._sum_source / us, self._sum_terminal / us, self._sum_current / us)
        self.has_ripple = self.front.set_ripple(self.source.ripple_V if not self._contact else 0.0)
        self.adc.pending = self.adc.convert()

    # -- defects --------------------------------------------------------------------------------------------

    def _happen(self, at):
        """The events that are due at `at`; before each the state stands there."""
        while self._next_event <= at:
            _, kind, begins, value = self._events.pop(0)
            self._next_event = self._events[0][0] if self._events else FAR
            if not self.moving:
                self._wake(at, _FIRST_us)
            self._step_us = _FIRST_us
            self._follow_heat()
            defects.happen(self, kind, begins, value)
            self._follow_heat()

    def set_contact(self, contact):
        """How the source is connected: "" as it should be, "disconnected", "reversed"."""
        self._contact = contact
        self.current_A = 0.0

    def break_clamp(self, broken):
        """A broken clamp leaves the gate to the amplifier, whatever the pin says."""
        self._clamp_broken = broken
        self._clamped = self._clamp_asked and not broken

    def set_sense_ohm(self, ohm):
        """Another resistance stands where the sense resistor stood; 0 is the resistor itself."""
        self.sense.replace(ohm)
        self._settled_A = _SETTLED_OPEN_A if ohm > 1.0 else _SETTLED_A
        self.demand_A = self.front.demand_A(self._dac_V, self.sense.ohm)
