"""Every message as a frozen dataclass, the registry of them, and the way to bytes and back.

A message checks its own fields when it is made. Quantities carry their unit in the field's name; the
meaning of the other fields stands beside the layout, in layouts.py. Requests name the message that answers
them. Framing, check sequence and sequence numbers are not decided here.
"""

from __future__ import annotations

import struct
from collections.abc import Callable
from dataclasses import dataclass
from typing import ClassVar, TypeVar, dataclass_transform

from construct import Struct

from . import layouts
from .errors import BadField, Malformed, UnknownMessage, VersionMismatch
from .layouts import HEADER, MAX_PAYLOAD, NEVER_HEARD, VERSION
from .mapping import Laid, laid_out, struct_format
from .vocabulary import (
    EventKind,
    Fault,
    LimitField,
    Limiting,
    LimitSet,
    Mode,
    Refusal,
    ResetCause,
    Silence,
    State,
)

__all__ = ["HEADER_SIZE", "MAX_PAYLOAD", "MESSAGES", "NEVER_HEARD", "VERSION", "Envelope", "pack", "parse"]

HEADER_SIZE: int = HEADER.sizeof()
_split_header = struct.Struct(struct_format(HEADER)).unpack_from


class Message(Laid):
    """Anything that crosses the wire in a frame of its own."""

    __slots__ = ()
    ID: ClassVar[int]


class Request(Message):
    """What a host asks; REPLY is the message that says it was done."""

    __slots__ = ()
    REPLY: ClassVar[type[Message]]


class Push(Message):
    """What the board sends unasked."""

    __slots__ = ()


MESSAGES: dict[int, type[Message]] = {}

MessageClass = TypeVar("MessageClass", bound=Message)


@dataclass_transform(frozen_default=True)
def _message(
    message_id: int, layout: Struct, reply: type[Message] | None = None
) -> Callable[[type[MessageClass]], type[MessageClass]]:
    """Class decorator: makes the frozen dataclass of a layout, and enters it under its id."""

    def register(declared: type[MessageClass]) -> type[MessageClass]:
        cls = laid_out(layout)(declared)
        if message_id in MESSAGES:
            raise TypeError(f"{cls.__name__} and {MESSAGES[message_id].__name__} share an id")
        cls.ID = message_id
        if issubclass(cls, Request) and reply is not None:
            cls.REPLY = reply
        MESSAGES[message_id] = cls
        return cls

    return register


# Answers that serve several requests


@_message(0xC0, layouts.DONE)
class Done(Message):
    """The request was carried out."""

    request: int


@_message(0xC1, layouts.REFUSED)
class Refused(Message):
    """The request was not carried out, and nothing has changed."""

    request: int
    refusal: Refusal
    field: LimitField = LimitField.NONE
    detail: int = 0


# Who is there


@_message(0x81, layouts.HELLO_REPLY)
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


@_message(0x01, layouts.HELLO, reply=HelloReply)
class Hello(Request):
    """Opens a session, whose number is in the header, and takes control unless it only watches."""

    wire_version: int = VERSION
    watch: bool = False


@_message(0x82, layouts.IDENTITY)
class Identity(Message):
    """What the board is made of."""

    control_period_us: int
    board_file_crc: int
    calibration_number: int
    reset_cause: ResetCause
    log_capacity: int
    interpreter: str


@_message(0x02, layouts.EMPTY, reply=Identity)
class Identify(Request):
    """Asks what the board is made of."""


# Limits and set-point


@_message(0x83, layouts.LIMITS)
class Limits(Message):
    """The limits in force, or those that the board itself stands."""

    current_uA: int
    voltage_uV: int
    power_uW: int
    heatsink_mC: int
    junction_mC: int
    slew_uA_per_ms: int
    silence_ms: int


@_message(0x03, layouts.GET_LIMITS, reply=Limits)
class GetLimits(Request):
    """Asks for one of the two sets of limits."""

    which: LimitSet = LimitSet.IN_FORCE


@_message(0x04, layouts.LIMITS, reply=Done)
class SetLimits(Request):
    """Puts limits in force. Refused as BEYOND_BOARD with the field and the largest value that fits."""

    current_uA: int
    voltage_uV: int
    power_uW: int
    heatsink_mC: int
    junction_mC: int
    slew_uA_per_ms: int
    silence_ms: int


@_message(0x05, layouts.SET_POINT, reply=Done)
class SetPoint(Request):
    """What to hold: the value in uA, uW, mohm or uV after the mode."""

    mode: Mode
    value: int


@_message(0x06, layouts.ENABLE, reply=Done)
class Enable(Request):
    """Turns the load on."""

    when_silent: Silence = Silence.STOP


@_message(0x07, layouts.EMPTY, reply=Done)
class Disable(Request):
    """Turns the load off; accepted from anybody, in any session, and never refused."""


# What is going on


@_message(0x88, layouts.STATUS)
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


@_message(0x08, layouts.EMPTY, reply=Status)
class GetStatus(Request):
    """Asks what the load is doing; answered in any session."""


@_message(0x8C, layouts.FAULT_REPORT)
class FaultReport(Message):
    """The latched fault; value and limit are in the unit of the Fault."""

    fault: Fault
    standing: bool
    value: int
    limit: int
    time_us: int


@_message(0x0C, layouts.EMPTY, reply=FaultReport)
class GetFault(Request):
    """Asks which fault is latched."""


@_message(0x09, layouts.EMPTY, reply=Done)
class ClearFault(Request):
    """Clears the latched fault; refused while its cause stands."""


@_message(0x0E, layouts.EMPTY, reply=Done)
class Beat(Request):
    """Tells the board that its host is alive; any other frame of the controlling session does so too."""


# Telemetry and log


@_message(0x0A, layouts.SET_TELEMETRY, reply=Done)
class SetTelemetry(Request):
    """How often readings are pushed."""

    every_steps: int


@laid_out(layouts.LOG_ENTRY)
class LogEntry(Laid):
    """One line of the run log that the board keeps."""

    time_ms: int
    voltage_uV: int
    voltage_min_uV: int
    voltage_max_uV: int
    current_uA: int
    heatsink_cC: int
    charge_mC: int


@_message(0x8D, layouts.LOG_ENTRIES)
class LogEntries(Message):
    """A piece of the run log; fewer entries than fit mean that the log ends here."""

    first: int
    total: int
    spacing_ms: int
    entries: tuple[LogEntry, ...] = ()


@_message(0x0D, layouts.GET_LOG, reply=LogEntries)
class GetLog(Request):
    """Asks for a piece of the run log."""

    first: int = 0


@_message(0x40, layouts.TELEMETRY)
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


@_message(0x41, layouts.LOG_LINE)
class LogLine(Push):
    """Something the firmware has to say in words."""

    level: int
    text: str


@_message(0x42, layouts.EVENT)
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
