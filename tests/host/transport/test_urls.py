"""Port URLs: what each means, and what is said about one that means nothing."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from sinkwright.errors import LinkLost, SinkwrightError
from sinkwright.transport.urls import (
    BoardUrl,
    SerialUrl,
    SimulatedUrl,
    TcpUrl,
    is_lock_step,
    open_channel,
    parse_url,
)


@pytest.mark.parametrize("text", ["/dev/ttyACM0", "COM7", "loop://", "rfc2217://host:7000", "hwgrep://Pico"])
def test_anything_else_is_left_to_pyserial(text: str) -> None:
    assert parse_url(text) == SerialUrl(text)


@pytest.mark.parametrize("text", ["tcp:127.0.0.1:7411", "socket://127.0.0.1:7411"])
def test_tcp_and_socket_urls_name_a_host_and_a_port(text: str) -> None:
    assert parse_url(text) == TcpUrl(text, "127.0.0.1", 7411)


def test_a_tcp_host_may_be_an_ipv6_address_in_brackets() -> None:
    assert parse_url("tcp:[::1]:7411") == TcpUrl("tcp:[::1]:7411", "::1", 7411)


@pytest.mark.parametrize(
    "text", ["tcp:", "tcp:host", "tcp:host:", "tcp:host:0", "tcp:host:99999", "tcp:host:x"]
)
def test_a_tcp_url_without_a_port_number_says_how_to_write_it(text: str) -> None:
    with pytest.raises(SinkwrightError, match=r"tcp:127\.0\.0\.1:7411"):
        parse_url(text)


def test_a_board_url_names_a_board() -> None:
    assert parse_url("board:bench-1") == BoardUrl("board:bench-1", "bench-1")


def test_a_board_url_without_a_name_is_refused() -> None:
    with pytest.raises(SinkwrightError, match="needs the name"):
        parse_url("board:")


def test_an_empty_url_is_refused() -> None:
    with pytest.raises(SinkwrightError, match="names no board"):
        parse_url(" ")


def test_a_bare_simulated_url_is_the_demo_source_at_real_time() -> None:
    assert parse_url("sim:") == SimulatedUrl("sim:", source=None, speed=1.0, seed=1)


def test_a_simulated_url_takes_a_source_and_options_in_any_order() -> None:
    parsed = parse_url("sim:cell.toml,seed=7,speed=max,store=memory.json,board=mine.toml")
    assert isinstance(parsed, SimulatedUrl)
    assert (parsed.source, parsed.board) == (Path("cell.toml"), Path("mine.toml"))
    assert (parsed.store, parsed.seed, parsed.speed) == (Path("memory.json"), 7, math.inf)


@pytest.mark.parametrize("text", ["sim:speed=max", "sim:,speed=max"])
def test_options_may_come_without_a_source(text: str) -> None:
    assert parse_url(text) == SimulatedUrl(text, speed=math.inf)


def test_an_unknown_option_names_the_known_ones_and_the_nearest() -> None:
    with pytest.raises(SinkwrightError) as caught:
        parse_url("sim:cell.toml,sped=max")
    assert "Did you mean speed=?" in str(caught.value)
    assert "speed=, seed=, board=, store=" in str(caught.value)
    assert "No load was touched." in str(caught.value)


@pytest.mark.parametrize(
    "option",
    ["speed=0", "speed=-1", "speed=nan", "speed=inf", "speed=fast", "seed=-1", "seed=1.5", "seed=4294967296"],
)
def test_an_unusable_value_is_quoted(option: str) -> None:
    with pytest.raises(SinkwrightError, match=option):
        parse_url(f"sim:,{option}")


def test_an_option_given_twice_is_refused() -> None:
    with pytest.raises(SinkwrightError, match="seed stands there twice"):
        parse_url("sim:,seed=1,seed=2")


def test_only_a_simulated_board_at_full_speed_is_lock_step() -> None:
    assert is_lock_step("sim:,speed=max")
    assert not any(map(is_lock_step, ["sim:", "sim:,speed=100", "/dev/ttyACM0", "tcp:localhost:7411"]))


def test_a_board_url_has_to_be_resolved_before_it_is_opened() -> None:
    with pytest.raises(LinkLost, match="has to be found first"):
        open_channel("board:bench-1")
