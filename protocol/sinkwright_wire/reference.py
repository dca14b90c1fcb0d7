"""The text of protocol/REFERENCE.md: byte tables of every message, the codes, and the rules as tables.

Everything is read off the layouts, the vocabulary and the conversation's own table, so that the page cannot
say anything else than the program does. It knows no files.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from enum import IntEnum

from construct import Construct, FormatField, GreedyBytes, Struct

from .conversation import RULES, Arrival, Turn
from .framing import ESCAPE, ESCAPED, FLAG, GOOD_FINAL_FCS
from .layouts import HEADER, MAX_PAYLOAD, MAX_TEXT, VERSION, Tail
from .mapping import Laid, bare
from .messages import ENTRIES, MESSAGES, Message, Push, Request
from .vocabulary import VOCABULARY, Fault

_INTRODUCTION = f"""# The wire

Generated from `sinkwright_wire` by `python -m sinkwright_wire.generate`: never edit it here.

This is wire version {VERSION}. Host and board exchange frames over any stream of octets. Numbers are
little-endian; `u` is unsigned, `i` is two's complement, and the figure after it counts bits. Quantities
carry their unit in the field's name.

## Frames

`7E`, stuffed content, `7E`, after RFC 1662; one flag may end a frame and begin the next. The content is
header, payload and FCS-32, the check sequence of RFC 1662 (over header and payload, least significant
octet first). Over a good content with its check sequence the register ends at `{GOOD_FINAL_FCS:08X}`.
"""

_BETWEEN = f"""
Nothing else may follow `{ESCAPE.hex().upper()}`. A content with a bare `03`, another escape, a bad
check sequence or more than {MAX_PAYLOAD} octets of payload is discarded and counted, unless everything
between the flags is printable UTF-8: then it is a line that the firmware printed. `03` never occurs in
a frame, so that Ctrl-C always reaches the board's interpreter.

## Header
"""

_RULES = """
## Conversation

Ids from `01` to `3F` are requests, `40` to `5F` are pushes (session and sequence 0), from `80` on are
replies. The host draws a session number in its hello and counts its requests; a reply repeats session
and sequence of its request. The board takes the next sequence as new, answers the last one again from
memory without acting again, and refuses anything else. Disable, and what only asks, is taken from
anybody. The version octet and the layouts of Hello and HelloReply never change.

The host keeps to this table; one request at a time is outstanding.
"""


def _table(head: Sequence[str], rows: Sequence[Sequence[str]]) -> Iterator[str]:
    yield "| " + " | ".join(head) + " |"
    yield "|" + "---|" * len(head)
    for row in rows:
        yield "| " + " | ".join(row) + " |"


def _entry_of(tail: Tail) -> type[Laid]:
    """The dataclass whose layout a tail repeats."""
    return next(entry for entry in ENTRIES if entry.LAYOUT is tail.subcon)


def _type_of(field: Construct) -> tuple[str, int | None]:
    """The field's type in words, and its size in octets if that is fixed."""
    if field is GreedyBytes:
        return f"text, up to {MAX_TEXT}", None
    if isinstance(field, Tail):
        return f"{_entry_of(field).__name__}, up to {field.most}", None
    size = field.sizeof()
    if isinstance(field, FormatField):
        return f"{'i' if field.fmtstr[-1].islower() else 'u'}{8 * size}", size
    return f"{size} octets", size


def _byte_table(layout: Struct) -> Iterator[str]:
    rows = []
    offset = 0
    for field in layout.subcons:
        kind, size = _type_of(bare(field))
        rows.append((str(offset), kind, f"`{field.name}`", field.docs))
        offset += size or 0
    if rows:
        yield from _table(("at", "type", "field", "meaning"), rows)
    else:
        yield "No payload."


def _message_section(message: type[Message]) -> Iterator[str]:
    yield f"\n### {message.ID:02X} {message.__name__}\n"
    yield message.__doc__ or ""
    if issubclass(message, Request):
        yield f"Answered by {message.REPLY.__name__}."
    yield ""
    yield from _byte_table(message.LAYOUT)


def _messages() -> Iterator[str]:
    ordered = [MESSAGES[message_id] for message_id in sorted(MESSAGES)]
    requests = [message for message in ordered if issubclass(message, Request)]
    pushes = [message for message in ordered if issubclass(message, Push)]
    replies = [message for message in ordered if message not in requests and message not in pushes]
    for title, group in (("Requests", requests), ("Replies", replies), ("Pushes", pushes)):
        yield f"\n## {title}"
        for message in group:
            yield from _message_section(message)
        for entry in _entries_of(group):
            yield f"\n### {entry.__name__}\n\n{entry.__doc__}\n"
            yield from _byte_table(entry.LAYOUT)


def _entries_of(group: Sequence[type[Message]]) -> Iterator[type[Laid]]:
    """The entries that these messages carry, whose own tables then follow."""
    for message in group:
        for field in map(bare, message.LAYOUT.subcons):
            if isinstance(field, Tail):
                yield _entry_of(field)


def _codes(words: type[IntEnum]) -> Iterator[str]:
    yield f"\n### {words.__name__}\n\n{words.__doc__}\n"
    if words is Fault:
        rows = [(str(int(fault)), fault.name, fault.unit, fault.sentence) for fault in Fault]
        yield from _table(("code", "name", "unit", "meaning"), rows)
    else:
        yield from _table(
            ("code", "name", "meaning"),
            [(str(int(word)), word.name, getattr(word, "sentence", "")) for word in words],
        )


def _rules_table() -> Iterator[str]:
    rows = []
    for turn in Turn:
        for arrival in Arrival:
            if (turn, arrival) in RULES:
                then, occurrence = RULES[turn, arrival]
                rows.append((turn.name, arrival.value, occurrence.__name__, then.name))
    yield from _table(("turn", "what arrives", "is told as", "next turn"), rows)
    yield ""
    yield from (f"{turn.name}: {turn.value}." for turn in Turn)


def _lines() -> Iterator[str]:
    yield _INTRODUCTION
    escapes = [(octet.hex().upper(), escaped.hex(" ").upper()) for octet, escaped in ESCAPED.items()]
    yield from _table(("octet", f"stands in a frame as (flag is {FLAG.hex().upper()})"), escapes)
    yield _BETWEEN
    yield from _byte_table(HEADER)
    yield _RULES
    yield from _rules_table()
    yield from _messages()
    yield "\n## Codes"
    for words in VOCABULARY:
        yield from _codes(words)


def render_reference() -> str:
    """The text of protocol/REFERENCE.md."""
    return "\n".join(_lines()) + "\n"
