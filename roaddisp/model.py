"""The central types: what each stage of a run hands to the next.

Read from top to bottom they tell the way of the data: what the user brought,
made sure of and in SI (`Study`, `Scenario`), what is derived from it hour by
hour (`LinkStrengths`, `WeatherHours`), what the engine makes (`Segments`,
`WeatherStates`, `Responses`, `HourlyBlock`) and what is left at the end
(`Statistics`, `Result`).

Letters used for array shapes, everywhere in the package:
``L`` links, ``S`` segments, ``R`` receptors, ``T`` hours, ``W`` weather states,
``G`` groups of links, ``C`` vehicle classes, ``K`` tracers (NOx, primary NO2),
``P`` profiles, ``F`` fleets. Missing is NaN until a named rule replaces it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
import numpy.typing as npt

from roaddisp.errors import Problem

if TYPE_CHECKING:
    import pandas as pd
    import xarray as xr

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


# --- what the user brought -------------------------------------------------


@dataclass(frozen=True)
class InputFile:
    """A file a study read: its path as the study names it, and its fingerprint."""

    role: str
    name: str
    sha256: str
    size: int


@dataclass(frozen=True)
class Clock:
    """The hours of a run, each named by its beginning.

    Attributes
    ----------
    standard : (T,) datetime64[m]
        Local standard time: the axis of every hourly array, without a gap.
    civil : (T,) datetime64[m]
        The same hours by the civil clock, which profiles follow.
    utc_offset : float
        Hours that local standard time is ahead of UTC: the smaller of the
        zone's offsets in January and July.
    timezone : str
        IANA name.
    """

    standard: TimeArray
    civil: TimeArray
    utc_offset: float
    timezone: str

    @property
    def utc(self) -> TimeArray:
        """(T,) datetime64[m]: the same hours in UTC."""
        shift = np.timedelta64(round(self.utc_offset * 60), "m")
        utc: TimeArray = self.standard - shift
        return utc


@dataclass(frozen=True)
class Network:
    """Roads, one entry a link, in the study CRS.

    Attributes
    ----------
    link, name : tuple of str (L,)
    lines : tuple (L,) of tuples of (N, 2) arrays [m]
        The parts of each link, without repeated vertices.
    width : (L,) [m]
        Travelled way.
    aadt : (L,) [vehicles/day], NaN where hourly counts stand instead.
    speed : (L,) [m/s]
    heavy_share : (L,) fraction, NaN where the mix decides.
    profile, fleet : (L,) index into `Profiles.names`, `Fleet.names`; -1 for none.
    """

    link: tuple[str, ...]
    name: tuple[str, ...]
    lines: tuple[tuple[FloatArray, ...], ...]
    width: FloatArray
    aadt: FloatArray
    speed: FloatArray
    heavy_share: FloatArray
    profile: IntArray
    fleet: IntArray


@dataclass(frozen=True)
class Profiles:
    """Shares of a day's traffic by hour, made whole: every month and day type.

    Attributes
    ----------
    names : tuple of str (P,)
    share : (P, 12, 3, 24)
        By month, day type (weekday, saturday, sunday) and civil hour; sums to 1
        over the hours.
    day_factor : (P, 12, 3)
        The day's total over AADT.
    """

    names: tuple[str, ...]
    share: FloatArray
    day_factor: FloatArray


@dataclass(frozen=True)
class Counts:
    """Hourly counts on the run's own hours.

    Attributes
    ----------
    vehicles : (L, T) or, with classes, (L, C, T) [vehicles/h]; NaN where not counted.
    classes : tuple of str (C,), or None where counts are of all vehicles.
    speed : (L, T) [m/s], or None where the network's speed holds.
    """

    vehicles: FloatArray
    classes: tuple[str, ...] | None
    speed: FloatArray | None


@dataclass(frozen=True)
class Fleet:
    """Shares of vehicle classes in each fleet; each row of ``share`` (F, C) sums to 1."""

    names: tuple[str, ...]
    classes: tuple[str, ...]
    share: FloatArray


@dataclass(frozen=True)
class FactorTable:
    """Emission factors by vehicle class and speed, for one year.

    Attributes
    ----------
    classes : tuple of str (C,)
    heavy : (C,) bool
    speed : tuple (C,) of (N,) arrays [m/s], ascending
    nox : tuple (C,) of (N,) arrays [g/km], as NO2
    no2_fraction : tuple (C,) of (N,) arrays
    year : int or None
    built_in : bool
    sources : tuple (C,) of str, empty for the user's own table
    """

    classes: tuple[str, ...]
    heavy: BoolArray
    speed: tuple[FloatArray, ...]
    nox: tuple[FloatArray, ...]
    no2_fraction: tuple[FloatArray, ...]
    year: int | None
    built_in: bool
    sources: tuple[str, ...]


@dataclass(frozen=True)
class StationHours:
    """Weather as the station wrote it, on the run's own hours, in SI.

    Attributes
    ----------
    wind_from : (T,) [deg], NaN where not reported
    wind_speed : (T,) [m/s]
    temperature : (T,) [K]
    stability : (T,) int codes, -1 missing; None where it is to be derived
    cloud : (T,) [tenths]; None where stability is given
    ceiling : (T,) [m], inf for none; None where stability is given
    mixing_height : (T,) [m], inf for none
    pressure : (T,) [Pa], NaN where not reported
    latitude, longitude : float [deg]
        Where the sun is reckoned: the roads' centroid.
    """

    wind_from: FloatArray
    wind_speed: FloatArray
    temperature: FloatArray
    stability: IntArray | None
    cloud: FloatArray | None
    ceiling: FloatArray | None
    mixing_height: FloatArray
    pressure: FloatArray
    latitude: float
    longitude: float


@dataclass(frozen=True)
class Background:
    """Air before the roads of the study, (T,) [ppb] each; ``no`` None where unknown."""

    o3: FloatArray
    no2: FloatArray
    no: FloatArray | None


@dataclass(frozen=True)
class Grid:
    """The cells a GeoTIFF has; cell centres at multiples of the spacing.

    ``west`` and ``north`` are the centre of the upper left cell [m].
    """

    west: float
    north: float
    spacing: float
    rows: int
    columns: int


@dataclass(frozen=True)
class Receptors:
    """Where concentrations are asked for.

    Attributes
    ----------
    receptor, site, kind : tuple of str (R,); site and kind may be empty
    x, y : (R,) [m] in the study CRS
    z : (R,) [m] above ground
    longitude, latitude : (R,) [deg], WGS 84
    on_road : (R,) bool, within the travelled way of a link
    grid : Grid or None
    cell : (R, 2) row and column in the grid, -1 for receptors that are not of it
    """

    receptor: tuple[str, ...]
    site: tuple[str, ...]
    kind: tuple[str, ...]
    x: FloatArray
    y: FloatArray
    z: FloatArray
    longitude: FloatArray
    latitude: FloatArray
    on_road: BoolArray
    grid: Grid | None
    cell: IntArray

    def __len__(self) -> int:
        return len(self.receptor)

    @property
    def xyz(self) -> FloatArray:
        """(R, 3) [m]: x, y and height above ground."""
        return np.column_stack([self.x, self.y, self.z])


@dataclass(frozen=True)
class Site:
    """A polygon the user marked, kept for maps: rings of (N, 2) arrays [m], outer first."""

    site: str
    kind: str
    polygons: tuple[tuple[FloatArray, ...], ...]


@dataclass(frozen=True)
class Options:
    """Choices of a scenario, in SI; each is named in the record."""

    terrain: Terrain
    ugm3_per_ppb: float
    reference: str
    year: int
    anemometer_height: float
    wind_height: WindHeight
    wind_floor: float
    calm_threshold: float
    calms: CalmRule
    curves: Literal["briggs"]
    wake_margin: float
    conversion: Literal["ozone-limited"]
    standards: tuple[str, ...]
    hourly: tuple[str, ...] | Literal["all"]


@dataclass(frozen=True)
class Scenario:
    """Everything one run needs, checked, in SI, on one clock."""

    name: str
    options: Options
    clock: Clock
    network: Network
    profiles: Profiles | None
    counts: Counts | None
    fleet: Fleet
    factors: FactorTable
    station: StationHours
    background: Background
    receptors: Receptors
    sites: tuple[Site, ...]
    files: tuple[InputFile, ...]
    settings: Mapping[str, Any]
    """The scenario's ``study.toml`` with defaults filled in, for the record."""


