"""Coordinate systems: the study's own, and the way into it."""

from __future__ import annotations

import re
from functools import lru_cache
from typing import Any, Final

import numpy as np

from roaddisp.model import FloatArray
from roaddisp.study.problems import Problems
from roaddisp.study.raw import RawTable

WGS84: Final = "EPSG:4326"
_CODE = re.compile(r"[A-Za-z]{2,12}:[0-9]{1,9}")
_MOST_SCALE_ERROR = 0.01
_MOST_CONVERGENCE = 5.0  # deg


def layer_crs(table: RawTable, problems: Problems) -> Any:
    """Take the coordinate system a layer states, None (and a problem) where there is none."""
    import pyproj
    from pyproj.exceptions import CRSError

    if not table.crs:
        problems.error(
            "the layer states no coordinate system (CRS)",
            file=table.file,
            place=table.place(),
            allowed="any CRS, stated in the file (a Shapefile has it in its .prj)",
            mend="assign the CRS in a GIS",
        )
        return None
    try:
        crs = pyproj.CRS.from_user_input(table.crs)
        return crs.to_2d()
    except CRSError:
        problems.error(
            "the coordinate system (CRS) of the layer is not known",
            file=table.file,
            place=table.place(),
            value=table.crs,
            allowed="a CRS that PROJ knows",
            mend="assign the CRS in a GIS",
        )
        return None


def given_crs(text: str, problems: Problems, *, file: str, place: str) -> Any:
    """Take the study's own coordinate system: projected, in metres, eastings and northings."""
    import pyproj
    from pyproj.exceptions import CRSError

    about = {"file": file, "place": place, "value": text}
    allowed = 'a projected CRS in metres, as "EPSG:32613"'
    if _CODE.fullmatch(text.strip()) is None:
        problems.error(
            "study.crs: not the code of a coordinate system",
            allowed=allowed,
            mend="write the authority and the code",
            **about,
        )
        return None
    try:
        crs = pyproj.CRS.from_user_input(text.strip().upper())
    except CRSError:
        problems.error(
            "study.crs: no coordinate system has this code",
            allowed=allowed,
            mend="look the code up",
            **about,
        )
        return None
    if not crs.is_projected:
        problems.error(
            "study.crs: a geographic CRS where metres are needed",
            allowed=allowed,
            mend="take the UTM zone, or leave the key out",
            **about,
        )
        return None
    axes = crs.axis_info[:2]
    if any(abs(axis.unit_conversion_factor - 1.0) > 1e-12 for axis in axes):
        problems.error(
            f"study.crs: a CRS in {axes[0].unit_name} where metres are needed",
            allowed=allowed,
            mend="take the metric CRS of the same zone, or leave the key out; layers may stay "
            "in feet, they are converted",
            **about,
        )
        return None
    if {axis.direction.lower() for axis in axes} != {"east", "north"}:
        problems.error(
            "study.crs: its axes do not point east and north",
            allowed=allowed,
            mend="take the UTM zone, or leave the key out",
            **about,
        )
        return None
    return crs


def utm_crs(longitude: float, latitude: float) -> Any:
    """Take the UTM zone (WGS 84) of a place.

    >>> utm_crs(-105.0, 40.0).to_epsg()
    32613
    """
    import pyproj

    zone = min(int((longitude + 180.0) // 6.0) + 1, 60)
    return pyproj.CRS.from_epsg((32600 if latitude >= 0 else 32700) + zone)


def moved(x: FloatArray, y: FloatArray, source: Any, target: Any) -> tuple[FloatArray, FloatArray]:
    """Bring coordinates from one system to another; infinite where that is impossible."""
    if source == target:
        return np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    east, north = _way(source, target).transform(
        np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    )
    return np.asarray(east, dtype=float), np.asarray(north, dtype=float)


@lru_cache(maxsize=16)
def _way(source: Any, target: Any) -> Any:
    import pyproj

    return pyproj.Transformer.from_crs(source, target, always_xy=True)


def check_distortion(
    crs: Any, longitude: float, latitude: float, problems: Problems, *, file: str, place: str
) -> None:
    """Hold metres and north of the study's CRS against the earth at the roads."""
    import pyproj

    factors = pyproj.Proj(crs).get_factors(longitude, latitude)
    scale = 0.5 * (factors.meridional_scale + factors.parallel_scale)
    name = crs.to_string()
    if not abs(scale - 1.0) <= _MOST_SCALE_ERROR:
        problems.error(
            f"study.crs: at the roads a metre of this CRS is {1 / scale:.3f} m",
            file=file,
            place=place,
            value=name,
            allowed="within 1 %",
            mend="take the UTM zone of the roads, or leave the key out",
        )
    elif abs(factors.meridian_convergence) > _MOST_CONVERGENCE:
        problems.caution(
            f"study.crs: at the roads its north is {factors.meridian_convergence:.1f} deg from "
            "true north, from which wind directions count",
            file=file,
            place=place,
            value=name,
            mend="take the UTM zone of the roads, or leave the key out",
        )
