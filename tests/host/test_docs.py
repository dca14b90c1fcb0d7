"""The how-to pages: every example is read by the program itself, and every command named exists."""

from __future__ import annotations

import csv
import re
import tomllib
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner

from sinkwright.cli.template import template
from sinkwright.definitions import load_board, load_plan, load_source
from sinkwright.definitions.board import BoardFile
from sinkwright.definitions.keytables import DOCS
from sinkwright.definitions.loading import default_board_path

DATA = Path(__file__).parent.parent / "data"


def blocks(page: str, language: str) -> list[str]:
    text = (DOCS / page).read_text(encoding="utf-8")
    return re.findall(rf"^```{language}\n(.*?)^```$", text, flags=re.MULTILINE | re.DOTALL)


def merged(fragment: str) -> dict[str, Any]:
    """The shipped board with the keys of a fragment changed; a table within a table is replaced whole."""
    whole = tomllib.loads(default_board_path().read_text(encoding="utf-8"))
    for key, value in tomllib.loads(fragment).items():
        whole[key] = {**whole[key], **value} if isinstance(value, dict) else value
    return whole


@pytest.mark.parametrize("text", blocks("plans.md", "toml"))
def test_every_plan_on_its_page_is_a_plan(text: str, tmp_path: Path) -> None:
    path = tmp_path / "example.toml"
    path.write_text(text, encoding="utf-8")
    assert load_plan(path).tests


@pytest.mark.parametrize("text", blocks("simulated-sources.md", "toml"))
def test_every_source_on_its_page_is_a_source(text: str, tmp_path: Path) -> None:
    path = tmp_path / "example.toml"
    path.write_text(text, encoding="utf-8")
    assert load_source(path).kind in text


@pytest.mark.parametrize("text", blocks("boards.md", "toml"))
def test_every_change_on_the_boards_page_makes_a_board_that_holds_together(text: str) -> None:
    import msgspec

    assert msgspec.convert(merged(text), BoardFile) != load_board()


@pytest.mark.parametrize("page", ["plans.md", "simulated-sources.md", "boards.md"])
def test_every_template_command_on_a_page_works(
    page: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    lines = [line for block in blocks(page, "sh") for line in block.splitlines()]
    commands = [line.split()[2:] for line in lines if line.startswith("sinkwright template ")]
    assert commands
    for arguments in commands:
        result = CliRunner().invoke(template, arguments, catch_exceptions=False)
        assert result.exit_code == 0
        assert Path(arguments[-1]).read_text(encoding="utf-8").startswith("#")


def test_the_leads_on_the_plans_page_are_those_of_the_wire_table() -> None:
    """awg.csv: ASTM B258 diameters, IEC 60028 copper; two leads of 0.5 m make one metre."""
    rows = csv.DictReader((DATA / "awg.csv").read_text(encoding="utf-8").splitlines()[1:])
    mohm_per_m = {row["awg"]: float(row["mohm_per_m_20C"]) for row in rows}
    assert f"{mohm_per_m['18']:.0f} mΩ together" in (DOCS / "plans.md").read_text(encoding="utf-8")


def test_the_heat_on_the_boards_page_is_worked_out_right() -> None:
    board = load_board()
    inner_K = 50 * board.transistor.junction_to_sink_K_per_W
    text = (DOCS / "boards.md").read_text(encoding="utf-8")
    assert f"end at {40 + 50 * 0.5:.0f} °C, and the junction {inner_K:.0f} K above" in text
