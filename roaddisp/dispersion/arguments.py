"""Checks of the arguments of the public functions: name, value, what is allowed.

Every check returns a fresh contiguous array, so that compiled code always sees
the same layout.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TypeVar

import numpy as np
import numpy.typing as npt

from roaddisp.model import STABILITY_CLASSES, FloatArray, IntArray

TOUCHING: float = 1e-6
"""m in plan; nearer than this a receptor is on the line."""

Name = TypeVar("Name", bound=str)


def receptor_points(receptors: npt.ArrayLike) -> FloatArray:
    """Receptors as (R, 3): finite, and none below the ground."""
    points = _finite("receptors", receptors)
    if points.ndim != 2 or points.shape[1] != 3:
        raise ValueError(
            f"receptors: shape {points.shape}; allowed: (R, 3), x, y and height above ground [m]"
        )
    if points.size and points[:, 2].min() < 0.0:
        row = int(points[:, 2].argmin())
        raise ValueError(
            f"receptors[{row}, 2]: {points[row, 2]:g} m; allowed: a height of 0 m and more"
        )
    return points


def segment_ends(segments: npt.ArrayLike, name: str = "segments") -> FloatArray:
    """Segments as (S, 2, 2), finite."""
    ends = _finite(name, segments)
    if ends.ndim != 3 or ends.shape[1:] != (2, 2):
        raise ValueError(f"{name}: shape {ends.shape}; allowed: (S, 2, 2), both end points [m]")
    return ends


def per_segment(name: str, value: npt.ArrayLike, count: int, *, positive: bool) -> FloatArray:
    """Spread a scalar or (S,) array as (S,): finite, and positive or not negative."""
    values = _finite(name, value)
    if values.shape not in {(), (count,)}:
        raise ValueError(f"{name}: shape {values.shape}; allowed: a scalar or ({count},)")
    wrong = values <= 0.0 if positive else values < 0.0
    if np.any(wrong):
        allowed = "above 0" if positive else "0 and more"
        raise ValueError(f"{name}: {np.atleast_1d(values)[wrong.ravel()][0]:g}; allowed: {allowed}")
    return np.array(np.broadcast_to(values, (count,)))


def positive_scalar(name: str, value: float, unit: str) -> float:
    """Take a single finite number above 0."""
    number = _finite(name, value)
    if number.shape != () or number <= 0.0:
        raise ValueError(f"{name}: {value!r}; allowed: one number above 0 {unit}")
    return float(number)


def wind_directions(wind_from: npt.ArrayLike) -> FloatArray:
    """Directions as (W,), finite [deg]."""
    directions = np.atleast_1d(_finite("wind_from", wind_from))
    if directions.ndim != 1:
        raise ValueError(f"wind_from: shape {directions.shape}; allowed: (W,) [deg]")
    return directions


def lids(mixing_height: npt.ArrayLike, count: int) -> FloatArray:
    """Mixing heights as (W,): above 0, infinite where there is no lid."""
    heights = np.array(mixing_height, dtype=np.float64)
    if heights.shape not in {(), (count,)}:
        raise ValueError(f"mixing_height: shape {heights.shape}; allowed: a scalar or ({count},)")
    wrong = ~(heights > 0.0)
    if np.any(wrong):
        raise ValueError(
            f"mixing_height: {np.atleast_1d(heights)[wrong.ravel()][0]:g} m; "
            "allowed: above 0 m, inf for no lid"
        )
    return np.array(np.broadcast_to(heights, (count,)))


def strengths(strength: npt.ArrayLike, count: int) -> FloatArray:
    """Line strengths as (S,) or (K, S), finite."""
    values = _finite("strength", strength)
    if values.ndim not in {1, 2} or values.shape[-1] != count:
        raise ValueError(
            f"strength: shape {values.shape}; allowed: ({count},) or (K, {count}) [g/m/s]"
        )
    return values


def groups(group: npt.ArrayLike, count: int) -> IntArray:
    """Take groups as (S,) whole numbers from 0."""
    values = _finite("group", group)
    if values.shape != (count,):
        raise ValueError(f"group: shape {values.shape}; allowed: ({count},)")
    wrong = (values < 0.0) | (values != np.floor(values))
    if wrong.any():
        raise ValueError(f"group: {values[wrong][0]:g}; allowed: whole numbers from 0")
    return values.astype(np.int64)


def class_codes(name: str, stability: str | Sequence[str] | npt.NDArray[np.str_]) -> IntArray:
    """Class letters as (W,) codes 0 to 5."""
    letters = [stability] if isinstance(stability, str) else [str(item) for item in stability]
    for place, letter in enumerate(letters):
        if len(letter) != 1 or letter not in STABILITY_CLASSES:
            where = name if isinstance(stability, str) else f"{name}[{place}]"
            raise ValueError(f"{where}: {letter!r}; allowed: one of A, B, C, D, E, F")
    return np.array([STABILITY_CLASSES.index(letter) for letter in letters], dtype=np.int64)


def one_of(name: str, value: Name, allowed: Sequence[str]) -> Name:
    """Take a name out of a short list."""
    if value not in allowed:
        choices = ", ".join(repr(choice) for choice in allowed)
        raise ValueError(f"{name}: {value!r}; allowed: {choices}")
    return value


def refuse_touching(receptors: FloatArray, segments: FloatArray, sigma_y0: FloatArray) -> None:
    """Refuse a receptor on a line that has length and no width: its value diverges."""
    for index in np.flatnonzero(sigma_y0 == 0.0):
        start, end = segments[index]
        along = end - start
        squared = float(along @ along)
        if squared == 0.0:
            continue
        offset = receptors[:, :2] - start
        share = np.clip(offset @ along / squared, 0.0, 1.0)
        gap = offset - share[:, None] * along
        touching = np.hypot(gap[:, 0], gap[:, 1]) < TOUCHING
        if touching.any():
            raise ValueError(
                f"receptors[{int(touching.argmax())}] lies on segments[{int(index)}] in plan "
                f"(within {TOUCHING:g} m) and its sigma_y0 is 0, so the concentration has no "
                "bound; allowed: a receptor off the line, or sigma_y0 above 0 m"
            )


def _finite(name: str, value: npt.ArrayLike) -> FloatArray:
    try:
        array = np.array(value, dtype=np.float64, order="C")
    except (TypeError, ValueError) as error:
        raise ValueError(f"{name}: {value!r} is not an array of numbers ({error})") from error
    wrong = ~np.isfinite(array)
    if wrong.any():
        place = tuple(int(axis[0]) for axis in np.nonzero(np.atleast_1d(wrong)))
        where = f"{name}{list(place)}" if array.ndim else name
        raise ValueError(f"{where}: {np.atleast_1d(array)[place]}; allowed: a finite number")
    return array
