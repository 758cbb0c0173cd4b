"""Mass concentration of the background to mixing ratio."""

from __future__ import annotations

from typing import Final, Literal, overload

import numpy as np
import numpy.typing as npt

from roaddisp.constants import NO2_UGM3_PER_PPB
from roaddisp.model import FloatArray

Gas = Literal["o3", "no2", "no", "nox"]

UGM3_PER_PPB: Final[dict[str, dict[Gas, float]]] = {
    "25 C": {
        "no2": NO2_UGM3_PER_PPB["25 C"],
        "nox": NO2_UGM3_PER_PPB["25 C"],
        "no": 1.2265,
        "o3": 1.9619,
    },
    "20 C": {
        "no2": NO2_UGM3_PER_PPB["20 C"],
        "nox": NO2_UGM3_PER_PPB["20 C"],
        "no": 1.2474,
        "o3": 1.9953,
    },
}
"""ug/m3 in one ppb at 298.15 K and 293.15 K, both 101.325 kPa; NOx as NO2.

``M P / (R T)`` to four decimals, with 30.0061 (NO), 46.0055 (NO2) and 47.9982
(O3) g/mol and the gas constant of CODATA 2018.
"""


@overload
def ppb_from_ugm3(value: float, gas: Gas, reference: str) -> float: ...
@overload
def ppb_from_ugm3(value: npt.ArrayLike, gas: Gas, reference: str) -> float | FloatArray: ...
def ppb_from_ugm3(value: npt.ArrayLike, gas: Gas, reference: str) -> float | FloatArray:
    """Mixing ratio of a gas from its mass concentration.

    Parameters
    ----------
    value : (...) [ug/m3]; NOx as NO2
    gas : "o3", "no2", "no" or "nox"
    reference : "25 C" or "20 C"
        State to which the mass concentration refers, at 101.325 kPa.

    Returns
    -------
    (...) [ppb], float for a scalar

    Raises
    ------
    ValueError
        Where gas or reference is another.

    Examples
    --------
    >>> round(ppb_from_ugm3(188.04, "no2", "25 C"), 6)
    100.0
    """
    if reference not in UGM3_PER_PPB:
        raise ValueError(f"reference is {reference!r}; allowed: {', '.join(UGM3_PER_PPB)}")
    factors = UGM3_PER_PPB[reference]
    if gas not in factors:
        raise ValueError(f"gas is {gas!r}; allowed: {', '.join(factors)}")
    ppb: FloatArray = np.asarray(value, dtype=np.float64) / factors[gas]
    return float(ppb) if ppb.ndim == 0 else ppb
