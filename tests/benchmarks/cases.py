"""Invented cases to measure with: receptors, straight segments and weather states."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from roaddisp.model import FloatArray, IntArray, Terrain

CLASSES = "ABCDEF"
EXTENT = 5000.0
"""m; side of the square that holds roads and receptors."""


@dataclass(frozen=True)
class Case:
    """Arguments of `roaddisp.response_table`, one group of segments in five."""

    receptors: FloatArray
    segments: FloatArray
    wind_from: FloatArray
    stability: list[str]
    strength: FloatArray
    group: IntArray
    terrain: Terrain
    height: float
    sigma_z0: float
    sigma_y0: float
    mixing_height: FloatArray

    @property
    def pair_states(self) -> int:
        return len(self.receptors) * len(self.segments) * len(self.wind_from)

    def options(self) -> dict[str, Any]:
        """All but receptors and segments, as keywords."""
        return {
            name: value
            for name, value in vars(self).items()
            if name not in ("receptors", "segments")
        }

    def share(self, receptors: int, segments: int, states: int) -> Case:
        """Every n-th receptor, segment and state, so that a share stands for the whole."""
        rows = _spread(len(self.receptors), receptors)
        lines = _spread(len(self.segments), segments)
        hours = _spread(len(self.wind_from), states)
        return replace(
            self,
            receptors=self.receptors[rows],
            segments=self.segments[lines],
            strength=self.strength[lines],
            group=self.group[lines],
            wind_from=self.wind_from[hours],
            stability=[self.stability[hour] for hour in hours],
            mixing_height=self.mixing_height[hours],
        )


def single_lines(
    receptors: int,
    segments: int,
    directions: int = 36,
    *,
    terrain: Terrain = "open",
    lids: bool = False,
    seed: int = 20,
) -> Case:
    """Straight lines of 100 m to 1 km, 0.1 m wide, and receptors among them.

    States are ``directions`` evenly spread winds times six classes. With ``lids``
    every state has a mixing height between 100 m (class F) and 1,200 m (class A).
    """
    rng = np.random.default_rng(seed)
    centre = rng.uniform(0.0, EXTENT, (segments, 2))
    angle = rng.uniform(0.0, np.pi, segments)
    half = 0.5 * rng.uniform(100.0, 1000.0, segments)
    along = half[:, None] * np.column_stack([np.cos(angle), np.sin(angle)])
    points = np.column_stack([rng.uniform(0.0, EXTENT, (receptors, 2)), np.full(receptors, 1.5)])
    wind = np.arange(directions) * 360.0 / directions
    tops = np.array([1200.0, 900.0, 700.0, 500.0, 200.0, 100.0])
    return Case(
        receptors=points,
        segments=np.stack([centre - along, centre + along], axis=1),
        wind_from=np.tile(wind, len(CLASSES)),
        stability=list(np.repeat(list(CLASSES), directions)),
        strength=rng.uniform(1e-5, 1e-3, segments),
        group=np.arange(segments) % 5,
        terrain=terrain,
        height=1.3,
        sigma_z0=1.2,
        sigma_y0=0.1 / np.sqrt(12.0),
        mixing_height=np.repeat(tops if lids else np.full(6, np.inf), directions),
    )


def _spread(total: int, wanted: int) -> IntArray:
    return np.unique(np.linspace(0, total - 1, min(wanted, total)).astype(np.int64))
