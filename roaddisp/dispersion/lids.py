"""Which weather states have a lid that any pair of receptor and source can feel."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from roaddisp.dispersion.columns import LID_REACH
from roaddisp.dispersion.curves import coefficients
from roaddisp.model import BoolArray, FloatArray, IntArray, Terrain


def lid_is_felt(
    stability_codes: IntArray,
    mixing_height: FloatArray,
    *,
    terrain: Terrain,
    sigma_z0: npt.ArrayLike,
    heights: npt.ArrayLike,
    receptor_z: npt.ArrayLike,
    farthest: float,
) -> BoolArray:
    """Whether a lid changes anything, state by state, for the pairs that feel it most.

    Parameters
    ----------
    stability_codes : (W,) int
        0 to 5 for the classes A to F.
    mixing_height : (W,)
        Height of the lid, inf for none [m].
    terrain : "open" or "urban"
    sigma_z0, heights, receptor_z : array_like
        Initial vertical spread and release height of the sources, height of the
        receptors [m]; the largest of each decides.
    farthest : float
        No receptor is farther downwind of a source than this [m].

    Returns
    -------
    (W,) array of bool
        False where the first image in the lid is 4.5 standard deviations and more
        away for every pair and nothing stands above the lid: there a table with the
        lid equals one without.

    Examples
    --------
    Unstable air carries a plume up to a lid at 300 m within a kilometre, stable air
    does not:

    >>> import numpy as np
    >>> lid_is_felt(
    ...     np.array([0, 5]), np.array([300.0, 300.0]), terrain="open", sigma_z0=1.2,
    ...     heights=1.3, receptor_z=1.5, farthest=1000.0,
    ... ).tolist()
    [True, False]
    """
    lid = np.asarray(mixing_height, dtype=np.float64)
    curves = coefficients(terrain)[np.asarray(stability_codes, dtype=np.int64), 1]
    spread = curves[:, 0] * farthest * (1.0 + curves[:, 1] * farthest) ** curves[:, 2]
    spread = np.hypot(spread, np.max(sigma_z0, initial=0.0))
    source, receptor = np.max(heights, initial=0.0), np.max(receptor_z, initial=0.0)
    image_is_near = 2.0 * lid - source - receptor < LID_REACH * spread
    return np.asarray(image_is_near | (np.maximum(source, receptor) > lid), dtype=np.bool_)
