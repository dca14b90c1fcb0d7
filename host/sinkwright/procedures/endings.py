"""Why a test ended before it was through, and the names that `stopped_by` then carries.

A fault's name in results is its name on the wire in lower case with dashes ("heatsink-hot"), so that a
script can compare it with the table of faults. This file knows no device: it only turns causes into words.
"""

from __future__ import annotations

from enum import IntEnum

from sinkwright.results import END_KEYS
from sinkwright_wire.vocabulary import RunEnd

INTERRUPTED = "interrupted"
DERATED = "derated"
TURNED_OFF = "turned-off"
LINK_LOST = "link-lost"
#: Anything else that kept a test from going on; its words are in the notes.
FAILED = "failed"


#: The ends that a board keeps to by itself, by the key that a plan gives them.
BOARD_ENDS = {
    RunEnd.VOLTAGE: "end_voltage_V",
    RunEnd.CHARGE: "end_charge_Ah",
    RunEnd.ENERGY: "end_energy_Wh",
    RunEnd.DURATION: "duration_s",
    RunEnd.TEMPERATURE: "end_temperature_degC",
}


class Stopped(Exception):
    """The test must end now; `stopped_by` goes into the result, `sentence` tells a person why."""

    def __init__(self, stopped_by: str, sentence: str) -> None:
        super().__init__(sentence)
        self.stopped_by = stopped_by
        self.sentence = sentence


def name_of(fault: IntEnum) -> str:
    """The fault's name in results: HEATSINK_HOT becomes "heatsink-hot"."""
    return fault.name.lower().replace("_", "-")


def is_planned(stopped_by: str | None) -> bool:
    """Whether a test ended as its plan asked, so that the next one may begin."""
    return stopped_by is None or stopped_by in END_KEYS
