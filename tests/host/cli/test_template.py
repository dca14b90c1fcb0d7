"""`sinkwright template`: prints or writes a file, and never overwrites one unasked."""

from __future__ import annotations

from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from sinkwright import templates
from sinkwright.cli.template import template
from sinkwright.errors import FileError


def run(*arguments: str) -> Result:
    return CliRunner().invoke(template, arguments, catch_exceptions=False)


@pytest.mark.parametrize(
    ("arguments", "family", "kind"),
    [
        (("plan",), "plan", "load-regulation"),
        (("plan", "hold"), "plan", "hold"),
        (("board",), "board", ""),
        (("source",), "source", "supply"),
        (("source", "curve"), "source", "curve"),
    ],
)
def test_a_template_is_printed_as_it_is(arguments: tuple[str, ...], family: str, kind: str) -> None:
    result = run(*arguments)
    assert (result.exit_code, result.stdout) == (0, templates.template(family, kind))


def test_a_file_is_written_once_and_again_only_by_force(tmp_path: Path) -> None:
    path = tmp_path / "mine.toml"
    assert run("plan", "rest", "--out", str(path)).exit_code == 0
    path.write_text("my own work", encoding="utf-8")
    with pytest.raises(FileError, match="--force"):
        run("plan", "rest", "--out", str(path))
    assert path.read_text(encoding="utf-8") == "my own work"
    assert run("plan", "rest", "--out", str(path), "--force").exit_code == 0
    assert path.read_text(encoding="utf-8") == templates.template("plan", "rest")


def test_an_unknown_kind_is_answered_with_the_likely_one() -> None:
    with pytest.raises(FileError, match="Did you mean load-regulation"):
        run("plan", "load_regulation")
    with pytest.raises(FileError, match="Leave small out"):
        run("board", "small")


def test_a_place_that_cannot_be_written_is_told(tmp_path: Path) -> None:
    with pytest.raises(FileError, match="cannot be written"):
        run("board", "--out", str(tmp_path / "absent" / "board.toml"))
