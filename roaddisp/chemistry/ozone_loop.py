"""The compiled loop of ozone limiting, for many receptors and hours."""

from __future__ import annotations

import numba as nb
import numpy as np

from roaddisp.dispersion.compiling import parallel_compiled
from roaddisp.model import FloatArray


@parallel_compiled
def limited_no2(
    nox_ugm3: FloatArray,
    primary_ppb: FloatArray,
    o3: FloatArray,
    no2_background: FloatArray,
    ugm3_per_ppb: float,
) -> FloatArray:
    """Total NO2 (R, T) [ppb], as `ozone_limiting.ozone_limited` has it.

    ``nox_ugm3`` (R, T) of the roads [ug/m3 as NO2], ``primary_ppb`` (R, T), ``o3`` and
    ``no2_background`` (T,) [ppb].
    """
    receptors, hours = nox_ugm3.shape
    no2 = np.empty((receptors, hours))
    for r in nb.prange(receptors):
        for t in range(hours):
            no_road = nox_ugm3[r, t] / ugm3_per_ppb - primary_ppb[r, t]
            no_road = no_road if no_road > 0.0 else 0.0 * no_road
            oxidised = no_road if no_road < o3[t] else o3[t]
            no2[r, t] = primary_ppb[r, t] + oxidised + no2_background[t]
    return no2
