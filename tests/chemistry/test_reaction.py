"""Limits of the reaction-limited conversion. (Against an integrator: tests/outside.)"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.chemistry.ozone_limiting import ozone_limited_no2
from roaddisp.chemistry.reaction import no2_after, reaction_limited_no2

AIR = {"temperature": 288.15, "photolysis": 0.0}


@given(st.floats(0, 2000), st.floats(0, 300), st.floats(0, 150), st.floats(0, 1))
def test_given_time_in_the_dark_it_is_the_ozone_limited_value(
    nox: float, o3: float, no2: float, fraction: float
) -> None:
    settled = reaction_limited_no2(nox, o3, no2, fraction, travel_time=np.inf, **AIR)
    assert settled == pytest.approx(ozone_limited_no2(nox, o3, no2, fraction), abs=1e-7)


@given(
    st.floats(0, 2000),
    st.floats(0, 300),
    st.floats(0, 150),
    st.floats(0, 1),
    st.floats(0, 5000),
    st.floats(0, 1e-2),
    st.floats(0, 100),
)
def test_bounds_and_start(
    nox: float, o3: float, no2: float, fraction: float, time: float, light: float, no: float
) -> None:
    """Never below 0, above all NOx or above all oxidant; at time 0 nothing has happened."""
    arguments = (nox, o3, no2, fraction)
    conditions = {"temperature": 300.0, "photolysis": light, "no_background": no}
    made = reaction_limited_no2(*arguments, travel_time=time, **conditions)
    start = fraction * nox + no2
    assert -1e-9 <= made <= min(nox + no2 + no, o3 + start) + 1e-6
    at_once = reaction_limited_no2(*arguments, travel_time=0.0, **conditions)
    assert at_once == pytest.approx(start, abs=1e-9)


def test_in_the_dark_no2_grows_with_time_towards_the_bound() -> None:
    times = np.array([0.0, 5.0, 20.0, 60.0, 300.0, 3600.0])
    made = reaction_limited_no2(120.0, 35.0, 12.0, 0.15, travel_time=times, **AIR)
    assert np.all(np.diff(made) > 0)
    assert made[-1] == pytest.approx(ozone_limited_no2(120.0, 35.0, 12.0, 0.15), abs=1e-3)


def test_equal_nitrogen_and_oxidant_in_the_dark() -> None:
    """A = B, J = 0: y = A - (A - y0) / (1 + k t (A - y0)), second-order decay.

    A 60, y0 20, k 4.5e-4, t 100: 60 - 40 / (1 + 0.045 x 40) = 45.7142857 ppb.
    """
    arguments = {"nox": 60.0, "no2": 20.0, "rate": 4.5e-4, "photolysis": 0.0}
    exact = no2_after(100.0, oxidant=60.0, **arguments)
    assert exact == pytest.approx(45.7142857, abs=1e-7)
    for near in (1e-13, 1e-10, 1e-7):
        assert no2_after(100.0, oxidant=60.0 + near, **arguments) == pytest.approx(
            45.7142857, abs=1e-6
        )


def test_first_moments_are_the_rate_itself() -> None:
    """y'(0) = k (A - y0)(B - y0) - J y0 = 4.43e-4 x 82 x 30 - 8e-3 x 18 = 0.94578 ppb/s."""
    case = {"nox": 100.0, "oxidant": 48.0, "no2": 18.0, "rate": 4.43e-4, "photolysis": 8e-3}
    slope = (no2_after(1e-4, **case) - 18.0) / 1e-4
    assert slope == pytest.approx(0.94578, rel=1e-4)


def test_without_nitrogen_there_is_no_no2() -> None:
    assert reaction_limited_no2(0.0, 0.0, 0.0, 0.1, travel_time=60.0, **AIR) == 0.0
    assert reaction_limited_no2(0.0, 40.0, 0.0, 0.1, travel_time=60.0, **AIR) == 0.0
    settled = reaction_limited_no2(0.0, 0.0, 0.0, 0.1, travel_time=np.inf, **AIR)
    assert settled == 0.0


def test_steady_mixture_of_pure_no2_in_light() -> None:
    """All oxidant as NO2 at first: w0 is all but D, where the closed form is most delicate."""
    made = no2_after(
        np.array([1e-6, 1e9]), nox=40.0, oxidant=40.0, no2=40.0, rate=4.5e-4, photolysis=9e-3
    )
    # k x^2 = J (40 - x): x = 20 and 20 left, for 4.5e-4 x 400 = 9e-3 x 20
    assert made == pytest.approx([40.0, 20.0], abs=1e-6)


def test_shapes_and_missing_values() -> None:
    made = reaction_limited_no2(
        np.full((2, 1), 100.0), 30.0, 12.0, 0.1, travel_time=np.array([10.0, 20.0, np.nan]), **AIR
    )
    assert made.shape == (2, 3)
    assert np.isnan(made).tolist() == [[False, False, True]] * 2
    assert isinstance(reaction_limited_no2(100, 30, 12, 0.1, travel_time=9, **AIR), float)
    cold = AIR | {"temperature": np.nan}
    assert np.isnan(reaction_limited_no2(100, 30, 12, 0.1, travel_time=9, **cold))


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"travel_time": -1.0}, "travel_time is -1 s"),
        ({"temperature": 0.0}, "temperature is 0 K; allowed: above 0"),
        ({"pressure": -5.0}, "pressure is -5 Pa"),
        ({"photolysis": -1e-3}, "photolysis is -0.001"),
        ({"no_background": -2.0}, "no_background is -2"),
    ],
)
def test_impossible_values_are_refused(changes: dict[str, float], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        reaction_limited_no2(100, 30, 12, 0.1, **({"travel_time": 10.0} | AIR | changes))
