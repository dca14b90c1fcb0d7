"""The mode laws: constant power, resistance and voltage, as sampled loops around a constant-current sink.

A law is asked once for each voltage-current pair that was read after everything had come to rest at the present
demand, so it acts without delay on what its last move led to. It answers with the current to go to; the control
step takes the demand there along the ramp. Each is half a Newton step on the load line, with the source's resistance
as `slope` observed it: so constant resistance converges also below the source's own, and constant power keeps to the
stable branch, where the power still rises with the current. What cannot be reached, resolved or settled is said in
`limiting`, and the current then stands still. Called within the control step: allocates nothing, and every
intermediate stays below 2**30.
"""

from micropython import const

import wire

#: Below this nothing can be told about a source: a law takes its current back.
FLOOR_uV = const(100_000)
_MOST_uA = const(16_000_000)
_MOST_mA = const(16_000)
_LARGEST_MOHM = const(1 << 26)
_LARGE_mohm = const(1 << 20)
_SHARE_BITS = const(14)
_SHARE_MASK = const((1 << 14) - 1)
#: Where the power's slope is less than this part of the voltage (V - I*Rs < V/8), 99 % of what the source can give
#: has been reached.
_TOP_BITS = const(3)
#: Half a code is then worth 3 % of the set-point.
_RESOLVED_CODES = const(16)
_PROBE_CODES = const(8)
#: Changes of direction without coming closer, until a law gives up.
_TURNS = const(6)
#: Half a Newton step; an error that only changes its sign, as ripple and noise do, earns ever less.
_GAIN_BITS = const(1)
_LEAST_GAIN_BITS = const(5)
_SAME_SIGN = const(4)
_CALM_PAIRS = const(8)
_NO_LIMIT = const(0x7FFFFFFF)
#: Which limit binds a set-point, by mode, as Refused.field counts them.
_LIMIT_FIELD = (0, wire.LIMIT_FIELD_CURRENT, wire.LIMIT_FIELD_POWER, 0, wire.LIMIT_FIELD_VOLTAGE)


