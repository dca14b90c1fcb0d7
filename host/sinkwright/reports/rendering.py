"""Fills the templates and puts the page on the disk: one self-contained file, without network or script.

It knows jinja2 and the files beside it, and nothing of what a page says.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

from sinkwright.errors import RecordError
from sinkwright.records.outfile import written_whole

_HERE = Path(__file__).parent
_NEEDED = ("jinja2", "matplotlib")


def check_packages() -> None:
    """Raises RecordError with the way out when the packages of the extra are missing."""
    from importlib.util import find_spec

    missing = [name for name in _NEEDED if find_spec(name) is None]
    if missing:
        raise RecordError(
            f"a report needs packages that are not installed ({', '.join(missing)})",
            remedy="Install them with: pip install 'sinkwright[report]' - the record is complete without.",
        )


def render(template: str, *, simulated: bool, **contents: Any) -> str:
    """The page of a template beside this file; text is escaped, drawings are not."""
    import jinja2

    environment = jinja2.Environment(
        loader=jinja2.FileSystemLoader(_HERE),
        autoescape=True,
        trim_blocks=True,
        lstrip_blocks=True,
        undefined=jinja2.StrictUndefined,
    )
    page = environment.get_template(template).render(css=_css(simulated), **contents)
    return page.strip() + "\n"


def _css(simulated: bool) -> Any:
    import markupsafe

    names = ("report.css", "simulated.css") if simulated else ("report.css",)
    return markupsafe.Markup("".join((_HERE / name).read_text(encoding="utf-8") for name in names))


def write_page(page: str, path: Path, *records: Path) -> Path:
    """Write a page whole. Raises RecordError where that fails, and for a path that is one of the records."""
    with written_whole(path, *records) as file:
        file.write(page.encode("utf-8", "replace"))
    return path
