"""A refusal of the board as a sentence for a person, with its detail in human units and what to do next.

The sentences themselves stand in sinkwright_wire.messages; this adds the numbers and the way out. It must not
send or wait.
"""

from __future__ import annotations

from sinkwright.errors import BoardRefused
from sinkwright_wire.messages import Enable, Refused, SetLimits
from sinkwright_wire.vocabulary import Fault, LimitField, Refusal, SelfTest


def refused(request: object, reply: Refused, where: str, load: str) -> BoardRefused:
    """The error for `request` that was answered with `reply`."""
    refusal = reply.refusal
    return BoardRefused(
        _in_words(request, refusal, reply),
        refusal=refusal,
        detail=reply.detail,
        field=reply.field,
        where=where,
        load=load,
        remedy=_RESTART if _in_maintenance(request, refusal) else _REMEDIES.get(refusal, ""),
    )


def fault_in_words(fault: Fault, value: int, limit: int) -> str:
    """The fault's sentence with its reading, and with the limit where there is one."""
    if fault == Fault.SELF_TEST:
        return f"{_SELF_TEST_FAILED} {_self_test(value)}"
    if fault.unit in HUMAN_UNITS:
        numbers = f"{in_human_units(value, fault.unit)}, limit {in_human_units(limit, fault.unit)}"
    else:
        numbers = in_human_units(value, fault.unit) if value else ""
    return f"{fault.sentence.rstrip('.')} ({numbers})." if numbers else fault.sentence


def in_human_units(value: int, wire_unit: str) -> str:
    """A raw integer of the wire with the unit a person expects: (4000000, "uA") is "4 A"."""
    parts, unit = HUMAN_UNITS.get(wire_unit, (1, wire_unit))
    return f"{value / parts:.6g} {unit}" if parts != 1 else f"{value} {unit}".strip()


#: Raw units of the wire: how many make one of the unit that is shown.
HUMAN_UNITS: dict[str, tuple[float, str]] = {
    "uA": (1e6, "A"),
    "uV": (1e6, "V"),
    "uW": (1e6, "W"),
    "mC": (1e3, "°C"),
    "mohm": (1e3, "ohm"),
    "ms": (1e3, "s"),
    "us": (1e6, "s"),
    "uA_per_ms": (1e3, "A/s"),
}

_FIELD_UNITS = {
    LimitField.CURRENT: "uA",
    LimitField.VOLTAGE: "uV",
    LimitField.POWER: "uW",
    LimitField.HEATSINK: "mC",
    LimitField.JUNCTION: "mC",
    LimitField.SLEW: "uA_per_ms",
    LimitField.SILENCE: "ms",
}


def _in_words(request: object, refusal: Refusal, reply: Refused) -> str:
    sentence = refusal.sentence.rstrip(".")
    if _in_maintenance(request, refusal):
        return "The board has started for maintenance, without its watchdog, and does not sink"
    if refusal == Refusal.BOARD_IMAGE:
        return f"{_SELF_TEST_FAILED} {_self_test(reply.detail)}".rstrip(".")
    if refusal in (Refusal.BEYOND_LIMIT, Refusal.BEYOND_BOARD):
        bound = in_human_units(reply.detail, _FIELD_UNITS.get(reply.field, ""))
        if refusal == Refusal.BEYOND_LIMIT and isinstance(request, SetLimits):
            return f"The limit would be below the set-point in force, {bound}"
        return f"{sentence}: the largest that fits is {bound}"
    if refusal == Refusal.PROGRAM_BAD:
        return (
            f"The program cannot be followed: step {reply.detail}, counted from 0, is missing, shorter than a "
            "control step, longer than two weeks, or beyond a limit in force"
        )
    if refusal == Refusal.TOO_LONG:
        return f"That is more than the board has room for; what fits is {reply.detail}"
    if refusal == Refusal.ENDS_MISSING and reply.detail == _FOR_A_PROGRAM:
        return "The program repeats without end, and no end of the run is set on the board"
    if refusal in (Refusal.FAULT_LATCHED, Refusal.CAUSE_STANDS):
        return f"{sentence}. {Fault(reply.detail).sentence}"
    if refusal == Refusal.ZERO_NOT_READY:
        return f"The current's zero is still being measured, for {in_human_units(reply.detail, 'ms')} more"
    if refusal == Refusal.ZERO_OUT_OF_BUDGET:
        bound = in_human_units(reply.detail, "uA")
        return f"With the load off the current reads {bound}, further from zero than the parts allow"
    return sentence


def _in_maintenance(request: object, refusal: Refusal) -> bool:
    """Whether this refusal can only mean a maintenance boot: there alone Enable itself is not offered."""
    return refusal == Refusal.NOT_OFFERED and isinstance(request, Enable)


def _self_test(code: int) -> str:
    """What the board's own test found; a newer board may find what this program has no words for."""
    known = SelfTest.__members__.values()
    return SelfTest(code).sentence if code in known else f"It gave the code {code}."


#: Detail of ENDS_MISSING: it is the program that needs an end.
_FOR_A_PROGRAM = 1
_SELF_TEST_FAILED = "The board did not pass its own test at start, and stays off."
_RESTART = "Restart the board, or switch it off and on, when the maintenance is done."
_REMEDIES = {
    Refusal.BOARD_IMAGE: "Remove the cause, then restart the board or switch it off and on.",
    Refusal.BEYOND_LIMIT: "Ask for less, or raise the limit in force.",
    Refusal.BEYOND_BOARD: "Ask for less: the board's own limits stand in its board file.",
    Refusal.FAULT_LATCHED: "Remove the cause, then clear the fault.",
    Refusal.CAUSE_STANDS: "Remove the cause first, then clear the fault again.",
    Refusal.NOT_IN_CONTROL: "Let the other program end, or turn the load off with `sinkwright off`.",
    Refusal.LOAD_IS_ON: "Turn the load off first.",
    Refusal.NO_SETPOINT: "Give a set-point before turning the load on.",
    Refusal.ZERO_OUT_OF_BUDGET: "Check that no current flows, then the current amplifier and its wiring.",
    Refusal.RUN_NOT_FETCHED: "Fetch it with `sinkwright resume`, then turn the load on again.",
    Refusal.NOT_OFFERED: "Choose something that this firmware offers, or bring it up to date.",
}
