"""`sinkwright resume`: fetches a run that went on or ended without a host, and finishes its record and report."""

from __future__ import annotations

import asyncio
from pathlib import Path
from typing import TYPE_CHECKING

import click

from sinkwright.cli.port_option import json_option, port_option

if TYPE_CHECKING:
    from sinkwright.procedures.resuming import Resumed


@click.command()
@click.argument("record_path", metavar="[RECORD]", required=False, type=Path)
@port_option
@json_option
@click.pass_context
def resume(ctx: click.Context, record_path: Path | None, url: str | None, as_json: bool) -> None:
    """Fetch a run that went on or ended without this computer; finish its record and report.

    Without RECORD, the record in ~/sinkwright that names the board's run. The load is neither turned on nor off.
    """
    from sinkwright.cli.output import print_json, tell_files, tell_results
    from sinkwright.procedures.job import Done
    from sinkwright.results import exit_code_of

    resumed = asyncio.run(_resume(url, record_path))
    if as_json:
        print_json({
            **resumed.result.to_json(),
            "report": str(resumed.report),
            "board_log_entries": resumed.entries,
            "sentence": resumed.words,
        })  # fmt: skip
    else:
        click.echo(resumed.words)
        tell_results(resumed.result)
        tell_files(Done(resumed.result, resumed.record, resumed.report))
    ctx.exit(exit_code_of(resumed.result))


async def _resume(url: str | None, record_path: Path | None) -> Resumed:
    from sinkwright.cli.record_path import find_record
    from sinkwright.instrument import Instrument
    from sinkwright.procedures.resuming import resume as fetch
    from sinkwright.records import default_folder

    path = find_record(record_path) if record_path else None
    async with await Instrument.open(url, watch=True) as load:
        return await fetch(load, default_folder(), path)
