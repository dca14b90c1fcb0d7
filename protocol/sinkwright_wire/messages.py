"""Every message as a frozen dataclass, the registry of them, and the way to bytes and back.

Those about a run stand in run_messages.py, and are to be had from here as well. Quantities carry their unit in
the field's name; the meaning of the other fields stands beside the layout, in layouts.py. Framing, check sequence
and sequence numbers are not decided here.
"""

from __future__ import annotations

import struct
from dataclasses import dataclass

from . import layouts
from .errors import BadField, Malformed, UnknownMessage, VersionMismatch
from .layouts import HEADER, MAX_PAYLOAD, NEVER_HEARD, VERSION
from .mapping import struct_format
from .registry import MESSAGES, Done, Message, Push, Refused, Request, message
from .run_messages import (
    ENTRIES,
    ArmBurst,
    BurstReading,
    BurstReadings,
    GetBurst,
    GetLog,
    GetRun,
    LoadProgram,
    LogEntries,
    LogEntry,
    MarkFetched,
    ProgramStep,
    Run,
    SetEnds,
)
from .vocabulary import (
    EventKind,
    Fault,
    Limiting,
    LimitSet,
    Mode,
    ResetCause,
    Silence,
    State,
)

__all__ = [
    "ENTRIES",
    "HEADER_SIZE",
    "MAX_PAYLOAD",
    "MESSAGES",
    "NEVER_HEARD",
    "VERSION",
    "ArmBurst",
    "BurstReading",
    "BurstReadings",
    "Done",
    "Envelope",
    "GetBurst",
    "GetLog",
    "GetRun",
    "LoadProgram",
    "LogEntries",
    "LogEntry",
    "MarkFetched",
    "Message",
    "ProgramStep",
    "Push",
    "Refused",
    "Request",
    "Run",
    "SetEnds",
    "pack",
    "parse",
]

HEADER_SIZE: int = HEADER.sizeof()
_split_header = struct.Struct(struct_format(HEADER)).unpack_from


# Who is there


@message(0x81, layouts.HELLO_REPLY)
class HelloReply(Message):
    """Who answers, and whether this session controls the load."""

    wire_version: int
    simulated: bool
    firmware_major: int
    firmware_minor: int
    firmware_patch: int
    boot_number: int
    board_id: bytes
    name: str
    in_control: bool
    other_heard_ms: int


@message(0x01, layouts.HELLO, reply=HelloReply)
class Hello(Request):
    """Opens a session, whose number is in the header, and takes control unless it only watches."""

    wire_version: int = VERSION
    watch: bool = False


@message(0x82, layouts.IDENTITY)
class Identity(Message):
    """What the board is made of."""

    control_period_us: int
    board_file_crc: int
    calibration_number: int
    reset_cause: ResetCause
    log_capacity: int
    interpreter: str


@message(0x02, layouts.EMPTY, reply=Identity)
class Identify(Request):
    """Asks what the board is made of."""


# Limits and set-point


@message(0x83, layouts.LIMITS)
class Limits(Message):
    """The limits in force, or those that the board itself stands."""

    current_uA: int
    voltage_uV: int
    power_uW: int
    heatsink_mC: int
    junction_mC: int
    slew_uA_per_ms: int
    silence_ms: int


@message(0x03, layouts.GET_LIMITS, reply=Limits)
class GetLimits(Request):
    """Asks for one of the two sets of limits."""

    which: LimitSet = LimitSet.IN_FORCE


@message(0x04, layouts.LIMITS, reply=Done)
class SetLimits(Request):
    """Puts limits in force. Refused as BEYOND_BOARD with the field and the largest value that fits."""

    current_uA: int
    voltage_uV: int
    power_uW: int
    heatsink_mC: int
    junction_mC: int
    slew_uA_per_ms: int
    silence_ms: int


@message(0x05, layouts.SET_POINT, reply=Done)
class SetPoint(Request):
    """What to hold: the value in uA, uW, mohm or uV after the mode."""

    mode: Mode
    value: int


@message(0x06, layouts.ENABLE, reply=Done)
class Enable(Request):
    """Turns the load on, which begins a run.

    CONTINUE is refused as ENDS_MISSING without a voltage end and a charge or duration end; any Enable is refused
    as RUN_NOT_FETCHED while a finished run that was allowed to go on alone has not been marked as fetched.
    """

    when_silent: Silence = Silence.STOP
    run: int = 0
    program: bool = False


