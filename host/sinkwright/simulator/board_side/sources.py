"""Simulated sources: what a supply, a cell or a curve does at its terminals, step by step in time.

Each source answers `step(h, wanted, c, d)`: for the next `h` seconds the load would take `wanted` amperes,
but no more than its leads and its on-resistance let through, c + d*V for V volts at the source's terminals.
The answer stands in `voltage_V` and `current_A`. Steps are implicit (backward Euler), so any `h` is stable
and the plant alone decides how fine to go. Nothing here knows of boards, chips or time of day.

`moving` says that a state of the source's own still changes fast; `wait_s` is how long until it acts by
itself; `ripple_V` is the ripple's amplitude just now.
"""

import math

_NEVER = 1e9
_VOLT_AT_REST = 2e-6
_LATCH_RELEASE_s = 1.0
_ZERO_A = 1e-3
# What is left across a supply whose output is off, so that its terminals are not an open node.
_BLEED_S = 1e-6
# Slower pairs than this are followed well enough by the plant's slow steps.
_FAST_PAIR_s = 1.0


class Supply:
    """A Thevenin source with optional inductance, output capacitance, current limit, recovery and ripple.

    Recovery: right after a load step the output deviates from its new value by as much again as the static
    drop, and that extra part decays with `recovery_s`. Limit: the current into the output capacitance is
    limited, so the capacitance still delivers its charge. A latched supply returns once no load has asked
    for current for 1 s.
    """

    def __init__(self, source):
        self.voltage_V = self._open_V = self._nominal_V = source["voltage_V"]
        resistance = max(source["resistance_ohm"], 1e-9)
        self._recovery_s = source.get("recovery_s") or 0.0
        self._static_ohm = resistance if self._recovery_s else 0.0
        self._ohm = resistance + self._static_ohm
        self._farad = source.get("capacitance_F") or 0.0
        henry = source.get("inductance_H") or 0.0
        # Without a capacitance between them the source's and the leads' inductance are one: the plant adds
        # it there.
        self.lead_inductance_H = 0.0 if self._farad else henry
        self._henry = henry if self._farad else 0.0
        self._set_limit(source)
        self._ripple_V = (source.get("ripple_V") or 0.0) / 2
        self.ripple_V = self._ripple_V
        self.ripple_Hz = source.get("ripple_Hz") or 0.0
        self.current_A = 0.0
        self._inner_A = 0.0  # before the output capacitance
        self._lagged_A = 0.0
        self._limited = False
        self.latched = False
        self._quiet_s = 0.0
        self.wait_s = _NEVER
        self.moving = False

    def set_open_V(self, volt):
        """Its regulator fails and the output rises to `volt`; None brings back what it was set to."""
        self._open_V = self._nominal_V if volt is None else volt

    def _set_limit(self, source):
        limit = source.get("limit_A")
        kind = source.get("limit_kind") or "constant"
        self._has_limit = limit is not None
        self._latches = self._has_limit and kind == "latch"
        self._limit_0_A = limit or 0.0
        self._limit_per_V = 0.0
        if self._has_limit and kind == "foldback":
            self._limit_0_A = source["foldback_A"]
            self._limit_per_V = (limit - self._limit_0_A) / self._open_V

    def step(self, h, wanted, c, d):
        if self.latched:
            a = 0.0
            b = _BLEED_S
        else:
            b = 1.0 / self._ohm
            a = (self._open_V + self._static_ohm * self._lagged_A) * b
            if self._henry:
                z = h / self._henry
                n = 1.0 / (1.0 + z * self._ohm)
                a = (self._inner_A + z * a * self._ohm) * n
                b = z * n
        before = self.voltage_V
        g = self._farad / h
        charge = g * before
        load = wanted
        volt = (charge + a - load) / (g + b)
        reach = c + d * volt
        if reach < load:
            volt = (charge + a - c) / (g + b + d)
            load = c + d * volt
        inner = a - b * volt
        if self._has_limit and not self.latched:
            if self._limited and not self._farad:
                over = wanted >= self._limit_0_A + self._limit_per_V * before
            else:
                over = inner > self._limit_0_A + self._limit_per_V * volt
            self._limited = over
            if over:
                self._limit(h, wanted, c, d)
                self._ripple_and_lag(h)
                self.moving = self._latches or abs(self.voltage_V - before) > _VOLT_AT_REST
                return
        self.voltage_V = volt
        self.current_A = load
        self._inner_A = inner
        self._ripple_and_lag(h)
        self.moving = (
            abs(volt - before) > _VOLT_AT_REST
            or self._static_ohm * abs(inner - self._lagged_A) > _VOLT_AT_REST
        )
        if self.latched:
            self._rest(h, wanted)

    def _ripple_and_lag(self, h):
        regulating = not (self._limited or self.latched)
        self.ripple_V = self._ripple_V if regulating else 0.0
        if self._static_ohm:
            self._lagged_A += (self._inner_A - self._lagged_A) * (1.0 - math.exp(-h / self._recovery_s))

    def _limit(self, h, wanted, c, d):
        """The limit holds: the inner current is limit_0 + limit_per_V * V."""
        g = self._farad / h
        rest = g - self._limit_per_V
        if rest > g / 2:
            charge = g * self.voltage_V + self._limit_0_A
            volt = (charge - wanted) / rest
            load = wanted
            if c + d * volt < load:
                volt = max((charge - c) / (rest + d), 0.0)
                load = c + d * volt
        else:
            # Nothing stores charge: the load's floor and the limit line, met by turns from the voltage
            # before.
            load = min(self._limit_0_A + self._limit_per_V * self.voltage_V, wanted)
            volt = max((load - c) / d, 0.0)
        self.voltage_V = volt
        self.current_A = load
        self._inner_A = self._limit_0_A + self._limit_per_V * volt
        if self._latches:
            self.latched = True
            self._limited = False
            self._inner_A = 0.0
            self._quiet_s = 0.0

    def _rest(self, h, wanted):
        """A load that still asks for current holds the latch, although nothing flows."""
        self._quiet_s = self._quiet_s + h if wanted < _ZERO_A else 0.0
        left = _LATCH_RELEASE_s - self._quiet_s
        self.wait_s = left if wanted < _ZERO_A else _NEVER
        if left <= 0.0:
            self.latched = False
            self.moving = True
            self.wait_s = _NEVER


