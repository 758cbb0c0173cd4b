"""Turner's stability table against EPA-454/R-99-005, Tables 6-4 to 6-6."""

from __future__ import annotations

import math

import numpy as np
import pytest

from roaddisp.constants import KNOT
from roaddisp.weather.stability import turner_class

NO_CEILING = math.inf

# EPA-454/R-99-005, Table 6-4: whole knots, printed limits in m/s, class numbers for a
# net radiation index of 4, 3, 2, 1, 0, -1, -2 (1 = A ... 7 = G, taken as F).
TABLE_6_4 = [
    ([0, 1], (0.0, 0.7), [1, 1, 2, 3, 4, 6, 7]),
    ([2, 3], (0.8, 1.8), [1, 2, 2, 3, 4, 6, 7]),
    ([4, 5], (1.9, 2.8), [1, 2, 3, 4, 4, 5, 6]),
    ([6], (2.9, 3.3), [2, 2, 3, 4, 4, 5, 6]),
    ([7], (3.4, 3.8), [2, 2, 3, 4, 4, 4, 5]),
    ([8, 9], (3.9, 4.8), [2, 3, 3, 4, 4, 4, 5]),
    ([10], (4.9, 5.4), [3, 3, 4, 4, 4, 4, 5]),
    ([11], (5.5, 5.9), [3, 3, 4, 4, 4, 4, 4]),
    ([12, 13, 40], (6.0, 25.0), [3, 4, 4, 4, 4, 4, 4]),
]
LETTER = {1: "A", 2: "B", 3: "C", 4: "D", 5: "E", 6: "F", 7: "F"}

# One sky for each index, by Tables 6-5 and 6-6: cloud, ceiling, elevation, night.
SKY = {
    4: (0, NO_CEILING, 70.0, False),
    3: (0, NO_CEILING, 50.0, False),
    2: (0, NO_CEILING, 25.0, False),
    1: (0, NO_CEILING, 10.0, False),
    0: (10, 1000.0, 70.0, False),
    -1: (5, NO_CEILING, -20.0, True),
    -2: (4, NO_CEILING, -20.0, True),
}

CELLS = [
    pytest.param(knots, limits, index, LETTER[number], id=f"{knots[0]}kt_index{index}")
    for knots, limits, numbers in TABLE_6_4
    for index, number in zip((4, 3, 2, 1, 0, -1, -2), numbers, strict=True)
]


def test_there_are_63_cells() -> None:
    assert len(CELLS) == 63


@pytest.mark.parametrize(("knots", "limits", "index", "letter"), CELLS)
def test_every_cell_in_knots_and_at_the_printed_limits(
    knots: list[int], limits: tuple[float, float], index: int, letter: str
) -> None:
    cloud, ceiling, elevation, night = SKY[index]
    for speed in [*(knot * KNOT for knot in knots), *limits]:
        assert turner_class(speed, cloud, ceiling, elevation, night=night) == letter


@pytest.mark.parametrize(
    ("half_knots", "below", "at"),
    [(1.5, "A", "B"), (3.5, "B", "B"), (6.5, "B", "B"), (7.5, "B", "C"), (11.5, "C", "D")],
)
def test_half_knots_round_up(half_knots: float, below: str, at: str) -> None:
    """Design rule; the letters are Table 6-4 at index 3 on either side of the half."""
    cloud, ceiling, elevation, night = SKY[3]
    speeds = np.array([half_knots * KNOT - 1e-4, half_knots * KNOT])
    assert turner_class(speeds, cloud, ceiling, elevation, night=night).tolist() == [below, at]


@pytest.mark.parametrize(
    ("elevation", "letter"),
    # Table 6-5 (its last row from memory), seen at 8 kt: 4 B, 3 C, 2 C, 1 D, and at
    # 4 kt: 4 A, 3 B, 2 C, 1 D, which tells all four apart.
    [(60.01, "A"), (60.0, "B"), (35.01, "B"), (35.0, "C"), (15.01, "C"), (15.0, "D"), (0.1, "D")],
)
def test_limits_of_insolation(elevation: float, letter: str) -> None:
    assert turner_class(4 * KNOT, 0, NO_CEILING, elevation) == letter


# Table 6-6 by day, at 4 kt and strong sun (class 4): index 4 A, 3 B, 2 C, 1 D.
@pytest.mark.parametrize(
    ("cloud", "ceiling_ft", "letter"),
    [
        (5, 1_000, "A"),  # cloud 5/10 or less takes nothing off
        (6, 6_999, "C"),  # two off below 7,000 ft
        (6, 7_000, "B"),  # one off from 7,000 ft
        (6, 15_999, "B"),
        (6, 16_000, "A"),  # nothing from 16,000 ft
        (9, math.inf, "A"),
        (10, math.inf, "B"),  # one more off for 10/10 (from memory)
        (10, 16_000, "B"),
        (10, 7_000, "C"),  # cumulative (from memory)
    ],
)
def test_cloud_and_ceiling_by_day(cloud: float, ceiling_ft: float, letter: str) -> None:
    assert turner_class(4 * KNOT, cloud, ceiling_ft * 0.3048, 70.0) == letter


def test_the_days_index_is_at_least_one() -> None:
    """Methods 2.1 step 3d (from memory): class 2 sun, two off, is 1 and not 0.

    At 2 kt index 1 is C and index 0 would be D.
    """
    assert turner_class(2 * KNOT, 9, 500.0, 25.0) == "C"


def test_overcast_below_7000_ft_is_neutral_by_night_too() -> None:
    """Table 6-6, step 1."""
    assert turner_class(1 * KNOT, 10, 2133.0, -30.0) == "D"
    assert turner_class(1 * KNOT, 10, 2134.0, -30.0) == "F"


def test_night_is_the_sun_at_the_horizon_unless_said() -> None:
    assert turner_class(2 * KNOT, 0, NO_CEILING, 0.0) == "F"
    assert turner_class(2 * KNOT, 0, NO_CEILING, 0.1) == "C"
    assert turner_class(2 * KNOT, 0, NO_CEILING, 5.0, night=True) == "F"
