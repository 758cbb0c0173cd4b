"""Arrays and words that the central types share."""

from __future__ import annotations

from typing import Literal

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]
Float32Array = npt.NDArray[np.float32]
IntArray = npt.NDArray[np.int64]
BoolArray = npt.NDArray[np.bool_]
TimeArray = npt.NDArray[np.datetime64]

Terrain = Literal["open", "urban"]
CalmRule = Literal["both", "leave-out", "worst-direction"]
WindHeight = Literal["release", "station"]

STABILITY_CLASSES = "ABCDEF"
"""Class letters in the order of their codes 0 to 5; code -1 is a missing class."""

TRACERS = ("nox", "no2")
"""Order of the tracer axis ``K``: NOx as NO2-equivalent mass, primary NO2."""
