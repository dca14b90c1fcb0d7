"""What is said of a load whose board cannot be reached any more."""

from __future__ import annotations

import pytest

from sinkwright.last_known import LastKnown
from sinkwright_wire.messages import Disable, Done, Enable, Event
from sinkwright_wire.vocabulary import EventKind, RunEnd, Silence


def after(*requests: object) -> LastKnown:
    known = LastKnown()
    for request in requests:
        known.note_request(request)
        known.note_reply(request, Done(6), 10.0)
    return known


def test_a_load_that_is_to_stop_alone_is_said_to_turn_itself_off() -> None:
    words = after(Enable()).sentence(11.0, 3.0)
    assert "1.0 s ago" in words
    assert "the board turns it off by itself 3 s after the last command" in words


@pytest.mark.parametrize("answered", [True, False])
def test_a_load_that_is_to_go_on_alone_is_said_to_do_so(answered: bool) -> None:
    known = LastKnown()
    request = Enable(Silence.CONTINUE, 7)
    known.note_request(request)
    if answered:
        known.note_reply(request, Done(6), 10.0)
    words = known.sentence(11.0, 3.0)
    assert "the board goes on to the ends of the run" in words
    assert "sinkwright resume" in words


def test_a_later_run_goes_by_its_own_policy() -> None:
    words = after(Enable(Silence.CONTINUE, 7), Disable(), Enable()).sentence(11.0, 3.0)
    assert "turns it off by itself" in words


def test_a_run_that_the_board_ended_is_known_to_be_off() -> None:
    known = after(Enable(Silence.CONTINUE, 7))
    known.note_push(Event(1, 5, EventKind.ENDED, int(RunEnd.VOLTAGE)), 20.0)
    assert known.sentence(21.0, 3.0).startswith("The load was off when it was last heard, 1.0 s ago")
