"""Colours of concentrations, on maps and in layer styles alike.

From pale sand to dark plum: lightness falls evenly, so the order survives in
greyscale and for every kind of colour vision.
"""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from roaddisp.model import FloatArray

ANCHORS: Final = ("#f7f0de", "#efd5a4", "#e2b07f", "#cb8873", "#a4617a", "#744274", "#432a5c")
"""sRGB, evenly spaced from the lowest value to the highest."""

INK: Final = "#20242b"
PAPER: Final = "#fbfaf7"
ROAD: Final = "#8d9299"
SITE: Final = "#0b5a52"

_STEPS = (1.0, 2.0, 2.5, 5.0, 10.0)


def shade(position: float) -> str:
    """Colour at a position from 0 (lowest) to 1 (highest), as ``#rrggbb``.

    >>> shade(0.0), shade(1.0)
    ('#f7f0de', '#432a5c')
    """
    anchors = np.array([[int(code[i : i + 2], 16) for i in (1, 3, 5)] for code in ANCHORS])
    at = min(max(position, 0.0), 1.0) * (len(ANCHORS) - 1)
    places = np.arange(len(ANCHORS))
    red, green, blue = (round(float(np.interp(at, places, anchors[:, i]))) for i in range(3))
    return f"#{red:02x}{green:02x}{blue:02x}"


def levels(values: FloatArray, count: int = 8) -> FloatArray:
    """Round class limits that cover the bulk of some values.

    The highest and lowest hundredth may lie outside, so that a few cells on a road
    do not take all the colours.

    Parameters
    ----------
    values : array
        NaN is left out.
    count : int
        About how many classes.

    Returns
    -------
    (N,) array, ascending, N >= 2

    Examples
    --------
    >>> levels(np.linspace(11.0, 48.0, 200), 8).tolist()
    [10.0, 15.0, 20.0, 25.0, 30.0, 35.0, 40.0, 45.0, 50.0]
    """
    known = values[np.isfinite(values)]
    if not known.size:
        return np.array([0.0, 1.0])
    low, high = (float(limit) for limit in np.percentile(known, [1.0, 99.0]))
    span = max(high - low, 1e-3 * max(abs(high), 1e-3))
    power = 10.0 ** math.floor(math.log10(span / count))
    step = next(power * lead for lead in _STEPS if power * lead * count >= span * 0.999)
    first, last = math.floor(low / step), math.ceil(high / step)
    # whole numbers times a step gather noise in the last digits
    limits: FloatArray = np.round(np.arange(first, max(last, first + 1) + 1) * step, 12)
    return limits
