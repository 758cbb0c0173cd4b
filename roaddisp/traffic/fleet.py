"""Shares of vehicle classes on each link."""

from __future__ import annotations

import numpy as np

from roaddisp.model import BoolArray, Fleet, FloatArray, IntArray

LIGHT_CLASSES = ("car", "van", "motorcycle")
HEAVY_CLASSES = ("bus", "rigid_truck", "articulated_truck")

WITHOUT_MIX = "light and heavy"
"""Name of the fleet of a study that gives no mix."""


def fleet_without_mix() -> Fleet:
    """Return the fleet of a study that gives no mix: cars, and trucks by ``heavy_share``.

    Examples
    --------
    >>> fleet_without_mix().classes
    ('car', 'articulated_truck')
    """
    return Fleet((WITHOUT_MIX,), ("car", "articulated_truck"), np.array([[1.0, 0.0]]))


def two_class_shares(heavy_share: FloatArray) -> FloatArray:
    """Cars and articulated trucks where only the heavy share is known.

    Parameters
    ----------
    heavy_share : (L,) fraction
        NaN, not given, means no heavy vehicles.

    Returns
    -------
    (L, 2) fraction
        Car, articulated truck.

    Raises
    ------
    ValueError
        Where a share is not within 0 to 1.

    Examples
    --------
    >>> import numpy as np
    >>> two_class_shares(np.array([0.25, np.nan]))
    array([[0.75, 0.25],
           [1.  , 0.  ]])
    """
    heavy = np.nan_to_num(_checked_share(heavy_share), nan=0.0)
    return np.stack([1.0 - heavy, heavy], axis=1)


def class_shares(mix: FloatArray, heavy: BoolArray, heavy_share: FloatArray) -> FloatArray:
    """Fleet mix of each link, its heavy and light groups scaled to the heavy share.

    Parameters
    ----------
    mix : (L, C) fraction
        Each row sums to 1.
    heavy : (C,) bool
        Which classes are heavy.
    heavy_share : (L,) fraction
        NaN leaves the mix as it is.

    Returns
    -------
    (L, C) fraction
        Each row sums to 1; within a group the classes keep their proportions.

    Raises
    ------
    ValueError
        Where a share is not within 0 to 1, or the mix has no class of a group
        that the heavy share calls for.

    Examples
    --------
    >>> import numpy as np
    >>> mix = np.array([[0.6, 0.2, 0.05, 0.15]])  # car, van, bus, truck
    >>> heavy = np.array([False, False, True, True])
    >>> class_shares(mix, heavy, np.array([0.4])).round(3)
    array([[0.45, 0.15, 0.1 , 0.3 ]])
    """
    wanted = _checked_share(heavy_share)
    present = mix[:, heavy].sum(axis=1)
    lacking = np.flatnonzero(
        ((wanted > 0) & (present <= 0)) | ((wanted < 1) & (mix[:, ~heavy].sum(axis=1) <= 0))
    )
    if lacking.size:
        first = lacking[0]
        group = "heavy" if present[first] <= 0 else "light"
        raise ValueError(
            f"heavy share {wanted[first]:g} of link {first} calls for {group} vehicles and its "
            f"mix has none ({lacking.size} such links); give the mix a {group} class, "
            "or leave the heavy share out"
        )
    with np.errstate(divide="ignore", invalid="ignore"):
        up_heavy = np.where(wanted > 0, wanted / present, 0.0)
        up_light = np.where(wanted < 1, (1.0 - wanted) / (1.0 - present), 0.0)
    scale = np.where(heavy, up_heavy[:, None], up_light[:, None])
    return np.where(np.isnan(wanted)[:, None], mix, mix * scale)


def link_shares(
    fleet: Fleet, heavy: BoolArray, *, of_link: IntArray, heavy_share: FloatArray
) -> FloatArray:
    """Class shares of each link, with or without a mix.

    Parameters
    ----------
    fleet : Fleet
        The study's mixes, or `fleet_without_mix`.
    heavy : (C,) bool
        Which of the fleet's classes are heavy.
    of_link : (L,) int
        Fleet of each link; -1 takes the only one.
    heavy_share : (L,) fraction, NaN where not given

    Returns
    -------
    (L, C) fraction

    Raises
    ------
    ValueError
        As `class_shares`; and where a link names no fleet and there are several.

    Examples
    --------
    >>> import numpy as np
    >>> link_shares(
    ...     fleet_without_mix(),
    ...     np.array([False, True]),
    ...     of_link=np.array([-1]),
    ...     heavy_share=np.array([0.1]),
    ... )
    array([[0.9, 0.1]])
    """
    if fleet.names == (WITHOUT_MIX,) and fleet.classes == ("car", "articulated_truck"):
        return two_class_shares(heavy_share)
    index = only_or_named(of_link, fleet.names, what="fleet")
    return class_shares(fleet.share[index], heavy, heavy_share)


def only_or_named(index: IntArray, names: tuple[str, ...], *, what: str) -> IntArray:
    """Resolve -1, none named, to the only one there is.

    Parameters
    ----------
    index : (L,) int
    names : tuple of str
    what : str
        ``"profile"`` or ``"fleet"``, for the message.

    Returns
    -------
    (L,) int

    Raises
    ------
    ValueError
        Where a link names none and there are several.

    Examples
    --------
    >>> import numpy as np
    >>> only_or_named(np.array([0, -1]), ("town",), what="profile")
    array([0, 0])
    """
    unnamed = np.flatnonzero(np.asarray(index) < 0)
    if unnamed.size and len(names) != 1:
        raise ValueError(
            f"link {unnamed[0]} names no {what} and there are {len(names)}: "
            f"{', '.join(names)}; name one of them ({unnamed.size} such links)"
        )
    return np.where(np.asarray(index) < 0, 0, index)


def _checked_share(heavy_share: FloatArray) -> FloatArray:
    share = np.asarray(heavy_share, dtype=np.float64)
    if np.any((share < 0) | (share > 1)):
        first = int(np.flatnonzero((share < 0) | (share > 1))[0])
        raise ValueError(f"heavy share {share[first]:g} of link {first}; allowed: 0 to 1")
    return share
