"""Which interpreter runs the firmware, and that a child of it works and is shut off from its surroundings."""

from __future__ import annotations

import subprocess

import pytest

from sinkwright.simulator import interpreter
from sinkwright.simulator.interpreter import cpython, find_interpreter

SCRIPT = """
import sys, gc
print(sys.implementation.name, sys.argv[1:])
if hasattr(gc, "mem_free"):
    print(gc.mem_alloc() + gc.mem_free())
sys.exit(5)
"""


@pytest.fixture
def script(tmp_path):
    path = tmp_path / "script.py"
    path.write_text(SCRIPT)
    return path


def test_micropython_runs_a_file_with_its_arguments_and_passes_its_exit_code_on(script):
    """Installed with every test environment for which it has a wheel; see pyproject.toml."""
    found = find_interpreter()
    done = subprocess.run(found.run(script, "a", "b c"), capture_output=True, text=True)
    name = {"MicroPython": "micropython", "CPython": "cpython"}[found.name]
    assert done.stdout.splitlines()[0] == f"{name} ['a', 'b c']"
    assert done.returncode == 5


def test_the_heap_has_the_size_that_was_asked_for(script):
    if find_interpreter().name == "CPython":
        return  # no heap of its own
    sizes = []
    for heap_bytes in (1 << 20, 3 << 20):
        done = subprocess.run(find_interpreter(heap_bytes).run(script), capture_output=True, text=True)
        sizes.append(int(done.stdout.splitlines()[1]))
    assert sizes == pytest.approx([1 << 20, 3 << 20], rel=0.05)


def test_without_the_package_cpython_takes_its_place_and_says_so(script, monkeypatch):
    monkeypatch.setattr(interpreter, "find_spec", lambda name: None)
    found = find_interpreter()
    assert found == cpython()
    assert found.name == "CPython"
    done = subprocess.run(found.run(script, "a"), capture_output=True, text=True)
    assert done.stdout == "cpython ['a']\n"
    assert done.returncode == 5


def test_what_a_person_has_set_for_python_does_not_reach_the_child(script, monkeypatch, tmp_path):
    (tmp_path / "gc.py").write_text("raise SystemExit('the wrong gc')")
    for name in ("PYTHONPATH", "PYTHONHOME", "PYTHONSTARTUP"):
        monkeypatch.setenv(name, str(tmp_path))
    done = subprocess.run(cpython().run(script), capture_output=True, text=True)
    assert (done.returncode, done.stderr) == (5, "")


def test_nothing_is_written_beside_a_file_that_is_run(tmp_path):
    (tmp_path / "imported.py").write_text("")
    path = tmp_path / "script.py"
    path.write_text(f"import sys; sys.path.insert(0, {str(tmp_path)!r}); import imported")
    subprocess.run(cpython().run(path), check=True)
    assert not (tmp_path / "__pycache__").exists()
