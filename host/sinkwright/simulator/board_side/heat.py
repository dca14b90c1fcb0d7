"""Where the power goes: junction, case and heatsink temperatures, thermistor, the sense resistor's warmth.

A chain of Foster stages, each R*(1 - exp(-t/tau)) of the power step. Foster nodes are no places, but the
sums are: junction = ambient + all stages; the heatsink's sensor = ambient + the heatsink's stage. Steps are
exact for a power that is constant over the step, however long.
"""

import math

_KELVIN = 273.15
# How long a bead takes to follow the air around it: from memory, NTCs of some millimetres in still air.
_LOOSE_s = 15.0


class HeatChain:
    def __init__(self, plant):
        self.ambient_degC = plant["ambient_degC"]
        stages = list(plant["transistor"]["stages"])
        self._stages = [[ohm, tau, 0.0] for ohm, tau in stages]
        self._case = [plant["case_to_sink"][0], plant["case_to_sink"][1], 0.0]
        self._sink = [plant["heatsink"][0], plant["heatsink"][1], 0.0]
        self._all = self._stages + [self._case, self._sink]
        self._sink_K_per_W = plant["heatsink"][0]
        self._sink_s = plant["heatsink"][1]
        self._loose = False
        self._sensor_K = 0.0

    def step(self, power_W, h):
        """`power_W` for `h` seconds."""
        for stage in self._all:
            stage[2] += (power_W * stage[0] - stage[2]) * (1.0 - math.exp(-h / stage[1]))
        self._sensor_K = self._sensor_K * math.exp(-h / _LOOSE_s) if self._loose else self._sink[2]

    def slow_fan(self, factor):
        """The sink's resistance to the air becomes `factor` times as large; its heat capacity stays."""
        self._sink[0] = self._sink_K_per_W * factor
        self._sink[1] = self._sink_s * factor

    def loosen_sensor(self, loose):
        """The sensor hangs in the air from now on, and comes to its temperature."""
        self._loose = loose

    @property
    def sensor_degC(self):
        return self.ambient_degC + self._sensor_K

    @property
    def heatsink_degC(self):
        return self.ambient_degC + self._sink[2]

    @property
    def case_degC(self):
        return self.heatsink_degC + self._case[2]

    @property
    def junction_degC(self):
        return self.case_degC + sum(stage[2] for stage in self._stages)


class SenseResistor:
    """The resistance that the current is measured by, as it warms itself: R = R0 * (1 + per_K * rise)."""

    def __init__(self, entry):
        self._cold_ohm = entry["resistance_ohm"]
        self._per_K = entry.get("resistance_per_K") or 0.0
        self._K_per_W = entry.get("heating_K_per_W") or 0.0
        self._tau_s = entry.get("heating_s") or 5.0
        self._rise_K = 0.0
        self._instead_ohm = 0.0
        self.ohm = self._cold_ohm

    def step(self, current_A, h):
        power_W = current_A * current_A * self.ohm
        self._rise_K += (power_W * self._K_per_W - self._rise_K) * (1.0 - math.exp(-h / self._tau_s))
        self.ohm = self._instead_ohm or self._cold_ohm * (1.0 + self._per_K * self._rise_K)

    def replace(self, ohm):
        """From now on another resistance is found there; 0 brings the resistor back."""
        self._instead_ohm = ohm
        self.ohm = ohm or self._cold_ohm


class Thermistor:
    """A thermistor from the ADC's pin to ground, with a pull-up to its supply; `defect` is "", "open" or
    "short".

    Between the table's points ln R is straight in 1/T, which is what a thermistor does over a few kelvin.
    """

    def __init__(self, entry):
        self._supply_V = entry["supply_V"]
        self._pullup_ohm = entry["pullup_ohm"]
        self._table = [(1.0 / (_KELVIN + degC), math.log(ohm)) for degC, ohm in entry["table"]]
        self._segment = 0
        self.defect = ""

    def resistance_ohm(self, degC):
        x = 1.0 / (_KELVIN + degC)
        table = self._table
        j = self._segment
        while j > 0 and x > table[j][0]:
            j -= 1
        while j < len(table) - 2 and x < table[j + 1][0]:
            j += 1
        self._segment = j
        x0, y0 = table[j]
        x1, y1 = table[j + 1]
        return math.exp(y0 + (x - x0) * (y1 - y0) / (x1 - x0))

    def pin_V(self, degC):
        if self.defect:
            return self._supply_V if self.defect == "open" else 0.0
        ohm = self.resistance_ohm(degC)
        return self._supply_V * ohm / (ohm + self._pullup_ohm)
