"""The numbers of the wire: ids, `struct` formats and codes of every message.

Generated from protocol/sinkwright_wire by `python -m sinkwright_wire.generate`: never edit it here. The
names above a format are its fields in their order; their meaning stands in protocol/REFERENCE.md.
"""

from micropython import const

VERSION = const(1)
MAX_PAYLOAD = const(112)
MAX_TEXT = const(100)
MAX_ENTRIES = const(4)
MAX_STEPS = const(10)
MAX_READINGS = const(16)
NEVER_HEARD = const(0xFFFFFFFF)

# version, id, session, sequence, length
HEADER_FORMAT = "<BBHHB"
HEADER_SIZE = const(7)

HELLO = const(0x01)
# wire_version, watch
HELLO_FORMAT = "<BB"

IDENTIFY = const(0x02)
IDENTIFY_FORMAT = "<"

GET_LIMITS = const(0x03)
# which
GET_LIMITS_FORMAT = "<B"

SET_LIMITS = const(0x04)
# current_uA, voltage_uV, power_uW, heatsink_mC, junction_mC, slew_uA_per_ms, silence_ms
SET_LIMITS_FORMAT = "<iiiiiiI"

SET_POINT = const(0x05)
# mode, value
SET_POINT_FORMAT = "<Bi"

ENABLE = const(0x06)
# when_silent, run, program
ENABLE_FORMAT = "<BIB"

DISABLE = const(0x07)
DISABLE_FORMAT = "<"

GET_STATUS = const(0x08)
GET_STATUS_FORMAT = "<"

CLEAR_FAULT = const(0x09)
CLEAR_FAULT_FORMAT = "<"

SET_TELEMETRY = const(0x0A)
# every_steps
SET_TELEMETRY_FORMAT = "<H"

GET_FAULT = const(0x0C)
GET_FAULT_FORMAT = "<"

GET_LOG = const(0x0D)
# first
GET_LOG_FORMAT = "<H"

BEAT = const(0x0E)
BEAT_FORMAT = "<"

SET_ENDS = const(0x0F)
# voltage_uV, charge_mC, energy_mJ, duration_ms, temperature_mC
SET_ENDS_FORMAT = "<iIIIi"

GET_RUN = const(0x10)
GET_RUN_FORMAT = "<"

MARK_FETCHED = const(0x11)
# run
MARK_FETCHED_FORMAT = "<I"

LOAD_PROGRAM = const(0x12)
# first, total, repeats, steps
LOAD_PROGRAM_FORMAT = "<BBH"

ARM_BURST = const(0x13)
# before, trigger
ARM_BURST_FORMAT = "<HB"

GET_BURST = const(0x14)
# first
GET_BURST_FORMAT = "<H"

RESTART = const(0x15)
# maintenance
RESTART_FORMAT = "<B"

TELEMETRY = const(0x40)
# number, time_us, state, mode, limiting, fault, setpoint, voltage_uV, voltage_min_uV,
# voltage_max_uV, current_uA, current_min_uA, current_max_uA, force_uV, heatsink_mC, junction_mC,
# charge_uC, energy_uJ, pairs, overruns, dropped
TELEMETRY_FORMAT = "<IQBBBBiiiiiiiiiiqqHHI"

LOG_LINE = const(0x41)
# level, text
LOG_LINE_FORMAT = "<B"

EVENT = const(0x42)
# number, time_us, kind, code, value, limit
EVENT_FORMAT = "<IQBBii"

HELLO_REPLY = const(0x81)
# wire_version, simulated, firmware_major, firmware_minor, firmware_patch, boot_number, board_id,
# name, in_control, other_heard_ms
HELLO_REPLY_FORMAT = "<BBBBBI8s16sBI"

IDENTITY = const(0x82)
# control_period_us, board_file_crc, calibration_number, reset_cause, log_capacity, interpreter
IDENTITY_FORMAT = "<IIIBH32s"

LIMITS = const(0x83)
# current_uA, voltage_uV, power_uW, heatsink_mC, junction_mC, slew_uA_per_ms, silence_ms
LIMITS_FORMAT = "<iiiiiiI"

STATUS = const(0x88)
# time_us, state, mode, limiting, fault, setpoint, voltage_uV, current_uA, force_uV, heatsink_mC,
# junction_mC, zero_uA, zero_samples, controller, overruns, dropped, discarded, log_entries
STATUS_FORMAT = "<QBBBBiiiiiiiHHHIIH"

FAULT_REPORT = const(0x8C)
# fault, standing, value, limit, time_us
FAULT_REPORT_FORMAT = "<BBiiQ"

LOG_ENTRIES = const(0x8D)
# first, total, spacing_ms, entries
LOG_ENTRIES_FORMAT = "<HHI"

RUN = const(0x90)
# run, state, ended_by, fetched, when_silent, started_us, ended_us, charge_uC, energy_uJ,
# log_entries, spacing_ms
RUN_FORMAT = "<IBBBBQQqqHI"

BURST_READINGS = const(0x94)
# first, total, before, started_us, step_us, readings
BURST_READINGS_FORMAT = "<HHHQI"

DONE = const(0xC0)
# request
DONE_FORMAT = "<B"

REFUSED = const(0xC1)
# request, refusal, field, detail
REFUSED_FORMAT = "<BBBi"

# time_ms, voltage_uV, voltage_min_uV, voltage_max_uV, current_uA, heatsink_cC, charge_mC
LOG_ENTRY_FORMAT = "<IiiiihI"

# duration_ms, value, shape, trigger
PROGRAM_STEP_FORMAT = "<IiBB"

# kind, value
BURST_READING_FORMAT = "<Bi"

