"""The golden frames that both ends of the wire must produce and accept, as messages and as bytes."""

from __future__ import annotations

import json
from dataclasses import dataclass
from enum import IntEnum
from pathlib import Path
from typing import Any, get_type_hints

from sinkwright_wire.mapping import Laid
from sinkwright_wire.messages import MESSAGES, Message

GOLDEN_FILE = Path(__file__).resolve().parents[1] / "data" / "golden_frames.json"

_CLASSES = {message.__name__: message for message in MESSAGES.values()}


@dataclass(frozen=True)
class GoldenFrame:
    """One message with the bytes that it must have on the wire."""

    title: str
    session: int
    sequence: int
    message: Message
    frame: bytes


def _entry(cls: type[Laid], raw: list[Any]) -> Laid:
    hints = list(get_type_hints(cls).items())
    values = zip((field.name for field in cls.LAYOUT.subcons), raw, strict=True)
    return cls(**{name: _value(value, dict(hints)[name]) for name, value in values})


def _value(raw: Any, hint: Any) -> Any:
    if isinstance(raw, dict):
        return bytes.fromhex(raw["hex"])
    if isinstance(raw, list):
        return tuple(_entry(hint.__args__[0], entry) for entry in raw)
    if hint is bool or (isinstance(hint, type) and issubclass(hint, IntEnum)):
        return hint(raw)
    return raw


def golden_frames() -> list[GoldenFrame]:
    """Every golden frame of the file."""
    frames = []
    for entry in json.loads(GOLDEN_FILE.read_text(encoding="utf-8"))["frames"]:
        cls = _CLASSES[entry["message"]]
        hints = get_type_hints(cls)
        fields = {name: _value(raw, hints[name]) for name, raw in entry["fields"]}
        frames.append(
            GoldenFrame(
                entry["title"],
                entry["session"],
                entry["sequence"],
                cls(**fields),
                bytes.fromhex(entry["frame"]),
            )
        )
    return frames
