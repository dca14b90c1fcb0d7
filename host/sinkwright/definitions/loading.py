"""Reads plan, board and source files, and turns every mistake in them into a FileError of one paragraph.

Decides what may be read at all (size, encoding, depth); which values are right is declared in plan, board and
source. Opens nothing but the file named.
"""

from __future__ import annotations

import math
import re
import tomllib
from pathlib import Path
from typing import Any

import msgspec
import msgspec.inspect as mi

from ..errors import FileError
from .board import BoardFile
from .explain import Mistake, first_mistake, join
from .plan import LATER_KINDS, Plan
from .source import CellSource, CurveSource, SourceFile, SupplySource

LARGEST_BYTES = 1 << 20
DEEPEST = 16
_PROGRAM_KEYS = {"plan": ("name", "text"), "board": ("text",), "source": ("text",)}


def load_plan(path: Path | str) -> Plan:
    """A plan; its name is the file's, without the ending. Raises FileError."""
    return parse_plan(read_text(Path(path), "plan"), Path(path).stem, where=str(path))


def load_board(path: Path | str | None = None) -> BoardFile:
    """A board file, by default the shipped one. Raises FileError."""
    file = default_board_path() if path is None else Path(path)
    return parse_board(read_text(file, "board"), where=str(file))


def load_source(path: Path | str) -> SourceFile:
    """A simulated source. Raises FileError."""
    return parse_source(read_text(Path(path), "source"), where=str(path))


def default_board_path() -> Path:
    """The board file that is shipped."""
    return Path(__file__).parent.parent / "templates" / "board.toml"


def parse_plan(text: str, name: str = "", *, where: str = "plan") -> Plan:
    """A plan from its text. Raises FileError."""
    return _convert(text, Plan, "plan", where, {"name": name, "text": text})


def parse_board(text: str, *, where: str = "board") -> BoardFile:
    """A board file from its text. Raises FileError."""
    return _convert(text, BoardFile, "board", where, {"text": text})


def parse_source(text: str, *, where: str = "source") -> SourceFile:
    """A simulated source from its text. Raises FileError."""
    return _convert(text, SupplySource | CellSource | CurveSource, "source", where, {"text": text})


def read_text(path: Path, kind: str) -> str:
    """The text of a small UTF-8 file. Raises FileError, also for what is no file at all."""
    try:
        if path.exists() and not path.is_file():
            raise _unreadable(path, "is not a file", f"name a {kind} file")
        with path.open("rb") as file:
            content = file.read(LARGEST_BYTES + 1)
    except FileNotFoundError:
        raise _unreadable(
            path, "does not exist", f"check the name, or write one: {_template(kind)}"
        ) from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise _unreadable(path, f"cannot be read ({reason})", "check the name and who may read it") from error
    if len(content) > LARGEST_BYTES:
        raise _unreadable(
            path, "is larger than 1 MiB", f"a {kind} file has a few hundred lines: is this the right file?"
        )
    return _decode(path, content, kind)


def _decode(path: Path, content: bytes, kind: str) -> str:
    if content.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise _unreadable(path, "is written in UTF-16", "save it as UTF-8")
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        if b"\0" in content:
            raise _unreadable(path, "is not text", f"name a {kind} file, which is TOML") from None
        raise _unreadable(path, f"is not UTF-8 (line {line})", "save it as UTF-8") from None
    if "\0" in text:
        raise _unreadable(path, "is not text", f"name a {kind} file, which is TOML")
    return text.replace("\r\n", "\n")


def _convert(text: str, target: Any, kind: str, where: str, added: dict[str, str]) -> Any:
    data = _parse(text, kind, where)
    mistake = _not_finite(data, "", 0) or _by_program(data, target, kind)
    if mistake is None:
        try:
            return msgspec.convert({**data, **added}, target)
        except (msgspec.ValidationError, OverflowError) as error:
            mistake = _explained(data, target, kind) or Mistake(
                "", str(error), f"compare with {_template(kind)}"
            )
    raise FileError(_clause(mistake), where=_place(where, mistake.key), remedy=_sentence(mistake.right))


