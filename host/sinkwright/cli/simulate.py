"""`sinkwright simulate`: a simulated board behind a pseudo-terminal or a TCP port, for other programs."""

from __future__ import annotations

import math
import signal
from contextlib import closing
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from sinkwright.cli.port_option import json_option

if TYPE_CHECKING:
    from sinkwright.simulator.listeners import Listener


class Speed(click.ParamType):
    """A factor on the wall clock, or `max`."""

    name = "speed"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        if value == "max":
            return math.inf
        try:
            speed = float(value)
        except ValueError:
            speed = math.nan
        if not 0 < speed < math.inf:
            self.fail(f"{value!r} is no speed: write max, or a number above 0 (1 is real time).", param, ctx)
        return speed


@click.command()
@click.option("--source", type=Path, metavar="FILE", help="The source to simulate. Without it: the demo's.")
@click.option("--board", type=Path, metavar="FILE", help="The board file. Without it: the shipped one.")
@click.option("--speed", type=Speed(), default="1", metavar="N|max", help="1, the default, is real time.")
@click.option(
    "--seed",
    type=click.IntRange(0, 0xFFFF_FFFF),
    default=1,
    show_default=True,
    help="Which board: the errors of its parts follow from it.",
)
@click.option("--store", type=Path, metavar="FILE", help="Keeps what the board remembers between two starts.")
@click.option("--listen", default="pty", metavar="pty|tcp:PORT", help="Where to serve it (default pty).")
@json_option
@click.pass_context
def simulate(
    ctx: click.Context,
    source: Path | None,
    board: Path | None,
    speed: float,
    seed: int,
    store: Path | None,
    listen: str,
    as_json: bool,
) -> None:
    """Serve a simulated board to other programs until Ctrl-C.

    The first line printed is the URL to open. The board runs the shipped firmware; its clock follows the wall
    clock times the speed, and above speed 1 it waits for the next request after half the silence limit.
    """
    from sinkwright.definitions import load_board, load_source
    from sinkwright.demo import demo_source_path
    from sinkwright.simulator.launcher import SimulatedBoard
    from sinkwright.simulator.listeners import open_listener
    from sinkwright.simulator.serve import Server

    source_path = source or demo_source_path()
    source_file, board_file = load_source(source_path), load_board(board)
    try:
        with (
            closing(open_listener(listen)) as listener,
            closing(SimulatedBoard.start(source_file, board_file, seed, store)) as simulated,
        ):
            # The firmware boots within this, so that a board that cannot start gives away no URL.
            simulated.exchange(b"", 0)
            facts = {
                "url": listener.url,
                "simulated": True,
                "board": board_file.name,
                "source": str(source_path),
                "seed": seed,
                "speed": "max" if math.isinf(speed) else speed,
                "interpreter": simulated.interpreter,
            }
            # SIGTERM ends it as Ctrl-C does.
            signal.signal(signal.SIGTERM, signal.default_int_handler)
            _tell(listener, facts, as_json)
            Server(simulated, listener, speed, round(board_file.limits.host_silence_s * 1e6)).run()
    except KeyboardInterrupt:
        click.echo("Stopped: the simulated board is gone.", err=True)
        ctx.exit(130)


def _tell(listener: Listener, facts: dict[str, Any], as_json: bool) -> None:
    """The URL first and alone on its line, so that a script can read it; the rest is for people."""
    if as_json:
        import json

        click.echo(json.dumps(facts | ({"note": listener.note} if listener.note else {}), ensure_ascii=False))
    else:
        click.echo(listener.url)
        click.echo(
            f"SIMULATED board {facts['board']} with {facts['source']}, seed {facts['seed']}, "
            f"speed {facts['speed']}, firmware run by {facts['interpreter']}. Ctrl-C ends it.",
            err=True,
        )
    if listener.note:
        click.echo(listener.note, err=True)
