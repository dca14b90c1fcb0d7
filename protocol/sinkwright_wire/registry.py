"""What a message is, the registry of all of them, and the two answers that serve several requests.

A message checks its own fields when it is made. Requests name the message that answers them. Which messages there
are stands in messages.py and run_messages.py.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import ClassVar, TypeVar, dataclass_transform

from construct import Struct

from . import layouts
from .mapping import Laid, laid_out
from .vocabulary import LimitField, Refusal


class Message(Laid):
    """Anything that crosses the wire in a frame of its own."""

    __slots__ = ()
    ID: ClassVar[int]


class Request(Message):
    """What a host asks; REPLY is the message that says it was done."""

    __slots__ = ()
    REPLY: ClassVar[type[Message]]


class Push(Message):
    """What the board sends unasked."""

    __slots__ = ()


MESSAGES: dict[int, type[Message]] = {}

MessageClass = TypeVar("MessageClass", bound=Message)


@dataclass_transform(frozen_default=True)
def message(
    message_id: int, layout: Struct, reply: type[Message] | None = None
) -> Callable[[type[MessageClass]], type[MessageClass]]:
    """Class decorator: makes the frozen dataclass of a layout, and enters it under its id."""

    def register(declared: type[MessageClass]) -> type[MessageClass]:
        cls = laid_out(layout)(declared)
        if message_id in MESSAGES:
            raise TypeError(f"{cls.__name__} and {MESSAGES[message_id].__name__} share an id")
        cls.ID = message_id
        if issubclass(cls, Request) and reply is not None:
            cls.REPLY = reply
        MESSAGES[message_id] = cls
        return cls

    return register


# Answers that serve several requests


@message(0xC0, layouts.DONE)
class Done(Message):
    """The request was carried out."""

    request: int


@message(0xC1, layouts.REFUSED)
class Refused(Message):
    """The request was not carried out, and nothing has changed."""

    request: int
    refusal: Refusal
    field: LimitField = LimitField.NONE
    detail: int = 0
