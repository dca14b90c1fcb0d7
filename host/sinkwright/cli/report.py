"""`sinkwright report`: the HTML page of one record, or the comparison of two."""

from __future__ import annotations

from pathlib import Path

import click

from sinkwright.cli.port_option import json_option
from sinkwright.cli.record_path import find_record


@click.command()
@click.argument("record_paths", metavar="RECORD [RECORD]", nargs=-1, type=Path)
@click.option("--out", type=Path, metavar="FILE", help="Where the page goes. Without it: beside the record.")
@json_option
def report(record_paths: tuple[Path, ...], out: Path | None, as_json: bool) -> None:
    """Write the HTML report of a record; of two records, a comparison.

    A record is a file, or the name of one in ~/sinkwright.
    """
    if not 1 <= len(record_paths) <= 2:
        raise click.UsageError("One record makes a report and two a comparison; name one or two.")
    from sinkwright.records import open_record

    paths = [find_record(path) for path in record_paths]
    facts = []
    for path in paths:
        with open_record(path) as record:
            facts.append((record.verdict, record.header.simulated, record.unfinished))
    page = _write(paths, out)
    notices = [
        f"{path}: {unfinished}." for path, (_, _, unfinished) in zip(paths, facts, strict=True) if unfinished
    ]
    if as_json:
        from sinkwright.cli.output import print_json

        print_json({
            "report": str(page),
            "records": [str(path) for path in paths],
            "verdicts": [verdict for verdict, _, _ in facts],
            "simulated": any(simulated for _, simulated, _ in facts),
            "notices": notices,
        })  # fmt: skip
        return
    for notice in notices:
        click.echo(f"Take care: {notice}", err=True)
    mark = "SIMULATED. " if any(simulated for _, simulated, _ in facts) else ""
    click.echo(f"{mark}{'Report' if len(paths) == 1 else 'Comparison'}: {page}")


def _write(paths: list[Path], out: Path | None) -> Path:
    from sinkwright import reports

    if len(paths) == 1:
        usual = reports.default_report_path(paths[0])
        return reports.write_report(paths[0], _page_path(out, usual))
    usual = reports.default_comparison_path(*paths)
    return reports.write_comparison(paths[0], paths[1], _page_path(out, usual))


def _page_path(out: Path | None, usual: Path) -> Path:
    """The file asked for; in a folder asked for, the usual name."""
    if out is None:
        return usual
    return out / usual.name if out.is_dir() else out
