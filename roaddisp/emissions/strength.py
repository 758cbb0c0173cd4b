"""Line strengths of NOx and primary NO2, hour by hour."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Final, overload

import numpy as np
import numpy.typing as npt

from roaddisp.constants import (
    HOUR,
    INITIAL_SIGMA_Z,
    LOWEST_PLUME_WIND_HEIGHT,
    RELEASE_HEIGHT,
)
from roaddisp.emissions.factors import class_factors, emission_factors
from roaddisp.model import (
    BoolArray,
    Clock,
    Counts,
    FactorTable,
    Fleet,
    FloatArray,
    IntArray,
    LinkStrengths,
    Network,
    Profiles,
)
from roaddisp.traffic.fleet import link_shares, only_or_named
from roaddisp.traffic.volumes import profile_shape

_METRES_PER_KILOMETRE: Final = 1000.0


@overload
def line_strength(vehicles_per_hour: float, grams_per_kilometre: float) -> float: ...
@overload
def line_strength(
    vehicles_per_hour: npt.ArrayLike, grams_per_kilometre: npt.ArrayLike
) -> float | FloatArray: ...
def line_strength(
    vehicles_per_hour: npt.ArrayLike, grams_per_kilometre: npt.ArrayLike
) -> float | FloatArray:
    """Strength of a road as a line source.

    Parameters
    ----------
    vehicles_per_hour : (...) [1/h]
    grams_per_kilometre : (...) [g/km]
        Of one vehicle; the two broadcast.

    Returns
    -------
    (...) [g/m/s], float for scalars; NaN where an argument is NaN

    Raises
    ------
    ValueError
        Where an argument is negative.

    Examples
    --------
    >>> round(line_strength(10_000 / 24, 0.5) * 1e6, 2)  # ug/m/s
    57.87
    """
    volume = np.asarray(vehicles_per_hour, dtype=np.float64)
    factor = np.asarray(grams_per_kilometre, dtype=np.float64)
    for name, values in (("vehicles_per_hour", volume), ("grams_per_kilometre", factor)):
        if np.any(values < 0):
            raise ValueError(f"{name} is {values[values < 0].flat[0]:g}; allowed: 0 and more")
    strength: FloatArray = volume * factor / (_METRES_PER_KILOMETRE * HOUR)
    return float(strength) if strength.ndim == 0 else strength


def link_strengths(
    network: Network,
    *,
    profiles: Profiles | None,
    counts: Counts | None,
    fleet: Fleet,
    factors: FactorTable,
    clock: Clock,
) -> LinkStrengths:
    """Hourly strengths of NOx and primary NO2 of every link.

    A link with an AADT follows its profile; a link without one, and every link
    of a study without profiles, takes its hourly counts.

    Parameters
    ----------
    network : Network
    profiles : Profiles or None
    counts : Counts or None
        At least one of the two.
    fleet : Fleet
        Not used for counts by class.
    factors : FactorTable
    clock : Clock

    Returns
    -------
    LinkStrengths
        Links on profiles share a group where profile and wind height are the
        same, and their amplitude is the strength if the whole AADT passed in one
        hour. A link on counts is a group of its own and its amplitude is the
        mean strength of the hours that were counted.

    Raises
    ------
    ValueError
        Where a link has neither AADT nor counts, a class has no factors, a
        speed lies outside the table, or a heavy share asks what the mix lacks.

    Notes
    -----
    Release height and initial vertical spread are those of light and heavy
    vehicles, weighted by the NOx each group emits on the link over the run (US
    EPA guidance for quantitative PM hot-spot analyses, Appendix J, from memory).
    The plume feels the wind at its release height, not below 2 m, rounded to
    0.1 m so that links share it.

    Examples
    --------
    >>> import numpy as np
    >>> from roaddisp.emissions.factors import built_in_factors
    >>> from roaddisp.traffic.fleet import fleet_without_mix
    >>> road = Network(
    ...     link=("A1",),
    ...     name=("",),
    ...     lines=((np.array([[0.0, 0.0], [100.0, 0.0]]),),),
    ...     width=np.array([7.2]),
    ...     aadt=np.array([24_000.0]),
    ...     speed=np.array([50 / 3.6]),
    ...     heavy_share=np.array([0.1]),
    ...     profile=np.array([0]),
    ...     fleet=np.array([0]),
    ... )
    >>> hour = np.array(["2024-05-14T08:00"], dtype="datetime64[m]")
    >>> made = link_strengths(
    ...     road,
    ...     profiles=Profiles(("flat",), np.full((1, 12, 3, 24), 1 / 24), np.ones((1, 12, 3))),
    ...     counts=None,
    ...     fleet=fleet_without_mix(),
    ...     factors=built_in_factors(),
    ...     clock=Clock(hour, hour, utc_offset=0.0, timezone="UTC"),
    ... )
    >>> (made.hourly()[:, 0, 0] * 1e6).round(2)  # ug/m/s of NOx and of primary NO2
    array([136.93,  28.97])
    """
    by_counts = _on_counts(network, profiles, counts)
    on_profiles, on_counts = np.flatnonzero(~by_counts), np.flatnonzero(by_counts)
    amplitude, heavy_part = np.zeros((2, len(by_counts))), np.zeros(len(by_counts))
    counted_shape = np.zeros((2, 0, len(clock.standard)))
    if on_profiles.size:
        amplitude[:, on_profiles], heavy_part[on_profiles] = _from_aadt(
            network, on_profiles, fleet, factors
        )
    if counts is not None and on_counts.size:
        strength, heavy_part[on_counts] = _from_counts(network, on_counts, counts, fleet, factors)
        amplitude[:, on_counts], counted_shape = _mean_and_shape(strength)

    release_height = _by_group(RELEASE_HEIGHT, heavy_part)
    wind_height = _to_tenths(np.maximum(release_height, LOWEST_PLUME_WIND_HEIGHT))
    group = np.zeros(len(by_counts), dtype=np.int64)
    profile_shapes, profile_heights = np.zeros((0, len(clock.standard))), np.zeros(0)
    if profiles is not None and on_profiles.size:
        profile = only_or_named(network.profile[on_profiles], profiles.names, what="profile")
        pairs, group[on_profiles] = _distinct(profile, wind_height[on_profiles])
        profile_shapes = profile_shape(profiles, clock.civil)[pairs[:, 0].astype(np.int64)]
        profile_heights = pairs[:, 1]
    group[on_counts] = len(profile_heights) + np.arange(on_counts.size)
    return LinkStrengths(
        amplitude=amplitude,
        group=group,
        shape=np.concatenate([np.stack([profile_shapes, profile_shapes]), counted_shape], axis=1),
        wind_height=np.concatenate([profile_heights, wind_height[on_counts]]),
        release_height=release_height,
        sigma_z0=_by_group(INITIAL_SIGMA_Z, heavy_part),
    )


def _on_counts(network: Network, profiles: Profiles | None, counts: Counts | None) -> BoolArray:
    if profiles is None and counts is None:
        raise ValueError("a network needs profiles or hourly counts; neither was given")
    if profiles is None:
        return np.ones(len(network.link), dtype=bool)
    without = np.isnan(network.aadt)
    if counts is None and without.any():
        names = ", ".join(network.link[index] for index in np.flatnonzero(without)[:5])
        raise ValueError(f"links without AADT and without hourly counts: {names}; give one of them")
    return without


def _from_aadt(
    network: Network, links: IntArray, fleet: Fleet, factors: FactorTable
) -> tuple[FloatArray, FloatArray]:
    """Strength (2, N) if the AADT passed in one hour, and the heavy part (N,) of its NOx."""
    share = _shares(network, links, fleet, factors)
    nox, no2_fraction = emission_factors(factors, network.speed[links], where=share > 0)
    by_class = share * nox
    per_vehicle = np.stack([by_class.sum(axis=0), (by_class * no2_fraction).sum(axis=0)])
    strength = np.asarray(line_strength(network.aadt[links], per_vehicle))
    return strength, _part(by_class[factors.heavy].sum(axis=0), by_class.sum(axis=0))


def _from_counts(
    network: Network, links: IntArray, counts: Counts, fleet: Fleet, factors: FactorTable
) -> tuple[FloatArray, FloatArray]:
    """Hourly strength (2, N, T) and the heavy part (N,) of its NOx."""
    vehicles = counts.vehicles[links]
    if counts.classes is None:
        share = _shares(network, links, fleet, factors)
        used_classes = [c for c in range(len(share)) if share[c].any()]
        volumes = {c: share[c][:, None] * vehicles for c in used_classes}
    else:
        of_table = _in_table(counts.classes, factors)
        volumes = {c: vehicles[:, place] for place, c in enumerate(of_table)}
    strength = np.zeros((2, links.size, counts.vehicles.shape[-1]))
    heavy_nox = np.zeros(links.size)
    for c, volume in volumes.items():
        passing = volume > 0
        nox, no2_fraction = np.zeros(volume.shape), np.zeros(volume.shape)
        if counts.speed is not None:
            nox[passing], no2_fraction[passing] = class_factors(
                factors, c, counts.speed[links][passing]
            )
        else:
            used = passing.any(axis=1)
            values = class_factors(factors, c, network.speed[links][used])
            nox[used], no2_fraction[used] = (value[:, None] for value in values)
        class_nox = np.asarray(line_strength(volume, nox))
        strength += np.stack([class_nox, class_nox * no2_fraction])
        if factors.heavy[c]:
            heavy_nox += np.nansum(class_nox, axis=1)
    return strength, _part(heavy_nox, np.nansum(strength[0], axis=1))


def _mean_and_shape(strength: FloatArray) -> tuple[FloatArray, FloatArray]:
    counted = np.isfinite(strength).sum(axis=2)
    mean = np.nansum(strength, axis=2) / np.maximum(counted, 1)
    shape = strength / np.where(mean > 0, mean, 1.0)[:, :, None]
    return mean, shape


def _shares(network: Network, links: IntArray, fleet: Fleet, factors: FactorTable) -> FloatArray:
    """Class shares (C, N) in the order of the factor table."""
    of_table = _in_table(fleet.classes, factors)
    share = np.zeros((len(factors.classes), links.size))
    share[of_table] = link_shares(
        fleet,
        factors.heavy[of_table],
        of_link=network.fleet[links],
        heavy_share=network.heavy_share[links],
    ).T
    return share


def _in_table(classes: tuple[str, ...], factors: FactorTable) -> list[int]:
    lacking = [name for name in classes if name not in factors.classes]
    if lacking:
        raise ValueError(
            f"no emission factors for {', '.join(lacking)}; "
            f"the table has {', '.join(factors.classes)}"
        )
    return [factors.classes.index(name) for name in classes]


def _part(heavy: FloatArray, total: FloatArray) -> FloatArray:
    return np.where(total > 0, heavy / np.where(total > 0, total, 1.0), 0.0)


def _by_group(values: Mapping[str, float], heavy_part: FloatArray) -> FloatArray:
    return values["light"] * (1.0 - heavy_part) + values["heavy"] * heavy_part


def _to_tenths(height: FloatArray) -> FloatArray:
    # first to nine digits, so that 2.25 held as 2.2499999 still rounds up
    rounded: FloatArray = np.floor(np.round(height * 10, 9) + 0.5) / 10
    return rounded


def _distinct(profile: IntArray, wind_height: FloatArray) -> tuple[FloatArray, IntArray]:
    pairs, inverse = np.unique(np.column_stack([profile, wind_height]), axis=0, return_inverse=True)
    return pairs, inverse.reshape(-1)
