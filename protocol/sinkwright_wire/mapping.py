"""How the fields of a dataclass meet those of a construct layout: types, ranges, words and text.

construct passes unknown enumeration values as plain integers and ignores unknown keys when it builds, so
neither is left to it: each field has a rule here that checks a value before it is built and after it was
parsed.

construct builds, and parses what has a tail. A layout of fixed length is parsed by `struct`, with the
format that `struct_format` reads off the layout and that the firmware uses too: a simulated board at full
speed sends thousands of readings a second, and interpreting each field would take several times as long.
Tests hold both ways, and construct's compiled one, to the same result. Nothing here knows which messages
there are.
"""

from __future__ import annotations

import dataclasses
import struct
from collections.abc import Callable, Sequence
from enum import IntEnum
from typing import Any, ClassVar, TypeVar, dataclass_transform, get_type_hints

from construct import (
    Construct,
    ConstructError,
    FormatField,
    GreedyBytes,
    Renamed,
    Struct,
    Terminated,
)

from .errors import BadField, Malformed, UnknownValue
from .layouts import MAX_TEXT, Tail


class Laid:
    """A frozen dataclass with a layout. It checks its own fields, whoever makes it."""

    __slots__ = ()
    LAYOUT: ClassVar[Struct]
    CODEC: ClassVar[Codec]

    def __post_init__(self) -> None:
        self.CODEC.check(self)


LaidClass = TypeVar("LaidClass", bound=Laid)


@dataclass_transform(frozen_default=True)
def laid_out(layout: Struct) -> Callable[[type[LaidClass]], type[LaidClass]]:
    """Class decorator: makes the frozen dataclass of a layout, with its codec. TypeError if they differ."""

    def prepare(declared: type[LaidClass]) -> type[LaidClass]:
        cls = dataclasses.dataclass(frozen=True, slots=True)(declared)
        cls.LAYOUT = layout
        cls.CODEC = Codec(cls)
        return cls

    return prepare


def bare(subcon: Construct) -> Construct:
    """The construct below its name and its note."""
    while isinstance(subcon, Renamed):
        subcon = subcon.subcon
    return subcon


@dataclasses.dataclass(frozen=True)
class Rule:
    """One field: what fits, told in words, and the ways to and from what construct handles."""

    expected: str
    fits: Callable[[Any], bool]
    to_wire: Callable[[Any], Any] | None = None
    from_wire: Callable[[Any], Any] | None = None


def is_tail(field: Construct) -> bool:
    """Whether a field takes the rest of the payload."""
    return field is GreedyBytes or isinstance(field, Tail)


_LONG_AS_INT = str.maketrans("lL", "iI")


def struct_format(layout: Struct) -> str:
    """The format, for `struct` of either interpreter, of a layout up to its tail if it has one."""
    codes = []
    for field in map(bare, layout.subcons):
        if isinstance(field, FormatField):
            # construct writes 32-bit integers as "l"; with "<" that is the same as the more usual "i".
            codes.append(field.fmtstr[-1].translate(_LONG_AS_INT))
        elif not is_tail(field):
            codes.append(f"{field.sizeof()}s")
    return "<" + "".join(codes)


def number_range(field: FormatField) -> tuple[int, int]:
    """Smallest and largest value of an integer field."""
    bits = 8 * field.sizeof()
    signed = field.fmtstr[-1].islower()
    return (-(1 << bits - 1), (1 << bits - 1) - 1) if signed else (0, (1 << bits) - 1)


def _number(field: FormatField) -> Rule:
    low, high = number_range(field)
    # The exact type is asked for: a float would pass the comparison, and a bool is a slip.
    return Rule(f"an integer from {low} to {high}", lambda value: type(value) is int and low <= value <= high)


def _yes_or_no(name: str, message: str) -> Rule:
    def from_wire(raw: int) -> bool:
        if raw > 1:
            raise UnknownValue(message, name, raw)
        return raw == 1

    return Rule("True or False", lambda value: isinstance(value, bool), int, from_wire)


def _word(words: type[IntEnum], name: str, message: str) -> Rule:
    by_number = {int(word): word for word in words}

    def from_wire(raw: int) -> IntEnum:
        try:
            return by_number[raw]
        except KeyError:
            raise UnknownValue(message, name, raw) from None

    return Rule(f"a {words.__name__}", lambda value: isinstance(value, words), int, from_wire)


def _octets(size: int) -> Rule:
    return Rule(f"{size} bytes", lambda value: isinstance(value, bytes) and len(value) == size)


def _text(size: int, padded: bool) -> Rule:
    def fits(value: Any) -> bool:
        try:
            return isinstance(value, str) and "\0" not in value and len(value.encode()) <= size
        except UnicodeEncodeError:
            return False

    def to_wire(text: str) -> bytes:
        return text.encode().ljust(size if padded else 0, b"\0")

    def from_wire(raw: bytes) -> str:
        return (raw.rstrip(b"\0") if padded else raw).decode()

    return Rule(f"text of at most {size} bytes in UTF-8, without NUL", fits, to_wire, from_wire)


