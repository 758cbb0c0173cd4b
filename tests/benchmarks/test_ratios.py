"""Ratios that hold on any machine, and on a busy one; seconds are for measure.py."""

from __future__ import annotations

import time
from collections.abc import Callable

import pytest
import yardstick_loop
import yardstick_numpy
from cases import Case, single_lines

import roaddisp as rd


@pytest.fixture(scope="module")
def case() -> Case:
    case = single_lines(1000, 40, 6)
    rd.response_table(case.receptors, case.segments, **case.options())
    yardstick_loop.response_table(case.share(8, 2, 6))
    return case


def per_pair(run: Callable[[Case], object], case: Case, times: int) -> float:
    """Least processor seconds for a receptor, a segment and a state."""
    seconds = []
    for _ in range(times):
        start = time.process_time()
        run(case)
        seconds.append(time.process_time() - start)
    return min(seconds) / case.pair_states


def ours(case: Case) -> object:
    return rd.response_table(case.receptors, case.segments, **case.options())


def test_response_table_is_hundreds_of_times_faster_than_200_points_in_numpy(case: Case) -> None:
    """Processor time, so that neither threads nor neighbours count; 2,000 is the aim."""
    slow = per_pair(yardstick_numpy.response_table, case.share(250, 10, 6), times=2)
    assert slow > 200.0 * per_pair(ours, case, times=5)


def test_response_table_is_many_times_faster_than_a_compiled_loop(case: Case) -> None:
    slow = per_pair(yardstick_loop.response_table, case.share(500, 20, 12), times=2)
    assert slow > 5.0 * per_pair(ours, case, times=5)


@pytest.mark.parametrize("kind", ["urban", "lids"])
def test_urban_terrain_and_lids_cost_little_more(case: Case, kind: str) -> None:
    """Within 2 x is the aim (measure.py); a busy machine may blur it to 4 x here."""
    other = single_lines(
        1000, 40, 6, **{"urban": {"terrain": "urban"}, "lids": {"lids": True}}[kind]
    )
    ours(other)
    assert per_pair(ours, other, times=5) < 4.0 * per_pair(ours, case, times=5)
