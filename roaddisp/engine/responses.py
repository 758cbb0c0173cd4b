"""What receptors see of the roads, once per weather state, block by block."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from roaddisp.dispersion.kernel import windowed_table
from roaddisp.model import LinkStrengths, Receptors, Responses, Segments, Terrain, WeatherStates

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

    Yields
    ------
    Responses
        Blocks in the order of the receptors.
    """
    link = segments.link
    tracers, groups = strengths.shape.shape[:2]
    row_bytes = 4 * max(len(states), 1) * tracers * groups
    size = int(np.clip(TABLE_BYTES // row_bytes, 1, LARGEST_BLOCK))
    for first in range(0, len(receptors), size):
        block = slice(first, min(first + size, len(receptors)))
        table = windowed_table(
            receptors.xyz[block],
            segments.ends,
            wind_from=states.wind_from,
            stability_codes=states.stability,
            strength=strengths.amplitude[:, link] * segments.weight,
            group=strengths.group[link],
            n_groups=groups,
            terrain=terrain,
            height=strengths.release_height[link],
            sigma_z0=strengths.sigma_z0[link],
            sigma_y0=segments.sigma_y0,
            mixing_height=states.mixing_height,
            piece=segments.piece,
            near=segments.near,
            far=segments.far,
        )
        yield Responses(receptors=block, table=table, states=states)
