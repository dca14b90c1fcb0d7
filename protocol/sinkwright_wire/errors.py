"""What can be wrong with a message. One root, so that a caller can fence off the wire with one `except`.

These say what is wrong with bytes or fields; what it means for the load is said further up.
"""

from __future__ import annotations


class WireError(Exception):
    """Something about a message is wrong."""


class BadField(WireError, ValueError):
    """A message was to be built with a field that does not fit the wire."""

    def __init__(self, message: str, field: str, value: object, expected: str) -> None:
        super().__init__(f"{message}.{field} is {value!r}; it must be {expected}")
        self.message = message
        self.field = field
        self.value = value


class Malformed(WireError):
    """Bytes with a good check sequence that are not laid out as their header says."""


class UnknownMessage(WireError):
    """The id stands for no message of this wire version."""

    def __init__(self, message_id: int) -> None:
        super().__init__(f"no message has the id 0x{message_id:02X}")
        self.message_id = message_id


class UnknownValue(WireError):
    """A field carries a number that stands for nothing in this wire version."""

    def __init__(self, message: str, field: str, value: int) -> None:
        super().__init__(f"{message}.{field} is {value}, which stands for nothing")
        self.message = message
        self.field = field
        self.value = value


class VersionMismatch(WireError):
    """The frame is of another wire version: its payload must not be read with these layouts."""

    def __init__(self, version: int) -> None:
        super().__init__(f"the frame is of wire version {version}")
        self.version = version


class OutOfTurn(WireError):
    """A request was made while another waits for its answer, or a repeat without a request."""
