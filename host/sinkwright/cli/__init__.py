"""The command line: which commands there are, loaded only when they are called, and how errors leave.

Each command stands in a module of its own, named in the table below beside its one-line help, so that
`sinkwright --help` imports click and nothing else. Errors become one paragraph on stderr here, and nowhere
else.
"""

from __future__ import annotations

import importlib
import os
import sys
from collections.abc import Sequence
from typing import Any

import click

from sinkwright import __version__

#: Name, module and attribute, and the help shown in the list.
COMMANDS: dict[str, tuple[str, str]] = {
    "demo": ("sinkwright.cli.demo:demo", "Measure an invented power supply on a simulated board."),
    "run": ("sinkwright.cli.run:run", "Carry out a plan on a load, with record and report."),
    "off": ("sinkwright.cli.off:off", "Turn the load off, whoever holds the board."),
    "resume": ("sinkwright.cli.resume:resume", "Fetch a run that went on without this computer."),
    "records": ("sinkwright.cli.records:records", "List the records of runs."),
    "report": ("sinkwright.cli.report:report", "Write the HTML report of a record."),
    "export": ("sinkwright.cli.export:export", "Write a record's samples as CSV or Parquet."),
    "ports": ("sinkwright.cli.ports:ports", "List the boards that are connected."),
    "simulate": ("sinkwright.cli.simulate:simulate", "Serve a simulated board to other programs."),
    "template": ("sinkwright.cli.template:template", "Write a commented plan, board or source file."),
}


class LazyGroup(click.Group):
    """A group that knows its commands' help, and imports a command when it is called."""

    def list_commands(self, ctx: click.Context) -> list[str]:  # noqa: ARG002  click's signature
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:  # noqa: ARG002
        if cmd_name not in COMMANDS:
            return None
        module, _, attribute = COMMANDS[cmd_name][0].partition(":")
        return getattr(importlib.import_module(module), attribute)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:  # noqa: ARG002
        with formatter.section("Commands"):
            formatter.write_dl([(name, text) for name, (_, text) in COMMANDS.items()])


@click.group(cls=LazyGroup, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="sinkwright", message="%(prog)s %(version)s")
def cli() -> None:
    """A perfboard current sink as an instrument: plans, records, reports, verdicts.

    Exit codes: 0 all passes, 1 a verdict fails, 2 it could not be done, 3 stopped by a protection, 4 nothing
    failed and something is inconclusive, 130 interrupted.
    """


def main(arguments: Sequence[str] | None = None) -> None:
    """Run one command and leave with its exit code."""
    sys.exit(invoke(list(sys.argv[1:] if arguments is None else arguments)))


def invoke(arguments: list[str]) -> int:
    """Run one command and return its exit code; every error has been told by then."""
    try:
        code = cli.main(arguments, prog_name="sinkwright", standalone_mode=False)
    except BrokenPipeError:
        # Whoever read the output has gone, as `| head` does: nothing is left to tell, and a run ended early.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 2
    except BaseException as error:
        return _tell(error, as_json="--json" in arguments)
    return code if isinstance(code, int) else 0


def _tell(error: BaseException, *, as_json: bool) -> int:
    """Tell an error as one paragraph (and as JSON on stdout where asked for), and return its exit code."""
    from sinkwright.errors import SinkwrightError

    if isinstance(error, SystemExit):
        return error.code if isinstance(error.code, int) else 2
    if isinstance(error, SinkwrightError):
        return _show(str(error), error.to_json(), error.exit_code, as_json)
    if isinstance(error, click.ClickException):
        text = _usage(error)
        return _show(text, {"error": error.format_message()}, 2, as_json)
    if isinstance(error, (KeyboardInterrupt, click.Abort)):
        return _show("Stopped.", {"error": "interrupted"}, 130, as_json)
    return _show(_unexpected(error), {"error": f"{type(error).__name__}: {error}"}, 2, as_json)


def _show(text: str, data: dict[str, Any], code: int, as_json: bool) -> int:
    if as_json:
        import json

        click.echo(json.dumps({**data, "exit_code": code}, ensure_ascii=False))
    click.echo(text, err=True)
    return code


def _usage(error: click.ClickException) -> str:
    message = error.format_message()
    if isinstance(error, click.UsageError) and error.ctx is not None:
        return f"{message} No load was touched. `{error.ctx.command_path} --help` tells what is possible."
    return f"{message} No load was touched."


def _unexpected(error: BaseException) -> str:
    if os.environ.get("SINKWRIGHT_TRACEBACK"):
        import traceback

        return "".join(traceback.format_exception(error)).rstrip()
    return (
        f"Something went wrong that should not have: {type(error).__name__}: {error}. A load under this "
        "command was "
        "told to turn off, and its board does so by itself when this program has ended. Set "
        "SINKWRIGHT_TRACEBACK=1 "
        "and repeat it to see where, and please report that."
    )
