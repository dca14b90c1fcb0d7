"""Imports point one way. Read from the sources themselves, so that nothing has to be imported to find out."""

from __future__ import annotations

import ast
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
HOST = ROOT / "host" / "sinkwright"
FIRMWARE = ROOT / "firmware"

#: From the ground up: a layer imports itself and what stands before it, never what stands after it.
LAYERS = (
    ("errors", "stopping", "units", "results", "sample", "thermistor", "wire_units", "firmware_files"),
    ("demo", "templates"),
    ("definitions", "uncertainty"),
    ("board_image", "guard_image", "records", "refusals", "readings", "board_run"),
    ("simulator", "reports"),
    ("transport", "last_known"),
    ("link_failures", "traffic", "link"),
    ("discovery",),
    ("instrument", "runner"),
    ("programs",),
    ("blocking",),
    ("procedures",),
    ("cli", "__main__"),
)
LEVEL = {name: level for level, names in enumerate(LAYERS) for name in names}

#: These compute and keep; none of them may know a device.
WITHOUT_DEVICES = ("results", "records", "reports", "uncertainty", "definitions", "units", "board_image")
DEVICE_CODE = {"transport", "link", "instrument", "blocking", "procedures", "simulator", "serial", "cli"}

#: Costly imports, allowed inside functions only.
LAZY = {"numpy", "scipy", "matplotlib", "jinja2", "pyarrow", "GTC", "textual"}

#: What the firmware may import besides its own files.
MICROPYTHON = {"array", "binascii", "errno", "gc", "io", "json", "micropython", "struct", "sys"}
BOARD_ONLY = {"machine", "os", "select", "time"}


def sources(folder: Path) -> list[Path]:
    return sorted(path for path in folder.rglob("*.py") if "board_side" not in path.parts)


def imports(path: Path, *, top_level_only: bool = False) -> Iterator[str]:
    """Dotted names that `path` imports; relative imports as written from the package's root."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    nodes = tree.body if top_level_only else list(ast.walk(tree))
    for node in nodes:
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.level:
            root = HOST.parent if HOST in path.parents else ROOT / "protocol"
            package = path.relative_to(root).parts[: -node.level]
            base = ".".join((*package, *([node.module] if node.module else [])))
            yield base
            yield from (f"{base}.{alias.name}" for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module:
            yield node.module
            yield from (f"{node.module}.{alias.name}" for alias in node.names)


def part_of(path: Path) -> str:
    return path.relative_to(HOST).with_suffix("").parts[0]


def parts_imported(path: Path) -> set[str]:
    return {
        name.split(".")[1]
        for name in imports(path)
        if name.startswith("sinkwright.") and name.split(".")[1] in LEVEL
    }


def test_every_part_of_the_host_has_its_layer() -> None:
    parts = {part_of(path) for path in sources(HOST)} - {"__init__"}
    assert parts <= set(LEVEL), f"not in a layer yet: {sorted(parts - set(LEVEL))}"


@pytest.mark.parametrize("path", sources(HOST), ids=lambda path: str(path.relative_to(HOST)))
def test_a_file_imports_nothing_from_above_its_layer(path: Path) -> None:
    part = part_of(path)
    if part == "__init__":
        return  # the package's face: its two names are imported when they are used
    above = {name for name in parts_imported(path) if LEVEL[name] > LEVEL[part]}
    assert not above, f"{part} is below {sorted(above)}"


@pytest.mark.parametrize("part", WITHOUT_DEVICES)
def test_what_computes_and_keeps_knows_no_device(part: str) -> None:
    for path in sources(HOST):
        if part_of(path) == part:
            assert not parts_imported(path) & DEVICE_CODE, path


def test_click_stands_under_the_command_line_only() -> None:
    for path in sources(HOST):
        if part_of(path) not in ("cli", "__main__"):
            assert "click" not in {name.split(".")[0] for name in imports(path)}, path


@pytest.mark.parametrize("path", sources(HOST), ids=lambda path: str(path.relative_to(HOST)))
def test_costly_libraries_are_imported_where_they_are_used(path: Path) -> None:
    assert not {name.split(".")[0] for name in imports(path, top_level_only=True)} & LAZY


def test_the_wire_knows_nothing_of_the_host() -> None:
    for path in sources(ROOT / "protocol"):
        assert not any(name.startswith("sinkwright.") for name in imports(path) if "_wire" not in name), path


def test_the_firmware_imports_only_itself_and_micropython() -> None:
    own = {path.stem for path in FIRMWARE.glob("*.py")} | {"chips"}
    for path in FIRMWARE.rglob("*.py"):
        named = {name.split(".")[0] for name in imports(path)}
        allowed = own | MICROPYTHON | (BOARD_ONLY if path.name == "board.py" else set())
        assert named <= allowed, f"{path.name}: {sorted(named - allowed)}"


def test_showing_the_help_imports_nothing_costly() -> None:
    """The command line starts fast because its commands are loaded when they are called."""
    script = (
        "import sys\n"
        "from sinkwright.cli import main\n"
        "sys.argv = ['sinkwright', '--help']\n"
        "try:\n    main()\nexcept SystemExit:\n    pass\n"
        "print(' '.join(sorted({name.split('.')[0] for name in sys.modules})), file=sys.stderr)\n"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    loaded = set(done.stderr.split())
    assert not loaded & (LAZY | {"construct", "serial", "sqlite3", "msgspec", "asyncio"})
