"""What a run counts of itself, for the record."""

from __future__ import annotations

from functools import cache
from importlib.metadata import version
from platform import machine, python_version
from typing import Any

import numpy as np

from roaddisp.engine.kept import KeptResponses
from roaddisp.model import (
    BoolArray,
    LinkStrengths,
    Scenario,
    Segments,
    Statistics,
    WeatherHours,
    WeatherStates,
)


def counts(
    scenario: Scenario,
    strengths: LinkStrengths,
    weather: WeatherHours,
    states: WeatherStates,
    segments: Segments,
    present: BoolArray,
) -> dict[str, Any]:
    """Count links, receptors, hours and states, and the hours that lack something."""
    background = scenario.background
    return {
        "links": len(scenario.network.link),
        "segments": len(segments.ends),
        "groups_of_links": int(strengths.wind_height.size),
        "receptors": len(scenario.receptors),
        "receptors_on_road": int(scenario.receptors.on_road.sum()),
        "hours": int(scenario.clock.standard.size),
        "hours_present": int(present.sum()),
        "hours_without_background": int((np.isnan(background.o3) | np.isnan(background.no2)).sum()),
        "hours_without_traffic": int(np.isnan(strengths.shape).any(axis=(0, 1)).sum()),
        "weather": dict(weather.counts),
        "weather_states": len(states),
    }


def raised_hours(scenario: Scenario, statistics: Statistics) -> dict[str, Any]:
    """Of the hours that make a statistic, how many had their wind raised by a floor.

    At the receptor off the road where the statistic is highest, in each year.
    """
    told: dict[str, Any] = {}
    off_road = ~scenario.receptors.on_road
    for values, raised, name in (
        (statistics.no2_1h_p98_ppb, statistics.raised_in_p98, "no2_1h_p98_ppb"),
        (statistics.no2_1h_19th_ppb, statistics.raised_in_19th, "no2_1h_19th_ugm3"),
    ):
        for year, own, count in zip(statistics.years, values, raised, strict=True):
            candidates = np.where(off_road, own, np.nan)
            if np.isnan(candidates).all():
                continue
            highest = int(np.nanargmax(candidates))
            told.setdefault(name, {})[str(year)] = {
                "receptor": scenario.receptors.receptor[highest],
                "wind_raised_by_a_floor": int(count[highest]),
            }
    return told


def kept_note(kept: KeptResponses, strengths: LinkStrengths) -> dict[str, Any]:
    """Say that responses were kept, and how far their sources are from this run's."""
    change = np.abs(strengths.release_height - kept.release_height)
    return {
        "kept": "with links apart" if kept.apart else "by groups of links",
        "largest_change_of_release_height_m": float(change.max(initial=0.0)),
        "fingerprint": dict(kept.fingerprint),
    }


@cache
def versions() -> dict[str, str]:
    """Versions of what the numbers rest on."""
    from roaddisp import __version__

    libraries = ("numpy", "scipy", "numba", "pandas", "shapely", "pyproj", "geopandas", "rasterio")
    return {
        "roaddisp": __version__,
        "python": python_version(),
        "processor": machine(),
        **{name: version(name) for name in libraries},
    }
