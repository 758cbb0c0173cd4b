"""NO2 where ozone limits it: every molecule of ozone oxidises one of NO."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from roaddisp.chemistry.checks import checked
from roaddisp.model import FloatArray


def ozone_limited_no2(
    nox: npt.ArrayLike,
    o3: npt.ArrayLike,
    no2_background: npt.ArrayLike,
    primary_fraction: npt.ArrayLike,
) -> float | FloatArray:
    """Total NO2 by the ozone limiting method.

    Parameters
    ----------
    nox : (...) [ppb]
        What the roads add, all of them together: they share one ozone budget.
    o3 : (...) [ppb]
        Background, before the roads.
    no2_background : (...) [ppb]
    primary_fraction : (...)
        NO2 over NOx as emitted, by volume.

    Returns
    -------
    (...) [ppb]
        Road and background; float where every argument is a scalar, NaN where
        one is NaN.

    Raises
    ------
    ValueError
        Where an argument is negative or infinite, or the fraction above 1.

    Notes
    -----
    ``NO2 = f NOx + min((1 - f) NOx, O3) + NO2_background``: an upper bound, for
    the given background, of what oxidation by ozone can make; it is reached
    where the air has had time to react and no light.

    References
    ----------
    Cole & Summerhays 1979, J. Air Poll. Control Assoc. 29, 812-817 (from memory).

    Examples
    --------
    >>> ozone_limited_no2(100.0, 30.0, 12.0, 0.1)
    52.0
    """
    nox_, o3_, background, fraction = checked(
        nox=nox, o3=o3, no2_background=no2_background, primary_fraction=primary_fraction
    )
    total = ozone_limited(nox_, fraction * nox_, o3_, background, None)[0]
    return float(total) if total.ndim == 0 else total


def ozone_limited(
    nox_road: FloatArray,
    no2_primary: FloatArray,
    o3: FloatArray,
    no2_background: FloatArray,
    no_background: FloatArray | None,
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """NO2, NO and ozone beside the roads, primary NO2 being a tracer of its own.

    Parameters
    ----------
    nox_road : (...) [ppb]
    no2_primary : (...) [ppb]
        NO2 emitted as such, of ``nox_road``.
    o3, no2_background : (...) [ppb]
    no_background : (...) [ppb] or None
        Where unknown, the NO returned is the road's alone. Background NO is
        taken to be in balance with its ozone and oxidises no further.

    Returns
    -------
    no2, no, o3 : (...) [ppb]
        NO and NO2 add up to NOx, and NO2 and ozone to what they were before.

    Examples
    --------
    >>> import numpy as np
    >>> no2, no, o3 = ozone_limited(
    ...     np.array([100.0]), np.array([10.0]), np.array([30.0]), np.array([12.0]), None
    ... )
    >>> no2, no, o3
    (array([52.]), array([60.]), array([0.]))
    """
    # the float32 tracers of a pure NO2 source may differ in the last digit
    no_road = np.maximum(nox_road - no2_primary, 0.0)
    oxidised = np.minimum(no_road, o3)
    no2: FloatArray = no2_primary + oxidised + no2_background
    no: FloatArray = no_road - oxidised
    if no_background is not None:
        no = no + no_background
    o3_left: FloatArray = o3 - oxidised
    return no2, no, o3_left
