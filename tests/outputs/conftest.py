"""A result made by hand, in place of a run: every number is invented."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from roaddisp.model import (
    Background,
    Clock,
    FactorTable,
    Fleet,
    Grid,
    HourlyBlock,
    LinkStrengths,
    Network,
    Options,
    Receptors,
    Result,
    Scenario,
    Site,
    StationHours,
    Statistics,
    Study,
    Verdicts,
)

EAST, NORTH = 620_000.0, 4_440_000.0
HOURS = 48
FACTOR = 1.8804

ResultFactory = Callable[..., Result]


@pytest.fixture(scope="session")
def make_result() -> ResultFactory:
    return _result


@pytest.fixture
def result() -> Result:
    return _result()


def _network() -> Network:
    along = np.arange(-600.0, 601.0, 100.0)
    freeway = np.column_stack([EAST + 5e-5 * along**2, NORTH + along])
    street = np.array([[EAST - 500.0, NORTH - 200.0], [EAST + 600.0, NORTH - 210.0]])
    spur = np.array([[EAST + 300.0, NORTH + 250.0], [EAST + 420.0, NORTH + 300.0]])
    return Network(
        link=("F", "S"),
        name=("Larch Freeway", ""),
        lines=((freeway,), (street, spur)),
        width=np.array([24.0, 14.0]),
        aadt=np.array([72_000.0, np.nan]),
        speed=np.array([29.0, 17.9]),
        heavy_share=np.array([0.11, np.nan]),
        profile=np.array([0, 0]),
        fleet=np.array([0, 0]),
    )


def _receptors(network: Network, *, grid: bool, points: bool) -> Receptors:
    names, sites, kinds, x, y, z = [], [], [], [], [], []
    if points:
        places = [
            ("room", "School", "classroom", 220.0, -80.0, 1.5),
            ("yard", "School", "playground", 160.0, -120.0, 1.5),
            ("School-1", "School", "playground", 100.0, -160.0, 1.5),
            ("edge", "", "roadside", 18.0, 60.0, 1.5),
            ("attic", "", "home", -150.0, 90.0, 6.0),
            ("median", "", "", 2.0, 0.0, 1.5),
        ]
        for name, site, kind, east, north, height in places:
            names.append(name)
            sites.append(site)
            kinds.append(kind)
            x.append(EAST + east)
            y.append(NORTH + north)
            z.append(height)
    cell = [(-1, -1)] * len(names)
    layout = None
    if grid:
        layout = Grid(west=EAST - 300.0, north=NORTH + 300.0, spacing=20.0, rows=31, columns=35)
        for row in range(layout.rows):
            for column in range(layout.columns):
                if row + column < 6:
                    continue
                names.append(f"grid-{row}-{column}")
                sites.append("")
                kinds.append("grid")
                x.append(layout.west + 20.0 * column)
                y.append(layout.north - 20.0 * row)
                z.append(1.5)
                cell.append((row, column))
    easting, northing = np.array(x), np.array(y)
    distance = np.abs(easting - EAST - 5e-5 * (northing - NORTH) ** 2)
    return Receptors(
        receptor=tuple(names),
        site=tuple(sites),
        kind=tuple(kinds),
        x=easting,
        y=northing,
        z=np.array(z),
        longitude=-103.6 + (easting - EAST) / 85_000,
        latitude=40.1 + (northing - NORTH) / 111_000,
        on_road=distance < network.width[0] / 2,
        grid=layout,
        cell=np.array(cell, dtype=np.int64).reshape(-1, 2),
    )


def _statistics(receptors: Receptors, years: int) -> Statistics:
    distance = np.abs(receptors.x - EAST) + 8.0
    nox = 900.0 / distance**0.8
    mean = 7.0 + 0.25 * nox
    p98 = 48.0 + 420.0 / distance**0.55
    growth = 1.0 + 0.1 * np.arange(years)[:, None]
    return Statistics(
        years=2027 + np.arange(years),
        nox_road_mean_ugm3=nox * growth,
        no2_mean_ppb=mean * growth,
        no2_road_mean_ppb=(mean - 7.0) * growth,
        nox_mean_ppb=np.full((years, len(receptors)), np.nan),
        no2_1h_max_ppb=(p98 + 12.0) * growth,
        no2_1h_p98_ppb=p98 * growth,
        no2_1h_p98_truncated_ppb=np.floor(p98 * growth * 10) / 10,
        no2_1h_19th_ppb=(p98 - 6.0) * growth,
        raised_in_p98=np.zeros((years, len(receptors))),
        raised_in_19th=np.zeros((years, len(receptors))),
    )


def _verdicts(receptors: Receptors, statistics: Statistics) -> tuple[Verdicts, ...]:
    hourly = np.floor(statistics.no2_1h_p98_truncated_ppb.mean(axis=0) + 0.5)
    annual = np.floor(statistics.no2_mean_ppb.max(axis=0) + 0.5)
    judged = [
        kind != "grid" and not on_road
        for kind, on_road in zip(receptors.kind, receptors.on_road, strict=True)
    ]
    met_hourly = np.where(hourly <= 100, "yes", "no").astype(object)
    met_hourly[[name == "attic" for name in receptors.receptor]] = "undetermined"
    met_hourly[~np.array(judged, dtype=bool)] = ""
    reason = [
        "calm hours in the worst direction" if m == "undetermined" else "" for m in met_hourly
    ]
    judged_annual = [
        ok and kind != "roadside" for ok, kind in zip(judged, receptors.kind, strict=True)
    ]
    met_annual = np.where(judged_annual, np.where(annual <= 53, "yes", "no"), "")
    return (
        Verdicts(
            standard="us-naaqs-1h",
            value=hourly,
            limit=100.0,
            decimals=0,
            unit="ppb",
            met=tuple(met_hourly),
            reason=tuple(reason),
            provisional="1 year of 3",
        ),
        Verdicts(
            standard="california-annual",
            value=annual / 1000.0,
            limit=0.030,
            decimals=3,
            unit="ppm",
            met=tuple(met_annual.tolist()),
            reason=("",) * len(receptors),
            provisional="",
        ),
    )


def _hours(kept: tuple[int, ...]) -> HourlyBlock:
    hour = np.arange(HOURS)
    row = np.arange(len(kept))[:, None]
    nox = 40.0 + 10.0 * row + 15.0 * np.sin(hour / 4.0)
    nox[:, 7] = np.nan
    return HourlyBlock(
        receptors=slice(0, len(kept)),
        hours=hour,
        nox_road_ugm3=nox,
        no2_primary_road_ppb=nox * 0.08,
        no2_ppb=9.0 + nox * 0.3,
        no_ppb=nox * 0.2,
        o3_ppb=30.0 - nox * 0.1,
    )


def _scenario(network: Network, receptors: Receptors, *, built_in: bool, sites: bool) -> Scenario:
    standard = np.datetime64("2027-01-01T00:00", "m") + np.arange(HOURS) * np.timedelta64(60, "m")
    flat = np.full(HOURS, 10.0)
    parcel = np.array([[100.0, -160.0], [280.0, -160.0], [280.0, -20.0], [100.0, -20.0]])
    court = np.array([[170.0, -100.0], [170.0, -80.0], [190.0, -80.0], [190.0, -100.0]])
    corner = np.array([EAST, NORTH])
    school = Site("School", "playground", ((parcel + corner, court + corner),))
    empty = Site("Annex", "", ((parcel * [1.0, -1.0] + corner,),))
    return Scenario(
        name="base",
        options=Options(
            terrain="open",
            ugm3_per_ppb=FACTOR,
            reference="25 C",
            year=2027,
            anemometer_height=10.0,
            wind_height="release",
            wind_floor=1.0,
            calm_threshold=0.5,
            calms="both",
            direction_step=0.0,
            direction_seed=1,
            curves="briggs",
            wake_margin=0.0,
            conversion="ozone-limited",
            standards=("us-naaqs-1h", "california-annual"),
            hourly=(),
        ),
        clock=Clock(standard, standard, -7.0, "America/Denver"),
        network=network,
        profiles=None,
        counts=None,
        fleet=Fleet(("all",), ("car",), np.array([[1.0]])),
        factors=FactorTable(
            classes=("car",),
            heavy=np.array([False]),
            speed=(np.array([10.0, 30.0]),),
            nox=(np.array([0.3, 0.4]),),
            no2_fraction=(np.array([0.2, 0.2]),),
            year=2027,
            built_in=built_in,
            sources=("",),
        ),
        station=StationHours(flat, flat, flat, None, flat, flat, flat, flat, 40.1, -103.6),
        background=Background(flat, flat, None),
        receptors=receptors,
        sites=(school, empty) if sites else (),
        files=(),
        settings={},
    )


def _result(
    *,
    grid: bool = True,
    points: bool = True,
    sites: bool = True,
    years: int = 1,
    kept: tuple[int, ...] = (1, 3),
    built_in: bool = False,
    title: str = "School at Larch Field (invented)",
) -> Result:
    network = _network()
    receptors = _receptors(network, grid=grid, points=points)
    scenario = _scenario(network, receptors, built_in=built_in, sites=sites)
    statistics = _statistics(receptors, years)
    shape = np.ones((2, 1, HOURS))
    shape[:, :, ::2] = 0.5
    shape[:, :, 5] = np.nan
    return Result(
        study=Study(Path("study.toml"), title, "EPSG:32613", {"base": scenario}, ()),
        scenario=scenario,
        strengths=LinkStrengths(
            amplitude=np.array([[4e-4, 1e-4], [6e-5, 2e-5]]),
            group=np.array([0, 0]),
            shape=shape,
            wind_height=np.array([2.0]),
            release_height=np.array([2.6, 1.8]),
            sigma_z0=np.array([2.4, 1.7]),
        ),
        statistics=statistics,
        worst=None,
        verdicts=_verdicts(receptors, statistics),
        kept=kept,
        hours=_hours(kept),
        record={
            "counts": {"receptors": np.int64(len(receptors)), "calm hours": 3},
            "warnings": ["none to speak of"],
            "timings": {"all": 1.5, "never ran": float("nan")},
        },
    )


@pytest.fixture
def with_values() -> Callable[..., Result]:
    """Replace fields of a result's statistics."""

    def change(result: Result, **fields: np.ndarray) -> Result:
        return replace(result, statistics=replace(result.statistics, **fields))

    return change
