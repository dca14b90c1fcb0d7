"""The junction's estimate against the transient thermal impedance of a Foster network.

Stages (K/W, s): 0.3/1 ms, 0.7/30 ms, 0.5/0.5 s, 2.5/300 s, an invented part. The expected values are
Zth(t) = sum Ri*(1 - exp(-t/taui)), computed independently; the network form is that of JESD51-14 (from memory).
"""

from __future__ import annotations

import math

import pytest

from tests.firmware.running import on_board

STAGES = ((0.3, 0.001), (0.7, 0.030), (0.5, 0.5), (2.5, 300.0))
STEP_S = 0.0025
#: K/W at s: 0.50840 at 10 ms, 1.06650 at 0.1 s, 1.44065 at 1 s, 1.95317 at 60 s, 4.0 for ever.
TABLE = {0.01: 0.50840, 0.1: 1.06650, 1.0: 1.44065, 60.0: 1.95317, 3000.0: 4.0}


def image_stages() -> list[dict[str, int]]:
    every = (2, 2, 2, 512)
    return [
        {
            "r_mK_per_W": round(r * 1000),
            "every_steps": n,
            "share_x32768": round(32768 * (1 - math.exp(-n * STEP_S / tau))),
        }
        for (r, tau), n in zip(STAGES, every, strict=True)
    ]


@pytest.fixture(scope="module")
def rises() -> list[int]:
    """Rise in mK at 20 W at each of the table's times."""
    steps = [round(time / STEP_S / 2) for time in TABLE]
    return on_board(f"""
        from thermal import Junction
        junction = Junction({image_stages()!r})
        found = []
        done = 0
        for until in {steps!r}:
            while done < until:
                junction.step(20_000)
                done += 1
            found.append(junction.rise_mK)
    """)


@pytest.mark.parametrize("at", range(len(TABLE)))
def test_the_estimate_follows_the_foster_table_within_one_percent(rises: list[int], at: int) -> None:
    impedance = list(TABLE.values())[at]
    assert rises[at] / 1000 / 20 == pytest.approx(impedance, rel=0.01)


def test_an_absurd_power_leaves_every_intermediate_a_small_integer() -> None:
    rise_mK = on_board(f"""
        from thermal import Junction
        junction = Junction({image_stages()!r})
        for _ in range(2000):
            junction.step(2**29)
        found = junction.rise_mK
    """)
    assert 0 < rise_mK * 1000 < 4 * 400_000_000


def test_the_halves_of_a_product_stay_small_at_the_largest_jump() -> None:
    """The largest jump is from nothing to 400 K; each half times the largest share must fit 31 bits, signed."""
    jump_uK = 400_000_000
    for delta in (jump_uK, -jump_uK):
        assert abs((delta >> 14) * 32768) < 2**30
        assert (delta & (1 << 14) - 1) * 32768 < 2**30
