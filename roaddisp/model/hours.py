"""What is derived from the inputs hour by hour, and what the engine makes of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from roaddisp.model.types import BoolArray, Float32Array, FloatArray, IntArray


@dataclass(frozen=True)
class LinkStrengths:
    """What the links emit: ``strength[k, l, t] = amplitude[k, l] * shape[k, group[l], t]``.

    Attributes
    ----------
    amplitude : (K, L) [g/m/s]
    group : (L,) int
        Links of one group share the hourly shape and the wind height.
    shape : (K, G, T), no unit; NaN where an hour's traffic is missing
    wind_height : (G,) [m]
        Height at which the group's plume feels the wind.
    release_height, sigma_z0 : (L,) [m]
    """

    amplitude: FloatArray
    group: IntArray
    shape: FloatArray
    wind_height: FloatArray
    release_height: FloatArray
    sigma_z0: FloatArray

    def hourly(self) -> FloatArray:
        """(K, L, T) [g/m/s]; large for many links, meant for one or a few."""
        strength: FloatArray = self.amplitude[:, :, None] * self.shape[:, self.group, :]
        return strength


@dataclass(frozen=True)
class WeatherHours:
    """Weather as the engine takes it.

    Attributes
    ----------
    wind_from : (T,) [deg] in [0, 360), NaN in calm and missing hours
    wind_speed : (G, T) [m/s]
        As the plume of each group feels it, after every floor.
    stability : (T,) int codes, -1 where missing
    mixing_height : (T,) [m]
    calm, missing : (T,) bool
        A missing hour lacks wind or stability; a calm one has a stability.
    raised : (T,) bool
        Hours, neither calm nor missing, whose wind a floor has raised.
    counts : mapping
        Hours that each step of the wind touched, for the record.
    """

    wind_from: FloatArray
    wind_speed: FloatArray
    stability: IntArray
    mixing_height: FloatArray
    calm: BoolArray
    missing: BoolArray
    raised: BoolArray
    counts: Mapping[str, int]


# --- what the engine makes ------------------------------------------------------


@dataclass(frozen=True)
class Segments:
    """Straight lines that stand for the roads.

    A piece of a link between two vertices is replaced by several sets of
    parallel lines, a finer set for receptors near it; each line serves the
    receptors whose distance from the piece is in ``[near, far)``, so that a
    receptor's value never depends on which others are in the run.

    Attributes
    ----------
    ends : (S, 2, 2) [m]
    link : (S,) int
    weight : (S,)
        Share of the link's line strength that the line carries.
    sigma_y0 : (S,) [m]
    piece : (S, 2, 2) [m]
        The centreline piece the line belongs to.
    near, far : (S,) [m] from the piece
    """

    ends: FloatArray
    link: IntArray
    weight: FloatArray
    sigma_y0: FloatArray
    piece: FloatArray
    near: FloatArray
    far: FloatArray


@dataclass(frozen=True)
class LidStates:
    """States under a lid, to be computed only where the lid is felt.

    Attributes
    ----------
    wind_from : (V,) [deg]; stability : (V,) int codes; mixing_height : (V,) [m]
        States of ordinary hours first, then those of calm hours.
    of_hour : (T,) int
        State of each hour, -1 without a lid.
    calm_first : (Tc,) int
        First of the consecutive states of each calm hour, -1 without a lid.
    """

    wind_from: FloatArray
    stability: IntArray
    mixing_height: FloatArray
    of_hour: IntArray
    calm_first: IntArray


@dataclass(frozen=True)
class WeatherStates:
    """The distinct states among the hours: responses are computed once for each.

    A lid is part of no state here: most pairs of receptor and road never feel it,
    and an hourly lid would make every hour a state. What lids change is added from
    ``lids``.

    Attributes
    ----------
    wind_from : (W,) [deg]; stability : (W,) int codes
        States of ordinary hours first, then those of calm hours.
    of_hour : (T,) int
        State of each hour, -1 in calm and missing hours.
    calm_hours : (Tc,) int
        Hours to be run in every direction; empty where calms are left out.
    calm_first : (Tc,) int
        First of the ``directions`` consecutive states of each calm hour.
    directions : int
    lids : LidStates
    """

    wind_from: FloatArray
    stability: IntArray
    of_hour: IntArray
    calm_hours: IntArray
    calm_first: IntArray
    directions: int
    lids: LidStates

    def __len__(self) -> int:
        return len(self.wind_from)

    def without_calms(self) -> WeatherStates:
        """Return the states of ordinary hours alone."""
        ordinary = int(self.of_hour.max(initial=-1)) + 1
        under = int(self.lids.of_hour.max(initial=-1)) + 1
        return replace(
            self,
            wind_from=self.wind_from[:ordinary],
            stability=self.stability[:ordinary],
            calm_hours=self.calm_hours[:0],
            calm_first=self.calm_first[:0],
            lids=replace(
                self.lids,
                wind_from=self.lids.wind_from[:under],
                stability=self.lids.stability[:under],
                mixing_height=self.lids.mixing_height[:under],
                calm_first=self.lids.calm_first[:0],
            ),
        )


@dataclass(frozen=True)
class Responses:
    """What each receptor of a block sees of each group, at 1 m/s, per state.

    Attributes
    ----------
    receptors : slice
        The block's place among the receptors of the run.
    table : (W + F, K, G, R) float32 [g/m3]
        Per unit of the group's shape; after the W states without lids, the change
        that each of the F lid states makes which some pair of the block feels.
    states : WeatherStates
    lid_row : (V,) int
        Row of each lid state in the table, -1 where no pair feels it.
    """

    receptors: slice
    table: Float32Array
    states: WeatherStates
    lid_row: IntArray

    def lid_of_hour(self) -> IntArray:
        """(T,): row that an hour's lid adds, -1 for none."""
        return looked_up(self.lid_row, self.states.lids.of_hour)

    def lid_of_calm(self) -> IntArray:
        """(Tc,): first of the rows that a calm hour's lid adds, -1 for none."""
        return looked_up(self.lid_row, self.states.lids.calm_first)


def looked_up(row: IntArray, index: IntArray) -> IntArray:
    """Rows at the indices; -1 where an index is."""
    padded = np.append(row, -1)
    found: IntArray = padded[index]
    return found


@dataclass(frozen=True)
class HourlyBlock:
    """All hours at a block of receptors.

    ``hours`` says which hours the last axis holds: all of the run, or, in
    ``worst``, the calm ones, each run in the direction that gives the
    receptor most NO2. NaN where an hour is calm (in the block itself) or missing.

    Attributes
    ----------
    receptors : slice
    hours : (T,) int
    nox_road_ugm3, no2_primary_road_ppb, no2_ppb : (R, T)
    no_ppb, o3_ppb : (R, T) or None
        In total and left over; only of hours that are kept.
    worst : HourlyBlock or None
    """

    receptors: slice
    hours: IntArray
    nox_road_ugm3: FloatArray
    no2_primary_road_ppb: FloatArray
    no2_ppb: FloatArray
    no_ppb: FloatArray | None = None
    o3_ppb: FloatArray | None = None
    worst: HourlyBlock | None = None