class Cell:
    """Open-circuit voltage over the state of charge, a resistance, and resistor-capacitor pairs in series.

    Below an empty cell the voltage goes on falling along the first stretch of the table, down to nothing.
    """

    lead_inductance_H = 0.0
    ripple_V = 0.0
    ripple_Hz = 0.0
    wait_s = _NEVER

    def __init__(self, source):
        self._coulomb = source["capacity_Ah"] * 3600.0
        charge = source.get("state_of_charge")
        self.state_of_charge = 1.0 if charge is None else charge
        self._ocv = source["ocv"]
        self._segment = 0
        self._ohm = max(source["r0_ohm"], 1e-9)
        self._pairs = [[ohm, ohm * farad, 0.0] for ohm, farad in source.get("rc") or ()]
        self._pairs_V = 0.0
        self.voltage_V = self.open_circuit_V()
        self.current_A = 0.0
        self.moving = False

    def open_circuit_V(self):
        table = self._ocv
        x = self.state_of_charge
        j = self._segment
        while j > 0 and x < table[j][0]:
            j -= 1
        while j < len(table) - 2 and x > table[j + 1][0]:
            j += 1
        self._segment = j
        low = table[j]
        high = table[j + 1]
        return max(low[1] + (x - low[0]) * (high[1] - low[1]) / (high[0] - low[0]), 0.0)

    def step(self, h, wanted, c, d):
        inner_V = self.open_circuit_V() - self._pairs_V
        load = wanted
        reach = c + d * (inner_V - self._ohm * load)
        limited = reach < load
        if limited:
            load = (c + d * inner_V) / (1.0 + d * self._ohm)
            if load < 0.0:
                load = 0.0
        self.moving = False
        self.state_of_charge -= load * h / self._coulomb
        total = 0.0
        for pair in self._pairs:
            change = (load * pair[0] - pair[2]) * (1.0 - math.exp(-h / pair[1]))
            pair[2] += change
            total += pair[2]
            if pair[1] < _FAST_PAIR_s and abs(change) > _VOLT_AT_REST:
                self.moving = True
        if not limited:
            inner_V = self.open_circuit_V() - total
        self._pairs_V = total
        self.voltage_V = inner_V - self._ohm * load
        self.current_A = load


class Curve:
    """A static characteristic: straight lines between [V, A] points, the current never rising with the
    voltage.

    Below the first point the current stays as it is there; beyond a last point that still carries current,
    the voltage stays as it is there.
    """

    lead_inductance_H = 0.0
    ripple_V = 0.0
    ripple_Hz = 0.0
    wait_s = _NEVER
    moving = False

    def __init__(self, source):
        points = [(float(volt), float(ampere)) for volt, ampere in source["points"]]
        if points[0][0] > 0.0:
            points.insert(0, (0.0, points[0][1]))
        while len(points) > 2 and points[-2][1] <= 0.0:
            points.pop()
        if points[-1][1] > 0.0:
            points.append((points[-1][0] + 1e-6, 0.0))
        self._points = points
        self._segment = len(points) - 2
        self.voltage_V = points[-1][0]
        self.current_A = 0.0

    def step(self, _h, wanted, c, d):
        points = self._points
        j = self._segment
        while j > 0 and points[j][1] < min(wanted, c + d * points[j][0]):
            j -= 1
        while j < len(points) - 2 and points[j + 1][1] >= min(wanted, c + d * points[j + 1][0]):
            j += 1
        self._segment = j
        v0, i0 = points[j]
        v1, i1 = points[j + 1]
        slope = (i0 - i1) / (v1 - v0)
        load = wanted
        volt = v0 + (i0 - wanted) / slope if slope > 0.0 else v1
        if c + d * volt < load:
            volt = (i0 + slope * v0 - c) / (slope + d)
            load = c + d * volt
        elif volt > v1:
            volt = v1
        self.voltage_V = volt
        self.current_A = load


def open_source(source):
    """The source that the dict (a source file's keys with "kind") describes."""
    return {"supply": Supply, "cell": Cell, "curve": Curve}[source["kind"]](source)
