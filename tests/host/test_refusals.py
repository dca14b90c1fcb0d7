"""Refusals and faults whose number means something by itself: told in words, with the way out."""

from __future__ import annotations

import pytest

from sinkwright.refusals import fault_in_words, refused
from sinkwright_wire.messages import Enable, Refused, SetPoint
from sinkwright_wire.vocabulary import Fault, Mode, Refusal, SelfTest


@pytest.mark.parametrize("code", [code for code in SelfTest if code])
def test_a_board_that_failed_its_self_test_says_what_it_found(code: SelfTest) -> None:
    error = refused(
        Enable(), Refused(Enable.ID, Refusal.BOARD_IMAGE, detail=int(code)), "bench-1", "It is off."
    )
    text = str(error)
    assert "did not pass its own test at start" in text
    assert code.sentence.rstrip(".") in text
    assert "restart the board" in text
    assert code.sentence in fault_in_words(Fault.SELF_TEST, int(code), 0)


def test_a_code_that_this_program_does_not_know_is_given_as_it_is() -> None:
    assert "the code 99" in fault_in_words(Fault.SELF_TEST, 99, 0)


def test_a_maintenance_boot_is_told_apart_from_a_command_that_the_firmware_lacks() -> None:
    reply = Refused(Enable.ID, Refusal.NOT_OFFERED)
    text = str(refused(Enable(), reply, "bench-1", "It is off."))
    assert "started for maintenance" in text
    assert "Restart the board" in text
    other = str(refused(SetPoint(Mode.POWER, 1), Refused(SetPoint.ID, Refusal.NOT_OFFERED), "bench-1", ""))
    assert "does not offer that yet" in other
