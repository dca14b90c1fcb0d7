"""The options that several commands share: which board, and JSON output."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import click

Command = Callable[..., Any]


def port_option(command: Command) -> Command:
    """`--port URL`; without it the only board found is used, and never the simulated one."""
    return click.option(
        "--port",
        "url",
        metavar="URL",
        help="A device path, a serial URL, board:NAME, tcp:HOST:PORT, or "
        "sim:[SOURCE.toml][,speed=max][,seed=1]. Without it: the only board found.",
    )(command)


def json_option(command: Command) -> Command:
    """`--json`: stdout carries one JSON object and nothing else."""
    return click.option("--json", "as_json", is_flag=True, help="Print one JSON object instead of text.")(
        command
    )
