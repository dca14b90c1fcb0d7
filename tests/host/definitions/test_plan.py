"""Plans: what is accepted, with which defaults, and how a mistake is told."""

from __future__ import annotations

import pytest

from sinkwright.definitions.loading import parse_plan
from sinkwright.definitions.plan import KINDS, CurrentLimit, Hold, LoadRegulation, Plan, Rest
from sinkwright.errors import FileError
from tests.host.definitions.refusing import refusal

REST = '[[test]]\nkind = "rest"\nduration_s = 1\n'


def plan(text: str) -> Plan:
    return parse_plan(text, "supply", where="supply.toml")


def refused(text: str) -> FileError:
    return refusal(plan, text)


def test_a_plan_of_three_lines_works() -> None:
    made = plan('source = { rated_current_A = 2 }\n[[test]]\nkind = "load-regulation"\n')
    test = made.tests[0]
    assert isinstance(test, LoadRegulation)
    assert (test.no_load_current_A, test.full_load_current_A, test.points) == (0.0, None, 5)
    assert (made.name, made.when_host_silent, made.decision) == ("supply", "stop", "guarded")
    assert made.source.sense == "remote"


def test_the_text_as_read_travels_with_the_plan() -> None:
    assert plan(REST).text == REST


def test_all_kinds_of_this_version_are_read_in_order() -> None:
    made = plan(
        "[source]\nrated_current_A = 2.0\n"
        + '[[test]]\nkind = "rest"\nduration_s = 5\n'
        + '[[test]]\nkind = "hold"\npower_W = 4.5\nend_voltage_V = 3.0\n'
        + '[[test]]\nkind = "current-limit"\n'
        + '[[test]]\nkind = "load-regulation"\n'
    )
    assert [type(test) for test in made.tests] == [Rest, Hold, CurrentLimit, LoadRegulation]
    assert [test.kind for test in made.tests] == ["rest", "hold", "current-limit", "load-regulation"]


def test_bounds_are_read_by_quantity() -> None:
    made = plan(REST + "[test.accept]\nopen_circuit_voltage_V = { min = 11.5, max = 12.5 }\n")
    bounds = made.tests[0].accept["open_circuit_voltage_V"]
    assert (bounds.min, bounds.max) == (11.5, 12.5)


@pytest.mark.parametrize("kind", KINDS)
def test_every_quantity_of_a_kind_may_be_bounded(kind: str) -> None:
    settings = {
        "load-regulation": "full_load_current_A = 1",
        "current-limit": "up_to_A = 1",
        "hold": "current_A = 1\nduration_s = 1",
        "rest": "duration_s = 1",
    }
    bounds = "".join(f"{name} = {{ max = 1 }}\n" for name in KINDS[kind].QUANTITIES)
    made = plan(f'[[test]]\nkind = "{kind}"\n{settings[kind]}\n[test.accept]\n{bounds}')
    assert tuple(made.tests[0].accept) == KINDS[kind].QUANTITIES


def test_an_unknown_kind_is_answered_with_the_likely_one_and_the_list() -> None:
    error = refused(REST + '[[test]]\nkind = "loadregulation"\n')
    assert error.where == "supply.toml, test[2].kind"
    assert '"load-regulation"' in error.remedy
    assert all(kind in error.remedy for kind in KINDS)


def test_a_kind_of_a_later_version_is_told_from_an_unknown_one() -> None:
    error = refused('[[test]]\nkind = "transient"\n')
    assert "later version" in error.what
    assert "load-regulation, current-limit, hold or rest" in error.remedy


@pytest.mark.parametrize(
    ("line", "meant"),
    [
        ("full_lod_current_A = 2", "full_load_current_A"),
        ("Full_load_current_A = 2", "full_load_current_A"),
        ("full_load_current_mA = 2000", "full_load_current_A"),
        ("setle_s = 2", "settle_s"),
    ],
)
def test_a_misspelt_key_is_answered_with_the_likely_one(line: str, meant: str) -> None:
    error = refused(f'[source]\nrated_current_A = 2\n[[test]]\nkind = "load-regulation"\n{line}\n')
    assert error.where == f"supply.toml, test[1].{line.split()[0]}"
    assert error.remedy == f"Did you mean {meant}?"


def test_a_key_in_the_wrong_table_is_answered_with_its_table() -> None:
    assert refused("rated_current_A = 2\n" + REST).remedy == "It belongs under [source]"


def test_a_key_like_no_other_is_answered_with_the_list() -> None:
    assert "sense" in refused("[source]\ncolour = 3\n" + REST).remedy


def test_a_misspelt_quantity_is_answered_with_the_likely_one() -> None:
    error = refused(REST + "[test.accept]\nopen_circuit_voltage = { max = 3 }\n")
    assert error.where == "supply.toml, test[1].accept.open_circuit_voltage"
    assert "Did you mean open_circuit_voltage_V?" in error.remedy