@message(0x07, layouts.EMPTY, reply=Done)
class Disable(Request):
    """Turns the load off; accepted from anybody, in any session, and never refused."""


@message(0x15, layouts.RESTART, reply=Done)
class Restart(Request):
    """Restarts the board with its gate clamped.

    Refused as LOAD_IS_ON while it sinks, and as RUN_NOT_FETCHED where a run would be lost.
    """

    maintenance: bool = False


# What is going on


@message(0x88, layouts.STATUS)
class Status(Message):
    """What the load is doing, with the board's own counters."""

    time_us: int
    state: State
    mode: Mode
    limiting: Limiting
    fault: Fault
    setpoint: int
    voltage_uV: int
    current_uA: int
    force_uV: int
    heatsink_mC: int
    junction_mC: int
    zero_uA: int
    zero_samples: int
    controller: int
    overruns: int
    dropped: int
    discarded: int
    log_entries: int


@message(0x08, layouts.EMPTY, reply=Status)
class GetStatus(Request):
    """Asks what the load is doing; answered in any session."""


@message(0x8C, layouts.FAULT_REPORT)
class FaultReport(Message):
    """The latched fault; value and limit are in the unit of the Fault."""

    fault: Fault
    standing: bool
    value: int
    limit: int
    time_us: int


@message(0x0C, layouts.EMPTY, reply=FaultReport)
class GetFault(Request):
    """Asks which fault is latched."""


@message(0x09, layouts.EMPTY, reply=Done)
class ClearFault(Request):
    """Clears the latched fault; refused while its cause stands."""


@message(0x0E, layouts.EMPTY, reply=Done)
class Beat(Request):
    """Tells the board that its host is alive; any other frame of the controlling session does so too."""


# Telemetry, log and burst


@message(0x0A, layouts.SET_TELEMETRY, reply=Done)
class SetTelemetry(Request):
    """How often readings are pushed."""

    every_steps: int


@message(0x40, layouts.TELEMETRY)
class Telemetry(Push):
    """Readings, pushed at the rate that was set."""

    number: int
    time_us: int
    state: State
    mode: Mode
    limiting: Limiting
    fault: Fault
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


@message(0x41, layouts.LOG_LINE)
class LogLine(Push):
    """Something the firmware has to say in words."""

    level: int
    text: str


@message(0x42, layouts.EVENT)
class Event(Push):
    """Something happened on the board; code, value and limit follow from the kind."""

    number: int
    time_us: int
    kind: EventKind
    code: int = 0
    value: int = 0
    limit: int = 0


@dataclass(frozen=True, slots=True)
class Envelope:
    """A message with what its header said."""

    version: int
    id: int
    session: int
    sequence: int
    message: Message


def pack(message: Message, session: int = 0, sequence: int = 0) -> bytes:
    """Header and payload of a frame, without check sequence. Raises BadField for a number beyond 16 bits."""
    for name, value in (("session", session), ("sequence", sequence)):
        if not 0 <= value <= 0xFFFF:
            raise BadField("Header", name, value, "an integer from 0 to 65535")
    payload = message.CODEC.build(message)
    fields = {
        "version": VERSION,
        "id": message.ID,
        "session": session,
        "sequence": sequence,
        "length": len(payload),
    }
    return HEADER.build(fields) + payload


def parse(content: bytes) -> Envelope:
    """The message of a frame's content, whose check sequence was good. Raises WireError subclasses only."""
    if len(content) < HEADER_SIZE:
        raise Malformed(f"{len(content)} bytes are too few for a header")
    version, message_id, session, sequence, length = _split_header(content)
    # Hello and its reply never change, so that two versions can tell each other which they are.
    if version != VERSION and message_id not in (Hello.ID, HelloReply.ID):
        raise VersionMismatch(version)
    if length != len(content) - HEADER_SIZE:
        raise Malformed(f"the header announces {length} bytes of payload, {len(content) - HEADER_SIZE} came")
    if message_id not in MESSAGES:
        raise UnknownMessage(message_id)
    message = MESSAGES[message_id].CODEC.parse(content[HEADER_SIZE:])
    assert isinstance(message, Message)
    return Envelope(version, message_id, session, sequence, message)
