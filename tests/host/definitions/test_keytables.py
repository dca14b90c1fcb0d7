"""Key tables of the pages: complete, and never stale."""

from __future__ import annotations

from pathlib import Path

import pytest

from sinkwright.definitions import keytables, plan, source
from sinkwright.definitions.board import BoardFile

PAGES = keytables.DOCS


def test_no_page_is_stale() -> None:
    assert keytables.stale_pages(PAGES) == []


def test_every_table_stands_on_a_page() -> None:
    pages = "".join(page.read_text(encoding="utf-8") for page in PAGES.glob("*.md"))
    for name in keytables.all_tables():
        assert f"<!-- keys: {name} -->" in pages, name


def test_every_key_has_a_meaning_and_says_its_default() -> None:
    for name, table in keytables.all_tables().items():
        rows = [line for line in table.splitlines() if line.startswith("| `")]
        assert rows, name
        for row in rows:
            _, _key, _unit, default, _range, meaning, _ = (cell.strip() for cell in row.split("|"))
            assert default and meaning.endswith((".", "`")), row


@pytest.mark.parametrize("root", [plan.Plan, BoardFile, source.SupplySource])
def test_fields_that_the_program_fills_in_are_not_documented(root: type) -> None:
    assert all("| `text` |" not in table for table in keytables.all_tables().values())


def test_check_finds_a_stale_page_and_a_second_run_mends_it(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    page = tmp_path / "page.md"
    page.write_text("before\n<!-- keys: plan rest -->\nold\n<!-- end of keys -->\nafter\n", encoding="utf-8")
    assert keytables.main(["--check", str(tmp_path)]) == 1
    assert "stale" in capsys.readouterr().out
    assert keytables.main([str(tmp_path)]) == 0
    assert keytables.main(["--check", str(tmp_path)]) == 0
    text = page.read_text(encoding="utf-8")
    assert "| `duration_s` | s | required |" in text
    assert text.startswith("before\n") and text.endswith("after\n")


def test_a_folder_without_pages_is_not_called_fresh(tmp_path: Path) -> None:
    assert keytables.main(["--check", str(tmp_path)]) == 2