def _entries(entry: type[Laid], most: int) -> Rule:
    def fits(value: Any) -> bool:
        return (
            isinstance(value, tuple) and len(value) <= most and all(isinstance(one, entry) for one in value)
        )

    def to_wire(entries: tuple[Laid, ...]) -> list[dict[str, Any]]:
        return [entry.CODEC.to_fields(one) for one in entries]

    def from_wire(raw: list[Any]) -> tuple[Laid, ...]:
        names = [field.name for field in entry.LAYOUT.subcons]
        return tuple(entry.CODEC.from_values([one[name] for name in names]) for one in raw)

    return Rule(f"a tuple of at most {most} {entry.__name__}", fits, to_wire, from_wire)


def _rule(name: str, field: Construct, hint: Any, message: str) -> Rule:
    if isinstance(field, Tail):
        return _entries(hint.__args__[0], field.most)
    if hint is str:
        greedy = field is GreedyBytes
        return _text(MAX_TEXT if greedy else field.sizeof(), padded=not greedy)
    if hint is bytes:
        return _octets(field.sizeof())
    if hint is bool:
        return _yes_or_no(name, message)
    if hint is int and isinstance(field, FormatField):
        return _number(field)
    if isinstance(hint, type) and issubclass(hint, IntEnum):
        return _word(hint, name, message)
    raise TypeError(f"{message}.{name} is a {hint}, for which the wire has no rule")


class Codec:
    """Checks, builds and parses one dataclass."""

    def __init__(self, cls: type[Laid]) -> None:
        hints = get_type_hints(cls)
        fields: dict[str, Construct] = {field.name: bare(field) for field in cls.LAYOUT.subcons}
        declared = [field.name for field in dataclasses.fields(cls)]  # pyright: ignore[reportArgumentType]
        if declared != list(fields):
            raise TypeError(f"{cls.__name__} declares {declared}, but is laid out as {list(fields)}")
        self._cls = cls
        self._rules = {name: _rule(name, field, hints[name], cls.__name__) for name, field in fields.items()}
        self._positions = {name: position for position, name in enumerate(fields)}
        self._numbers = tuple(
            (name, *number_range(field))
            for name, field in fields.items()
            if isinstance(field, FormatField) and hints[name] is int
        )
        self._others = tuple((name, self._rules[name].fits) for name in fields if hints[name] is not int)
        self._from_wire = tuple(
            (self._positions[name], rule.from_wire) for name, rule in self._rules.items() if rule.from_wire
        )
        self._split = self._splitter()

    def _splitter(self) -> Callable[[bytes], Sequence[Any]]:
        """What takes a payload apart into the values of its fields; raises struct.error or ConstructError."""
        layout = self._cls.LAYOUT
        if not any(is_tail(bare(field)) for field in layout.subcons):
            return struct.Struct(struct_format(layout)).unpack
        # For parsing only: without Terminated construct ignores surplus bytes, with it a Struct has no size.
        parser = Struct(*layout.subcons, Terminated)
        names = tuple(self._positions)

        def split(payload: bytes) -> list[Any]:
            fields: Any = parser.parse(payload)
            return [fields[name] for name in names]

        return split

    def check(self, laid: Laid) -> None:
        """Raise BadField for the first field that does not fit."""
        for name, low, high in self._numbers:
            value = getattr(laid, name)
            if type(value) is not int or not low <= value <= high:
                raise BadField(self._cls.__name__, name, value, self._rules[name].expected)
        for name, fits in self._others:
            if not fits(getattr(laid, name)):
                raise BadField(self._cls.__name__, name, getattr(laid, name), self._rules[name].expected)

    def to_fields(self, laid: Laid) -> dict[str, Any]:
        """What construct builds from."""
        fields = {}
        for name, rule in self._rules.items():
            value = getattr(laid, name)
            fields[name] = rule.to_wire(value) if rule.to_wire else value
        return fields

    def from_values(self, raw: Sequence[Any]) -> Laid:
        """The dataclass of values in the layout's order. Raises WireError subclasses only."""
        values = list(raw)
        try:
            for position, convert in self._from_wire:
                values[position] = convert(values[position])
        except UnicodeDecodeError as error:
            raise Malformed(f"the text in {self._cls.__name__} is not UTF-8") from error
        return self._cls(*values)

    def build(self, laid: Laid) -> bytes:
        """The payload of a message."""
        return self._cls.LAYOUT.build(self.to_fields(laid))

    def parse(self, payload: bytes) -> Laid:
        """The message of a payload. Raises WireError subclasses only."""
        try:
            values = self._split(payload)
        except (struct.error, ConstructError) as error:
            raise Malformed(f"{self._cls.__name__} is not {len(payload)} bytes long") from error
        return self.from_values(values)
