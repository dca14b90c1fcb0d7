"""Which converters a board file may name: those that the firmware has a driver for.

The firmware's folder is asked, so that a new driver is known here by its file alone: chips/KIND_part.py drives PART.
"""

from __future__ import annotations

from typing import Literal

from ..firmware_files import find_firmware
from .keys import KeyMistake

#: INA226 (TI SBOS547, from memory): 2.5 uV a count, 15 bits and sign.
MONITOR_COUNT_V = 2.5e-6
MONITOR_FULL_SCALE_V = 0.08192
#: The second trip comes above the firmware's own, which comes a sixteenth above the limit.
MONITOR_SHARE = 1.125

Kind = Literal["dac", "adc", "monitor"]


def driven_parts(kind: Kind) -> tuple[str, ...]:
    """Part numbers in capitals, sorted."""
    files = (find_firmware() / "chips").glob(f"{kind}_*.py")
    return tuple(sorted(file.stem.removeprefix(f"{kind}_").upper() for file in files))


def check_part(kind: Kind, part: str) -> None:
    """Raises KeyMistake for a part without a driver."""
    known = driven_parts(kind)
    if part not in known:
        raise KeyMistake(
            "part", f'the firmware has no driver for "{part}"', "write one of " + ", ".join(known)
        )
