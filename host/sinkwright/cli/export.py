"""`sinkwright export`: a record's samples as CSV or Parquet."""

from __future__ import annotations

import sys
from pathlib import Path

import click

from sinkwright.cli.port_option import json_option
from sinkwright.cli.record_path import find_record


@click.command()
@click.argument("record_path", metavar="RECORD", type=Path)
@click.option("--to", "to", type=Path, required=True, metavar="FILE.{csv,parquet}", help="The file to write.")
@json_option
def export(record_path: Path, to: Path, as_json: bool) -> None:
    """Write a record's samples as CSV or Parquet, in SI units with UTC times.

    A record is a file, or the name of one in ~/sinkwright.
    """
    from sinkwright.records import open_record
    from sinkwright.records.export import export as write

    with open_record(find_record(record_path)) as record:
        total, simulated, unfinished = record.sample_count, record.header.simulated, record.unfinished
        quiet = not sys.stderr.isatty()
        with click.progressbar(length=total, label="Exporting", file=sys.stderr, hidden=quiet) as bar:
            count = write(record, to, lambda done: bar.update(done - bar.pos))
    if as_json:
        from sinkwright.cli.output import print_json

        print_json({
            "export": str(to),
            "record": str(record.path),
            "samples": count,
            "simulated": simulated,
            "notices": [f"{record.path}: {unfinished}."] if unfinished else [],
        })  # fmt: skip
        return
    if unfinished:
        click.echo(f"Take care: {record.path}: {unfinished}.", err=True)
    click.echo(f"{'SIMULATED. ' if simulated else ''}{count} samples: {to}")
