"""How every message lies in bytes: the single truth of the wire, from which firmware/wire.py is generated.

Little-endian throughout. Layouts are of fixed length, except for a tail that takes the rest of the payload
(LOG_LINE, LOG_ENTRIES, LOAD_PROGRAM, BURST_READINGS). The header's version byte and the layouts of HELLO
and HELLO_REPLY never change: two versions must be able to meet and say so. Nothing here knows the dataclasses
or the framing.
"""

from __future__ import annotations

from functools import partial
from typing import Any

from construct import (
    Bytes,
    Construct,
    GreedyBytes,
    GreedyRange,
    Int8ul,
    Int16sl,
    Int16ul,
    Int32sl,
    Int32ul,
    Int64sl,
    Int64ul,
    Struct,
)

VERSION = 1
# 7 bytes of header, 112 of payload, 4 of check sequence: 246 with every byte escaped, so that a frame with
# its flags stays under 256 bytes, the transmit buffer of the board's USB port.
MAX_PAYLOAD = 112
MAX_TEXT = 100
MAX_ENTRIES = 4
MAX_STEPS = 10
MAX_READINGS = 16
NEVER_HEARD = 0xFFFFFFFF


class Tail(GreedyRange):
    """Entries of one layout up to the end of the payload, `most` of them."""

    def __init__(self, layout: Struct, most: int) -> None:
        super().__init__(layout)
        self.most = most


def _field(kind: Any, name: str, meaning: str = "") -> Construct:
    """A named field with its meaning and unit, as protocol/REFERENCE.md prints it."""
    return (name / kind) * meaning


_u8 = partial(_field, Int8ul)
_u16 = partial(_field, Int16ul)
_u32 = partial(_field, Int32ul)
_u64 = partial(_field, Int64ul)
_i16 = partial(_field, Int16sl)
_i32 = partial(_field, Int32sl)
_i64 = partial(_field, Int64sl)

HEADER = Struct(
    _u8("version", "wire version"),
    _u8("id", "which message"),
    _u16("session", "drawn by the host in its hello; 0 in a push"),
    _u16("sequence", "of the request, repeated by its reply; 0 in a push"),
    _u8("length", "bytes of payload that follow"),
)

EMPTY = Struct()

HELLO = Struct(
    _u8("wire_version", "version the host speaks"),
    _u8("watch", "1: only look on, never take control"),
)
HELLO_REPLY = Struct(
    _u8("wire_version", "version the board speaks"),
    _u8("simulated", "1: no real board"),
    _u8("firmware_major"),
    _u8("firmware_minor"),
    _u8("firmware_patch"),
    _u32("boot_number", "another one after every start of the board"),
    _field(Bytes(8), "board_id", "the microcontroller's own number"),
    _field(Bytes(16), "name", "the board's name, UTF-8, padded with NUL"),
    _u8("in_control", "1: this session controls the load"),
    _u32("other_heard_ms", "since another host in control was last heard; FFFFFFFF: there is none"),
)

IDENTITY = Struct(
    _u32("control_period_us", "time between control steps"),
    _u32("board_file_crc", "CRC-32 of the board file that the image was made from"),
    _u32("calibration_number", "0: never calibrated"),
    _u8("reset_cause", "ResetCause"),
    _u16("log_capacity", "entries the run log can hold"),
    _field(Bytes(32), "interpreter", "name and version, UTF-8, padded with NUL"),
)

GET_LIMITS = Struct(_u8("which", "LimitSet"))
LIMITS = Struct(
    _i32("current_uA"),
    _i32("voltage_uV"),
    _i32("power_uW"),
    _i32("heatsink_mC"),
    _i32("junction_mC"),
    _i32("slew_uA_per_ms", "steepest change of the set current"),
    _u32("silence_ms", "how long the host may be silent while the load is on"),
)

SET_POINT = Struct(
    _u8("mode", "Mode"),
    _i32("value", "uA, uW, mohm or uV, after the mode"),
)
ENABLE = Struct(
    _u8("when_silent", "Silence"),
    _u32("run", "drawn by the host, so that the run can be told from others; 0: no name"),
    _u8("program", "1: follow the loaded program"),
)
SET_ENDS = Struct(
    _i32("voltage_uV", "ends when the voltage is at or below; 0: no such end"),
    _u32("charge_mC", "ends when so much charge has flowed; 0: no such end"),
    _u32("energy_mJ", "ends when so much energy was taken; 0: no such end"),
    _u32("duration_ms", "ends after so long; 0: no such end"),
    _i32("temperature_mC", "ends when the heatsink is at or above; 0: no such end"),
)
RUN = Struct(
    _u32("run", "as its Enable named it; 0: none, or no name"),
    _u8("state", "State"),
    _u8("ended_by", "RunEnd"),
    _u8("fetched", "1: nobody need fetch it (any more)"),
    _u8("when_silent", "Silence"),
    _u64("started_us", "by the board's clock"),
    _u64("ended_us", "by the board's clock; 0: it goes on, or there was none"),
    _i64("charge_uC", "microcoulomb since the run's start"),
    _i64("energy_uJ", "microjoule since the run's start"),
    _u16("log_entries", "entries in the run log"),
    _u32("spacing_ms", "time between entries"),
)
MARK_FETCHED = Struct(_u32("run", "the run that was fetched"))

