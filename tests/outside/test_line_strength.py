"""Line strength and design hour, from handbook arithmetic."""

from __future__ import annotations

import numpy as np
import pytest

from roaddisp.emissions.strength import line_strength
from roaddisp.model import Profiles
from roaddisp.traffic.volumes import profile_shape


def test_unit_factor() -> None:
    """1 veh/h at 1 g/km is 1 g / 1000 m / 3600 s = 0.277778 ug/m/s."""
    assert line_strength(1, 1) * 1e6 == pytest.approx(0.277778, abs=5e-7)


def test_average_strength_of_ten_thousand_vehicles_a_day() -> None:
    """10,000 / 24 * 0.5 * 0.277778 = 57.87 ug/m/s."""
    assert line_strength(10_000 / 24, 0.5) * 1e6 == pytest.approx(57.87, abs=5e-3)


def test_worked_line_source() -> None:
    """Turner 1970 (AP-26), problem 18 (from memory): 8,000 veh/h at 40 mi/h, 2e-2 g/s each.

    With 1 mi = 1600 m as printed, a vehicle emits 2e-2 / (40 * 1.6 / 3600) g/km and
    the line 2.5e-3 g/m/s.
    """
    per_kilometre = 2e-2 / (40 * 1.6 / 3600)
    assert line_strength(8000, per_kilometre) == pytest.approx(2.5e-3, rel=1e-9)


def test_directional_design_hour_volume() -> None:
    """DDHV = K D AADT: 0.09 * 0.55 * 60,000 = 2,970 veh/h (state forecasting handbooks)."""
    K, D, AADT = 0.09, 0.55, 60_000
    share = np.full((1, 12, 3, 24), (1 - K) / 23)
    share[..., 17] = K
    profiles = Profiles(("design",), share, np.ones((1, 12, 3)))
    civil = np.array(["2024-05-14T17:00", "2024-05-14T18:00"], dtype="datetime64[m]")
    design_hour, next_hour = profile_shape(profiles, civil)[0] * D * AADT
    assert design_hour == pytest.approx(2970, abs=1e-9)
    assert next_hour == pytest.approx(33_000 * 0.91 / 23, abs=1e-9)
