"""What receptors see of the roads, once per weather state, block by block."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise

import numpy as np

from roaddisp.dispersion.kernel import windowed_table
from roaddisp.model import (
    BoolArray,
    LinkStrengths,
    Receptors,
    Responses,
    Segments,
    Terrain,
    WeatherStates,
)

TABLE_BYTES = 256 * 2**20
"""Largest response table held at once [bytes]."""

LARGEST_BLOCK = 8192
"""Receptors of a table at most: enough for every thread to have work."""


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
    link = segments.link
    groups = strengths.shape.shape[1]
    points = receptors.xyz
    for block, own in _blocks(states, strengths, _every(receptors, calms_at)):
        table = windowed_table(
            points[block],
            segments.ends,
            wind_from=own.wind_from,
            stability_codes=own.stability,
            strength=strengths.amplitude[:, link] * segments.weight,
            group=strengths.group[link],
            n_groups=groups,
            terrain=terrain,
            height=strengths.release_height[link],
            sigma_z0=strengths.sigma_z0[link],
            sigma_y0=segments.sigma_y0,
            mixing_height=own.mixing_height,
            piece=segments.piece,
            near=segments.near,
            far=segments.far,
            across_only=True,
        )
        yield Responses(receptors=block, table=table, states=own)


def _every(receptors: Receptors, calms_at: BoolArray | None) -> BoolArray:
    return np.ones(len(receptors), dtype=np.bool_) if calms_at is None else calms_at


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
        row_bytes = 4 * max(len(own), 1) * tracers * groups
        size = int(np.clip(TABLE_BYTES // row_bytes, 1, LARGEST_BLOCK))
        for start in range(first, stop, size):
            yield slice(start, min(start + size, stop)), own
