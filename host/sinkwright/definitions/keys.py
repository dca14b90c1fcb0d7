"""How a key of a plan, board or source file is declared: its unit, meaning and range, once.

The declaration in `Annotated[float, quantity(...)]` is read by msgspec (ranges), by `explain` (messages) and
by `keytables` (documentation), so that none of them can tell another story. It knows no particular file.
"""

from __future__ import annotations

from typing import Any

import msgspec


class KeyMistake(ValueError):
    """Raised by a struct's own check: the key (from the struct on), what is wrong, what is right."""

    def __init__(self, key: str, what: str, right: str) -> None:
        super().__init__(f"{key}: {what}; {right}")
        self.key = key
        self.what = what
        self.right = right


def quantity(
    unit: str,
    meaning: str,
    *,
    default: str = "",
    gt: float | None = None,
    ge: float | None = None,
    le: float | None = None,
) -> msgspec.Meta:
    """A number in `unit`. `default` says in words what an omitted key means; `gt`, `ge`, `le` bound it."""
    extra = {"unit": unit, "default_text": default} if default else {"unit": unit}
    bounds: dict[str, Any] = {
        name: bound for name, bound in (("gt", gt), ("ge", ge), ("le", le)) if bound is not None
    }
    return msgspec.Meta(description=meaning, extra_json_schema=extra, **bounds)


def wording(meaning: str, *, default: str = "", shortest: int = 0, longest: int = 200) -> msgspec.Meta:
    """A text, a switch, a table or a list: anything without a unit."""
    extra = {"default_text": default} if default else {}
    return msgspec.Meta(
        description=meaning,
        min_length=shortest or None,
        max_length=longest,
        extra_json_schema=extra,
    )


def meaning(text: str, *, default: str = "") -> msgspec.Meta:
    """A key whose value is a table, a list, a choice or a switch."""
    return msgspec.Meta(description=text, extra_json_schema={"default_text": default} if default else {})


def by_program() -> msgspec.Meta:
    """A field that the program fills in; in a file it counts as an unknown key."""
    return msgspec.Meta(extra_json_schema={"by_program": True})