STATE_OFF = const(0)
STATE_SINKING = const(1)
STATE_ENDED = const(2)
STATE_FAULT = const(3)

MODE_NONE = const(0)
MODE_CURRENT = const(1)
MODE_POWER = const(2)
MODE_RESISTANCE = const(3)
MODE_VOLTAGE = const(4)

LIMITING_NONE = const(0)
LIMITING_SOURCE = const(1)
LIMITING_RAMPING = const(2)
LIMITING_DERATED = const(3)
LIMITING_NO_SOURCE = const(4)
LIMITING_SATURATED = const(5)
LIMITING_UNREACHABLE = const(6)
LIMITING_UNRESOLVED = const(7)
LIMITING_UNSETTLED = const(8)

FAULT_NONE = const(0)
FAULT_HEATSINK_HOT = const(1)
FAULT_JUNCTION_HOT = const(2)
FAULT_OVER_CURRENT = const(3)
FAULT_OVER_VOLTAGE = const(4)
FAULT_OVER_POWER = const(5)
FAULT_CURRENT_ALTHOUGH_OFF = const(6)
FAULT_HOST_SILENT = const(7)
FAULT_ADC_SILENT = const(8)
FAULT_DAC_SILENT = const(9)
FAULT_ADC_NOT_CONVERTING = const(10)
FAULT_THERMISTOR_OPEN = const(11)
FAULT_THERMISTOR_SHORT = const(12)
FAULT_CURRENT_ABOVE_DEMAND = const(13)
FAULT_REVERSED_SOURCE = const(14)
FAULT_LOOP_LATE = const(15)
FAULT_EXCEPTION = const(16)
FAULT_SELF_TEST = const(17)
FAULT_SENSE_LEAD = const(18)
FAULT_THERMISTOR_LOOSE = const(19)
FAULT_COOLING_WEAK = const(20)
FAULT_SUPPLY_LOW = const(21)
FAULT_CONVERTER_STUCK = const(22)
FAULT_CURRENT_MISSING = const(23)

REFUSAL_UNKNOWN_COMMAND = const(1)
REFUSAL_BAD_LENGTH = const(2)
REFUSAL_BAD_VALUE = const(3)
REFUSAL_BEYOND_LIMIT = const(4)
REFUSAL_BEYOND_BOARD = const(5)
REFUSAL_NOT_OFFERED = const(6)
REFUSAL_FAULT_LATCHED = const(7)
REFUSAL_CAUSE_STANDS = const(8)
REFUSAL_NOT_IN_CONTROL = const(9)
REFUSAL_OUT_OF_SEQUENCE = const(10)
REFUSAL_LOAD_IS_ON = const(11)
REFUSAL_NO_SETPOINT = const(12)
REFUSAL_ZERO_NOT_READY = const(13)
REFUSAL_ZERO_OUT_OF_BUDGET = const(14)
REFUSAL_NO_SESSION = const(15)
REFUSAL_WRONG_VERSION = const(16)
REFUSAL_ENDS_MISSING = const(17)
REFUSAL_RUN_NOT_FETCHED = const(18)
REFUSAL_PROGRAM_BAD = const(19)
REFUSAL_BOARD_IMAGE = const(20)
REFUSAL_TOO_LONG = const(21)

LIMIT_FIELD_NONE = const(0)
LIMIT_FIELD_CURRENT = const(1)
LIMIT_FIELD_VOLTAGE = const(2)
LIMIT_FIELD_POWER = const(3)
LIMIT_FIELD_HEATSINK = const(4)
LIMIT_FIELD_JUNCTION = const(5)
LIMIT_FIELD_SLEW = const(6)
LIMIT_FIELD_SILENCE = const(7)

LIMIT_SET_IN_FORCE = const(0)
LIMIT_SET_BOARD = const(1)

SILENCE_STOP = const(0)
SILENCE_CONTINUE = const(1)

RUN_END_NONE = const(0)
RUN_END_VOLTAGE = const(1)
RUN_END_CHARGE = const(2)
RUN_END_ENERGY = const(3)
RUN_END_DURATION = const(4)
RUN_END_TEMPERATURE = const(5)
RUN_END_DISABLED = const(6)
RUN_END_FAULT = const(7)
RUN_END_PROGRAM = const(8)

SHAPE_STEP = const(0)
SHAPE_RAMP = const(1)

BURST_TRIGGER_NOW = const(0)
BURST_TRIGGER_SETPOINT_CHANGE = const(1)
BURST_TRIGGER_FAULT = const(2)

READING_KIND_VOLTAGE = const(0)
READING_KIND_CURRENT = const(1)
READING_KIND_HEATSINK = const(2)
READING_KIND_FORCE = const(3)
READING_KIND_MISSED = const(4)

SELF_TEST_PASSED = const(0)
SELF_TEST_IMAGE = const(1)
SELF_TEST_STORE = const(2)
SELF_TEST_ADC = const(3)
SELF_TEST_DAC = const(4)
SELF_TEST_CALIBRATION = const(5)

RESET_POWER_ON = const(1)
RESET_WATCHDOG = const(2)
RESET_SOFT = const(3)
RESET_EXCEPTION = const(4)

EVENT_BOOT = const(1)
EVENT_ENABLED = const(2)
EVENT_DISABLED = const(3)
EVENT_FAULT = const(4)
EVENT_CLEARED = const(5)
EVENT_SOURCE_LIMITS = const(6)
EVENT_SOURCE_RETURNED = const(7)
EVENT_LOG = const(8)
EVENT_ENDED = const(9)
EVENT_BUTTON = const(10)
EVENT_RESTART = const(11)
