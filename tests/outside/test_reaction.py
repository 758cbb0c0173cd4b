"""NO + O3 and NO2 + light against an integrator and tabulated values."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from roaddisp.chemistry.reaction import (
    nitric_oxide_ozone_rate,
    no2_after,
    reaction_limited_no2,
)

# A = 100, B = 48, y0 = 18 ppb, k = 4.43e-4 per ppb and s; made with a stiff
# integrator (rtol 1e-11), in ppb, four decimals: at J = 8e-3 per s, and in the dark.
CHECK_CASE = {
    0: (18.0000, 18.0000),
    10: (25.2655, 26.7009),
    30: (32.2969, 36.3287),
    60: (35.8510, 42.7412),
    120: (37.1476, 46.7728),
    300: (37.2704, 47.9810),
    np.inf: (37.2705, 48.0000),
}


@pytest.mark.parametrize("time", CHECK_CASE)
def test_check_case(time: float) -> None:
    ours = [
        no2_after(time, nox=100.0, oxidant=48.0, no2=18.0, rate=4.43e-4, photolysis=light)
        for light in (8e-3, 0.0)
    ]
    # half of the last printed digit, and a little for its own rounding
    assert ours == pytest.approx(CHECK_CASE[time], abs=6e-5)


def _integrated(nox: float, oxidant: float, no2: float, k: float, light: float, t: float) -> float:
    def slope(_: float, y: np.ndarray) -> np.ndarray:
        return k * (nox - y) * (oxidant - y) - light * y

    solution = solve_ivp(slope, (0, t), [no2], method="Radau", rtol=1e-10, atol=1e-10)
    return float(solution.y[0, -1])


def test_forty_random_cases_against_a_stiff_integrator() -> None:
    """scipy's implicit Runge-Kutta of fifth order (Radau IIA)."""
    rng = np.random.default_rng(7)
    for _ in range(40):
        nox_road, o3, no2, no = rng.uniform([1, 0, 0, 0], [400, 80, 40, 30])
        fraction, light = rng.uniform(0.02, 0.4), rng.choice([0.0, rng.uniform(0, 9e-3)])
        time, temperature, pressure = rng.uniform([1, 258, 8e4], [600, 312, 1.03e5])
        # JPL 19-5 (from memory) with its own arithmetic: molecules/cm3 from p / (kB T)
        air = pressure / (1.380649e-23 * temperature) * 1e-6
        k = 3.0e-12 * np.exp(-1500 / temperature) * air * 1e-9
        start = fraction * nox_road + no2
        expected = _integrated(nox_road + no2 + no, o3 + start, start, k, light, time)
        ours = reaction_limited_no2(
            nox_road,
            o3,
            no2,
            fraction,
            travel_time=time,
            temperature=temperature,
            photolysis=light,
            no_background=no,
            pressure=pressure,
        )
        assert ours == pytest.approx(expected, abs=1e-4)


# k of JPL 19-5 in ppb-1 s-1 at 1 atm, four digits (values of the formula, from memory).
@pytest.mark.parametrize(
    ("temperature", "rate"),
    [
        (273.15, 3.322e-4),
        (283.15, 3.891e-4),
        (293.15, 4.503e-4),
        (298.15, 4.824e-4),
        (308.15, 5.495e-4),
    ],
)
def test_rate_constant(temperature: float, rate: float) -> None:
    assert nitric_oxide_ozone_rate(temperature) == pytest.approx(rate, rel=2e-4)


def test_steady_state_balances() -> None:
    """Leighton 1961: k [NO][O3] = J [NO2]."""
    k, light, nox, oxidant = 4.4e-4, 6e-3, 83.0, 41.0
    no2 = no2_after(np.inf, nox=nox, oxidant=oxidant, no2=9.0, rate=k, photolysis=light)
    assert k * (nox - no2) * (oxidant - no2) / (light * no2) == pytest.approx(1.0, abs=1e-9)
