"""`python -m sinkwright`: the same as the `sinkwright` command."""

from sinkwright.cli import main

main()
