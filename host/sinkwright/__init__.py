"""Sinkwright: a perfboard current sink as an instrument.

`connect` opens a load, `open_record` reads what a run kept. Both are fetched when first used, so that
importing this package costs nothing.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from sinkwright.blocking import connect
    from sinkwright.records import open_record

__all__ = ["__version__", "connect", "open_record"]

__version__ = "0.1.0"


def __getattr__(name: str) -> Any:
    if name == "connect":
        from sinkwright.blocking import connect

        return connect
    if name == "open_record":
        from sinkwright.records import open_record

        return open_record
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