@pytest.mark.parametrize(
    ("value", "right"),
    [
        ('"2 A"', "write 2 without quotes; the unit (A) stands in the key"),
        ('"1500 mA"', "write 1.5 without quotes"),
        ('"0,5"', "write 0.5 without quotes"),
        ('"2 V"', "V is another unit than the key's"),
        ('"plenty"', "write a number without quotes"),
        ("true", "write a number without quotes"),
        ("[1.0]", "write a number without quotes"),
    ],
)
def test_a_value_of_the_wrong_type_or_unit_is_answered_with_what_to_write(value: str, right: str) -> None:
    error = refused(f'[[test]]\nkind = "load-regulation"\nfull_load_current_A = {value}\n')
    assert error.where == "supply.toml, test[1].full_load_current_A"
    assert right.lower() in error.remedy.lower()


@pytest.mark.parametrize("value", ["nan", "+inf", "-inf", "1e999", "9" * 400])
def test_a_number_that_measures_nothing_is_refused(value: str) -> None:
    error = refused(f'[[test]]\nkind = "rest"\nduration_s = {value}\n')
    assert error.where == "supply.toml, test[1].duration_s"
    assert error.remedy == "Write a finite number"


@pytest.mark.parametrize(
    ("text", "where"),
    [
        ('[[test]]\nkind = "rest"\n', "test[1].duration_s"),
        ("[[test]]\nduration_s = 1\n", "test[1].kind"),
        ('[[test]]\nkind = "load-regulation"\n', "test[1].full_load_current_A"),
        ('[[test]]\nkind = "current-limit"\n', "test[1].up_to_A"),
        ("[source]\n", "test"),
    ],
)
def test_a_missing_key_is_named(text: str, where: str) -> None:
    error = refused(text)
    assert error.where == f"supply.toml, {where}"
    assert "is missing" in error.what


@pytest.mark.parametrize("text", ["", "\n\n", "# only a comment\n"])
def test_an_empty_plan_is_answered_with_the_template(text: str) -> None:
    error = refused(text)
    assert error.what == "the file is empty"
    assert "sinkwright template plan" in error.remedy


def test_single_brackets_are_answered_with_double_ones() -> None:
    assert "[[test]]" in refused('[test]\nkind = "rest"\nduration_s = 1\n').remedy


def test_a_value_out_of_range_is_answered_with_the_range_in_its_unit() -> None:
    error = refused('[[test]]\nkind = "rest"\nduration_s = -1\n')
    assert error.what.startswith("-1 s")
    assert error.remedy == "It must be above 0 and at most 32000000 s"


@pytest.mark.parametrize(
    ("settings", "where", "words"),
    [
        ("current_A = 1", "test[1]", "never end"),
        ("duration_s = 1", "test[1]", "no set-point"),
        ("current_A = 1\npower_W = 2\nduration_s = 1", "test[1].power_W", "second set-point"),
    ],
)
def test_a_hold_has_one_set_point_and_an_end(settings: str, where: str, words: str) -> None:
    error = refused(f'[[test]]\nkind = "hold"\n{settings}\n')
    assert error.where == f"supply.toml, {where}"
    assert words in error.what


def test_a_set_point_beyond_the_plans_own_limit_is_refused_with_what_fits() -> None:
    error = refused('[limits]\npower_W = 5\n[[test]]\nkind = "hold"\npower_W = 6\nduration_s = 1\n')
    assert error.where == "supply.toml, test[1].power_W"
    assert "at most 5" in error.remedy


def test_no_load_must_lie_below_full_load() -> None:
    text = '[source]\nrated_current_A = 1\n[[test]]\nkind = "load-regulation"\nno_load_current_A = 1.5\n'
    assert refused(text).where == "supply.toml, test[1].no_load_current_A"


@pytest.mark.parametrize(
    ("bounds", "where"),
    [("{}", ""), ("{ min = 3, max = 2 }", ".min"), ("3", ""), ("{ maximum = 3 }", ".maximum")],
)
def test_bounds_that_bound_nothing_are_refused(bounds: str, where: str) -> None:
    error = refused(REST + f"[test.accept]\nduration_s = {bounds}\n")
    assert error.where == f"supply.toml, test[1].accept.duration_s{where}"


def test_leads_without_their_uncertainty_and_leads_of_remote_sense_are_refused() -> None:
    alone = refused('[source]\nsense = "two-wire"\nlead_resistance_ohm = 0.04\n' + REST)
    assert alone.where == "supply.toml, source.lead_resistance_uncertainty_ohm"
    beside_remote = refused("[source]\nlead_resistance_ohm = 0.04\n" + REST)
    assert "remote" in beside_remote.what


def test_going_on_without_a_host_needs_a_voltage_end_and_another() -> None:
    hold = '[[test]]\nkind = "hold"\ncurrent_A = 1\nend_voltage_V = 3\n'
    error = refused('when_host_silent = "continue"\n' + hold)
    assert "end_charge_Ah or duration_s" in error.remedy
    assert plan('when_host_silent = "continue"\n' + hold + "duration_s = 60\n").when_host_silent == "continue"


@pytest.mark.parametrize("key", ["name", "text"])
def test_what_the_program_fills_in_cannot_be_written(key: str) -> None:
    assert refused(f'{key} = "x"\n' + REST).where == f"supply.toml, {key}"
