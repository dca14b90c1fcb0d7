"""Reports: one record as an HTML page that stands alone, or two compared."""

from __future__ import annotations

from pathlib import Path

__all__ = ["default_comparison_path", "default_report_path", "write_comparison", "write_report"]


def default_report_path(record_path: Path) -> Path:
    """Beside the record, under its name."""
    return record_path.with_suffix(".html")


def default_comparison_path(first: Path, second: Path) -> Path:
    """Beside the second record, under both names."""
    return second.with_name(f"{first.stem}_and_{second.stem}"[:200] + ".html")


def write_report(record_path: str | Path, out_path: str | Path | None = None) -> Path:
    """Write the report of a record, by default beside it; returns its path.

    Raises RecordError for what is no record, for a page that cannot be written, and when the packages of the
    extra `sinkwright[report]` are missing.
    """
    from sinkwright.records.reader import open_record
    from sinkwright.reports.contents import Contents
    from sinkwright.reports.rendering import check_packages, render, write_page

    check_packages()
    record_path = Path(record_path)
    with open_record(record_path) as record:
        contents = Contents.of(record)
    page = render("report.html.j2", simulated=contents.simulated, report=contents)
    return write_page(page, Path(out_path) if out_path else default_report_path(record_path), record_path)


def write_comparison(
    first_path: str | Path, second_path: str | Path, out_path: str | Path | None = None
) -> Path:
    """Write the comparison of two records: what differs between the runs, then their quantities side by side.

    Raises RecordError as `write_report` does.
    """
    from sinkwright.records.reader import open_record
    from sinkwright.reports.comparison import Comparison
    from sinkwright.reports.rendering import check_packages, render, write_page

    check_packages()
    first_path, second_path = Path(first_path), Path(second_path)
    with open_record(first_path) as first, open_record(second_path) as second:
        contents = Comparison.of(first, second)
    page = render("comparison.html.j2", simulated=contents.simulated, comparison=contents)
    path = Path(out_path) if out_path else default_comparison_path(first_path, second_path)
    return write_page(page, path, first_path, second_path)
