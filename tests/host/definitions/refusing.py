"""How tests ask for the message that a person would read."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from sinkwright.errors import FileError


def refusal(parse: Callable[[str], object], text: str) -> FileError:
    """The error that `text` ends in; it must be one paragraph that says the load was left alone."""
    with pytest.raises(FileError) as raised:
        parse(text)
    message = str(raised.value)
    assert "\n" not in message
    assert "No load was touched." in message
    assert raised.value.remedy
    assert raised.value.exit_code == 2
    return raised.value
