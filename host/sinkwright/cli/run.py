"""`sinkwright run`: carries out a plan, or only tells what it would draw, heat and take."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from sinkwright.cli.port_option import json_option, port_option

if TYPE_CHECKING:
    from sinkwright.definitions.board import BoardFile
    from sinkwright.definitions.plan import Plan
    from sinkwright.procedures.job import Done, Job
    from sinkwright.procedures.progress import Progress


@click.command()
@click.argument("plan_path", metavar="PLAN.toml", type=Path)
@port_option
@click.option("--out", type=Path, metavar="DIR", help="Where record and report go. Without it: ~/sinkwright.")
@click.option("--item", default="", metavar="LABEL", help="What is tested: a label of your own.")
@click.option("--operator", default="", metavar="NAME", help="Who tests it.")
@click.option("--board", "board_path", type=Path, metavar="BOARD.toml", help="The board's own file.")
@click.option("--check", is_flag=True, help="Only tell what the plan would draw, heat and take.")
@json_option
@click.option(
    "--events", is_flag=True, help="Print what goes on as JSON, one object a line; the result is last."
)
@click.pass_context
def run(
    ctx: click.Context,
    plan_path: Path,
    url: str | None,
    out: Path | None,
    item: str,
    operator: str,
    board_path: Path | None,
    check: bool,
    as_json: bool,
    events: bool,
) -> None:
    """Carry out a plan on a load, and keep a record and a report of it.

    Ctrl-C turns the load off at any time. The exit code tells the verdict: see `sinkwright --help`.
    """
    from sinkwright.definitions.loading import load_plan

    plan = load_plan(plan_path)
    board = _board_for(url, board_path)
    if check:
        _check(plan, board, as_json or events)
        return
    from sinkwright.procedures.job import Job

    job = Job(plan, board, url, out, item, operator)
    ctx.exit(carry_out_and_tell(job, as_json=as_json, events=events))


def carry_out_and_tell(job: Job, *, as_json: bool, events: bool) -> int:
    """Carry out a job with its progress shown and its results printed; returns the exit code."""
    from sinkwright.cli.output import (
        LineProgress,
        SilentProgress,
        TextProgress,
        print_json,
        tell_files,
        tell_results,
    )
    from sinkwright.results import exit_code_of

    progress = LineProgress() if events else SilentProgress() if as_json else TextProgress()
    done = carry_out_here(job, progress)
    if as_json or events:
        print_json(done.result.to_json())
    else:
        tell_results(done.result)
        tell_files(done)
    return exit_code_of(done.result)


def carry_out_here(job: Job, progress: Progress) -> Done:
    """Carry out a job in this process, with the signals of a terminal."""
    import asyncio

    from sinkwright.cli.signals import stopping_on_signals
    from sinkwright.procedures.job import carry_out
    from sinkwright.stopping import StopRequest

    stop = StopRequest()
    try:
        with stopping_on_signals(stop, lambda: progress.sinking):
            return asyncio.run(carry_out(job, progress, stop))
    except BaseException:
        if progress.kept is not None:
            click.echo(f"What was measured is kept in {progress.kept.record}", err=True)
        raise


def _board_for(url: str | None, board_path: Path | None) -> BoardFile:
    """The board file that was named, else the simulated board's own, else the shipped one."""
    from sinkwright.definitions.loading import load_board
    from sinkwright.transport.urls import SimulatedUrl, parse_url

    if board_path is None and url is not None:
        parsed = parse_url(url)
        if isinstance(parsed, SimulatedUrl):
            board_path = parsed.board
    return load_board(board_path)


def _check(plan: Plan, board: BoardFile, as_json: bool) -> None:
    from sinkwright.cli.output import print_json
    from sinkwright.procedures.expectation import spell_time
    from sinkwright.procedures.preflight import preflight

    expected = preflight(plan, board)
    if as_json:
        print_json({"plan": plan.name, "board": board.name, **expected.to_json()})
        return
    click.echo(f"Plan {plan.name} on the board {board.name}. Nothing was drawn; this is what a run would do:")
    for number, sentence in enumerate(expected.sentences(), start=1):
        click.echo(f"  {number}. {sentence}")
    click.echo(f"  In all about {spell_time(expected.duration_s)}.")
    for warning in expected.warnings:
        click.echo(f"  Note: {warning}")
