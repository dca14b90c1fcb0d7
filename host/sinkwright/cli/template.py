"""`sinkwright template`: a commented file to begin with."""

from __future__ import annotations

import difflib
from pathlib import Path

import click

from sinkwright.errors import FileError
from sinkwright.templates import kinds
from sinkwright.templates import template as text_of

_FIRST = {"plan": "load-regulation", "source": "supply"}


@click.command()
@click.argument("family", type=click.Choice(["plan", "board", "source"]))
@click.argument("kind", required=False)
@click.option("--out", type=click.Path(path_type=Path), help="Write to this file instead of stdout.")
@click.option("--force", is_flag=True, help="Overwrite the file if it exists.")
def template(family: str, kind: str | None, out: Path | None, force: bool) -> None:
    """Write a commented file of that kind: a plan, a board file, or a simulated source.

    A plan's KIND is load-regulation (default), current-limit, hold or rest; a source's is supply (default),
    cell or curve.
    """
    text = text_of(family, _checked(family, kind))
    if out is None:
        click.echo(text, nl=False)
        return
    _write(out, text, force)
    click.echo(f"Wrote {out}", err=True)


def _checked(family: str, kind: str | None) -> str:
    known = kinds(family)
    if kind is None:
        return _FIRST.get(family, "")
    if not known:
        raise FileError(f"a {family} has no kinds, but {kind} was asked for", remedy=f"Leave {kind} out.")
    if kind not in known:
        close = difflib.get_close_matches(kind, known, n=1)
        meant = f"Did you mean {close[0]}? " if close else ""
        raise FileError(
            f"there is no {family} template {kind}", remedy=f"{meant}There are {', '.join(known)}."
        )
    return kind


def _write(out: Path, text: str, force: bool) -> None:
    try:
        with out.open("w" if force else "x", encoding="utf-8", newline="\n") as file:
            file.write(text)
    except FileExistsError:
        raise FileError("the file exists", where=str(out), remedy="Name another, or add --force.") from None
    except OSError as error:
        reason = error.strerror or str(error)
        raise FileError(
            f"the file cannot be written ({reason})", where=str(out), remedy="Name a place that can be."
        ) from error
