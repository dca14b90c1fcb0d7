"""Simulated sources: the keys of each kind, and what no real source could be."""

from __future__ import annotations

import pytest

from sinkwright.definitions.loading import parse_source
from sinkwright.definitions.source import CellSource, CurveSource, SourceFile, SupplySource
from sinkwright.errors import FileError
from tests.host.definitions.refusing import refusal

SUPPLY = 'kind = "supply"\nvoltage_V = 12.1\nresistance_ohm = 0.045\n'
CELL = 'kind = "cell"\ncapacity_Ah = 2.5\nocv = [[0.0, 2.9], [1.0, 4.18]]\nr0_ohm = 0.03\n'


def source(text: str) -> SourceFile:
    return parse_source(text, where="bench.toml")


def refused(text: str) -> FileError:
    return refusal(source, text)


def test_a_supply_with_all_its_keys() -> None:
    made = source(
        SUPPLY
        + "inductance_H = 1e-6\ncapacitance_F = 470e-6\nlimit_A = 2.5\n"
        + 'limit_kind = "foldback"\nfoldback_A = 0.8\nrecovery_s = 0.0005\nripple_V = 0.01\nripple_Hz = 100\n'
        + "leads_ohm = 0.04\nleads_inductance_H = 1e-6\nremote_sense = false\n"
    )
    assert isinstance(made, SupplySource)
    assert (made.kind, made.foldback_A, made.remote_sense) == ("supply", 0.8, False)


def test_a_cell_starts_full_and_without_slow_resistances() -> None:
    made = source(CELL)
    assert isinstance(made, CellSource)
    assert (made.state_of_charge, made.rc, made.ocv[1]) == (1.0, (), (1.0, 4.18))


def test_a_curve_is_a_list_of_volt_and_ampere() -> None:
    made = source('kind = "curve"\npoints = [[0.0, 0.76], [0.45, 0.69], [0.57, 0.0]]\n')
    assert isinstance(made, CurveSource)
    assert made.points[1] == (0.45, 0.69)
    assert made.text.startswith("kind")


@pytest.mark.parametrize(
    ("points", "key"),
    [
        ("[[0, 1], [1, 2], [2, 0]]", "points[2]"),
        ("[[0, 1], [0, 0.5], [2, 0]]", "points[2]"),
        ("[[0, 1], [2, 0.5], [1, 0]]", "points[3]"),
        ("[[0, 1], [1, 0.5]]", "points[2]"),
        ("[[0, 1], [1, -0.5]]", "points[2]"),
        ("[[0, 1]]", "points"),
        ("[]", "points"),
        ("[[0, 1, 2], [1, 0]]", "points[1]"),
        ('[[0, "1"], [1, 0]]', "points[1][2]"),
        ("[[0, nan], [1, 0]]", "points[1][2]"),
        ("3", "points"),
    ],
)
def test_a_curve_that_no_source_has_is_refused_at_the_point_concerned(points: str, key: str) -> None:
    assert refused(f'kind = "curve"\npoints = {points}\n').where == f"bench.toml, {key}"


@pytest.mark.parametrize(
    ("line", "key"),
    [
        ("leads_ohm = -0.1", "leads_ohm"),
        ("capacitance_F = -1e-6", "capacitance_F"),
        ('limit_kind = "foldback"\nlimit_A = 2', "foldback_A"),
        ('limit_kind = "latch"', "limit_A"),
        ('limit_kind = "foldback"\nlimit_A = 2\nfoldback_A = 3', "foldback_A"),
        ("limit_A = 2\nfoldback_A = 1", "foldback_A"),
        ("ripple_V = 0.1", "ripple_Hz"),
        ("ripple_V = 30\nripple_Hz = 100", "ripple_V"),
        ('limit_kind = "fold"', "limit_kind"),
        ('remote_sense = "no"', "remote_sense"),
        ("capacity_Ah = 3", "capacity_Ah"),
    ],
)
def test_a_supply_that_cannot_be_is_refused(line: str, key: str) -> None:
    assert refused(f"{SUPPLY}{line}\n").where == f"bench.toml, {key}"


def test_a_negative_resistance_and_a_missing_key_are_named() -> None:
    negative = refused('kind = "supply"\nvoltage_V = 12\nresistance_ohm = -0.1\n')
    assert negative.where == "bench.toml, resistance_ohm"
    assert "above 0" in negative.remedy
    missing = refused('kind = "supply"\nresistance_ohm = 0.1\n')
    assert (missing.where, missing.what) == ("bench.toml, voltage_V", "it is missing")


@pytest.mark.parametrize(
    ("changed", "key"),
    [
        (("ocv = [[0.0, 2.9], [1.0, 4.18]]", "ocv = [[0.1, 2.9], [1.0, 4.18]]"), "ocv"),
        (("ocv = [[0.0, 2.9], [1.0, 4.18]]", "ocv = [[0.0, 4.2], [1.0, 4.18]]"), "ocv[2]"),
        (("ocv = [[0.0, 2.9], [1.0, 4.18]]", "ocv = [[0.0, -1.0], [1.0, 4.18]]"), "ocv[1]"),
        (("r0_ohm = 0.03", "r0_ohm = 0.03\nrc = [[0.01, 0]]"), "rc[1]"),
        (("r0_ohm = 0.03", "r0_ohm = 0"), "r0_ohm"),
        (("capacity_Ah = 2.5", "capacity_Ah = 2.5\nstate_of_charge = 80"), "state_of_charge"),
    ],
)
def test_a_cell_that_cannot_be_is_refused(changed: tuple[str, str], key: str) -> None:
    assert refused(CELL.replace(*changed)).where == f"bench.toml, {key}"


def test_an_unknown_kind_of_source_is_answered_with_the_kinds() -> None:
    error = refused('kind = "batery"\n')
    assert "supply, cell or curve" in error.remedy
    assert "is missing" in refused("voltage_V = 12\n").what
