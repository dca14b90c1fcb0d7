"""Errors that a person may see: one paragraph of what, where, state of the load, and what to do."""

from __future__ import annotations

import pytest

from sinkwright import errors
from sinkwright.errors import (
    LOAD_UNTOUCHED,
    BoardRefused,
    FileError,
    Interrupted,
    ProtectionTripped,
    SinkwrightError,
)

KINDS = [
    kind
    for kind in vars(errors).values()
    if isinstance(kind, type) and issubclass(kind, SinkwrightError) and kind is not SinkwrightError
]


def test_the_paragraph_says_where_what_load_and_remedy_in_this_order() -> None:
    error = FileError("min is above max", where="plan.toml, test[1].accept", remedy="Swap them")
    assert str(error) == ("plan.toml, test[1].accept: min is above max. No load was touched. Swap them.")


def test_without_a_place_or_a_remedy_the_paragraph_is_shorter() -> None:
    assert str(SinkwrightError("It broke!", load="The load is off.")) == "It broke! The load is off."


def test_sentences_that_end_already_get_no_second_full_stop() -> None:
    assert str(SinkwrightError("What now?", load="", remedy="Wait.")) == "What now? Wait."


def test_the_json_form_has_the_same_four_facts() -> None:
    error = FileError("bad", where="here", remedy="mend it")
    assert error.to_json() == {
        "error": "bad",
        "where": "here",
        "load": LOAD_UNTOUCHED,
        "remedy": "mend it",
    }


@pytest.mark.parametrize("kind", KINDS)
def test_every_kind_is_caught_by_the_root(kind: type[SinkwrightError]) -> None:
    assert issubclass(kind, SinkwrightError)
    assert kind.__doc__


def test_exit_codes_tell_what_kind_of_end_it_was() -> None:
    """Source: the exit codes in the command line's own help."""
    assert FileError("x").exit_code == 2
    assert ProtectionTripped("x", fault="over-current").exit_code == 3
    assert Interrupted("x").exit_code == 130


def test_a_refusal_and_a_fault_keep_their_codes() -> None:
    refused = BoardRefused("no", refusal=4, detail=2_000_000, field=1, remedy="Ask for less.")
    assert (refused.refusal, refused.detail, refused.field) == (4, 2_000_000, 1)
    assert ProtectionTripped("x", fault="over-current", load="The load is off.").fault == "over-current"
