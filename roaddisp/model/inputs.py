"""What the user brought, made sure of, in SI and on one clock."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

import numpy as np

from roaddisp.errors import Problem
from roaddisp.model.types import (
    BoolArray,
    CalmRule,
    FloatArray,
    IntArray,
    Terrain,
    TimeArray,
    WindHeight,
)


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

    def taken(self, chosen: Sequence[int]) -> Receptors:
        """Return the receptors at these places, without the grid they may be of."""
        rows = np.array(chosen, dtype=np.int64)
        return Receptors(
            receptor=tuple(self.receptor[row] for row in rows),
            site=tuple(self.site[row] for row in rows),
            kind=tuple(self.kind[row] for row in rows),
            x=self.x[rows],
            y=self.y[rows],
            z=self.z[rows],
            longitude=self.longitude[rows],
            latitude=self.latitude[rows],
            on_road=self.on_road[rows],
            grid=None,
            cell=np.full((len(rows), 2), -1),
        )


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
    direction_step: float
    direction_seed: int
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
