"""What every conversion checks of its arguments."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from roaddisp.model import FloatArray


def checked(**values: npt.ArrayLike) -> tuple[FloatArray, ...]:
    """Arguments as arrays that broadcast, each found to be possible.

    Parameters
    ----------
    **values : array_like
        By name; one named ``primary_fraction`` is not above 1.

    Returns
    -------
    tuple of arrays, as they were shaped

    Raises
    ------
    ValueError
        Where a value is negative or infinite, the fraction is above 1, or the
        shapes do not broadcast.

    Examples
    --------
    >>> checked(nox=[50.0], o3=30.0)
    (array([50.]), array(30.))
    """
    arrays = {name: np.asarray(value, dtype=np.float64) for name, value in values.items()}
    for name, array in arrays.items():
        highest = 1.0 if name == "primary_fraction" else np.finfo(np.float64).max
        bad = (array < 0) | (array > highest)
        if np.any(bad):
            allowed = "0 to 1" if name == "primary_fraction" else "0 and more, finite"
            raise ValueError(f"{name} is {array[bad].flat[0]:g}; allowed: {allowed}")
    np.broadcast_shapes(*(array.shape for array in arrays.values()))
    return tuple(arrays.values())