PROGRAM_STEP = Struct(
    _u32("duration_ms"),
    _i32("value", "uA, uW, mohm or uV, after the mode in force"),
    _u8("shape", "Shape"),
    _u8("trigger", "1: the trigger output is high during this step"),
)
LOAD_PROGRAM = Struct(
    _u8("first", "number of the first step here"),
    _u8("total", "steps of the whole program; 0: none, forget the one before"),
    _u16("repeats", "how often it runs through; 0: until the run ends"),
    _field(Tail(PROGRAM_STEP, MAX_STEPS), "steps", f"up to {MAX_STEPS} ProgramStep"),
)

ARM_BURST = Struct(
    _u16("before", "readings to keep from before the trigger"),
    _u8("trigger", "BurstTrigger"),
)
GET_BURST = Struct(_u16("first", "the first reading wanted"))
BURST_READING = Struct(
    _u8("kind", "ReadingKind"),
    _i32("value", "uV, uA or mC, after the kind; 0: missed"),
)
BURST_READINGS = Struct(
    _u16("first", "number of the first reading here"),
    _u16("total", "readings captured; 0: not yet triggered, or not yet complete"),
    _u16("before", "how many of them are from before the trigger"),
    _u64("started_us", "when the first reading's conversion began, by the board's clock"),
    _u32("step_us", "time between readings: one a control step"),
    _field(Tail(BURST_READING, MAX_READINGS), "readings", f"up to {MAX_READINGS} BurstReading"),
)

RESTART = Struct(_u8("maintenance", "1: start without watchdog and stay off, so that files can be written"))

STATUS = Struct(
    _u64("time_us", "the board's clock"),
    _u8("state", "State"),
    _u8("mode", "Mode"),
    _u8("limiting", "Limiting"),
    _u8("fault", "Fault"),
    _i32("setpoint", "uA, uW, mohm or uV, after the mode"),
    _i32("voltage_uV"),
    _i32("current_uA"),
    _i32("force_uV", "voltage at the load's own terminals"),
    _i32("heatsink_mC"),
    _i32("junction_mC", "estimated through the thermal chain"),
    _i32("zero_uA", "what the current read with the gate clamped"),
    _u16("zero_samples", "readings behind the zero"),
    _u16("controller", "session in control; 0: none"),
    _u16("overruns", "control steps that came late"),
    _u32("dropped", "pushes not sent for want of room"),
    _u32("discarded", "damaged frames received"),
    _u16("log_entries", "entries in the run log"),
)

SET_TELEMETRY = Struct(_u16("every_steps", "control steps between two pushes; 0: none"))

FAULT_REPORT = Struct(
    _u8("fault", "Fault"),
    _u8("standing", "1: the cause is still there"),
    _i32("value", "what was read, in the fault's unit"),
    _i32("limit", "what it had to keep to, in the fault's unit"),
    _u64("time_us", "when it tripped, by the board's clock"),
)

GET_LOG = Struct(_u16("first", "the first entry wanted"))
LOG_ENTRY = Struct(
    _u32("time_ms", "since the run's start"),
    _i32("voltage_uV", "mean over the spacing"),
    _i32("voltage_min_uV"),
    _i32("voltage_max_uV"),
    _i32("current_uA", "mean over the spacing"),
    _i16("heatsink_cC", "in hundredths of a degree Celsius"),
    _u32("charge_mC", "millicoulomb since the run's start"),
)
LOG_ENTRIES = Struct(
    _u16("first", "number of the first entry here"),
    _u16("total", "entries in the log"),
    _u32("spacing_ms", "time between entries"),
    _field(Tail(LOG_ENTRY, MAX_ENTRIES), "entries", f"up to {MAX_ENTRIES} LogEntry"),
)

DONE = Struct(_u8("request", "id of the request that was carried out"))
REFUSED = Struct(
    _u8("request", "id of the request that was not carried out"),
    _u8("refusal", "Refusal"),
    _u8("field", "LimitField; 0 where no limit is concerned"),
    _i32("detail", "the largest value that fits, or what the Refusal says"),
)

TELEMETRY = Struct(
    _u32("number", "counts every push that fell due, sent or dropped"),
    _u64("time_us", "the board's clock"),
    _u8("state", "State"),
    _u8("mode", "Mode"),
    _u8("limiting", "Limiting"),
    _u8("fault", "Fault"),
    _i32("setpoint", "uA, uW, mohm or uV, after the mode"),
    _i32("voltage_uV", "mean since the last push"),
    _i32("voltage_min_uV"),
    _i32("voltage_max_uV"),
    _i32("current_uA", "mean since the last push"),
    _i32("current_min_uA"),
    _i32("current_max_uA"),
    _i32("force_uV", "voltage at the load's own terminals"),
    _i32("heatsink_mC"),
    _i32("junction_mC", "estimated through the thermal chain"),
    _i64("charge_uC", "microcoulomb since the load was turned on"),
    _i64("energy_uJ", "microjoule since the load was turned on"),
    _u16("pairs", "voltage-current pairs behind the means"),
    _u16("overruns", "control steps that came late"),
    _u32("dropped", "pushes not sent for want of room"),
)
LOG_LINE = Struct(
    _u8("level", "10 detail, 20 information, 30 warning, 40 error"),
    _field(GreedyBytes, "text", "UTF-8, at most 100 bytes"),
)
EVENT = Struct(
    _u32("number", "counts every event, sent or dropped"),
    _u64("time_us", "the board's clock"),
    _u8("kind", "EventKind"),
    _u8("code", "as the EventKind says"),
    _i32("value", "as the EventKind says"),
    _i32("limit", "as the EventKind says"),
)
