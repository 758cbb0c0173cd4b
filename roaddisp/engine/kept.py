"""Responses kept for what-if: computed once, then scaled to other traffic in a blink.

What a receptor sees of a link does not depend on the link's strength. Kept
responses hold it for each weather state, by link or by groups of links; a
change of volumes, speeds, fleet, factors, background or conversion then costs one
weighted sum of them. Where a state leaves every receptor of a block untouched by a
group, as most do, nothing is kept.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Final

import numba as nb
import numpy as np

from roaddisp.dispersion.compiling import ONE_AT_A_TIME, parallel_compiled
from roaddisp.engine.responses import responses
from roaddisp.model import (
    BoolArray,
    Float32Array,
    FloatArray,
    IntArray,
    LinkStrengths,
    Receptors,
    Responses,
    Segments,
    Terrain,
    WeatherHours,
    WeatherStates,
    looked_up,
)

SCHEME: Final = 1
"""Changes with any change that moves a response: files of another scheme are refused."""

LARGEST: Final = 4 * 2**30
"""Bytes of responses that are kept at most."""


@dataclass(frozen=True)
class KeptBlock:
    """Rows of one block of receptors, sorted by state.

    Attributes
    ----------
    receptors : slice
        Place among the kept receptors.
    calms : bool
        Whether the states of calm hours are among its rows.
    lid_row : (V,) int
        As in `Responses`.
    first : (W + F + 1,) int
        First row of each state, and of each lid state that is felt.
    group : (N,) int
        Group of links of each row.
    values : (N, K, R) float32 [g/m3 at 1 m/s]
        Per unit of the group's basis.
    """

    receptors: slice
    calms: bool
    lid_row: IntArray
    first: IntArray
    group: IntArray
    values: Float32Array


@dataclass(frozen=True)
class KeptResponses:
    """Responses of chosen receptors to links or groups of links.

    Attributes
    ----------
    receptors : tuple of int
        Which receptors of the scenario, in its order.
    group : (L,) int
        Group of each link.
    basis : (K, L) [g/m/s]
        Strengths within a group, to each other; ones for links apart.
    release_height, sigma_z0 : (L,) [m]
        Of the sources, as they were when the responses were computed.
    states : WeatherStates
    blocks : tuple of KeptBlock
    fingerprint : mapping of str to str
        Of all that the responses depend on, part by part.
    """

    receptors: tuple[int, ...]
    group: IntArray
    basis: FloatArray
    release_height: FloatArray
    sigma_z0: FloatArray
    states: WeatherStates
    blocks: tuple[KeptBlock, ...]
    fingerprint: dict[str, str]

    @property
    def apart(self) -> bool:
        """Whether every link has a group of its own."""
        return bool((self.group == np.arange(self.group.size)).all())

    @property
    def size(self) -> int:
        """Bytes of the kept values."""
        return sum(block.values.nbytes for block in self.blocks)


def keep(
    segments: Segments,
    strengths: LinkStrengths,
    receptors: Receptors,
    states: WeatherStates,
    *,
    chosen: tuple[int, ...],
    terrain: Terrain,
    calms_at: BoolArray,
    group: IntArray | None,
) -> KeptResponses:
    """Compute and keep the responses of receptors.

    Parameters
    ----------
    segments, strengths, states
        Of the run.
    receptors : Receptors
        Those chosen.
    chosen : tuple of int
        Their places in the scenario.
    terrain : "open" or "urban"
    calms_at : (R,) bool
        As `responses`.
    group : (L,) int or None
        Groups of links that keep their strengths to each other; None for every link
        apart.

    Returns
    -------
    KeptResponses
    """
    links = strengths.group.size
    if group is None:
        of_link, basis = np.arange(links), np.ones((1, links))
    else:
        of_link, basis = group, strengths.amplitude
    groups = int(of_link.max(initial=-1)) + 1
    units = replace(
        strengths, amplitude=basis, group=of_link, shape=np.zeros((len(basis), groups, 0))
    )
    tables = responses(segments, units, receptors, states, terrain=terrain, calms_at=calms_at)
    return KeptResponses(
        receptors=chosen,
        group=of_link,
        basis=basis,
        release_height=strengths.release_height,
        sigma_z0=strengths.sigma_z0,
        states=states,
        blocks=_within_memory(_rows(table, len(states)) for table in tables),
        fingerprint=fingerprint(segments, receptors, states, terrain),
    )


def _within_memory(blocks: Iterator[KeptBlock]) -> tuple[KeptBlock, ...]:
    kept: list[KeptBlock] = []
    size = 0
    for block in blocks:
        kept.append(block)
        size += block.values.nbytes
        if size > LARGEST:
            raise ValueError(
                f"the responses would take more than {LARGEST / 2**30:.0f} GiB; keep them for "
                "fewer receptors, or for groups of links that change together"
            )
    return tuple(kept)


def _rows(response: Responses, all_states: int) -> KeptBlock:
    """Keep the rows (state, group) in which some receptor sees something."""
    table = response.table.transpose(0, 2, 1, 3)
    seen = table.any(axis=(2, 3))
    state, group = np.nonzero(seen)
    return KeptBlock(
        receptors=response.receptors,
        calms=len(response.states) == all_states,
        lid_row=response.lid_row,
        first=np.searchsorted(state, np.arange(len(table) + 1)),
        group=group,
        values=np.ascontiguousarray(table[state, group]),
    )


def fingerprint(
    segments: Segments, receptors: Receptors, states: WeatherStates, terrain: Terrain
) -> dict[str, str]:
    """Fingerprints of what responses depend on, apart from the sources' heights.

    Returns
    -------
    dict of str to str
        ``scheme``, ``terrain``, ``roads``, ``receptors``, ``weather states``.
    """
    return {
        "scheme": str(SCHEME),
        "terrain": terrain,
        "roads": _digest(
            segments.ends, segments.link, segments.weight, segments.sigma_y0, segments.piece,
            segments.near, segments.far,
        ),
        "receptors": _digest(receptors.xyz),
        "weather states": _digest(
            states.wind_from, states.stability, states.lids.wind_from, states.lids.stability,
            states.lids.mixing_height,
        ),
    }  # fmt: skip


def _digest(*arrays: FloatArray | IntArray) -> str:
    digest = hashlib.sha256()
    for array in arrays:
        digest.update(str(array.shape).encode())
        digest.update(np.ascontiguousarray(array).tobytes())
    return digest.hexdigest()


def regrouped(kept: KeptResponses, strengths: LinkStrengths) -> Iterator[Responses]:
    """Response tables of other strengths, from kept responses.

    Parameters
    ----------
    kept : KeptResponses
    strengths : LinkStrengths
        Of the same links.

    Yields
    ------
    Responses
        As `responses` would; the sources' heights are those of ``kept``.

    Raises
    ------
    ValueError
        Where links kept as one group no longer scale together.
    """
    ratio, into = _scaling(kept, strengths)
    tracers, groups = strengths.shape.shape[:2]
    ordinary = kept.states.without_calms()
    for block in kept.blocks:
        own = kept.states if block.calms else ordinary
        receptors = block.receptors.stop - block.receptors.start
        rows = block.first.size - 1
        table = np.zeros((rows, tracers, groups, receptors), dtype=np.float32)
        with ONE_AT_A_TIME:
            add_rows(table, block.first, block.group, block.values, ratio, into)
        yield Responses(receptors=block.receptors, table=table, states=own, lid_row=block.lid_row)


def _scaling(kept: KeptResponses, strengths: LinkStrengths) -> tuple[Float32Array, IntArray]:
    """Factor (K, G) of each kept group and the group of the strengths it goes into (G,)."""
    basis = np.broadcast_to(kept.basis, strengths.amplitude.shape)
    ratio_of_link = np.divide(
        strengths.amplitude, basis, out=np.zeros_like(strengths.amplitude), where=basis > 0
    )
    lost = (basis == 0) & (strengths.amplitude > 0)
    groups = int(kept.group.max(initial=-1)) + 1
    _, lead = np.unique(kept.group, return_index=True)
    ratio, into = ratio_of_link[:, lead], strengths.group[lead]
    apart = ~np.isclose(ratio_of_link, ratio[:, kept.group], rtol=1e-6, atol=0.0)
    apart &= (basis > 0) | (strengths.amplitude > 0)
    parted = apart.any(axis=0) | lost.any(axis=0) | (strengths.group != into[kept.group])
    if parted.any():
        raise ValueError(
            f"{int(parted.sum())} links no longer scale with the group they were kept in "
            f"(the first is link number {int(np.flatnonzero(parted)[0]) + 1} of {kept.group.size}, "
            f"in {groups} groups); keep responses with links apart, or in groups that change "
            "together"
        )
    return ratio.astype(np.float32), into


@parallel_compiled
def add_rows(
    table: Float32Array,
    first: IntArray,
    group: IntArray,
    values: Float32Array,
    ratio: Float32Array,
    into: IntArray,
) -> None:
    """Add kept rows, each times its ratio, to ``table`` (W, K, G, R); states in parallel."""
    states, tracers, _, receptors = table.shape
    kept_tracers = values.shape[1]
    for w in nb.prange(states):
        for row in range(first[w], first[w + 1]):
            for k in range(tracers):
                factor = ratio[k, group[row]]
                source = k if kept_tracers > 1 else 0
                target = into[group[row]]
                for r in range(receptors):
                    table[w, k, target, r] += factor * values[row, source, r]


def link_means(kept: KeptResponses, strengths: LinkStrengths, weather: WeatherHours) -> FloatArray:
    """Mean of each link's share of the road tracers, over the hours that have a value.

    Parameters
    ----------
    kept : KeptResponses
        With links apart.
    strengths : LinkStrengths
    weather : WeatherHours

    Returns
    -------
    (K, L, R) [g/m3]
        Calm hours left out; the sum over the links is the mean of the roads.

    Raises
    ------
    ValueError
        Where links were kept in groups.
    """
    if not kept.apart:
        raise ValueError("shares of links need responses that were kept with links apart")
    weight = strengths.shape / weather.wind_speed
    valued = (kept.states.of_hour >= 0) & np.isfinite(weight).all(axis=(0, 1))
    tracers, groups = weight.shape[:2]
    means = np.zeros((tracers, kept.group.size, len(kept.receptors)))
    for block in kept.blocks:
        by_state = np.zeros((tracers, groups, block.first.size - 1))
        lid_of_hour = looked_up(block.lid_row, kept.states.lids.of_hour)
        for hours in (kept.states.of_hour, lid_of_hour):
            chosen = valued & (hours >= 0)
            for k, g in np.ndindex(tracers, groups):
                np.add.at(by_state[k, g], hours[chosen], weight[k, g, chosen])
        by_state /= max(int(valued.sum()), 1)
        state = np.repeat(np.arange(block.first.size - 1), np.diff(block.first))
        share = (
            strengths.amplitude[:, block.group] * by_state[:, strengths.group[block.group], state]
        )
        for k in range(tracers):
            rows = share[k, :, None] * block.values[:, 0].astype(np.float64)
            np.add.at(means[k, :, block.receptors], block.group, rows)
    return means
