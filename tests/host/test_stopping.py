"""A wish to stop: set once, seen everywhere, and whoever sleeps is woken."""

from __future__ import annotations

from sinkwright.stopping import StopRequest


def test_a_request_is_set_once_and_stays() -> None:
    stop = StopRequest()
    assert not stop.requested
    stop.request()
    stop.request()
    assert stop.requested


def test_hooks_are_called_at_the_request_and_at_once_after_it() -> None:
    woken: list[str] = []
    stop = StopRequest()
    stop.on_request(lambda: woken.append("before"))
    assert woken == []
    stop.request()
    stop.on_request(lambda: woken.append("after"))
    assert woken == ["before", "after"]


def test_a_forgotten_hook_is_not_called() -> None:
    woken: list[str] = []

    def hook() -> None:
        woken.append("woken")

    stop = StopRequest()
    stop.on_request(hook)
    stop.forget(hook)
    stop.forget(hook)
    stop.request()
    assert woken == []
