"""Remedies rank by what they cost."""

from sinkwright.uncertainty import remedies


def test_time_is_cheaper_than_a_meter_and_a_meter_than_a_soldering_iron() -> None:
    assert (
        remedies.cost(remedies.MEASURE_LONGER)
        < remedies.cost(remedies.CALIBRATE)
        < remedies.cost(remedies.FINER_CONVERTER)
    )


def test_a_remedy_that_is_not_listed_ranks_last() -> None:
    assert remedies.cost("Measure the leads.") > max(map(remedies.cost, remedies.CHEAPEST_FIRST))


def test_every_remedy_is_a_sentence() -> None:
    for remedy in remedies.CHEAPEST_FIRST:
        assert remedy[0].isupper()
        assert remedy.endswith(".")