@dataclass(frozen=True)
class Study:
    """A study folder, read and found fit to run.

    Attributes
    ----------
    path : Path
        Its ``study.toml``.
    title, crs : str
    scenarios : mapping of name to Scenario; the first is ``"base"``.
    cautions : tuple of Problem
        What a reader of the results should know; no errors.
    """

    path: Path
    title: str
    crs: str
    scenarios: Mapping[str, Scenario]
    cautions: tuple[Problem, ...]

    @property
    def folder(self) -> Path:
        """The folder that holds the study."""
        return self.path.parent


# --- what is derived from it, hour by hour ------------------------------------


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
    counts : mapping
        Hours that each step of the wind touched, for the record.
    """

    wind_from: FloatArray
    wind_speed: FloatArray
    stability: IntArray
    mixing_height: FloatArray
    calm: BoolArray
    missing: BoolArray
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
class WeatherStates:
    """The distinct states among the hours: responses are computed once for each.

    Attributes
    ----------
    wind_from : (W,) [deg]; stability : (W,) int codes; mixing_height : (W,) [m]
    of_hour : (T,) int
        State of each hour, -1 in calm and missing hours.
    calm_hours : (Tc,) int
        Hours to be run in every direction; empty where calms are left out.
    calm_first : (Tc,) int
        First of the ``directions`` consecutive states of each calm hour.
    directions : int
    """

    wind_from: FloatArray
    stability: IntArray
    mixing_height: FloatArray
    of_hour: IntArray
    calm_hours: IntArray
    calm_first: IntArray
    directions: int

    def __len__(self) -> int:
        return len(self.wind_from)


@dataclass(frozen=True)
class Responses:
    """What each receptor of a block sees of each group, at 1 m/s, per state.

    Attributes
    ----------
    receptors : slice
        The block's place among the receptors of the run.
    table : (W, K, G, R) float32 [g/m3]
        Per unit of the group's shape.
    states : WeatherStates
    """

    receptors: slice
    table: Float32Array
    states: WeatherStates


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
    nox_road_ugm3, no2_primary_road_ppb, no2_ppb, no_ppb, o3_ppb : (R, T)
    worst : HourlyBlock or None
    """

    receptors: slice
    hours: IntArray
    nox_road_ugm3: FloatArray
    no2_primary_road_ppb: FloatArray
    no2_ppb: FloatArray
    no_ppb: FloatArray
    o3_ppb: FloatArray
    worst: HourlyBlock | None = None


