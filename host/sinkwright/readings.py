"""What a load says of itself, in SI units: identity, limits, status, fault, events and its run log.

Plain frozen values made from wire messages. It must not send or wait.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Self

from sinkwright.errors import AskedTooMuch
from sinkwright.refusals import HUMAN_UNITS, fault_in_words, in_human_units
from sinkwright.sample import SETPOINT_PARTS, SETPOINT_UNITS
from sinkwright.wire_units import to_integer
from sinkwright_wire.messages import (
    Event,
    FaultReport,
    HelloReply,
    Identity,
    Limits,
    LogEntry,
    SetLimits,
    Status,
)
from sinkwright_wire.vocabulary import EventKind, Fault, Limiting, Mode, ResetCause, RunEnd, State

#: A transistor failed short, or the body diode of a reversed source: the clamped gate changes nothing.
NOT_STOPPED_BY_OFF = (Fault.CURRENT_ALTHOUGH_OFF, Fault.REVERSED_SOURCE)


@dataclass(frozen=True)
class BoardIdentity:
    """Which board answers, with what firmware. `calibration_number` 0 means never calibrated."""

    name: str
    board_id: str
    firmware_version: str
    interpreter: str
    simulated: bool
    control_period_s: float
    boot_number: int
    board_file_crc: int
    calibration_number: int
    reset_cause: ResetCause
    url: str

    @classmethod
    def of(cls, hello: HelloReply, identity: Identity, url: str) -> Self:
        return cls(
            name=hello.name,
            board_id=hello.board_id.hex(),
            firmware_version=f"{hello.firmware_major}.{hello.firmware_minor}.{hello.firmware_patch}",
            interpreter=identity.interpreter,
            simulated=hello.simulated,
            control_period_s=identity.control_period_us / 1e6,
            boot_number=hello.boot_number,
            board_file_crc=identity.board_file_crc,
            calibration_number=identity.calibration_number,
            reset_cause=identity.reset_cause,
            url=url,
        )


@dataclass(frozen=True)
class LoadLimits:
    """Limits that protections and set-points keep to. `silence_s`: how long it sinks without its host."""

    current_A: float
    voltage_V: float
    power_W: float
    heatsink_degC: float
    junction_degC: float
    slew_A_per_s: float
    silence_s: float

    @classmethod
    def of(cls, limits: Limits) -> Self:
        return cls(
            limits.current_uA / 1e6,
            limits.voltage_uV / 1e6,
            limits.power_uW / 1e6,
            limits.heatsink_mC / 1e3,
            limits.junction_mC / 1e3,
            limits.slew_uA_per_ms / 1e3,
            limits.silence_ms / 1e3,
        )

    def changed(self, **changes: float) -> Self:
        """The same with some replaced. Raises AskedTooMuch for a name that is no limit."""
        names = [field.name for field in fields(self)]
        unknown = [name for name in changes if name not in names]
        if unknown:
            raise AskedTooMuch(f"{unknown[0]} is no limit", remedy=f"The limits are {', '.join(names)}.")
        return replace(self, **changes)

    def to_wire(self) -> SetLimits:
        """The message that puts these in force. Raises AskedTooMuch for what is no quantity."""
        return SetLimits(
            to_integer(self.current_A, 1_000_000, "a current limit", "A"),
            to_integer(self.voltage_V, 1_000_000, "a voltage limit", "V"),
            to_integer(self.power_W, 1_000_000, "a power limit", "W"),
            to_integer(self.heatsink_degC, 1_000, "a heatsink limit", "°C"),
            to_integer(self.junction_degC, 1_000, "a junction limit", "°C"),
            to_integer(self.slew_A_per_s, 1_000, "a slew limit", "A/s"),
            to_integer(self.silence_s, 1_000, "a silence limit", "s"),
        )


@dataclass(frozen=True)
class LoadStatus:
    """State and newest readings. `zero_current_A` is what the current read with the gate clamped.

    `setpoint_SI` is in ampere, watt, ohm or volt, as the mode has it. `controlled` says whether any program
    controls the load. `dropped` counts pushes that the board had no room for, `discarded` damaged frames.
    """

    time_us: int
    state: State
    mode: Mode
    limiting: Limiting
    fault: Fault
    setpoint_SI: float
    voltage_V: float
    current_A: float
    force_V: float
    heatsink_degC: float
    junction_degC: float
    zero_current_A: float
    zero_samples: int
    controlled: bool
    overruns: int
    dropped: int
    discarded: int
    log_entries: int

    @classmethod
    def of(cls, status: Status) -> Self:
        return cls(
            time_us=status.time_us,
            state=status.state,
            mode=status.mode,
            limiting=status.limiting,
            fault=status.fault,
            setpoint_SI=status.setpoint / SETPOINT_PARTS.get(status.mode, 1_000_000),
            voltage_V=status.voltage_uV / 1e6,
            current_A=status.current_uA / 1e6,
            force_V=status.force_uV / 1e6,
            heatsink_degC=status.heatsink_mC / 1e3,
            junction_degC=status.junction_mC / 1e3,
            zero_current_A=status.zero_uA / 1e6,
            zero_samples=status.zero_samples,
            controlled=status.controller != 0,
            overruns=status.overruns,
            dropped=status.dropped,
            discarded=status.discarded,
            log_entries=status.log_entries,
        )

    @property
    def setpoint_unit(self) -> str:
        """The unit of `setpoint_SI`: A, W, ohm or V; empty while no set-point was given."""
        return SETPOINT_UNITS.get(self.mode, "")

    @property
    def in_words(self) -> str:
        """What the load is doing, as one sentence; never "off" while current flows all the same."""
        if self.fault in NOT_STOPPED_BY_OFF:
            return self.fault.sentence
        if self.state == State.SINKING:
            return f"The load sinks {self.current_A:.3f} A at {self.voltage_V:.3f} V."
        if self.state == State.FAULT:
            return f"The load is off. {self.fault.sentence}"
        return f"The load is off; its terminals are at {self.voltage_V:.3f} V."


@dataclass(frozen=True)
class FaultDescription:
    """A latched fault. `value` and `limit` are in `unit` (SI, °C for temperatures; "" for a bare number)."""

    fault: Fault
    sentence: str
    value: float
    limit: float
    unit: str
    standing: bool
    time_us: int

    @classmethod
    def of(cls, report: FaultReport) -> Self:
        fault = report.fault
        parts, unit = HUMAN_UNITS.get(fault.unit, (1, fault.unit))
        return cls(
            fault=fault,
            sentence=fault_in_words(fault, report.value, report.limit),
            value=report.value / parts,
            limit=report.limit / parts,
            unit=unit,
            standing=report.standing,
            time_us=report.time_us,
        )

    @property
    def name(self) -> str:
        """Its name in results: "heatsink-hot"."""
        return self.fault.name.lower().replace("_", "-")

    @property
    def load_in_words(self) -> str:
        """What the load is doing while this fault is latched."""
        if self.fault in NOT_STOPPED_BY_OFF:
            return "Turning off cannot stop this current: pull the source lead now."
        return "The load is off."


@dataclass(frozen=True)
class LoadEvent:
    """Something that happened on the board, by its clock. `value` and `limit` are the wire's integers."""

    number: int
    time_us: int
    kind: EventKind
    code: int
    value: int
    limit: int

    @classmethod
    def of(cls, event: Event) -> Self:
        return cls(event.number, event.time_us, event.kind, event.code, event.value, event.limit)

    @property
    def name(self) -> str:
        """Its name in records: "source-limits"."""
        return self.kind.name.lower().replace("_", "-")

    @property
    def in_words(self) -> str:
        """One sentence for a person."""
        if self.kind == EventKind.BOOT:
            return ResetCause(self.code).sentence
        if self.kind == EventKind.ENDED:
            return f"The board ended the run. {RunEnd(self.code).sentence}"
        if self.kind == EventKind.FAULT:
            return fault_in_words(Fault(self.code), self.value, self.limit)
        if self.kind == EventKind.SOURCE_LIMITS and self.code not in _PLAIN_SHORTAGE:
            return Limiting(self.code).sentence
        if self.kind == EventKind.SOURCE_LIMITS:
            demand = in_human_units(self.limit, "uA")
            return (
                f"The source limits: it gives {in_human_units(self.value, 'uA')} of the {demand} asked for."
            )
        return _EVENT_WORDS[self.kind]


#: Where what flows and what was asked for say it best; 0 is an event without a reason.
_PLAIN_SHORTAGE = (Limiting.NONE, Limiting.SOURCE)

_EVENT_WORDS = {
    EventKind.ENABLED: "The load was turned on.",
    EventKind.DISABLED: "The load was turned off.",
    EventKind.CLEARED: "A fault was cleared.",
    EventKind.SOURCE_RETURNED: "The source gives what is asked for again.",
    EventKind.LOG: "The board's run log was thinned out to make room.",
    EventKind.BUTTON: "The OFF button was pressed.",
    EventKind.RESTART: "The board is about to restart, as it was asked to.",
}


@dataclass(frozen=True)
class RunLog:
    """The board's own log of a run, in the wire's integers. `spacing_s` is the time between entries."""

    spacing_s: float
    entries: tuple[LogEntry, ...]
