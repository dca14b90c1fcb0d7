"""Writes what follows from the layouts: firmware/wire.py and protocol/REFERENCE.md.

Both are kept in the repository, so that neither a reader nor a board needs this program; a test fails when
they are stale. `python -m sinkwright_wire.generate` writes them, `--check` only compares.
"""

from __future__ import annotations

import argparse
import re
import sys
import textwrap
from collections.abc import Iterator
from enum import IntEnum
from pathlib import Path

from .layouts import (
    HEADER,
    MAX_ENTRIES,
    MAX_PAYLOAD,
    MAX_READINGS,
    MAX_STEPS,
    MAX_TEXT,
    NEVER_HEARD,
    VERSION,
)
from .mapping import Laid, struct_format
from .messages import ENTRIES, MESSAGES
from .reference import render_reference
from .vocabulary import VOCABULARY, EventKind, ResetCause

REPOSITORY = Path(__file__).resolve().parents[2]

_WIRE_HEAD = '''"""The numbers of the wire: ids, `struct` formats and codes of every message.

Generated from protocol/sinkwright_wire by `python -m sinkwright_wire.generate`: never edit it here. The
names above a format are its fields in their order; their meaning stands in protocol/REFERENCE.md.
"""

from micropython import const
'''

# The words of these two are long enough on the board without the whole name of their enumeration.
_PREFIXES: dict[type[IntEnum], str] = {ResetCause: "RESET", EventKind: "EVENT"}


def _upper_snake(name: str) -> str:
    return re.sub(r"(?<=[a-z])(?=[A-Z])", "_", name).upper()


def _fields(layout: object) -> Iterator[str]:
    names = ", ".join(field.name for field in layout.subcons)  # pyright: ignore[reportAttributeAccessIssue]
    return iter(textwrap.wrap(names, 100, initial_indent="# ", subsequent_indent="# "))


def _format_lines(laid: type[Laid]) -> Iterator[str]:
    yield from _fields(laid.LAYOUT)
    yield f'{_upper_snake(laid.__name__)}_FORMAT = "{struct_format(laid.LAYOUT)}"'


def _word_lines(words: type[IntEnum]) -> Iterator[str]:
    prefix = _PREFIXES.get(words, _upper_snake(words.__name__))
    for word in words:
        yield f"{prefix}_{word.name} = const({int(word)})"


def render_wire() -> str:
    """The text of firmware/wire.py."""
    lines = [
        _WIRE_HEAD,
        f"VERSION = const({VERSION})",
        f"MAX_PAYLOAD = const({MAX_PAYLOAD})",
        f"MAX_TEXT = const({MAX_TEXT})",
        f"MAX_ENTRIES = const({MAX_ENTRIES})",
        f"MAX_STEPS = const({MAX_STEPS})",
        f"MAX_READINGS = const({MAX_READINGS})",
        f"NEVER_HEARD = const(0x{NEVER_HEARD:08X})",
        "",
        *_fields(HEADER),
        f'HEADER_FORMAT = "{struct_format(HEADER)}"',
        f"HEADER_SIZE = const({HEADER.sizeof()})",
    ]
    for message_id, message in sorted(MESSAGES.items()):
        lines += [
            "",
            f"{_upper_snake(message.__name__)} = const(0x{message_id:02X})",
            *_format_lines(message),
        ]
    for entry in ENTRIES:
        lines += ["", *_format_lines(entry)]
    for words in VOCABULARY:
        lines += ["", *_word_lines(words)]
    return "\n".join(lines) + "\n"


def outputs() -> dict[Path, str]:
    """Each generated file with the text it must have."""
    return {
        REPOSITORY / "firmware" / "wire.py": render_wire(),
        REPOSITORY / "protocol" / "REFERENCE.md": render_reference(),
    }


def stale_files() -> list[Path]:
    """The generated files that are missing or differ from what the layouts say."""
    return [
        path
        for path, text in outputs().items()
        if not path.is_file() or path.read_text(encoding="utf-8") != text
    ]


def main(arguments: list[str] | None = None) -> int:
    """Write the files, or with `--check` name the stale ones and leave with 1."""
    parser = argparse.ArgumentParser(prog="python -m sinkwright_wire.generate", description=__doc__)
    parser.add_argument(
        "--check", action="store_true", help="write nothing; leave with 1 when a file is stale"
    )
    options = parser.parse_args(arguments)
    stale = stale_files()
    for path in stale:
        name = path.relative_to(REPOSITORY)
        if options.check:
            sys.stderr.write(f"{name} is stale: run `python -m sinkwright_wire.generate`\n")
        else:
            path.write_text(outputs()[path], encoding="utf-8")
            sys.stdout.write(f"{name} written\n")
    return 1 if stale and options.check else 0


if __name__ == "__main__":
    raise SystemExit(main())
