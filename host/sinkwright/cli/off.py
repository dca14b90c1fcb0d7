"""`sinkwright off`: turns the load off, whoever holds the board, and says what is seen afterwards."""

from __future__ import annotations

import asyncio
from typing import TYPE_CHECKING

import click

from sinkwright.cli.port_option import json_option, port_option

if TYPE_CHECKING:
    from sinkwright.readings import LoadStatus

#: The gate is clamped within one control step; a reading that shows it needs a few more.
LOOK_s = 0.1
#: More than this with the gate clamped is current that the board does not control.
FLOWING_A = 0.1


@click.command()
@port_option
@json_option
@click.pass_context
def off(ctx: click.Context, url: str | None, as_json: bool) -> None:
    """Turn the load off, at once and without asking, whoever holds the board."""
    from sinkwright.cli.output import print_json

    name, simulated, status = asyncio.run(_turn_off(url))
    flowing = is_flowing(status)
    words = in_words(status)
    if as_json:
        print_json(
            {
                "board": name,
                "simulated": simulated,
                "off": not flowing,
                "current_A": status.current_A,
                "voltage_V": status.voltage_V,
                "sentence": words,
            }
        )
    else:
        click.echo(f"{'SIMULATED ' if simulated else ''}{name}: {words}")
    ctx.exit(3 if flowing else 0)


async def _turn_off(url: str | None) -> tuple[str, bool, LoadStatus]:
    from sinkwright.instrument import Instrument

    async with await Instrument.open(url, watch=True) as load:
        await load.off()
        await load.pause(LOOK_s)
        return load.identity.name, load.identity.simulated, await load.status()


def is_flowing(status: LoadStatus) -> bool:
    """Whether current flows that the clamped gate does not stop."""
    from sinkwright.readings import NOT_STOPPED_BY_OFF

    return status.current_A > FLOWING_A or status.fault in NOT_STOPPED_BY_OFF


def in_words(status: LoadStatus) -> str:
    """What the load is doing after it was told to turn off; never "off" while current flows all the same."""
    if status.current_A > FLOWING_A:
        return f"{status.current_A:.3f} A flow although the load is off: pull the source lead now."
    return status.in_words
