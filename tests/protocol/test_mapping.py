"""Three ways to take a payload apart must agree: construct interpreted, construct compiled, and struct."""

from __future__ import annotations

import struct

import pytest
from construct import Bytes, FormatField, Int8ul, Struct
from hypothesis import given
from hypothesis import strategies as st

from sinkwright_wire.layouts import HEADER, LOG_ENTRY
from sinkwright_wire.mapping import Laid, bare, is_tail, laid_out, struct_format
from sinkwright_wire.messages import MESSAGES
from tests.support.messages import any_message

LAYOUTS = {f"{message.__name__}": message.LAYOUT for message in MESSAGES.values()}
LAYOUTS |= {"Header": HEADER, "LogEntry": LOG_ENTRY}
FIXED = {
    name: layout
    for name, layout in LAYOUTS.items()
    if layout.subcons and not any(is_tail(bare(field)) for field in layout.subcons)
}
COMPILED = {name: layout.compile() for name, layout in LAYOUTS.items()}


def values(layout, container):
    return [container[field.name] for field in layout.subcons]


@pytest.mark.parametrize("name", sorted(FIXED))
@given(data=st.data())
def test_interpreted_compiled_and_struct_read_the_same(name, data):
    layout = FIXED[name]
    payload = data.draw(st.binary(min_size=layout.sizeof(), max_size=layout.sizeof()))

    interpreted = values(layout, layout.parse(payload))

    assert values(layout, COMPILED[name].parse(payload)) == interpreted
    assert list(struct.unpack(struct_format(layout), payload)) == interpreted


@given(any_message())
def test_interpreted_compiled_and_the_message_itself_build_the_same(message):
    fields = message.CODEC.to_fields(message)
    name = type(message).__name__

    assert COMPILED[name].build(fields) == message.LAYOUT.build(fields) == message.CODEC.build(message)


@pytest.mark.parametrize("name", sorted(LAYOUTS))
def test_layouts_are_little_endian(name):
    numbers = [bare(field) for field in LAYOUTS[name].subcons if isinstance(bare(field), FormatField)]

    assert all(number.fmtstr[0] in "<=" or number.sizeof() == 1 for number in numbers)


def test_a_dataclass_that_differs_from_its_layout_is_refused_when_it_is_declared():
    with pytest.raises(TypeError, match="is laid out as"):

        @laid_out(Struct("one" / Int8ul, "other" / Int8ul))
        class _Wrong(Laid):
            other: int
            one: int


def test_a_field_without_a_rule_is_refused_when_it_is_declared():
    with pytest.raises(TypeError, match="no rule"):

        @laid_out(Struct("number" / Bytes(4)))
        class _Wrong(Laid):
            number: float
