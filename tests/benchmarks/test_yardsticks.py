"""The yardsticks compute what they are to be timed at."""

from __future__ import annotations

import kernel_c
import numpy as np
import pytest
import yardstick_loop
import yardstick_numpy
from cases import Case, single_lines

import roaddisp as rd
from roaddisp.model import FloatArray, Terrain

SMALL = {"receptors": 250, "segments": 12, "directions": 4}


def ours(case: Case) -> FloatArray:
    return rd.response_table(case.receptors, case.segments, **case.options())


def exact(case: Case) -> FloatArray:
    """Table (W, G, R) from the float64 path."""
    table = np.zeros((len(case.wind_from), int(case.group.max()) + 1, len(case.receptors)))
    for w, (wind, letter, lid) in enumerate(
        zip(case.wind_from, case.stability, case.mixing_height, strict=True)
    ):
        each = rd.unit_concentration(
            case.receptors,
            case.segments,
            wind_from=wind,
            wind_speed=1.0,
            stability=letter,
            terrain=case.terrain,
            height=case.height,
            sigma_z0=case.sigma_z0,
            sigma_y0=case.sigma_y0,
            mixing_height=lid,
        )
        np.add.at(table[w], case.group, (each * case.strength).T)
    return table


def relative_errors(found: FloatArray, expected: FloatArray) -> FloatArray:
    """Where the expected value is above a ten-thousandth of the largest."""
    seen = expected > 1e-4 * expected.max()
    return np.abs(found[seen] / expected[seen] - 1.0)


@pytest.mark.skipif(kernel_c.why_not() is not None, reason=str(kernel_c.why_not()))
@pytest.mark.parametrize(("terrain", "lids"), [("open", False), ("urban", False), ("open", True)])
def test_c_kernel_of_the_same_scheme_agrees_with_the_response_table(
    terrain: Terrain, lids: bool
) -> None:
    case = single_lines(**SMALL, terrain=terrain, lids=lids)
    table, live, nodes = kernel_c.response_table(case, threads=2)
    assert relative_errors(table, ours(case)).max() < 1e-3
    assert 0 < live < case.pair_states
    assert live <= nodes <= 2 * 36 * live


def test_loop_of_64_nodes_is_right_where_the_plume_is_wide() -> None:
    """And wrong by a multiple where a plume is narrower than the spacing of its nodes."""
    case = single_lines(**SMALL)
    errors = relative_errors(yardstick_loop.response_table(case), exact(case))
    assert np.median(errors) < 1e-3
    assert errors.max() > 1e-2


def test_200_points_are_right_where_the_plume_is_wide() -> None:
    """And 200 even points lose a narrow peak (over 10 % in some cases)."""
    case = single_lines(**SMALL)
    errors = relative_errors(yardstick_numpy.response_table(case), exact(case))
    assert np.median(errors) < 1e-2
    assert errors.max() > 1e-2


def test_yardsticks_agree_with_each_other_on_a_short_segment_far_away() -> None:
    """A 20 m segment 400 m away is smooth: every rule must give the same to 1e-3."""
    case = single_lines(1, 1, 1)
    still = Case(
        **{
            **vars(case),
            "receptors": np.array([[0.0, 0.0, 1.5]]),
            "segments": np.array([[[-400.0, -10.0], [-395.0, 10.0]]]),
            "wind_from": np.full(6, 270.0),
        }
    )
    expected = exact(still)
    for found in (yardstick_loop.response_table(still), yardstick_numpy.response_table(still)):
        np.testing.assert_allclose(found, expected, rtol=1e-3)
