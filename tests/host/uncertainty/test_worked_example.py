"""The page about uncertainty: its example is run, and prints what the page says."""

from __future__ import annotations

import contextlib
import io
import re
from pathlib import Path

PAGE = Path(__file__).resolve().parents[3] / "host" / "docs" / "uncertainty.md"


def block(language: str) -> str:
    found = re.findall(rf"^```{language}\n(.*?)^```", PAGE.read_text(encoding="utf-8"), re.M | re.S)
    assert len(found) == 1
    return found[0]


def test_the_worked_example_prints_what_the_page_says() -> None:
    printed = io.StringIO()
    with contextlib.redirect_stdout(printed):
        exec(compile(block("python"), str(PAGE), "exec"), {})
    assert printed.getvalue() == block("text")
