"""`sinkwright records`: what has been recorded, and which files of the folder cannot be read."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from sinkwright.cli.port_option import json_option

if TYPE_CHECKING:
    from sinkwright.records.listing import Listed


@click.command()
@click.option("--item", metavar="LABEL", help="Only the records of this item.")
@click.option("--in", "folder", type=Path, metavar="DIR", help="Where they lie. Without it: ~/sinkwright.")
@json_option
def records(item: str | None, folder: Path | None, as_json: bool) -> None:
    """List the records of runs, oldest first."""
    from sinkwright.records.listing import list_records
    from sinkwright.records.naming import default_folder

    where = folder or default_folder()
    none_yet = folder is None and not where.exists()
    listed, unreadable = ([], []) if none_yet else list_records(where, item)
    if as_json:
        from sinkwright.cli.output import print_json

        print_json({
            "folder": str(where),
            "records": [one.to_json() for one in listed],
            "unreadable": [error.to_json() for error in unreadable],
        })  # fmt: skip
        return
    _tell(listed, where, item)
    for error in unreadable:
        click.echo(f"Not listed: {error}", err=True)


def _tell(listed: list[Listed], where: Path, item: str | None) -> None:
    if not listed:
        of_item = f" of item {item!r}" if item is not None else ""
        click.echo(f"No record{of_item} in {where}.")
        return
    click.echo(f"In {where}:")
    for one in listed:
        mark = "SIMULATED  " if one.simulated else ""
        unfinished = "  (not finished)" if one.state == "open" else ""
        click.echo(
            f"  {one.started_utc[:10]} {one.started_utc[11:16]} UTC  {one.verdict:<12}  {mark}"
            f"{one.item or 'no label'}, plan {one.plan}, board {one.board}{unfinished}"
        )
        click.echo(f"    {Path(one.path).name}")