class Laws:
    def __init__(self, image, guard, slope):
        self._guard = guard
        self._slope = slope
        self._code_uA = (image["dac"]["uA_per_code_x64"] >> 6) + 1
        self._probe_uA = _PROBE_CODES * self._code_uA
        self._step_uV = image["scales"]["voltage"]["whole"] + 1
        self._laws = (None, None, self._power, self._resistance, self._voltage)
        self._voltage_uV = 0
        self._current_uA = 0
        self.obey(wire.MODE_NONE)
        self.ask(0)

    def obey(self, mode):
        """Another law; its set-point is asked next."""
        self._mode = mode
        self._law = self._laws[mode]
        power = mode == wire.MODE_POWER
        self._growth_bits = 2 if power else 1
        self._beyond = wire.LIMITING_UNREACHABLE if power else wire.LIMITING_UNSETTLED

    def ask(self, setpoint):
        """Another set-point, or another source: what was found out about the former one counts no more."""
        self._setpoint = setpoint
        self.limiting = wire.LIMITING_RAMPING
        self._turns = 0
        self._calm = 0
        self._rising = True
        self._positive = True
        self._same_sign = 0
        self._gain_bits = _GAIN_BITS
        self._swing = 0
        self._swing_before = 0
        self._far = False
        self._ceiling_uA = _MOST_uA
        self._good_uA = 0
        #: The source gave way under the last move: it must be let go before it is loaded again.
        self.gave_way = False

    def see(self, voltage_uV, current_uA):
        """The pair that `next_uA` goes by: kept here, because a frame of many words would come from the heap."""
        self._voltage_uV = voltage_uV
        self._current_uA = current_uA

    def next_uA(self, demand_uA, short):
        """The current to go to; `short` when the source gives clearly less than the demand."""
        self.limiting = wire.LIMITING_NONE
        if not short:
            return self._within_limits(demand_uA + self._trusted(self._law()))
        if self._mode == wire.MODE_POWER or self._law() < 0:
            return self._let_go()
        self._say(wire.LIMITING_SOURCE)
        return demand_uA

    def _trusted(self, change_uA):
        """Little more than flows already: from each move the next slope is learnt, and at a limit of the source the
        last good current is close below it."""
        current_uA = self._current_uA
        trusted_uA = (current_uA >> self._growth_bits) + self._probe_uA
        if change_uA > trusted_uA:
            change_uA = trusted_uA
        if self._turns >= _TURNS:
            self._turns = 0
            self._ceiling_uA = self._good_uA - (self._good_uA >> 2)
        room_uA = self._ceiling_uA - current_uA
        if change_uA <= room_uA:
            return change_uA
        if self._far and room_uA < self._probe_uA:
            self._say(self._beyond)
        return room_uA

    def _let_go(self):
        """The source gave way, and this set-point shall not lead there again."""
        if self._ceiling_uA > self._good_uA:
            self._ceiling_uA = self._good_uA
        else:
            # Not even that could be kept.
            self._ceiling_uA -= self._ceiling_uA >> 2
        self._say(wire.LIMITING_SOURCE)
        self.gave_way = True
        return 0

    def _within_limits(self, target_uA):
        most_uA = self._most_uA()
        if target_uA > most_uA:
            self._say(wire.LIMITING_DERATED if self._guard.derated else wire.LIMITING_SATURATED)
            return most_uA
        if target_uA <= 0:
            if self._far:
                self._say(wire.LIMITING_SOURCE)
            return 0
        if self._far:
            self._say(wire.LIMITING_RAMPING)
        elif self._setpoint and not self._resolved():
            self._say(wire.LIMITING_UNRESOLVED)
        return target_uA

    def _most_uA(self):
        """What the load itself allows at this voltage."""
        most_uA = self._guard.current_cap_uA
        if self._voltage_uV < FLOOR_uV:
            return most_uA
        power_mA = self._guard.limits.power_uW // (self._voltage_uV // 1000)
        if power_mA < _MOST_mA and power_mA * 1000 < most_uA:
            return power_mA * 1000
        return most_uA

    def _say(self, limiting):
        if self.limiting == wire.LIMITING_NONE:
            self.limiting = limiting

    def _resolved(self):
        """Whether the steps of the converters are small beside what is held."""
        if self._mode == wire.MODE_VOLTAGE:
            return self._code_uV() < self._voltage_uV // _RESOLVED_CODES
        if self._current_uA < _RESOLVED_CODES * self._code_uA:
            return False
        return self._voltage_uV > _RESOLVED_CODES * self._step_uV

    def _code_uV(self):
        """How far one code moves the voltage."""
        return self._code_uA * (self._slope.mohm >> 3) // 125 if self._slope.known else 0

    # -- the laws: how much more current is wanted --------------------------------------------------------------

    def _voltage(self):
        """f = V - Vset, df/dI = -Rs."""
        error_uV = self._voltage_uV - self._setpoint
        self._judge(error_uV, (self._setpoint >> 10) + 4 * self._step_uV + self._code_uV())
        if error_uV > 0:
            self._good_uA = self._current_uA
            if not self._slope.known:
                return self._probe_uA
        return current(error_uV, self._slope.mohm) >> self._gain_bits

    def _resistance(self):
        """f = V/R - I, df/dI = -(R + Rs)/R."""
        mohm = min(max(self._setpoint, 1), _LARGEST_MOHM)
        error_uA = current(self._voltage_uV, mohm) - self._current_uA
        self._judge(error_uA, self._tolerance_uA() + current(4 * self._step_uV, mohm))
        if error_uA > 0:
            self._good_uA = self._current_uA
            if not self._slope.known:
                return self._probe_uA
        return portion(error_uA, mohm, mohm + self._slope.mohm) >> self._gain_bits

    def _power(self):
        """f = P/V - I, df/dI = -(V - I*Rs)/V, as far as the power rises with the current."""
        if self._voltage_uV < FLOOR_uV:
            return -self._current_uA
        error_uA = drawn_by(self._setpoint, self._voltage_uV) - self._current_uA
        self._judge(error_uA, self._tolerance_uA() + self._counts_uA())
        if not self._slope.known:
            return error_uA >> _GAIN_BITS
        room_uV = self._room_uV()
        change_uA = times_up_to_8(error_uA, self._voltage_uV, room_uV) >> self._gain_bits
        # Half of the way to the top, so that the slope's own uncertainty does not lead beyond it.
        room_uV = room_uV - (self._voltage_uV >> _TOP_BITS) >> 1
        return self._below_top(change_uA, current(room_uV, self._slope.mohm))

    def _counts_uA(self):
        """What four counts of the voltage make of a power's current."""
        return self._current_uA // (self._voltage_uV // (4 * self._step_uV))

    def _tolerance_uA(self):
        return (self._current_uA >> 8) + 3 * self._code_uA

    def _room_uV(self):
        """V - I*Rs; zero at the most that the source can give, negative beyond."""
        voltage_uV = self._voltage_uV
        current_mA = self._current_uA // 1000
        if current_mA <= 0:
            return voltage_uV
        if self._slope.mohm > 2 * voltage_uV // current_mA:
            return -voltage_uV
        return voltage_uV - current_mA * self._slope.mohm

    def _below_top(self, change_uA, room_uA):
        current_uA = self._current_uA
        if room_uA < -(current_uA >> 3):
            # The source is giving way under the last move.
            self._ceiling_uA = min(self._ceiling_uA, self._good_uA)
        elif room_uA >= 0:
            self._good_uA = current_uA
        if change_uA <= room_uA:
            return change_uA
        if self._far and room_uA < (current_uA >> 5) + 2 * self._code_uA:
            self.limiting = wire.LIMITING_UNREACHABLE
        return room_uA

    # -- whether it comes closer --------------------------------------------------------------------------------

    def _judge(self, error, tolerance):
        """Note how far off it is, and count the changes of direction that brought it no closer."""
        size = error if error > 0 else -error
        self._choose_gain(error > 0)
        self._far = size > tolerance
        if not self._far:
            if self._turns:
                self._calm_down()
            return
        if (error > 0) != self._rising:
            self._turn(tolerance << 2)
        if size > self._swing:
            self._swing = size

    def _turn(self, least):
        """What this side's farthest point was, against the other side's before it."""
        if self._swing > least and self._swing << 1 > self._swing_before > 0:
            self._turns += 1
            self._calm = 0
        self._rising = not self._rising
        self._swing_before = self._swing
        self._swing = 0

    def _calm_down(self):
        self._calm += 1
        if self._calm > _CALM_PAIRS:
            self._calm = 0
            self._turns -= 1

    def _choose_gain(self, positive):
        if positive != self._positive:
            self._positive = positive
            self._same_sign = 0
            if self._gain_bits < _LEAST_GAIN_BITS:
                self._gain_bits += 1
            return
        self._same_sign += 1
        if self._same_sign >= _SAME_SIGN:
            self._same_sign = 0
            if self._gain_bits > _GAIN_BITS:
                self._gain_bits -= 1


