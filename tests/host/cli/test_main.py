"""The command line as a whole: its table of commands, and how errors leave it."""

from __future__ import annotations

import subprocess
import sys

import click
import pytest

import sinkwright
from sinkwright.cli import COMMANDS, cli, invoke
from sinkwright.errors import LinkLost
from tests.host.cli.calling import assert_one_paragraph, call, environment

HEAVY = ("asyncio", "msgspec", "construct", "serial", "sqlite3", "numpy", "matplotlib", "json")


def test_help_lists_every_command():
    shown = call("--help").stdout
    assert all(f"  {name} " in shown for name in COMMANDS)


def test_help_imports_click_and_nothing_heavier():
    code = f"import sys; {{}}; print([name for name in {HEAVY!r} if name in sys.modules], file=sys.stderr)"
    ours = "from sinkwright.cli import invoke; invoke(['--help'])"
    assert _stderr_of(code.format(ours)) == _stderr_of(code.format("import click"))


def _stderr_of(code: str) -> str:
    arguments = [sys.executable, "-c", code]
    return subprocess.run(arguments, capture_output=True, text=True, env=environment(), check=True).stderr


@pytest.mark.parametrize("name", COMMANDS)
def test_each_command_of_the_table_is_there_and_has_help(name):
    command = cli.get_command(click.Context(cli), name)
    assert isinstance(command, click.Command)
    assert command.name == name
    assert command.help


def test_the_version_is_that_of_the_package():
    assert call("--version").stdout == f"sinkwright {sinkwright.__version__}\n"


def test_an_unknown_command_is_one_paragraph_and_2():
    done = call("rune")
    assert done.returncode == 2
    assert_one_paragraph(done)
    assert "No load was touched." in done.stderr


@pytest.fixture
def failing(monkeypatch):
    """A command that fails with the error given."""

    def prepare(error: BaseException) -> None:
        @click.command()
        @click.option("--json", "as_json", is_flag=True)
        def fail(as_json: bool) -> None:
            raise error

        monkeypatch.setattr(cli, "get_command", lambda ctx, name: fail)

    return prepare


def test_an_error_of_ours_leaves_with_its_own_code(failing, capsys):
    failing(LinkLost("gone"))
    assert invoke(["run"]) == 2
    told = capsys.readouterr()
    assert told.out == ""
    assert told.err == "gone. No load was touched.\n"


def test_with_json_an_error_is_one_object_on_stdout(failing, capsys):
    failing(LinkLost("gone", where="sim:", remedy="Look at the cable."))
    assert invoke(["run", "--json"]) == 2
    assert capsys.readouterr().out == (
        '{"error": "gone", "where": "sim:", "load": "No load was touched.", '
        '"remedy": "Look at the cable.", "exit_code": 2}\n'
    )


def test_an_unexpected_error_is_one_paragraph_that_tells_how_to_see_more(failing, capsys, monkeypatch):
    monkeypatch.delenv("SINKWRIGHT_TRACEBACK", raising=False)
    failing(ZeroDivisionError("division by zero"))
    assert invoke(["run"]) == 2
    told = capsys.readouterr().err
    assert "Traceback" not in told
    assert "SINKWRIGHT_TRACEBACK=1" in told
    assert len(told.splitlines()) == 1


def test_the_traceback_is_shown_when_asked_for(failing, capsys, monkeypatch):
    monkeypatch.setenv("SINKWRIGHT_TRACEBACK", "1")
    failing(ZeroDivisionError("division by zero"))
    assert invoke(["run"]) == 2
    assert "Traceback" in capsys.readouterr().err


def test_ctrl_c_outside_a_run_leaves_with_130(failing):
    failing(KeyboardInterrupt())
    assert invoke(["run"]) == 130
