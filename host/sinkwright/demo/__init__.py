"""The demonstration's scenario: an invented bench supply that comes back from an invented community workshop.

Says where its two files lie. `source.toml` is also what a bare `sim:` is connected to.
"""

from __future__ import annotations

from pathlib import Path

_FOLDER = Path(__file__).resolve().parent


def demo_source_path() -> Path:
    """The simulated supply of the demonstration."""
    return _FOLDER / "source.toml"


def demo_plan_path() -> Path:
    """The plan that the demonstration carries out."""
    return _FOLDER / "returned-supply.toml"