def current(voltage_uV, mohm):
    """V/R in uA, within 16 A either way."""
    whole_mA = voltage_uV // mohm
    if whole_mA >= _MOST_mA:
        return _MOST_uA
    if whole_mA < -_MOST_mA:
        return -_MOST_uA
    rest_uV = voltage_uV - whole_mA * mohm
    if mohm >= _LARGE_mohm:
        rest_uV >>= 7
        mohm >>= 7
    return whole_mA * 1000 + rest_uV * 1000 // mohm


def drawn_by(power_uW, voltage_uV):
    """P/V in uA, at most 16 A; the voltage from 1 mV."""
    voltage_mV = voltage_uV // 1000
    current_mA = power_uW // voltage_mV
    if current_mA >= _MOST_mA:
        return _MOST_uA
    return current_mA * 1000 + (power_uW - current_mA * voltage_mV) * 1000 // voltage_mV


def portion(value, part, whole):
    """value * part/whole for 0 <= part <= whole < 2**27; value up to 2**24 either way."""
    while whole >= 1 << 15:
        whole >>= 1
        part >>= 1
    share = (part << _SHARE_BITS) // whole
    return (value >> _SHARE_BITS) * share + ((value & _SHARE_MASK) * share >> _SHARE_BITS)


def times_up_to_8(value_uA, voltage_uV, room_uV):
    """value * V/room, where the room counts for no less than an eighth of the voltage."""
    least_uV = voltage_uV >> _TOP_BITS
    if room_uV < least_uV:
        room_uV = least_uV
    share = (voltage_uV >> 7 << 7) // (room_uV >> 7)
    return (value_uA >> 7) * share + ((value_uA & 127) * share >> 7)


def refused(mode, value, limits):
    """Why a set-point cannot be taken: None, or (refusal, detail, the limit's field)."""
    if not wire.MODE_CURRENT <= mode <= wire.MODE_VOLTAGE:
        return wire.REFUSAL_BAD_VALUE, mode, 0
    if value < 0 or value == 0 and mode in (wire.MODE_RESISTANCE, wire.MODE_VOLTAGE):
        return wire.REFUSAL_BAD_VALUE, value, 0
    largest = largest_setpoint(mode, limits)
    if value > largest:
        return wire.REFUSAL_BEYOND_LIMIT, largest, _LIMIT_FIELD[mode]
    return None


def largest_setpoint(mode, limits):
    return (0, limits.current_uA, limits.power_uW, _NO_LIMIT, limits.voltage_uV)[mode]
