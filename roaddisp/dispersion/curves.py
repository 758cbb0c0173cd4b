"""Briggs' curves: how far a plume has spread at a distance downwind.

Every expression has the form ``a x (1 + b x)^p`` with ``x`` the distance [m];
the tables below hold ``(a, b, p)`` for the classes A to F.
"""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from roaddisp.dispersion.arguments import class_codes, one_of
from roaddisp.model import FloatArray, Terrain

Coefficients = tuple[float, float, float]

SIGMA_Y: Final[dict[Terrain, tuple[Coefficients, ...]]] = {
    "open": (
        (0.22, 0.0001, -0.5),
        (0.16, 0.0001, -0.5),
        (0.11, 0.0001, -0.5),
        (0.08, 0.0001, -0.5),
        (0.06, 0.0001, -0.5),
        (0.04, 0.0001, -0.5),
    ),
    "urban": (
        (0.32, 0.0004, -0.5),
        (0.32, 0.0004, -0.5),
        (0.22, 0.0004, -0.5),
        (0.16, 0.0004, -0.5),
        (0.11, 0.0004, -0.5),
        (0.11, 0.0004, -0.5),
    ),
}
"""Crosswind spread. Briggs (1973), as reprinted by Gifford (1976)."""

SIGMA_Z: Final[dict[Terrain, tuple[Coefficients, ...]]] = {
    "open": (
        (0.20, 0.0, 0.0),
        (0.12, 0.0, 0.0),
        (0.08, 0.0002, -0.5),
        (0.06, 0.0015, -0.5),
        (0.03, 0.0003, -1.0),
        (0.016, 0.0003, -1.0),
    ),
    "urban": (
        (0.24, 0.001, 0.5),
        (0.24, 0.001, 0.5),
        (0.20, 0.0, 0.0),
        (0.14, 0.0003, -0.5),
        (0.08, 0.0015, -0.5),
        (0.08, 0.0015, -0.5),
    ),
}
"""Vertical spread. Same source; urban E and F bend with 0.0015, not 0.0003."""

PUBLISHED_RANGE: Final = (100.0, 10_000.0)
"""m; the curves are printed for these distances and extrapolated outside them."""


def sigma_y(
    distance: npt.ArrayLike, stability: str, terrain: Terrain = "open"
) -> FloatArray | np.float64:
    """Crosswind standard deviation of a plume.

    Parameters
    ----------
    distance : array_like
        Along the wind from the source, not negative [m]. NaN gives NaN.
    stability : str
        Class letter, "A" to "F".
    terrain : "open" or "urban"

    Returns
    -------
    array of the shape of ``distance``, or a scalar for a scalar [m]

    Raises
    ------
    ValueError
        For a negative distance, an unknown class or an unknown terrain.

    Notes
    -----
    Printed for 100 m to 10 km; shorter and longer distances are extrapolated.

    References
    ----------
    Briggs, G. A. (1973), Diffusion estimation for small emissions, ATDL
    contribution 79; Gifford, F. A. (1976), Nuclear Safety 17, 68-86.

    Examples
    --------
    >>> sigma_y([100.0, 1000.0], "D").round(2)
    array([ 7.96, 76.28])
    """
    return _spread(distance, stability, terrain, SIGMA_Y)


def sigma_z(
    distance: npt.ArrayLike, stability: str, terrain: Terrain = "open"
) -> FloatArray | np.float64:
    """Vertical standard deviation of a plume.

    Parameters
    ----------
    distance : array_like
        Along the wind from the source, not negative [m]. NaN gives NaN.
    stability : str
        Class letter, "A" to "F".
    terrain : "open" or "urban"

    Returns
    -------
    array of the shape of ``distance``, or a scalar for a scalar [m]

    Raises
    ------
    ValueError
        For a negative distance, an unknown class or an unknown terrain.

    Notes
    -----
    Printed for 100 m to 10 km; shorter and longer distances are extrapolated.

    References
    ----------
    Briggs, G. A. (1973), Diffusion estimation for small emissions, ATDL
    contribution 79; Gifford, F. A. (1976), Nuclear Safety 17, 68-86.

    Examples
    --------
    >>> sigma_z([100.0, 1000.0], "F", "urban").round(2)
    array([ 7.46, 50.6 ])
    """
    return _spread(distance, stability, terrain, SIGMA_Z)


def coefficients(terrain: Terrain) -> FloatArray:
    """Give ``(a, b, p)`` of both curves for every class: (6, 2, 3), crosswind first."""
    name = one_of("terrain", terrain, ("open", "urban"))
    return np.array(list(zip(SIGMA_Y[name], SIGMA_Z[name], strict=True)), dtype=np.float64)


def _spread(
    distance: npt.ArrayLike,
    stability: str,
    terrain: Terrain,
    table: dict[Terrain, tuple[Coefficients, ...]],
) -> FloatArray | np.float64:
    x = np.asarray(distance, dtype=np.float64)
    if np.any(x < 0.0):
        raise ValueError(f"distance: {np.nanmin(x):g} m; allowed: 0 m and more")
    code = int(class_codes("stability", stability)[0])
    a, b, p = table[one_of("terrain", terrain, ("open", "urban"))][code]
    spread: FloatArray | np.float64 = a * x * (1.0 + b * x) ** p
    return spread
