"""The words of the wire: every enumeration, and for each member the sentence a person reads.

This is the only place where codes get their words; firmware/wire.py takes the codes from here. It knows
nothing of layouts or framing.
"""

from __future__ import annotations

from enum import IntEnum


class Word(IntEnum):
    """A code with the sentence that explains it."""

    sentence: str

    def __new__(cls, value: int, sentence: str) -> Word:
        word = int.__new__(cls, value)
        word._value_ = value
        word.sentence = sentence
        return word


class State(Word):
    """What the load is doing."""

    OFF = 0, "The gate is clamped."
    SINKING = 1, "The load draws current as its mode demands."
    ENDED = 2, "A run reached its end; the gate is clamped."
    FAULT = 3, "A protection tripped; the gate is clamped until the fault is cleared."


class Mode(Word):
    """What is held constant; the unit of a set-point follows from it."""

    NONE = 0, "No set-point was given yet."
    CURRENT = 1, "Constant current; set-point in uA."
    POWER = 2, "Constant power; set-point in uW."
    RESISTANCE = 3, "Constant resistance; set-point in mohm."
    VOLTAGE = 4, "Constant voltage; set-point in uV."


class Limiting(Word):
    """Why the current is not what the set-point asks for."""

    NONE = 0, "The set-point is met."
    SOURCE = 1, "The source limits: it gives less current than the load demands."
    RAMPING = 2, "The current is on its way to the set-point, as fast as the slew limit lets it."
    DERATED = 3, "The board is hot and draws less than was asked, so as not to trip."
    NO_SOURCE = 4, "No source is there: voltage and current are both missing."
    SATURATED = (
        5,
        "The set-point takes more current or power than the limits allow: the load draws the most of it.",
    )
    UNREACHABLE = 6, "The set power is more than the source can give: P > Voc^2 / (4 Rs)."
    UNRESOLVED = 7, "The set-point is finer than the board can resolve with this source."
    UNSETTLED = 8, "The set-point cannot be held steadily, as a voltage against a hard current limit."


class Fault(IntEnum):
    """A protection that tripped. `unit` is that of its value and limit, "" for a bare number."""

    unit: str
    sentence: str

    def __new__(cls, value: int, unit: str, sentence: str) -> Fault:
        fault = int.__new__(cls, value)
        fault._value_ = value
        fault.unit = unit
        fault.sentence = sentence
        return fault

    NONE = 0, "", "No protection has tripped."
    HEATSINK_HOT = 1, "mC", "The heatsink became hotter than its limit: let it cool, check fan and mounting."
    JUNCTION_HOT = (
        2,
        "mC",
        "The transistor's junction was estimated hotter than its limit: ask for less power.",
    )
    OVER_CURRENT = 3, "uA", "The current was above its limit."
    OVER_VOLTAGE = 4, "uV", "The source's voltage was above the limit: disconnect it."
    OVER_POWER = 5, "uW", "The power was above its limit."
    CURRENT_ALTHOUGH_OFF = 6, "uA", "Current flows although the load is off: pull the source lead now."
    HOST_SILENT = 7, "ms", "The host was not heard for longer than the silence limit: the board turned off."
    ADC_SILENT = 8, "", "The ADC does not answer on its bus (the value is the bus error number)."
    DAC_SILENT = 9, "", "The DAC does not answer on its bus (the value is the bus error number)."
    ADC_NOT_CONVERTING = 10, "", "The ADC does not convert (the value is its configuration register)."
    THERMISTOR_OPEN = 11, "counts", "The heatsink's thermistor reads as open: check its wires."
    THERMISTOR_SHORT = 12, "counts", "The heatsink's thermistor reads as a short: check its wires."
    CURRENT_ABOVE_DEMAND = 13, "uA", "More current flowed than was asked for: the sink does not control it."
    REVERSED_SOURCE = 14, "uV", "The source is connected the wrong way round: disconnect it."
    LOOP_LATE = 15, "us", "A control step came so late that the protections could not be relied on."
    EXCEPTION = 16, "", "The firmware met an error of its own and turned the load off."
    SELF_TEST = 17, "", "The board did not pass its own test at start (the value is a SelfTest)."
    SENSE_LEAD = (
        18,
        "uV",
        "The sense leads do not show what the force leads carry: one is open, loose or swapped.",
    )
    THERMISTOR_LOOSE = 19, "mC", "The thermistor does not warm as the power demands: it has come off."
    COOLING_WEAK = (
        20,
        "mC",
        "The heatsink warms more than its cooling should let it: check the fan and the air.",
    )
    SUPPLY_LOW = 21, "mV", "The board's own supply sank too low for its readings to be relied on."
    CONVERTER_STUCK = (
        22,
        "",
        "A converter answers but does not do what it is told (the value is its register).",
    )
    CURRENT_MISSING = (
        23,
        "uA",
        "Less current was read than was asked for although the source's voltage stands: sense resistor, gate drive or "
        "DAC has failed, and more may have flowed than was shown.",
    )


