"""Units at the door: quantities with their unit, brought to the project's own.

A quantity is written as a number and a unit (``"45 mph"``), a column header
carries its unit in brackets (``"speed [mph]"``). Each quantity has a short list
of spellings; nothing else is guessed at. Inside the package values are in SI,
except for four that keep the unit of the trade: emission factors in g/km,
concentrations in ppb, cloud in tenths and angles in degrees.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from roaddisp.constants import FOOT, HOUR, MILE
from roaddisp.errors import RoaddispError

FloatArray = npt.NDArray[np.float64]

FromMass = Callable[[FloatArray], FloatArray]
"""Turns ug/m3 of one gas into ppb; who knows the gas and the reference passes it."""


class QuantityError(RoaddispError, ValueError):
    """A value cannot be taken as the quantity asked for.

    Attributes
    ----------
    allowed, mend : str
        What would be accepted, and what to do next.
    """

    def __init__(self, message: str, *, allowed: str, mend: str) -> None:
        super().__init__(message)
        self.allowed = allowed
        self.mend = mend


@dataclass(frozen=True)
class Unit:
    """A unit: ``ours = value * factor + offset``; ``mass`` needs a `FromMass`."""

    factor: float
    offset: float = 0.0
    mass: bool = False


_FAHRENHEIT: Final = 5.0 / 9.0
_INCH_OF_MERCURY: Final = 3386.389  # Pa, conventional (mercury at 0 degC); from memory
_OKTA: Final = 10.0 / 8.0

UNITS: Final[dict[str, dict[str, Unit]]] = {
    "length": {"m": Unit(1.0), "ft": Unit(FOOT), "mi": Unit(MILE), "km": Unit(1000.0)},
    "speed": {
        "km/h": Unit(1000.0 / HOUR),
        "mph": Unit(MILE / HOUR),
        "m/s": Unit(1.0),
        "kn": Unit(1852.0 / HOUR),
    },
    "emission factor": {
        "g/km": Unit(1.0),
        "mg/km": Unit(1e-3),
        "g/mi": Unit(1000.0 / MILE),
    },
    "concentration": {"ppb": Unit(1.0), "ppm": Unit(1000.0), "ug/m3": Unit(1.0, mass=True)},
    "temperature": {
        "degC": Unit(1.0, 273.15),
        "degF": Unit(_FAHRENHEIT, 273.15 - 32.0 * _FAHRENHEIT),
        "K": Unit(1.0),
    },
    "pressure": {"hPa": Unit(100.0), "Pa": Unit(1.0), "inHg": Unit(_INCH_OF_MERCURY)},
    "radiation": {"W/m2": Unit(1.0)},
    "cloud": {"tenths": Unit(1.0), "oktas": Unit(_OKTA), "%": Unit(0.1)},
    "angle": {"deg": Unit(1.0)},
    "fraction": {"%": Unit(0.01)},
}
"""Spellings of each quantity, with the way into the unit kept inside."""

INSIDE: Final[dict[str, str]] = {
    "length": "m",
    "speed": "m/s",
    "emission factor": "g/km",
    "concentration": "ppb",
    "temperature": "K",
    "pressure": "Pa",
    "radiation": "W/m2",
    "cloud": "tenths",
    "angle": "deg",
    "fraction": "",
}
"""The unit each quantity has inside the package."""

UNITLESS: Final = frozenset({"fraction"})
"""Quantities that may be written without a unit."""

_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,4})?", re.ASCII)
_HEADER = re.compile(r"(?P<name>.*?)\s*(?:\[(?P<unit>[^\[\]]*)\])?", re.DOTALL)


def spellings(quantity: str) -> str:
    """List the units a quantity may be written in, as text.

    >>> spellings("speed")
    'km/h, mph, m/s, kn'
    """
    return ", ".join(UNITS[quantity])


def parse_number(text: str) -> float:
    """Read a plain decimal number.

    Parameters
    ----------
    text : str
        Digits with a point, an exponent if need be; blanks around it are dropped.

    Returns
    -------
    float

    Raises
    ------
    QuantityError
        For anything else: thousands separators, a decimal comma, ``nan``, ``inf``.

    Examples
    --------
    >>> parse_number(" 12.5 ")
    12.5
    """
    stripped = text.strip()
    if _NUMBER.fullmatch(stripped) is None:
        if stripped.lower().lstrip("+-") in {"nan", "inf", "infinity", "na", "n/a", "null", "none"}:
            mend = "leave the place empty where a value is missing"
        elif re.fullmatch(r"[+-]?[\d.]*,\d+", stripped):
            mend = "write a decimal point, and no separator between thousands"
        else:
            mend = "write digits, with a decimal point"
        raise QuantityError("not a number", allowed="a finite decimal number", mend=mend)
    value = float(stripped)
    if not np.isfinite(value):
        raise QuantityError(
            "a number too large to hold",
            allowed="a finite decimal number",
            mend="write fewer digits",
        )
    return value


def parse_quantity(
    text: str | float | bool, quantity: str, *, from_mass: FromMass | None = None
) -> float:
    """Read a number with its unit.

    Parameters
    ----------
    text : str
        Such as ``"45 mph"``. A bare number is accepted for a fraction alone.
    quantity : str
        A key of `UNITS`.
    from_mass : callable, optional
        Turns ug/m3 into ppb where the quantity is a concentration.

    Returns
    -------
    float
        In the unit kept inside (`INSIDE`).

    Raises
    ------
    QuantityError
        Where there is no number, no unit, or a unit of another spelling.

    Examples
    --------
    >>> round(parse_quantity("45 mph", "speed"), 4)
    20.1168
    >>> parse_quantity("40 %", "fraction")
    0.4
    """
    example = f'"12 {next(iter(UNITS[quantity]))}"'
    if isinstance(text, bool) or not isinstance(text, str | int | float):
        raise QuantityError(
            f"not a {quantity}",
            allowed=f"a number with its unit ({spellings(quantity)}) as text",
            mend=f"write for example {example}",
        )
    if not isinstance(text, str):
        text = repr(text)
    stripped = text.strip()
    found = _NUMBER.match(stripped)
    if found is None:
        parse_number(stripped.split(" ")[0] if stripped else "")
        raise QuantityError(
            "not a number with its unit",
            allowed=f"a number and one of {spellings(quantity)}",
            mend=f"write for example {example}",
        )
    value = parse_number(found.group())
    unit = stripped[found.end() :].strip()
    if unit.startswith((",", "_", ".")):
        parse_number(stripped.split(" ")[0])
    if not unit and quantity not in UNITLESS:
        raise QuantityError(
            f"a number without a unit, where a {quantity} is needed",
            allowed=f"a number and one of {spellings(quantity)}",
            mend=f"write the unit behind the number, for example {example}",
        )
    return float(to_inside(np.array(value), quantity, unit, from_mass=from_mass))


def check_unit(quantity: str, unit: str) -> Unit:
    """Find a unit of a quantity by its spelling.

    Raises
    ------
    QuantityError
        Where the spelling is not one of the quantity's.

    Examples
    --------
    >>> check_unit("length", "ft").factor
    0.3048
    """
    known = UNITS[quantity]
    if unit in known:
        return known[unit]
    if not unit and quantity in UNITLESS:
        return Unit(1.0)
    close = [spelling for spelling in known if spelling.lower() == unit.lower().replace(" ", "")]
    where = [
        name for name, units in UNITS.items() if unit in units and name != quantity and unit != "%"
    ]
    if close:
        mend = f"write {close[0]!r} (spelling and case matter)"
    elif where:
        mend = (
            f"{unit!r} is a unit of {where[0]}, not of {quantity}: look whether the column is right"
        )
    else:
        mend = f"convert the values, or write one of: {spellings(quantity)}"
    raise QuantityError(
        f"{unit!r} is not a unit of {quantity} that is read here",
        allowed=spellings(quantity),
        mend=mend,
    )


def to_inside(
    values: FloatArray, quantity: str, unit: str, *, from_mass: FromMass | None = None
) -> FloatArray:
    """Bring values to the unit kept inside.

    Parameters
    ----------
    values : array
        In ``unit``; NaN stays NaN.
    quantity, unit : str
    from_mass : callable, optional
        Needed for ug/m3.

    Returns
    -------
    array of the same shape

    Raises
    ------
    QuantityError
        Where the unit is unknown, or is a mass and no ``from_mass`` was passed.

    Examples
    --------
    >>> to_inside(np.array([32.0, 212.0]), "temperature", "degF").round(6).tolist()
    [273.15, 373.15]
    """
    known = check_unit(quantity, unit)
    if not known.mass:
        return np.asarray(values, dtype=float) * known.factor + known.offset
    if from_mass is None:
        raise QuantityError(
            "ug/m3 cannot be turned into ppb here, where the gas is not known",
            allowed="ppb, ppm",
            mend="write the value in ppb",
        )
    return np.asarray(from_mass(np.asarray(values, dtype=float)), dtype=float)


def split_header(header: str) -> tuple[str, str | None]:
    """Part a column header into name and unit; the unit is None without a bracket.

    Examples
    --------
    >>> split_header("speed [km/h]")
    ('speed', 'km/h')
    >>> split_header("stability")
    ('stability', None)
    """
    found = _HEADER.fullmatch(header.strip())
    if found is None:
        return header.strip(), None
    unit = found.group("unit")
    return found.group("name").strip(), None if unit is None else unit.strip()
