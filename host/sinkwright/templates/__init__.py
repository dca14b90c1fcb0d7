"""The commented files that `sinkwright template` hands out, found by kind."""

from __future__ import annotations

from pathlib import Path

FOLDER = Path(__file__).parent


def kinds(family: str) -> list[str]:
    """Kinds of `plan` or `source` that have a template."""
    return sorted(path.stem for path in (FOLDER / family).glob("*.toml"))


def template(family: str, kind: str = "") -> str:
    """The text of a template: family `plan`, `source` (with a kind) or `board`. Raises FileNotFoundError."""
    path = FOLDER / family / f"{kind}.toml" if kind else FOLDER / f"{family}.toml"
    return path.read_text(encoding="utf-8")
