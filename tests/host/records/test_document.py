from __future__ import annotations

import pytest

from sinkwright.records.document import PAGE, main, renewed
from sinkwright.records.schema import RUN_KEYS, TABLES
from tests.host.records.made_up import header


def test_the_page_shows_the_schema_of_this_version() -> None:
    assert main(["--check"]) == 0, "run: python -m sinkwright.records.document"


def test_every_column_and_every_key_is_documented() -> None:
    page = PAGE.read_text(encoding="utf-8")
    names = [column.name for table in TABLES for column in table.columns] + list(RUN_KEYS)
    assert [name for name in names if f"| `{name}` |" not in page] == []


def test_every_key_that_a_header_writes_is_documented() -> None:
    assert set(header().to_rows()) <= set(RUN_KEYS)


def test_a_page_without_markers_is_refused() -> None:
    with pytest.raises(ValueError, match="markers"):
        renewed("# A page\n")
