"""`sinkwright ports`: which boards are connected, and which ports were left alone."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING

import click

if TYPE_CHECKING:
    from sinkwright.discovery import Finding


@click.command()
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object instead of text.")
def ports(as_json: bool) -> None:
    """Find boards and say who they are.

    Only ports whose USB identity is that of a board are opened, because opening resets other devices.
    """
    import asyncio

    from sinkwright.discovery import survey

    findings = asyncio.run(survey())
    if as_json:
        click.echo(json.dumps({"ports": [finding.to_json() for finding in findings]}))
        return
    for finding in findings:
        click.echo(_line(finding))
    boards = sum(finding.board is not None for finding in findings)
    if not boards:
        click.echo("No board was found. A simulated one is always there: --port sim:")


def _line(finding: Finding) -> str:
    device = finding.device
    usb = f" [{device.usb}]" if device.usb else ""
    if finding.board is None:
        return f"{device.device}{usb}  {finding.note}"
    told = finding.to_json()["board"]
    return (
        f"{device.device}{usb}  {told['name']}, board {told['board_id']}, "
        f"firmware {told['firmware_version']}; use --port board:{told['name']}"
    )