# --- what is left at the end ------------------------------------------------------


@dataclass(frozen=True)
class Statistics:
    """Statistics of every receptor; by year first, then over the years.

    Attributes
    ----------
    years : (Y,) int
    nox_road_mean_ugm3, no2_mean_ppb, no2_road_mean_ppb, nox_mean_ppb : (Y, R)
        Means over the hours that have a value; ``nox_mean_ppb`` is total NOx,
        NaN where the background gives no NO.
    no2_1h_max_ppb, no2_1h_p98_ppb, no2_1h_19th_ppb : (Y, R)
        Highest hour; 98th percentile of daily maxima by the rank table; 19th
        highest hour, NaN where there are fewer.
    no2_1h_p98_truncated_ppb : (Y, R)
        The same percentile of hours truncated to 0.1 ppb.
    """

    years: IntArray
    nox_road_mean_ugm3: FloatArray
    no2_mean_ppb: FloatArray
    no2_road_mean_ppb: FloatArray
    nox_mean_ppb: FloatArray
    no2_1h_max_ppb: FloatArray
    no2_1h_p98_ppb: FloatArray
    no2_1h_p98_truncated_ppb: FloatArray
    no2_1h_19th_ppb: FloatArray


@dataclass(frozen=True)
class Verdicts:
    """One standard, judged at every receptor.

    Attributes
    ----------
    standard : str
    value : (R,) in the standard's own unit and rounding; regulatory
    limit : float
    decimals : int
        With which value and limit are written.
    unit : str
    met : tuple of str (R,)
        ``yes``, ``no``, ``undetermined``, or empty where the standard does not judge.
    reason : tuple of str (R,)
        Why undetermined; empty otherwise.
    provisional : str
        Why a result counts as provisional (too few years); empty otherwise.
    """

    standard: str
    value: FloatArray
    limit: float
    decimals: int
    unit: str
    met: tuple[str, ...]
    reason: tuple[str, ...]
    provisional: str


@dataclass(frozen=True)
class Result:
    """One scenario's outcome: statistics, verdicts and the hours asked for.

    Attributes
    ----------
    study : Study
    scenario : Scenario
    strengths : LinkStrengths
    statistics : Statistics
        Regulatory: calm hours left out.
    worst : Statistics or None
        Calm hours run in the worst direction.
    verdicts : tuple of Verdicts
    kept : tuple of int
        Receptors whose hours were asked for.
    hours : HourlyBlock
        Their hours (its ``receptors`` counts among ``kept``).
    record : mapping
        Counts, warnings, versions and timings of the run.
    """

    study: Study
    scenario: Scenario
    strengths: LinkStrengths
    statistics: Statistics
    worst: Statistics | None
    verdicts: tuple[Verdicts, ...]
    kept: tuple[int, ...]
    hours: HourlyBlock
    record: Mapping[str, Any] = field(repr=False)

    @cached_property
    def summary(self) -> pd.DataFrame:
        """One row a receptor: the columns of ``receptors.csv``.

        ``summary.attrs["columns"]`` maps each column to its meaning and unit.
        """
        from roaddisp.outputs.tables import receptor_table

        return receptor_table(self)

    @cached_property
    def hourly(self) -> xr.Dataset:
        """Hours of the receptors asked for, dimensions ``(receptor, time)``.

        Variables ``nox_road_ugm3, nox_road_ppb, no2_primary_road_ppb, no2_ppb,
        no_ppb, o3_ppb``; time is local standard, hour-beginning.
        """
        from roaddisp.outputs.tables import hourly_dataset

        return hourly_dataset(self)

    def write(self, out: str | Path) -> tuple[Path, ...]:
        """Write every file of the run into the folder ``out``, all or none.

        Parameters
        ----------
        out : str or Path
            Made where it is missing. Files of an earlier run there are replaced.

        Returns
        -------
        tuple of Path
            The files written.

        Raises
        ------
        OutputError
            Where the folder cannot be written, or holds files of the same names
            that no run of roaddisp left.
        """
        from roaddisp.outputs.folder import write_result

        return write_result(self, Path(out))
