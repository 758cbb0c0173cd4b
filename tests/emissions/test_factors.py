"""Factor tables: bounds, monotone interpolation, the built-in rows."""

from __future__ import annotations

import csv
from importlib.resources import files

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.interpolate import CubicSpline

from roaddisp.emissions.factors import built_in_factors, emission_factors, nearest_year
from roaddisp.model import FactorTable

# Fritsch & Carlson 1980 (SIAM J. Numer. Anal. 17, 238-246), data set RPN 14 (from memory):
# the example for which an ordinary cubic spline overshoots.
RPN14_X = [7.99, 8.09, 8.19, 8.7, 9.2, 10.0, 12.0, 15.0, 20.0]
RPN14_Y = [0, 2.76429e-5, 4.37498e-2, 0.169183, 0.469428, 0.943740, 0.998636, 0.999919, 0.999994]


def table(
    speed: list[float], nox: list[float], fraction: list[float] | None = None, name: str = "car"
) -> FactorTable:
    return FactorTable(
        classes=(name,),
        heavy=np.array([False]),
        speed=(np.array(speed),),
        nox=(np.array(nox),),
        no2_fraction=(np.array(fraction or [0.1] * len(speed)),),
        year=None,
        built_in=False,
        sources=("",),
    )


def test_no_overshoot_where_a_spline_overshoots() -> None:
    fine = np.linspace(7.99, 20.0, 2000)
    nox = emission_factors(table(RPN14_X, RPN14_Y), fine)[0][0]
    spline = CubicSpline(RPN14_X, RPN14_Y)(fine)
    assert spline.max() > 1.001
    assert nox.max() <= RPN14_Y[-1] + 1e-12
    assert np.all(np.diff(nox) >= 0)


@given(
    nox=st.lists(st.floats(0, 10), min_size=2, max_size=7),
    steps=st.lists(st.floats(0.5, 9), min_size=7, max_size=7),
    at=st.floats(0, 1),
)
def test_between_two_rows_stays_between_their_values(
    nox: list[float], steps: list[float], at: float
) -> None:
    speeds = 3.0 + np.cumsum(steps[: len(nox)])
    for low in range(len(nox) - 1):
        speed = speeds[low] + at * (speeds[low + 1] - speeds[low])
        value = emission_factors(table(speeds.tolist(), nox), np.array([speed]))[0][0, 0]
        pair = nox[low : low + 2]
        assert min(pair) - 1e-12 <= value <= max(pair) + 1e-12


def test_rows_are_reproduced() -> None:
    made = table([5.0, 10.0, 20.0], [0.9, 0.4, 0.55], [0.3, 0.25, 0.1])
    nox, fraction = emission_factors(made, np.array([20.0, 5.0, 10.0]))
    assert nox[0] == pytest.approx([0.55, 0.9, 0.4], rel=1e-12)
    assert fraction[0] == pytest.approx([0.1, 0.3, 0.25], rel=1e-12)


@pytest.mark.parametrize("speed", [50 / 3.6 * (1 - 2e-6), 80 / 3.6 * (1 + 2e-6), 0.0, np.inf])
def test_nothing_is_extrapolated(speed: float) -> None:
    made = table([50 / 3.6, 80 / 3.6], [0.3, 0.24], name="van")
    with pytest.raises(ValueError, match=r"factor table of van; allowed: 50 to 80 km/h"):
        emission_factors(made, np.array([60 / 3.6, speed]))


def test_rounding_of_a_unit_is_not_extrapolation() -> None:
    made = table([50 / 3.6, 80 / 3.6], [0.3, 0.24])
    edges = np.array([50 / 3.6 * (1 - 5e-7), 80 / 3.6 * (1 + 5e-7)])
    assert emission_factors(made, edges)[0][0].tolist() == [0.3, 0.24]


def test_one_row_allows_its_speed_alone() -> None:
    made = table([50 / 3.6], [0.3])
    assert emission_factors(made, np.array([50 / 3.6]))[0].tolist() == [[0.3]]
    with pytest.raises(ValueError, match=r"speed 51 km/h .* allowed: 50 km/h"):
        emission_factors(made, np.array([51 / 3.6]))


def test_missing_speed_gives_missing_factors() -> None:
    nox, fraction = emission_factors(table([5.0, 10.0], [0.9, 0.4]), np.array([np.nan, 10.0]))
    assert np.isnan(nox[0]).tolist() == np.isnan(fraction[0]).tolist() == [True, False]


def test_what_is_not_wanted_is_not_looked_up() -> None:
    nox, _ = emission_factors(
        table([5.0, 10.0], [0.9, 0.4]),
        np.array([[7.0, 99.0]]),
        where=np.array([[[True, False]]]),
    )
    assert nox.shape == (1, 1, 2)
    assert nox[0, 0, 1] == 0.0


def test_built_in_rows_name_their_source() -> None:
    rows = list(
        csv.DictReader(files("roaddisp").joinpath("data/factors.csv").read_text().splitlines())
    )
    assert len(rows) == 12
    for row in rows:
        assert "guidebook" in row["source"]
        assert "from memory" in row["source"]
        assert "does not vary with speed" in row["source"]


@pytest.mark.parametrize(
    ("name", "nox"),
    # EMEP/EEA guidebook, Tier 2 exhaust NOx, Euro 5 and V, g/km (from memory); the car
    # is half petrol, 0.061, half diesel, 0.550.
    [
        ("car", (0.061 + 0.550) / 2),
        ("van", 1.15),
        ("bus", 3.09),
        ("rigid_truck", 2.18),
        ("articulated_truck", 2.18),
    ],
)
def test_built_in_factors_are_the_published_averages_at_any_speed(name: str, nox: float) -> None:
    factors = built_in_factors()
    values, _ = emission_factors(factors, np.array([15.0, 55.0, 115.0]) / 3.6)
    assert values[factors.classes.index(name)] == pytest.approx(nox, rel=1e-12)


def test_primary_no2_of_the_built_in_car_is_weighted_by_nox() -> None:
    """3 % of petrol's 0.061 and 33 % of diesel's 0.550 g/km, Euro 5 (from memory)."""
    expected = (0.03 * 0.061 + 0.33 * 0.550) / (0.061 + 0.550)
    _, fraction = emission_factors(built_in_factors(), np.array([14.0]))
    assert fraction[0, 0] == pytest.approx(expected, abs=5e-3)


def test_heavy_classes_of_the_built_in_table() -> None:
    factors = built_in_factors()
    heavy = [
        name for name, is_heavy in zip(factors.classes, factors.heavy, strict=True) if is_heavy
    ]
    assert heavy == ["bus", "rigid_truck", "articulated_truck"]


def test_nearest_year() -> None:
    assert nearest_year([2035, 2020, 2028], 2027) == 2028
    assert nearest_year([2020, 2030], 2025) == 2020  # of two as near, the dirtier fleet
    with pytest.raises(ValueError, match="no years"):
        nearest_year([], 2025)
