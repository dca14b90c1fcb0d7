"""A wish to stop, raised by a signal handler or another thread, and seen wherever something waits.

It knows neither signals nor links: a command's signal handler calls `request`, a link looks at `requested` at
every receive, and `on_request` lets a channel that sleeps be woken.
"""

from __future__ import annotations

from collections.abc import Callable


class StopRequest:
    """Set once, by `request`, and never taken back."""

    def __init__(self) -> None:
        self._requested = False
        self._hooks: list[Callable[[], None]] = []

    @property
    def requested(self) -> bool:
        """Whether somebody asked to stop."""
        return self._requested

    def request(self) -> None:
        """Ask to stop. Safe in a signal handler: it takes no lock and waits for nothing."""
        self._requested = True
        for hook in tuple(self._hooks):
            hook()

    def on_request(self, hook: Callable[[], None]) -> None:
        """Call `hook` when the stop is asked for; at once if it was asked for already."""
        self._hooks.append(hook)
        if self._requested:
            hook()

    def forget(self, hook: Callable[[], None]) -> None:
        """Stop calling `hook`, because what it would wake is closed."""
        if hook in self._hooks:
            self._hooks.remove(hook)