def _parse(text: str, kind: str, where: str) -> dict[str, Any]:
    try:
        data = tomllib.loads(text)
    except RecursionError:
        raise FileError(
            "the file is nested too deeply", where=where, remedy=f"Compare it with {_template(kind)}"
        ) from None
    except ValueError as error:
        raise _not_toml(text, str(error), kind, where) from None
    if not data:
        raise FileError("the file is empty", where=where, remedy=f"Begin with a template: {_template(kind)}")
    return data


def _not_toml(text: str, reason: str, kind: str, where: str) -> FileError:
    lines = text.splitlines()
    match = re.search(r" \(at line (\d+), column \d+\)", reason)
    number = int(match[1]) if match else max(len(lines), 1)
    line = lines[number - 1].strip() if 0 < number <= len(lines) else ""
    reason = (
        "a number has too many digits" if "digits" in reason else re.sub(r" \(at .*\)", "", reason).lower()
    )
    what = f"the line cannot be understood: {reason[:120]}"
    if line.isprintable() and line:
        what += f", in `{line[:60]}`"
    return FileError(what, where=f"{where}, line {number}", remedy=_toml_advice(line, reason, kind))


def _toml_advice(line: str, reason: str, kind: str) -> str:
    if "overwrite" in reason.lower() or "twice" in reason.lower() or "duplicate" in reason.lower():
        return "Each key and each [table] may stand once; further tests are [[test]], in double brackets."
    if re.search(r"=\s*[-+]?\d+,\d+\s*(#.*)?$", line):
        return "Write decimals with a point: 2.5."
    if re.search(r"=\s*[-+]?[\d.]+\s*[A-Za-zµΩ%]+\s*(#.*)?$", line):
        return "Write the number alone; the unit stands in the key."
    if re.search(r"=\s*[A-Za-z]", line):
        return "Write texts in quotes, and switches as true or false."
    return f"The file is TOML: `key = value` lines under [table] lines; {_template(kind)} shows one."


def _not_finite(value: Any, path: str, depth: int) -> Mistake | None:
    """TOML can write nan and inf, and whole numbers of any size; none of them measures anything."""
    if depth > DEEPEST:
        return Mistake("", "is nested too deeply", "keep to the tables of a template")
    if isinstance(value, (int, float)) and not isinstance(value, bool):
        if isinstance(value, int) and abs(value) < 1 << 60:
            return None
        if isinstance(value, int) or not math.isfinite(value):
            shown = "far too large" if isinstance(value, int) or math.isinf(value) else "not a number (nan)"
            return Mistake(path, f"is {shown}", "write a finite number")
        return None
    if isinstance(value, dict):
        items = [(join(path, key[:60]), item) for key, item in value.items()]
    elif isinstance(value, list):
        items = [(f"{path}[{number}]", item) for number, item in enumerate(value, start=1)]
    else:
        return None
    return next((found for key, item in items if (found := _not_finite(item, key, depth + 1))), None)


def _by_program(data: dict[str, Any], target: Any, kind: str) -> Mistake | None:
    """Keys that the program fills in are unknown in a file; the rest of the walk explains them as such."""
    if any(key in data for key in _PROGRAM_KEYS[kind]):
        return _explained(data, target, kind)
    return None


def _explained(data: dict[str, Any], target: Any, kind: str) -> Mistake | None:
    return first_mistake(data, mi.type_info(target), LATER_KINDS if kind == "plan" else ())


_VERBS = ("is", "has", "would", "can", "cannot", "leaves", "exceeds", "gives", "uses", "goes", "must", "does")


def _clause(mistake: Mistake) -> str:
    """`is missing` becomes `it is missing`; what names its own subject stays."""
    if mistake.what.split(" ", 1)[0] not in _VERBS:
        return mistake.what
    return f"{'it' if mistake.key else 'the file'} {mistake.what}"


def _place(where: str, key: str) -> str:
    return f"{where}, {key}" if key else where


def _template(kind: str) -> str:
    extra = {"plan": " load-regulation", "source": " supply"}.get(kind, "")
    return f"`sinkwright template {kind}{extra}`"


def _sentence(right: str) -> str:
    return right[:1].upper() + right[1:]


def _unreadable(path: Path, what: str, right: str) -> FileError:
    return FileError(f"the file {what}", where=str(path), remedy=_sentence(right))
