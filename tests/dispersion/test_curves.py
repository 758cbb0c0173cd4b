"""Arguments and shapes of the spread curves; their values are in tests/outside."""

from __future__ import annotations

import numpy as np
import pytest

from roaddisp.dispersion.curves import sigma_y, sigma_z


@pytest.mark.parametrize("curve", [sigma_y, sigma_z])
def test_shape_follows_the_distance(curve):
    assert np.ndim(curve(250.0, "C")) == 0
    assert curve(np.full((2, 3), 250.0), "C").shape == (2, 3)


@pytest.mark.parametrize("curve", [sigma_y, sigma_z])
def test_missing_distance_gives_missing_spread(curve):
    assert np.isnan(curve([np.nan, 10.0], "E", "urban")).tolist() == [True, False]


@pytest.mark.parametrize(
    ("distance", "stability", "terrain", "message"),
    [
        (-1.0, "D", "open", "distance: -1 m; allowed: 0 m and more"),
        (10.0, "G", "open", "stability: 'G'; allowed: one of A, B, C, D, E, F"),
        (10.0, "D", "sea", "terrain: 'sea'; allowed: 'open', 'urban'"),
    ],
)
def test_what_cannot_be_is_refused(distance, stability, terrain, message):
    with pytest.raises(ValueError, match=message):
        sigma_z(distance, stability, terrain)
