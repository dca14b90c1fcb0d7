"""The errors a person may see: one root, each telling what, where, what the load is doing, and what to do.

A command prints `str(error)` as one paragraph and leaves with `error.exit_code`; no traceback is shown for any
of these. Subclasses say whose mistake it was, so that callers can tell "you asked wrongly" from "the board
misbehaved" without reading text.
"""

from __future__ import annotations

LOAD_UNTOUCHED = "No load was touched."


class SinkwrightError(Exception):
    """Something the person must know about, told in one paragraph."""

    exit_code = 2

    def __init__(self, what: str, *, where: str = "", load: str = LOAD_UNTOUCHED, remedy: str = "") -> None:
        super().__init__(what)
        self.what = what
        self.where = where
        self.load = load
        self.remedy = remedy

    def __str__(self) -> str:
        start = f"{self.where}: {self.what}" if self.where else self.what
        return " ".join(_sentence(part) for part in (start, self.load, self.remedy) if part)

    def to_json(self) -> dict[str, str]:
        """The same four facts for `--json`."""
        return {"error": self.what, "where": self.where, "load": self.load, "remedy": self.remedy}


class FileError(SinkwrightError):
    """A file of the person's own (plan, board, source, record) is not what it must be."""


class AskedTooMuch(SinkwrightError):
    """A value is beyond what the board, the source or the plan's own limits allow."""


class BoardRefused(SinkwrightError):
    """The board answered, and refused: the refusal's own sentence, with its code in `refusal`."""

    def __init__(self, what: str, *, refusal: int = 0, detail: int = 0, field: int = 0, **facts: str) -> None:
        super().__init__(what, **facts)
        self.refusal = refusal
        self.detail = detail
        self.field = field


class LinkLost(SinkwrightError):
    """The way to the board is gone, or what answers is not a board of ours."""


class RecordError(SinkwrightError):
    """A record could not be written, opened or understood."""


class Interrupted(SinkwrightError):
    """The person asked to stop (Ctrl-C, SIGTERM)."""

    exit_code = 130


class ProtectionTripped(SinkwrightError):
    """The board stopped by itself; `fault` is the fault's name in results (`stopped_by`)."""

    exit_code = 3

    def __init__(self, what: str, *, fault: str, **facts: str) -> None:
        super().__init__(what, **facts)
        self.fault = fault


def _sentence(text: str) -> str:
    text = text.strip()
    return text if text.endswith((".", "!", "?", ":")) else text + "."
