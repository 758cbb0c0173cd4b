"""Ozone limiting method, four cases worked by hand from its formula.

Cole & Summerhays 1979, J. Air Poll. Control Assoc. 29, 812-817 (from memory), in
ug/m3 with NOx as NO2: NO2 = f NOx + min((1 - f) NOx, (46/48) O3). Passing ozone
as its NO2 equivalent, 46/48 of its mass, the function works in any one unit.
"""

from __future__ import annotations

import pytest

from roaddisp.chemistry.ozone_limiting import ozone_limited_no2


@pytest.mark.parametrize(
    ("nox", "fraction", "o3", "no2"),
    [
        (200, 0.1, 80, 96.667),  # 20 + min(180, 76.667)
        (50, 0.1, 80, 50.0),  # 5 + min(45, 76.667)
        (200, 0.2, 0, 40.0),
        (500, 0.1, 160, 203.333),  # 50 + min(450, 153.333)
    ],
)
def test_handbook_cases(nox: float, fraction: float, o3: float, no2: float) -> None:
    assert ozone_limited_no2(nox, o3 * 46 / 48, 0.0, fraction) == pytest.approx(no2, abs=1e-3)


def test_background_is_added() -> None:
    """25 + min(75, 30) + 12 ppb."""
    assert ozone_limited_no2(100, 30, 12, 0.25) == pytest.approx(67.0, abs=1e-12)
