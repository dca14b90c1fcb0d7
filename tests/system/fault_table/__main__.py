"""`python -m tests.system.fault_table`: measures all rows, writes them into the page, says what does not hold."""

from __future__ import annotations

import sys

from . import table


def main() -> int:
    measured = table.measure()
    written = table.lines(measured)
    table.write_page(written)
    print("\n".join(written))
    lacking = [f"{row.fault}: {what}" for row, found in measured for what in found.shortfalls(row)]
    print("\n".join(lacking), file=sys.stderr)
    return 1 if lacking else 0


if __name__ == "__main__":
    sys.exit(main())
