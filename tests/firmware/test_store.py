"""The store: what was remembered is there after a loss of power at any octet of any write."""

from __future__ import annotations

from tests.firmware.running import on_board

ARRANGE = """
    from store import LoadIsOn, Store
    from stand_in_board import PowerLost, Slots
    class Off:
        state = wire.STATE_OFF
    medium = Slots()
    store = Store(medium, Off)
"""


def test_what_was_put_is_found_by_the_next_start() -> None:
    found = on_board(f"""{ARRANGE}
    store.put("boots", 7)
    store.put("calibration", {{"number": 3, "current": [1, 2]}})
    store.put("boots", 8)
    again = Store(medium, Off)
    found = [again.get("boots"), again.get("calibration"), again.get("absent"), again.get("absent", 5)]
    """)
    assert found == [8, {"number": 3, "current": [1, 2]}, None, 5]


def test_power_cut_at_every_octet_of_a_write_leaves_the_old_values_or_the_new() -> None:
    """Both slots are in use; the cut leaves the head of the new write before the tail of an older, longer one,
    or before nothing (a file that was made anew), or before erased flash."""
    found = on_board(f"""{ARRANGE}
    store.put("text", "an older and much longer text than those that follow")
    store.put("boots", 1)
    store.put("text", "short")
    before = list(medium.slots)
    store.put("boots", 2)
    slot = 0 if medium.slots[0] != before[0] else 1
    whole = medium.slots[slot]
    found = []
    for cut in range(len(whole) + 1):
        for tail in (before[slot][cut:], b"", b"\\xff" * 40):
            medium = Slots()
            medium.slots = list(before)
            medium.slots[slot] = whole[:cut] + tail
            again = Store(medium, Off)
            expected = 2 if cut == len(whole) else 1
            if [again.get("boots"), again.get("text"), again.spoiled] != [expected, "short", False]:
                found.append([cut, tail, again.get("boots")])
            # And it goes on from there.
            again.put("boots", 3)
            if Store(medium, Off).get("boots") != 3:
                found.append(["after", cut])
    found.append(len(whole))
    """)
    assert found[:-1] == []
    assert found[-1] > 40


def test_power_cut_at_every_octet_of_the_very_first_write_leaves_an_empty_store() -> None:
    found = on_board(f"""{ARRANGE}
    store.put("boots", 1)
    whole = medium.slots[0]
    found = []
    for cut in range(len(whole)):
        medium = Slots()
        medium.cut = cut
        try:
            Store(medium, Off).put("boots", 1)
        except PowerLost:
            pass
        again = Store(medium, Off)
        found.append([again.get("boots"), again.spoiled])
    """)
    assert found
    assert all(one == [None, False] for one in found)


def test_the_two_slots_are_written_by_turns() -> None:
    found = on_board(f"""{ARRANGE}
    found = []
    for number in range(4):
        before = list(medium.slots)
        store.put("boots", number)
        found.append([medium.slots[at] != before[at] for at in (0, 1)])
    """)
    assert found == [[True, False], [False, True], [True, False], [False, True]]


def test_one_bit_turned_over_anywhere_is_not_believed() -> None:
    found = on_board(f"""{ARRANGE}
    store.put("boots", 1)
    store.put("boots", 2)
    whole = medium.slots[1]
    found = []
    for at in range(len(whole) * 8):
        wrong = bytearray(whole)
        wrong[at >> 3] ^= 1 << (at & 7)
        medium.slots[1] = bytes(wrong)
        if Store(medium, Off).get("boots") != 1:
            found.append(at)
    """)
    assert found == []


def test_two_spoiled_slots_are_told_apart_from_an_empty_store() -> None:
    found = on_board(f"""{ARRANGE}
    found = [store.spoiled]
    medium.slots = [b"rubbish", b"\\xff" * 100]
    found.append(Store(medium, Off).spoiled)
    """)
    assert found == [False, True]


def test_nothing_is_written_while_the_load_sinks() -> None:
    found = on_board(f"""{ARRANGE}
    store.put("boots", 1)
    Off.state = wire.STATE_SINKING
    try:
        store.put("boots", 2)
    except LoadIsOn:
        found = [medium.writes, store.get("boots")]
    """)
    assert found == [1, 1]


def test_what_does_not_fit_a_slot_changes_nothing() -> None:
    found = on_board(f"""{ARRANGE}
    store.put("boots", 1)
    try:
        store.put("text", "x" * 5000)
    except ValueError as error:
        found = [medium.writes, store.get("text"), str(error)]
    """)
    assert found == [1, None, "the store holds no more than 4096 octets"]


def test_a_medium_that_does_not_keep_what_is_written_is_told_and_the_old_values_stay() -> None:
    found = on_board(f"""{ARRANGE}
    store.put("boots", 1)
    medium.write = lambda slot, data: None
    try:
        store.put("boots", 2)
    except OSError as error:
        found = [str(error), store.get("boots")]
    """)
    assert found == ["slot 1 does not hold what was written", 1]
