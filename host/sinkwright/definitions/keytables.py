"""Writes the key tables of the how-to pages from the declarations, and checks that they are not stale.

`python -m sinkwright.definitions.keytables [--check] [FOLDER]`: replaces what stands between
`<!-- keys: NAME -->` and `<!-- end of keys -->` in every page of the folder. Decides how a table looks; what
stands in it is declared in plan, board and source.
"""

from __future__ import annotations

import re
import sys
from collections.abc import Iterator
from pathlib import Path

import msgspec
import msgspec.inspect as mi

from . import plan, source
from .board import BoardFile
from .explain import bare, facts, join, shown, visible_fields

DOCS = Path(__file__).parents[2] / "docs"
_MARKED = re.compile(r"(<!-- keys: (?P<name>[^>]+?) -->\n).*?(<!-- end of keys -->)", re.DOTALL)
_HEAD = "| Key | Unit | Default | Range | Meaning |\n|---|---|---|---|---|\n"


def fill(page: str) -> str:
    """The page with every marked table written anew. Raises KeyError for an unknown name."""
    tables = all_tables()
    return _MARKED.sub(lambda found: f"{found[1]}\n{tables[found['name']]}\n{found[3]}", page)


def all_tables() -> dict[str, str]:
    """Tables by the names that pages use."""
    shared = set(visible_fields(_struct(plan.Test)))
    leads = set(visible_fields(_struct(source.Source)))
    tables = {
        "plan": _table(_struct(plan.Plan), leave_out={"source", "limits", "test"}),
        "plan source": _table(_struct(plan.SourceUnderTest)),
        "plan limits": _table(_struct(plan.PlanLimits)),
        "plan test": _table(_struct(plan.Test)),
        "plan bounds": _table(_struct(plan.Bounds)),
        "source leads": _table(_struct(source.Source)),
        "board": "".join(_board_tables(_struct(BoardFile))),
    }
    for kind, cls in plan.KINDS.items():
        accepted = "Quantities for `accept`: " + ", ".join(f"`{name}`" for name in cls.QUANTITIES) + ".\n"
        tables[f"plan {kind}"] = _table(_struct(cls), leave_out=shared) + "\n" + accepted
    for kind, cls in source.KINDS.items():
        tables[f"source {kind}"] = _table(_struct(cls), leave_out=leads)
    return tables


def stale_pages(folder: Path) -> list[Path]:
    """Pages whose tables differ from the declarations."""
    return [page for page in sorted(folder.glob("*.md")) if fill(_read(page)) != _read(page)]


def main(arguments: list[str]) -> int:
    """0 when all is well (or was made so), 1 when `--check` finds a stale page, 2 without pages."""
    folders = [Path(word) for word in arguments if word != "--check"]
    folder = folders[0] if folders else DOCS
    if not any(folder.glob("*.md")):
        print(f"There are no pages in {folder}: run this in a checkout, or name the folder.", file=sys.stderr)  # noqa: T201
        return 2
    stale = stale_pages(folder)
    for page in stale:
        if "--check" in arguments:
            print(f"{page}: the key tables are stale. Run `python -m sinkwright.definitions.keytables`.")  # noqa: T201
        else:
            page.write_text(fill(_read(page)), encoding="utf-8", newline="\n")
    return 1 if stale and "--check" in arguments else 0


def _struct(cls: type[msgspec.Struct]) -> mi.StructType:
    declared = mi.type_info(cls)
    assert isinstance(declared, mi.StructType)
    return declared


def _board_tables(declared: mi.StructType, path: str = "") -> Iterator[str]:
    tables = {key: field for key, field in visible_fields(declared).items() if _is_table(field)}
    yield (
        _table(declared, leave_out=set(tables)) + "\n" if len(tables) < len(visible_fields(declared)) else ""
    )
    for key, field in tables.items():
        inner = bare(field.type)
        assert isinstance(inner, mi.StructType)
        name = join(path, key)
        yield f"`[{name}]`: {_first_line(inner)}\n\n"
        yield from _board_tables(inner, name)


def _is_table(field: mi.Field) -> bool:
    return isinstance(bare(field.type), mi.StructType)


def _first_line(declared: mi.StructType) -> str:
    text = (declared.cls.__doc__ or "").split("\n")[0]
    return text if text[1:2].isupper() else text[:1].lower() + text[1:]


def _table(declared: mi.StructType, leave_out: set[str] | None = None) -> str:
    fields = visible_fields(declared)
    return _HEAD + "".join(_row(key, fields[key]) for key in fields if key not in (leave_out or ()))


def _row(key: str, field: mi.Field) -> str:
    noted = facts(field.type)
    cells = (
        f"`{key}`",
        str(noted.get("unit", "")),
        _default(field),
        _range(bare(field.type)),
        str(noted.get("description", "")),
    )
    return "| " + " | ".join(cells) + " |\n"


def _default(field: mi.Field) -> str:
    if field.required:
        return "required"
    if "default_text" in facts(field.type) and field.default in (None, msgspec.NODEFAULT, ()):
        return str(facts(field.type)["default_text"])
    if field.default == "":
        return "none"
    if field.name == "address":
        return f"0x{field.default:02x}"
    if isinstance(bare(field.type), mi.FloatType) and isinstance(field.default, float):
        return f"{field.default:.10g}"
    return shown(field.default).strip('"')


def _range(declared: mi.Type) -> str:
    if isinstance(declared, mi.LiteralType):
        return ", ".join(f"`{value}`" for value in declared.values)
    if isinstance(declared, mi.BoolType):
        return "`true`, `false`"
    if isinstance(declared, (mi.FloatType, mi.IntType)):
        bounds = ((">", declared.gt), ("≥", declared.ge), ("≤", declared.le))
        return ", ".join(f"{sign} {bound:.10g}" for sign, bound in bounds if bound is not None)
    return ""


def _read(page: Path) -> str:
    return page.read_text(encoding="utf-8")


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
