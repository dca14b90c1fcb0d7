"""Plans, board files and simulated sources: what they may say, read and checked.

Pure: reads files, opens no device. `load_plan`, `load_board` and `load_source` raise FileError.
"""

from .loading import (
    default_board_path,
    load_board,
    load_plan,
    load_source,
    parse_board,
    parse_plan,
    parse_source,
)

__all__ = [
    "default_board_path",
    "load_board",
    "load_plan",
    "load_source",
    "parse_board",
    "parse_plan",
    "parse_source",
]
