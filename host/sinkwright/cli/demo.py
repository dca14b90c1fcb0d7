"""`sinkwright demo`: the main job from end to end on a simulated board, and three commands to go on with."""

from __future__ import annotations

import shlex
import shutil
import sys
import sysconfig
from pathlib import Path
from typing import TYPE_CHECKING

import click

from sinkwright.cli.port_option import json_option

if TYPE_CHECKING:
    from sinkwright.procedures.job import Done
    from sinkwright.procedures.progress import Progress

ITEM = "bench supply 7"
OPERATOR = "demonstration"
_VERDICTS_OF_THE_SUPPLY = (1, 4)
_STORY = """\
Sinkwright shows its job on a simulated load: the shipped firmware runs, as on a microcontroller, and draws
current from a simulated source. Everything below is SIMULATED; nothing real is measured or switched.

The tool library of Tannenried, an invented place, lends out a 12 V bench supply. It came back from repair.
Before it is lent again somebody wants to know: does it hold its voltage, and does its current limit work?
"""


@click.command()
@click.option("--out", type=Path, metavar="DIR", help="Where record and report go. Without it: ~/sinkwright.")
@click.option("--seed", type=click.IntRange(0, 0xFFFF_FFFF), default=1, help="Which simulated board.")
@json_option
@click.pass_context
def demo(ctx: click.Context, out: Path | None, seed: int, as_json: bool) -> None:
    """Measure an invented power supply on a simulated board, from plan to report.

    The exit code is 0 when the demonstration was carried out: its verdicts are about an invented supply.
    `run` leaves with the verdict's own code.
    """
    from sinkwright.cli.output import SilentProgress, TextProgress, print_json, tell_results
    from sinkwright.results import exit_code_of

    if not as_json:
        click.echo(_STORY)
    done = _carry_out(out, seed, SilentProgress() if as_json else TextProgress())
    # What an invented supply is worth is no failure of this command; a run that was stopped is.
    code = exit_code_of(done.result)
    code = 0 if code in _VERDICTS_OF_THE_SUPPLY else code
    if as_json:
        print_json({**done.result.to_json(), "report": None if done.report is None else str(done.report)})
        ctx.exit(code)
    tell_results(done.result)
    _tell_what_it_means()
    _tell_what_next(done)
    ctx.exit(code)


def _carry_out(out: Path | None, seed: int, progress: Progress) -> Done:
    from sinkwright.cli.run import carry_out_here
    from sinkwright.definitions.loading import load_board, load_plan
    from sinkwright.demo import demo_plan_path
    from sinkwright.procedures.job import Job

    url = f"sim:,speed=max,seed={seed}"
    job = Job(load_plan(demo_plan_path()), load_board(), url, out, item=ITEM, operator=OPERATOR)
    return carry_out_here(job, progress)


def _tell_what_it_means() -> None:
    click.echo()
    click.echo(
        "How to read this: a verdict is given only when the whole uncertainty interval lies on one side\n"
        "of a bound. This board has never been calibrated, so its readings are as uncertain as its parts.\n"
        "Where that is too much, the verdict is INCONCLUSIVE, not a guess, and the cheapest remedy is named."
    )


def _tell_what_next(done: Done) -> None:
    from sinkwright.cli.output import tell_files
    from sinkwright.demo import demo_plan_path

    tell_files(done)
    sinkwright = _own_command()
    click.echo()
    click.echo("To go on, copy one of these (they need no activated environment):")
    if done.report is not None:
        click.echo("\n  # open the report\n  " + shlex.join(_opener(done.report)))
    longer = [*sinkwright, "run", str(demo_plan_path()), "--port", "sim:"]
    click.echo("\n  # watch the same plan in real time on the simulated board\n  " + shlex.join(longer))
    own_plan = [*sinkwright, "template", "plan", "load-regulation"]
    click.echo("\n  # write a plan of your own\n  " + shlex.join(own_plan))


def _own_command() -> list[str]:
    """How to start this very installation from anywhere."""
    name = "sinkwright.exe" if sys.platform == "win32" else "sinkwright"
    script = Path(sysconfig.get_path("scripts")) / name
    return [str(script)] if script.exists() else [sys.executable, "-m", "sinkwright"]


def _opener(report: Path) -> list[str]:
    """A command that shows the report: the system's own, else Python's."""
    name = "open" if sys.platform == "darwin" else "xdg-open"
    found = shutil.which(name)
    return [name, str(report)] if found else [sys.executable, "-m", "webbrowser", report.resolve().as_uri()]
