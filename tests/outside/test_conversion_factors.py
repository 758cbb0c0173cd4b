"""ug/m3 in one ppb: M P / (R T) with constants of scipy, and the printed figures."""

from __future__ import annotations

import pytest
import scipy.constants

from roaddisp.air.background import UGM3_PER_PPB
from roaddisp.standards.rules import standards

# g/mol, from the standard atomic weights (IUPAC): N 14.0067, O 15.9994.
MOLAR_MASS = {"no2": 46.0055, "nox": 46.0055, "no": 30.0061, "o3": 47.9982}
STATE = {"25 C": (298.15, 101325.0), "20 C": (293.15, 101325.0)}


def per_ppb(molar_mass: float, temperature: float, pressure: float) -> float:
    # g/mol * mol/m3 * 1e6 ug/g * 1e-9
    return molar_mass * pressure / (scipy.constants.R * temperature) * 1e-3


@pytest.mark.parametrize("reference", STATE)
@pytest.mark.parametrize("gas", MOLAR_MASS)
def test_factors_are_the_unrounded_ones_to_four_decimals(reference: str, gas: str) -> None:
    exact = per_ppb(MOLAR_MASS[gas], *STATE[reference])
    assert UGM3_PER_PPB[reference][gas] == pytest.approx(exact, abs=5e-5)


@pytest.mark.parametrize(
    ("reference", "gas", "printed"),
    [
        ("25 C", "no2", 1.88),  # US agency pages print 1.88 (40 CFR 50.3: 25 C, 760 mm Hg)
        ("20 C", "no2", 1.9125),  # UK reporting sheets, from memory
        ("25 C", "no", 1.2265),
        ("25 C", "o3", 1.9619),
        ("20 C", "no", 1.2474),
        ("20 C", "o3", 1.9953),
    ],
)
def test_printed_factors(reference: str, gas: str, printed: float) -> None:
    digits = len(str(printed).split(".")[1])
    assert round(UGM3_PER_PPB[reference][gas], digits) == printed


@pytest.mark.parametrize(
    ("name", "temperature", "pressure"),
    [
        ("us-naaqs-1h", 298.15, 101325.0),
        ("us-naaqs-annual", 298.15, 101325.0),
        ("eu-2008-1h", 293.0, 101300.0),  # 2008/50/EC: 293 K and 101.3 kPa, from memory
        ("eu-2008-annual", 293.0, 101300.0),
        ("eu-2008-nox-vegetation", 293.0, 101300.0),
    ],
)
def test_each_standard_has_its_own_factor(name: str, temperature: float, pressure: float) -> None:
    exact = per_ppb(46.0055, temperature, pressure)
    assert standards()[name].ugm3_per_ppb == pytest.approx(exact, abs=5e-5)


def test_levels_in_the_other_unit() -> None:
    """40 CFR 50.11 prints 188 and 100 ug/m3 beside 100 and 53 ppb."""
    hourly, annual = standards()["us-naaqs-1h"], standards()["us-naaqs-annual"]
    assert round(hourly.level * hourly.ugm3_per_ppb) == 188
    assert round(annual.level * annual.ugm3_per_ppb) == 100
