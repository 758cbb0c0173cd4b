"""Single cells: what they hold, and as which number they can be taken."""

from __future__ import annotations

from typing import Any

import numpy as np

from roaddisp.quantities import FromMass, QuantityError, parse_number, parse_quantity
from roaddisp.study.raw import as_text


def is_number(cell: Any) -> bool:
    """Whether a cell is a number already, and no truth value."""
    return isinstance(cell, int | float | np.number) and not isinstance(cell, bool | np.bool_)


def is_nothing(cell: Any) -> bool:
    """Whether a cell is empty or a plain zero."""
    text = as_text(cell)
    if not text:
        return True
    try:
        return parse_number(text.split(" ")[0]) == 0.0
    except QuantityError:
        return False


def taken(text: str, quantity: str, from_mass: FromMass | None) -> float | QuantityError:
    """Read a number (with its unit, where a quantity is named); NaN where empty."""
    if not text.strip():
        return float("nan")
    try:
        if quantity:
            return parse_quantity(text, quantity, from_mass=from_mass)
        return parse_number(text)
    except QuantityError as error:
        return error


def bound(value: float) -> str:
    """Write a limit of a range."""
    if np.isinf(value):
        return "any"
    return f"{value:g}" if abs(value) < 1e6 else f"{value:.0f}"
