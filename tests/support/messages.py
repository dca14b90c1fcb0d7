"""Hypothesis strategies for any message that the wire can carry."""

from __future__ import annotations

from enum import IntEnum
from typing import Any, get_type_hints

from construct import Construct, FormatField, GreedyBytes
from hypothesis import strategies as st

from sinkwright_wire.layouts import MAX_TEXT, Tail
from sinkwright_wire.mapping import Laid, bare, number_range
from sinkwright_wire.messages import MESSAGES, Message

_SIGNS = st.characters(exclude_characters="\0", exclude_categories=["Cs"])


def _text(size: int) -> st.SearchStrategy[str]:
    return st.text(_SIGNS, max_size=size).filter(lambda text: len(text.encode()) <= size)


def _field(field: Construct, hint: Any) -> st.SearchStrategy[Any]:
    if hint is str:
        return _text(MAX_TEXT if field is GreedyBytes else field.sizeof())
    if hint is bytes:
        return st.binary(min_size=field.sizeof(), max_size=field.sizeof())
    if hint is bool:
        return st.booleans()
    if isinstance(hint, type) and issubclass(hint, IntEnum):
        return st.sampled_from(list(hint))
    if isinstance(field, FormatField):
        return st.integers(*number_range(field))
    assert isinstance(field, Tail)
    return st.lists(laid(hint.__args__[0]), max_size=field.most).map(tuple)


def laid(cls: type[Laid]) -> st.SearchStrategy[Any]:
    """Any instance of one dataclass."""
    hints = get_type_hints(cls)
    return st.builds(
        cls, **{field.name: _field(bare(field), hints[field.name]) for field in cls.LAYOUT.subcons}
    )


def any_message() -> st.SearchStrategy[Message]:
    """Any message at all."""
    return st.sampled_from(list(MESSAGES.values())).flatmap(laid)


NUMBERS_16 = st.integers(0, 0xFFFF)
