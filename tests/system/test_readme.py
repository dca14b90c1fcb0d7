"""The README's two commands, and what CI runs, are one text."""

from __future__ import annotations

import re
import shutil
import subprocess
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]


def shell_blocks() -> list[str]:
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    return re.findall(r"^```sh\n(.*?)^```", text, flags=re.MULTILINE | re.DOTALL)


def test_the_readme_has_two_commands_of_one_line_each() -> None:
    demo, tests = shell_blocks()
    assert [block.count("\n") for block in (demo, tests)] == [1, 1]
    assert demo.rstrip().endswith("sinkwright demo")
    assert tests.rstrip().endswith("-m pytest")


def test_ci_runs_the_readmes_own_test_command() -> None:
    lines = (ROOT / ".ci" / "run").read_text(encoding="utf-8").splitlines()
    assert shell_blocks()[1].strip() in lines


def test_the_job_stands_in_the_first_paragraph() -> None:
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    assert text.splitlines()[0] == "# Sinkwright"
    assert "DC power sources" in text.split("\n\n")[1]


@pytest.mark.parametrize(
    "page", sorted([*ROOT.glob("*.md"), *ROOT.glob("host/docs/*.md")]), ids=lambda page: page.name
)
def test_links_between_the_pages_lead_somewhere(page: Path) -> None:
    for target in re.findall(r"\]\(([^)#]+)[^)]*\)", page.read_text(encoding="utf-8")):
        if not target.startswith(("http:", "https:")):
            assert (page.parent / target).exists(), f"{page.name} -> {target}"


def test_no_file_holds_a_path_of_one_machine() -> None:
    git = shutil.which("git")
    if git is None or not (ROOT / ".git").exists():
        tracked = [path for path in ROOT.rglob("*") if path.is_file() and ".venv" not in path.parts]
    else:
        listed = subprocess.run([git, "ls-files"], cwd=ROOT, capture_output=True, text=True, check=True)
        tracked = [ROOT / name for name in listed.stdout.splitlines()]
    machine_paths = re.compile("/" + "root/|/" + "work/|/home/[a-z]+/")
    for path in tracked:
        if path.suffix in (".py", ".md", ".toml", ".json", ".html", "") and path.exists():
            text = path.read_text(encoding="utf-8", errors="replace")
            assert not machine_paths.search(text), path