class Refusal(Word):
    """Why a request was not carried out. Nothing has changed on the board when one of these comes back."""

    UNKNOWN_COMMAND = 1, "The board's firmware does not know this request."
    BAD_LENGTH = 2, "The request is not as long as its kind must be."
    BAD_VALUE = 3, "The request carries a value that makes no sense."
    BEYOND_LIMIT = 4, "The value is beyond a limit in force."
    BEYOND_BOARD = 5, "The limit is beyond what the board stands."
    NOT_OFFERED = 6, "This board's firmware does not offer that yet."
    FAULT_LATCHED = 7, "A fault is latched: clear it first."
    CAUSE_STANDS = 8, "The cause of the fault still stands, so it cannot be cleared."
    NOT_IN_CONTROL = 9, "Another host controls this board."
    OUT_OF_SEQUENCE = 10, "The request does not follow the last one that the board heard."
    LOAD_IS_ON = 11, "This cannot be changed while the load is on."
    NO_SETPOINT = 12, "No set-point was given yet."
    ZERO_NOT_READY = 13, "The current's zero is still being measured; the detail is the time left in ms."
    ZERO_OUT_OF_BUDGET = 14, "With the load off the current reads further from zero than the parts allow."
    NO_SESSION = 15, "The board knows nothing of this session: it must begin with a hello."
    WRONG_VERSION = 16, "The board speaks another version of the wire."
    ENDS_MISSING = (
        17,
        "A run that may go on without a host needs a voltage end and a charge or duration end.",
    )
    RUN_NOT_FETCHED = (
        18,
        "A run that went on without its host has not been fetched yet; the detail is its state.",
    )
    PROGRAM_BAD = 19, "The program cannot be followed; the detail is the number of the step."
    BOARD_IMAGE = 20, "The board did not pass its own test at start; the detail is a SelfTest."
    TOO_LONG = 21, "That is more than the board has room for; the detail is what fits."


class LimitField(Word):
    """Which limit a refusal is about, in the order of the Limits message."""

    NONE = 0, "no limit"
    CURRENT = 1, "current_uA"
    VOLTAGE = 2, "voltage_uV"
    POWER = 3, "power_uW"
    HEATSINK = 4, "heatsink_mC"
    JUNCTION = 5, "junction_mC"
    SLEW = 6, "slew_uA_per_ms"
    SILENCE = 7, "silence_ms"


class LimitSet(Word):
    """Which limits are asked for."""

    IN_FORCE = 0, "The limits in force now."
    BOARD = 1, "What the board itself stands: no limit in force can go beyond."


class Silence(Word):
    """What the board does when the host falls silent."""

    STOP = 0, "Turn off and latch HOST_SILENT."
    CONTINUE = 1, "Go on to the run's own end."


class RunEnd(Word):
    """What ended a run."""

    NONE = 0, "It has not ended, or there was none."
    VOLTAGE = 1, "The source's voltage came down to the end voltage."
    CHARGE = 2, "The charge asked for has flowed."
    ENERGY = 3, "The energy asked for was taken."
    DURATION = 4, "The time asked for is over."
    TEMPERATURE = 5, "The end temperature was reached."
    DISABLED = 6, "It was turned off."
    FAULT = 7, "A protection tripped."
    PROGRAM = 8, "The program has run through."


class Shape(Word):
    """How a step of a program comes to its value."""

    STEP = 0, "At once, as fast as the slew limit lets it."
    RAMP = 1, "Evenly over the step, from where the step before ended."


class BurstTrigger(Word):
    """What a burst waits for."""

    NOW = 0, "Nothing: it begins at once."
    SETPOINT_CHANGE = 1, "The next change of the set-point."
    FAULT = 2, "The next fault."


class ReadingKind(Word):
    """What one reading of a burst is of."""

    VOLTAGE = 0, "The source's voltage, in uV."
    CURRENT = 1, "The current, in uA."
    HEATSINK = 2, "The heatsink's temperature, in mC."
    FORCE = 3, "The voltage at the load's own terminals, in uV."
    MISSED = 4, "Nothing: no conversion was ready at that control step."


class SelfTest(Word):
    """What the board's own test at start found."""

    PASSED = 0, "Nothing wrong."
    IMAGE = 1, "The board file on the board is missing, damaged or incomplete."
    STORE = 2, "The store holds nothing valid although it has been written."
    ADC = 3, "The ADC does not answer or does not convert."
    DAC = 4, "The DAC does not answer, or its power-up value is not zero."
    CALIBRATION = 5, "The stored calibration is outside the tolerances of the parts."


class ResetCause(Word):
    """Why the board last started."""

    POWER_ON = 1, "The board was powered up."
    WATCHDOG = 2, "The watchdog restarted the board: its firmware had stopped."
    SOFT = 3, "The board was restarted on request."
    EXCEPTION = 4, "The firmware met an error of its own and restarted."


class EventKind(Word):
    """What an Event tells; `code`, `value` and `limit` of the Event follow from it."""

    BOOT = 1, "The board started; code is a ResetCause."
    ENABLED = 2, "The load was turned on; code is a Mode, value the set-point."
    DISABLED = 3, "The load was turned off."
    FAULT = 4, "A protection tripped; code is a Fault, value and limit in its unit."
    CLEARED = 5, "A fault was cleared; code is the Fault."
    SOURCE_LIMITS = 6, "The source limits; code is a Limiting, value the current, limit the demand (uA)."
    SOURCE_RETURNED = 7, "The source meets the demand again; value is the current, limit the demand (uA)."
    LOG = 8, "The run log was thinned out to make room; value is its new spacing in ms."
    ENDED = 9, "The board ended the run by itself; code is a RunEnd."
    BUTTON = 10, "The OFF button was pressed."
    RESTART = 11, "The board is about to restart on request."


VOCABULARY: tuple[type[IntEnum], ...] = (
    State,
    Mode,
    Limiting,
    Fault,
    Refusal,
    LimitField,
    LimitSet,
    Silence,
    RunEnd,
    Shape,
    BurstTrigger,
    ReadingKind,
    SelfTest,
    ResetCause,
    EventKind,
)
