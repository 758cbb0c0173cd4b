"""What physics guarantees of the ozone limiting method. (Cases: tests/outside.)"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.chemistry.ozone_limiting import ozone_limited, ozone_limited_no2

NOX, O3, NO2, SHARE = (
    st.floats(0, 2000),
    st.floats(0, 300),
    st.floats(0, 150),
    st.floats(0, 1),
)
MORE = st.floats(0, 100)


@given(NOX, O3, NO2, SHARE)
def test_bounds(nox: float, o3: float, no2: float, fraction: float) -> None:
    total = ozone_limited_no2(nox, o3, no2, fraction)
    slack = 1e-9 * (1 + nox + o3 + no2)
    assert no2 + fraction * nox - slack <= total <= no2 + nox + slack
    assert total <= no2 + fraction * nox + o3 + slack


@given(NOX, O3, NO2, SHARE, MORE, MORE, SHARE)
def test_monotone(
    nox: float,
    o3: float,
    no2: float,
    fraction: float,
    more_nox: float,
    more_o3: float,
    other_fraction: float,
) -> None:
    low = ozone_limited_no2(nox, o3, no2, fraction)
    slack = 1e-9 * (1 + nox + o3 + no2)
    assert ozone_limited_no2(nox + more_nox, o3, no2, fraction) >= low - slack
    assert ozone_limited_no2(nox, o3 + more_o3, no2, fraction) >= low - slack
    assert ozone_limited_no2(nox, o3, no2, max(fraction, other_fraction)) >= low - slack


@given(NOX, O3, NO2)
def test_all_primary_is_all_no2(nox: float, o3: float, no2: float) -> None:
    assert ozone_limited_no2(nox, o3, no2, 1.0) == pytest.approx(nox + no2)


@given(NOX, O3, NO2, SHARE, st.one_of(st.none(), st.floats(0, 200)))
def test_nitrogen_and_oxidant_are_conserved(
    nox: float, o3: float, no2: float, fraction: float, no: float | None
) -> None:
    made_no2, made_no, left = ozone_limited(
        np.array([nox]),
        np.array([fraction * nox]),
        np.array([o3]),
        np.array([no2]),
        None if no is None else np.array([no]),
    )
    assert made_no2 + made_no == pytest.approx(nox + no2 + (no or 0.0), abs=1e-9)
    assert made_no2 + left == pytest.approx(fraction * nox + no2 + o3, abs=1e-9)
    assert made_no >= 0
    assert left >= 0


def test_shapes() -> None:
    assert isinstance(ozone_limited_no2(100, 30, 12, 0.1), float)
    total = ozone_limited_no2(np.full((3, 1), 100.0), np.array([0.0, 30.0]), 12.0, 0.1)
    assert total.tolist() == [[22.0, 52.0]] * 3


@pytest.mark.parametrize("place", range(4))
def test_nan_in_nan_out(place: int) -> None:
    arguments = [100.0, 30.0, 12.0, 0.1]
    arguments[place] = np.nan
    assert np.isnan(ozone_limited_no2(*arguments))


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((-1, 30, 12, 0.1), "nox is -1"),
        ((1, -30, 12, 0.1), "o3 is -30"),
        ((1, 30, [5, -12], 0.1), "no2_background is -12"),
        ((1, 30, 12, 1.01), "primary_fraction is 1.01; allowed: 0 to 1"),
        ((np.inf, 30, 12, 0.1), "nox is inf"),
    ],
)
def test_impossible_values_are_refused(arguments: tuple[object, ...], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        ozone_limited_no2(*arguments)
