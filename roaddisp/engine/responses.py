"""What receptors see of the roads, once per weather state, block by block."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from itertools import pairwise

import numpy as np

from roaddisp.dispersion.kernel import windowed_table
from roaddisp.dispersion.lids import lid_is_felt
from roaddisp.model import (
    BoolArray,
    Float32Array,
    FloatArray,
    IntArray,
    LidStates,
    LinkStrengths,
    Receptors,
    Responses,
    Segments,
    Terrain,
    WeatherStates,
)

TABLE_BYTES = 256 * 2**20
"""Largest response table held at once [bytes]."""

LARGEST_BLOCK = 16384
"""Receptors of a table at most; the more there are, the denser they lie in the loops."""

SHORT_RUN = 256
"""So few receptors between two whose calm hours are run go with them: a block of their own
would cost more."""


def responses(
    segments: Segments,
    strengths: LinkStrengths,
    receptors: Receptors,
    states: WeatherStates,
    *,
    terrain: Terrain,
    calms_at: BoolArray | None = None,
) -> Iterator[Responses]:
    """Compute the response tables of all receptors, a block at a time.

    Parameters
    ----------
    segments : Segments
        (S,) lines.
    strengths : LinkStrengths
        Its amplitudes enter the table; links of one group are summed in it.
    receptors : Receptors
        (R,) points.
    states : WeatherStates
        (W,) states.
    terrain : "open" or "urban"
    calms_at : (R,) bool, optional
        Receptors at which calm hours are to be run; all where not given. The many
        directions of calm hours cost most of a run, and a receptor that no
        standard judges has no use for them.

    Yields
    ------
    Responses
        Blocks in the order of the receptors.
    """
    for block, own in _blocks(states, strengths, _with_calms(states, receptors, calms_at)):
        points = receptors.xyz[block]

        felt = np.flatnonzero(_felt(segments, strengths, points, own.lids, terrain))
        lid_row = np.full(len(own.lids.wind_from), -1, dtype=np.int64)
        lid_row[felt] = len(own) + np.arange(felt.size)
        free = np.full(len(own), np.inf)
        table = _table(segments, strengths, points, own, free, terrain, changes=False)
        if felt.size:
            under = _chosen(own.lids, felt)
            lids = under.mixing_height
            change = _table(segments, strengths, points, under, lids, terrain, changes=True)
            table = np.concatenate([table, change])
        yield Responses(receptors=block, table=table, states=own, lid_row=lid_row)


def _table(
    segments: Segments,
    strengths: LinkStrengths,
    points: FloatArray,
    states: WeatherStates | LidStates,
    lids: FloatArray,
    terrain: Terrain,
    *,
    changes: bool,
) -> Float32Array:
    """Compute the table (W, K, G, R) of states, or the change that their lids make."""
    link = segments.link
    return windowed_table(
        points,
        segments.ends,
        wind_from=states.wind_from,
        stability_codes=states.stability,
        strength=strengths.amplitude[:, link] * segments.weight,
        group=strengths.group[link],
        n_groups=strengths.shape.shape[1],
        terrain=terrain,
        height=strengths.release_height[link],
        sigma_z0=strengths.sigma_z0[link],
        sigma_y0=segments.sigma_y0,
        mixing_height=lids,
        piece=segments.piece,
        near=segments.near,
        far=segments.far,
        across_only=True,
        touched_only=changes,
    )


def _felt(
    segments: Segments,
    strengths: LinkStrengths,
    points: FloatArray,
    lids: LidStates,
    terrain: Terrain,
) -> BoolArray:
    """Lid states that some pair of these receptors and the roads can feel."""
    if not len(lids.wind_from) or not len(segments.ends):
        return np.zeros(len(lids.wind_from), dtype=np.bool_)
    corners = np.concatenate([segments.ends.reshape(-1, 2), points[:, :2]])
    return lid_is_felt(
        lids.stability,
        lids.mixing_height,
        terrain=terrain,
        sigma_z0=strengths.sigma_z0,
        heights=strengths.release_height,
        receptor_z=points[:, 2],
        farthest=float(np.hypot(*np.ptp(corners, axis=0))),
    )


def _chosen(lids: LidStates, rows: IntArray) -> LidStates:
    return replace(
        lids,
        wind_from=lids.wind_from[rows],
        stability=lids.stability[rows],
        mixing_height=lids.mixing_height[rows],
    )


def _with_calms(
    states: WeatherStates, receptors: Receptors, calms_at: BoolArray | None
) -> BoolArray:
    """Receptors whose block holds the states of calm hours, in runs long enough to be blocks."""
    if calms_at is None or not states.calm_hours.size:
        return np.full(len(receptors), calms_at is None, dtype=np.bool_)
    wanted = np.flatnonzero(calms_at)
    filled = calms_at.copy()
    for first, last in pairwise(wanted.tolist()):
        if last - first <= SHORT_RUN:
            filled[first:last] = True
    return filled


def _blocks(
    states: WeatherStates, strengths: LinkStrengths, calms_at: BoolArray
) -> Iterator[tuple[slice, WeatherStates]]:
    """Cut the receptors into blocks that need the same states and fit the table."""
    tracers, groups = strengths.shape.shape[:2]
    ordinary = states.without_calms()
    turns = np.flatnonzero(np.diff(calms_at)) + 1
    for first, stop in pairwise([0, *turns.tolist(), calms_at.size]):
        if first == stop:
            continue
        own = states if calms_at[first] else ordinary
        rows = len(own) + len(own.lids.wind_from)
        row_bytes = 4 * max(rows, 1) * tracers * groups
        most = int(np.clip(TABLE_BYTES // row_bytes, 1, LARGEST_BLOCK))
        size = -(-(stop - first) // -(-(stop - first) // most))  # as even as can be
        for start in range(first, stop, size):
            yield slice(start, min(start + size, stop)), own
