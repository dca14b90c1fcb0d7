"""What all tests share: how hypothesis searches."""

from __future__ import annotations

from hypothesis import settings

# The same examples on every machine, and no deadline: a loaded machine is not a wrong program.
settings.register_profile("sinkwright", derandomize=True, deadline=None)
settings.load_profile("sinkwright")
