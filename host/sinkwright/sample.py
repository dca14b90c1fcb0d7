"""One telemetry reading as the host keeps it: the board's raw integers, and the same in SI units.

Records store the integers, so nothing is lost by rounding; procedures and people read the properties. It must
not know links, boards or files, and takes any object that has the wire's telemetry fields.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any, Protocol

#: The wire's numbers for states and modes, as names for people and records (wire reference, State and Mode).
STATE_NAMES = {0: "off", 1: "sinking", 2: "ended", 3: "fault"}
MODE_NAMES = {0: "none", 1: "current", 2: "power", 3: "resistance", 4: "voltage"}
LIMITING_NAMES = {
    0: "none",
    1: "source",
    2: "ramping",
    3: "derated",
    4: "no-source",
    5: "saturated",
    6: "unreachable",
    7: "unresolved",
    8: "unsettled",
}

SINKING = 1
FAULT = 3
_CURRENT_MODE = 1

#: Raw set-point units in each mode, as parts of one SI unit: uA, uW, mohm, uV.
SETPOINT_PARTS = {1: 1_000_000, 2: 1_000_000, 3: 1_000, 4: 1_000_000}
#: The SI unit of a set-point in each mode.
SETPOINT_UNITS = {1: "A", 2: "W", 3: "ohm", 4: "V"}


class TelemetryFields(Protocol):
    """What a Sample is made from: the wire's telemetry message, or a row of a record."""

    @property
    def number(self) -> int: ...


@dataclass(frozen=True, slots=True)
class Sample:
    """One telemetry frame. Voltages and currents are means over the frame's V-I pairs, with their extremes.

    `time_us` is the board's clock. `charge_uC` and `energy_uJ` count from the start of the run. `setpoint` is
    in the mode's own unit (uA, uW, mohm, uV). `dropped` counts telemetry frames that the board had no room to
    send.
    """

    number: int
    time_us: int
    state: int
    mode: int
    limiting: int
    fault: int
    setpoint: int
    voltage_uV: int
    voltage_min_uV: int
    voltage_max_uV: int
    current_uA: int
    current_min_uA: int
    current_max_uA: int
    force_uV: int
    heatsink_mC: int
    junction_mC: int
    charge_uC: int
    energy_uJ: int
    pairs: int
    overruns: int
    dropped: int

    @classmethod
    def of(cls, telemetry: TelemetryFields) -> Sample:
        """The sample in a telemetry message."""
        source: Any = telemetry
        return cls(*[getattr(source, name) for name in FIELD_NAMES])

    @property
    def time_s(self) -> float:
        return self.time_us / 1e6

    @property
    def sinking(self) -> bool:
        return self.state == SINKING

    @property
    def state_name(self) -> str:
        return STATE_NAMES.get(self.state, f"state {self.state}")

    @property
    def mode_name(self) -> str:
        return MODE_NAMES.get(self.mode, f"mode {self.mode}")

    @property
    def limiting_name(self) -> str:
        return LIMITING_NAMES.get(self.limiting, f"limit {self.limiting}")

    @property
    def setpoint_A(self) -> float:
        """The demanded current; not a number in the other modes."""
        return self.setpoint / 1e6 if self.mode == _CURRENT_MODE else float("nan")

    @property
    def setpoint_SI(self) -> float:
        """The set-point in ampere, watt, ohm or volt, as the mode has it; not a number without a mode."""
        parts = SETPOINT_PARTS.get(self.mode)
        return self.setpoint / parts if parts else float("nan")

    @property
    def setpoint_unit(self) -> str:
        """The unit of `setpoint_SI`: A, W, ohm or V; empty without a mode."""
        return SETPOINT_UNITS.get(self.mode, "")

    @property
    def voltage_V(self) -> float:
        return self.voltage_uV / 1e6

    @property
    def voltage_min_V(self) -> float:
        return self.voltage_min_uV / 1e6

    @property
    def voltage_max_V(self) -> float:
        return self.voltage_max_uV / 1e6

    @property
    def current_A(self) -> float:
        return self.current_uA / 1e6

    @property
    def current_min_A(self) -> float:
        return self.current_min_uA / 1e6

    @property
    def current_max_A(self) -> float:
        return self.current_max_uA / 1e6

    @property
    def power_W(self) -> float:
        """The product of the two means: where ripples of V and I go together it lacks their covariance."""
        return self.voltage_V * self.current_A

    @property
    def force_V(self) -> float:
        """Voltage at the board's force terminals, so lower than `voltage_V` by the drop in the leads."""
        return self.force_uV / 1e6

    @property
    def heatsink_degC(self) -> float:
        return self.heatsink_mC / 1e3

    @property
    def junction_degC(self) -> float:
        return self.junction_mC / 1e3

    @property
    def charge_C(self) -> float:
        return self.charge_uC / 1e6

    @property
    def energy_J(self) -> float:
        return self.energy_uJ / 1e6


#: The raw fields in order: what a record stores of each sample.
FIELD_NAMES: tuple[str, ...] = tuple(field.name for field in fields(Sample))
