"""Briggs' curves against printed values.

The table of check values for the expressions of Briggs (1973), ATDL contribution 79, as
reprinted by Gifford (1976) and in Fundamentals of Air Pollution, 3rd ed., Tables 19-6 and
19-7; printed to two decimals (one, beyond a kilometre).
"""

from __future__ import annotations

import pytest

from roaddisp.dispersion.curves import sigma_y, sigma_z

BRIGGS_VALUES = {
    (100, "open", "y"): (21.89, 15.92, 10.95, 7.96, 5.97, 3.98),
    (100, "open", "z"): (20.00, 12.00, 7.92, 5.60, 2.91, 1.55),
    (100, "urban", "y"): (31.38, 31.38, 21.57, 15.69, 10.79, 10.79),
    (100, "urban", "z"): (25.17, 25.17, 20.00, 13.79, 7.46, 7.46),
    (1000, "open", "y"): (209.76, 152.55, 104.88, 76.28, 57.21, 38.14),
    (1000, "open", "z"): (200.00, 120.00, 73.03, 37.95, 23.08, 12.31),
    (1000, "urban", "y"): (270.45, 270.45, 185.93, 135.22, 92.97, 92.97),
    (1000, "urban", "z"): (339.41, 339.41, 200.00, 122.79, 50.60, 50.60),
    (10000, "open", "y"): (1555.6, 1131.4, 777.8, 565.7, 424.3, 282.8),
    (10000, "open", "z"): (2000.0, 1200.0, 461.9, 150.0, 75.0, 40.0),
    (10000, "urban", "y"): (1431.1, 1431.1, 983.9, 715.5, 491.9, 491.9),
    (10000, "urban", "z"): (7959.9, 7959.9, 2000.0, 700.0, 200.0, 200.0),
}


@pytest.mark.parametrize(("distance", "terrain", "axis"), BRIGGS_VALUES)
def test_curves_give_the_printed_values(distance, terrain, axis):
    """3e-3 is the rounding of the smallest printed value, 1.55 m."""
    curve = sigma_y if axis == "y" else sigma_z
    for stability, printed in zip("ABCDEF", BRIGGS_VALUES[distance, terrain, axis], strict=True):
        assert curve(distance, stability, terrain) == pytest.approx(printed, rel=3e-3)
