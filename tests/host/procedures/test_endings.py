"""The names that `stopped_by` carries."""

from __future__ import annotations

import pytest

from sinkwright.procedures.endings import is_planned, name_of
from sinkwright_wire.messages import Fault


@pytest.mark.parametrize("fault", list(Fault))
def test_a_faults_name_is_lower_case_with_dashes(fault):
    assert name_of(fault).replace("-", "_").upper() == fault.name


def test_only_an_end_of_the_plan_lets_the_next_test_begin():
    assert is_planned(None)
    assert is_planned("duration_s")
    assert not is_planned("derated")
    assert not is_planned("interrupted")
    assert not is_planned(name_of(Fault.OVER_CURRENT))
