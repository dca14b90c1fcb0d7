"""The words of a whole report, compared with those kept; drawings are compared elsewhere.

After a change of wording that is meant, look at the new text and keep it:
`python -m tests.host.reports.test_golden_report`.
"""

from __future__ import annotations

import tempfile
from pathlib import Path

from sinkwright.reports import write_report
from tests.host.records.old_records import DATA, restored
from tests.host.reports.test_report import lines_of

KEPT = DATA / "version-1-report.txt"


def words_of_the_report(folder: Path) -> str:
    page = write_report(restored(1, folder)).read_text(encoding="utf-8")
    return "\n".join(lines_of(page)) + "\n"


def test_the_words_of_a_report_are_those_kept(tmp_path: Path) -> None:
    assert words_of_the_report(tmp_path) == KEPT.read_text(encoding="utf-8")


if __name__ == "__main__":
    with tempfile.TemporaryDirectory() as folder:
        KEPT.write_text(words_of_the_report(Path(folder)), encoding="utf-8")
