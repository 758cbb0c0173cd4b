"""Units at the door, against handbook factors."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.quantities import (
    INSIDE,
    UNITS,
    QuantityError,
    parse_number,
    parse_quantity,
    split_header,
    to_inside,
)

# One row for every spelling: text, value in the unit kept inside, relative tolerance.
# Sources: the international yard and pound agreement of 1959 (1 ft = 0.3048 m, 1 mi =
# 5280 ft, exact); the nautical mile of 1929 (1852 m, exact); the Celsius and Fahrenheit
# fixed points (0 and 100 degC, 32 and 212 degF); 1 inHg = 3386.389 Pa (mercury at 0 degC,
# NIST SP 811 App. B, from memory); eight oktas are a whole sky (WMO, from memory);
# 1 g/mi = 0.621371 g/km (methods dossier 4.5, to six digits).
HANDBOOK = [
    ("length", "3 m", 3.0, 0.0),
    ("length", "3 ft", 0.9144, 1e-12),
    ("length", "3 mi", 4828.032, 1e-12),
    ("length", "3 km", 3000.0, 0.0),
    ("speed", "36 km/h", 10.0, 1e-12),
    ("speed", "45 mph", 20.1168, 1e-12),
    ("speed", "3 m/s", 3.0, 0.0),
    ("speed", "7 kn", 3.601111111, 1e-9),
    ("emission factor", "3 g/km", 3.0, 0.0),
    ("emission factor", "250 mg/km", 0.25, 1e-12),
    ("emission factor", "2 g/mi", 1.242742, 1e-6),
    ("concentration", "3 ppb", 3.0, 0.0),
    ("concentration", "0.053 ppm", 53.0, 1e-12),
    ("temperature", "25 degC", 298.15, 1e-12),
    ("temperature", "77 degF", 298.15, 1e-12),
    ("temperature", "-40 degF", 233.15, 1e-12),
    ("temperature", "300 K", 300.0, 0.0),
    ("pressure", "1013.25 hPa", 101325.0, 1e-12),
    ("pressure", "98000 Pa", 98000.0, 0.0),
    ("pressure", "29.92 inHg", 101320.8, 1e-6),
    ("radiation", "675 W/m2", 675.0, 0.0),
    ("cloud", "7 tenths", 7.0, 0.0),
    ("cloud", "8 oktas", 10.0, 1e-12),
    ("cloud", "3 oktas", 3.75, 1e-12),
    ("cloud", "35 %", 3.5, 1e-12),
    ("angle", "270 deg", 270.0, 0.0),
    ("fraction", "12 %", 0.12, 1e-12),
    ("fraction", "0.12", 0.12, 0.0),
]


@pytest.mark.parametrize(("quantity", "text", "inside", "tolerance"), HANDBOOK)
def test_spelling_has_its_handbook_factor(
    quantity: str, text: str, inside: float, tolerance: float
) -> None:
    assert parse_quantity(text, quantity) == pytest.approx(inside, rel=max(tolerance, 1e-15))


def test_every_spelling_is_in_the_handbook_table() -> None:
    """A unit cannot be added without a factor from outside; ug/m3 is tested beside the air."""
    tested = {(quantity, text.split(" ")[-1]) for quantity, text, _, _ in HANDBOOK}
    known = {(quantity, unit) for quantity, units in UNITS.items() for unit in units}
    assert known - tested == {("concentration", "ug/m3")}
    assert set(INSIDE) == set(UNITS)


def test_mass_is_brought_to_ppb_by_who_knows_the_gas() -> None:
    """100 ppb of NO2 are 188.04 ug/m3 at 25 C (40 CFR 50.3, methods dossier 3.7)."""
    ppb = parse_quantity("188.04 ug/m3", "concentration", from_mass=lambda mass: mass / 1.8804)
    assert ppb == pytest.approx(100.0, rel=1e-12)
    with pytest.raises(QuantityError, match="ug/m3 cannot be turned into ppb here"):
        parse_quantity("188.04 ug/m3", "concentration")


@pytest.mark.parametrize(
    ("text", "quantity", "message", "mend"),
    [
        ("45", "speed", "a number without a unit", "12 km/h"),
        (45, "speed", "a number without a unit", "12 km/h"),
        ("45 MPH", "speed", "'MPH' is not a unit of speed", "write 'mph'"),
        ("45 miles", "speed", "'miles' is not a unit of speed", "convert the values"),
        ("45 mi", "speed", "'mi' is not a unit of speed", "is a unit of length"),
        ("fast", "speed", "not a number", "write digits"),
        ("mph", "speed", "not a number", "write digits"),
        ("", "speed", "not a number", "write digits"),
        ("1,5 m", "length", "not a number", "decimal point"),
        ("nan m", "length", "not a number", "leave the place empty"),
        ("1e999 m", "length", "too large", "fewer digits"),
        (True, "length", "not a length", ""),
        (None, "length", "not a length", ""),
    ],
)
def test_what_is_no_quantity_is_refused(
    text: object, quantity: str, message: str, mend: str
) -> None:
    with pytest.raises(QuantityError, match=message) as caught:
        parse_quantity(text, quantity)  # type: ignore[arg-type]
    assert mend in caught.value.mend
    assert caught.value.allowed


@pytest.mark.parametrize("text", ["nan", "inf", "-Infinity", "1_000", "1,000", "0x10", "١٢", "1 2"])
def test_plain_numbers_are_plain(text: str) -> None:
    """Python's float() would take most of these."""
    with pytest.raises(QuantityError):
        parse_number(text)


@given(st.floats(min_value=-1e12, max_value=1e12))
def test_printed_numbers_come_back(value: float) -> None:
    assert parse_number(repr(value)) == value


@given(st.text(max_size=30), st.sampled_from(sorted(UNITS)))
def test_any_text_is_a_quantity_or_refused(text: str, quantity: str) -> None:
    try:
        value = parse_quantity(text, quantity, from_mass=lambda mass: mass)
    except QuantityError:
        return
    assert np.isfinite(value)


def test_missing_stays_missing() -> None:
    celsius = np.array([np.nan, 0.0])
    assert np.array_equal(
        to_inside(celsius, "temperature", "degC"), [np.nan, 273.15], equal_nan=True
    )


@pytest.mark.parametrize(
    ("header", "parts"),
    [
        ("speed [km/h]", ("speed", "km/h")),
        ("speed[mph]", ("speed", "mph")),
        (" WID FT [ft] ", ("WID FT", "ft")),
        ("stability", ("stability", None)),
        ("empty []", ("empty", "")),
        ("a [b] c", ("a [b] c", None)),
    ],
)
def test_header_is_parted_into_name_and_unit(header: str, parts: tuple[str, str | None]) -> None:
    assert split_header(header) == parts
