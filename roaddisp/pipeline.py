"""The whole way, from a checked study to its result.

Read `run` from top to bottom: it is the method statement in code.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from importlib.metadata import version
from platform import machine, python_version
from typing import Any

import numpy as np

from roaddisp.dispersion.kernel import needs_compiling
from roaddisp.emissions.strength import link_strengths
from roaddisp.engine.hours import Conversion, hours
from roaddisp.engine.responses import responses
from roaddisp.engine.states import weather_states
from roaddisp.errors import Problem, StudyError
from roaddisp.geometry.segments import road_segments
from roaddisp.model import (
    BoolArray,
    HourlyBlock,
    LinkStrengths,
    Result,
    Scenario,
    Segments,
    Statistics,
    Study,
    Verdicts,
    WeatherHours,
    WeatherStates,
)
from roaddisp.standards.rules import standard
from roaddisp.standards.statistics import block_statistics, join_statistics
from roaddisp.standards.verdicts import judge
from roaddisp.standards.years import completeness
from roaddisp.weather.wind import weather_hours

Progress = Callable[[str, int, int], None]
"""Called with a stage's name, the steps done and the steps in all."""


@dataclass
class _Timer:
    """Seconds spent in each stage."""

    seconds: dict[str, float] = field(default_factory=dict)

    @contextmanager
    def stage(self, name: str) -> Iterator[None]:
        start = time.perf_counter()
        yield
        self.seconds[name] = self.seconds.get(name, 0.0) + time.perf_counter() - start


def run(study: Study, *, scenario: str | None = None, progress: Progress | None = None) -> Result:
    """Run one scenario of a study.

    Parameters
    ----------
    study : Study
        From `read_study`.
    scenario : str, optional
        Name of a scenario; the study as it stands (``"base"``) where not given.
    progress : callable, optional
        Called as ``progress(stage, done, total)`` while the run lasts.

    Returns
    -------
    Result

    Raises
    ------
    StudyError
        Where the study has no such scenario.

    Examples
    --------
    >>> import tempfile, roaddisp as rd
    >>> from roaddisp.study.new import new_study
    >>> folder = tempfile.TemporaryDirectory()
    >>> _ = new_study(folder.name)
    >>> result = rd.run(rd.read_study(folder.name))
    >>> bool((result.summary["no2_mean_ppb"] > 0).all())
    True
    >>> folder.cleanup()
    """
    chosen = _scenario(study, scenario or "base")
    say = progress or (lambda *_: None)
    timer = _Timer()

    with timer.stage("traffic and emissions"):
        strengths = link_strengths(
            chosen.network,
            profiles=chosen.profiles,
            counts=chosen.counts,
            fleet=chosen.fleet,
            factors=chosen.factors,
            clock=chosen.clock,
        )
    with timer.stage("weather"):
        weather = _weather(chosen, strengths)
        states = weather_states(weather, calms=chosen.options.calms)
    with timer.stage("geometry"):
        segments = _segments(chosen)
    statistics, worst, kept = _fold(chosen, strengths, weather, states, segments, say, timer)
    present = weather.calm | _has_value(chosen, strengths, weather)
    return Result(
        study=study,
        scenario=chosen,
        strengths=strengths,
        statistics=statistics,
        worst=worst,
        verdicts=_verdicts(chosen, present, statistics, worst),
        kept=_kept_receptors(chosen),
        hours=kept,
        record={
            "versions": _versions(),
            "inputs": [vars(file) for file in chosen.files],
            "settings": chosen.settings,
            "counts": _counts(chosen, strengths, weather, states, segments, present)
            | {"hours_that_make_a_statistic": _raised_hours(chosen, statistics)},
            "warnings": [vars(caution) for caution in study.cautions],
            "timings_s": {name: round(seconds, 3) for name, seconds in timer.seconds.items()},
        },
    )


def run_all(study: Study, *, progress: Progress | None = None) -> dict[str, Result]:
    """Run every scenario of a study; the first key is ``"base"``.

    Parameters
    ----------
    study : Study
    progress : callable, optional
        As in `run`.

    Returns
    -------
    dict of str to Result
    """
    return {name: run(study, scenario=name, progress=progress) for name in study.scenarios}


def _scenario(study: Study, name: str) -> Scenario:
    if name not in study.scenarios:
        problem = Problem(
            severity="error",
            file=study.path.name,
            place="[scenario]",
            value=name,
            allowed=", ".join(study.scenarios),
            mend=f"ask for one of these, or add a table [scenario.{name}]",
            message="the study has no scenario of this name",
        )
        raise StudyError([problem])
    return study.scenarios[name]


def _weather(scenario: Scenario, strengths: LinkStrengths) -> WeatherHours:
    options = scenario.options
    return weather_hours(
        scenario.station,
        scenario.clock,
        terrain=options.terrain,
        anemometer_height=options.anemometer_height,
        wind_height=options.wind_height,
        wind_floor=options.wind_floor,
        calm_threshold=options.calm_threshold,
        plume_heights=strengths.wind_height,
    )


def _segments(scenario: Scenario) -> Segments:
    network = scenario.network
    return road_segments(network.lines, network.width + 2.0 * scenario.options.wake_margin)


def _fold(
    scenario: Scenario,
    strengths: LinkStrengths,
    weather: WeatherHours,
    states: WeatherStates,
    segments: Segments,
    say: Progress,
    timer: _Timer,
) -> tuple[Statistics, Statistics | None, HourlyBlock]:
    """Fold the engine's blocks into statistics, and keep the hours asked for."""
    options = scenario.options
    conversion = Conversion(method=options.conversion, ugm3_per_ppb=options.ugm3_per_ppb)
    total = len(scenario.receptors)
    kept = _kept_receptors(scenario)
    regulatory: list[Statistics] = []
    worst: list[Statistics] = []
    hourly: list[HourlyBlock] = []
    stage = "compiling, then receptors" if needs_compiling() else "receptors"
    say(stage, 0, total)
    with timer.stage("responses and hours"):
        blocks = hours(
            responses(
                segments,
                strengths,
                scenario.receptors,
                states,
                terrain=options.terrain,
                calms_at=_calms_at(scenario),
            ),
            strengths,
            weather,
            scenario.background,
            conversion,
        )
        for block in blocks:
            with timer.stage("statistics"):
                filled = block if block.worst is None else _with_calms(block)
                plain = filled if options.calms == "worst-direction" else block
                regulatory.append(_statistics(scenario, weather, plain))
                if options.calms == "both":
                    unchanged = block.worst is None
                    worst.append(
                        regulatory[-1] if unchanged else _statistics(scenario, weather, filled)
                    )
                hourly.append(_rows(plain, kept))
            say(stage, block.receptors.stop, total)
    return (
        join_statistics(regulatory),
        join_statistics(worst) if worst else None,
        _join_hours(hourly),
    )


def _statistics(scenario: Scenario, weather: WeatherHours, block: HourlyBlock) -> Statistics:
    return block_statistics(
        block.nox_road_ugm3,
        block.no2_ppb,
        clock=scenario.clock,
        background=scenario.background,
        calm=weather.calm,
        raised=weather.raised,
        ugm3_per_ppb=scenario.options.ugm3_per_ppb,
    )


def _calms_at(scenario: Scenario) -> BoolArray:
    """Receptors whose calm hours are run: all, or those that some standard judges."""
    receptors = scenario.receptors
    if scenario.options.calms == "worst-direction":
        return np.ones(len(receptors), dtype=np.bool_)
    rules = [standard(name) for name in scenario.options.standards]
    judged = [any(rule.judges(kind) for rule in rules) for kind in receptors.kind]
    return np.array(judged, dtype=np.bool_) & ~receptors.on_road


def _with_calms(block: HourlyBlock) -> HourlyBlock:
    """Put the calm hours of the worst direction in their places."""
    worst = block.worst
    if worst is None:
        return block
    whole = {}
    for name in HOURLY_FIELDS:
        values = getattr(block, name).copy()
        values[:, worst.hours] = getattr(worst, name)
        whole[name] = values
    return replace(block, worst=None, **whole)


HOURLY_FIELDS = (
    "nox_road_ugm3",
    "no2_primary_road_ppb",
    "no2_ppb",
    "no_ppb",
    "o3_ppb",
)


def _kept_receptors(scenario: Scenario) -> tuple[int, ...]:
    names = scenario.receptors.receptor
    wanted = scenario.options.hourly
    if wanted == "all":
        return tuple(range(len(names)))
    return tuple(names.index(name) for name in wanted)


def _rows(block: HourlyBlock, kept: tuple[int, ...]) -> HourlyBlock:
    """Keep the rows of a block whose hours were asked for."""
    first, stop = block.receptors.start, block.receptors.stop
    rows = [index - first for index in kept if first <= index < stop]
    return replace(
        block, worst=None, **{name: getattr(block, name)[rows] for name in HOURLY_FIELDS}
    )


def _join_hours(blocks: list[HourlyBlock]) -> HourlyBlock:
    arrays: dict[str, Any] = {
        name: np.concatenate([getattr(block, name) for block in blocks]) for name in HOURLY_FIELDS
    }
    count = len(arrays["no2_ppb"])
    return HourlyBlock(receptors=slice(0, count), hours=blocks[0].hours, **arrays)


def _has_value(scenario: Scenario, strengths: LinkStrengths, weather: WeatherHours) -> BoolArray:
    """Hours that lack neither weather, nor traffic, nor background."""
    background = scenario.background
    known: BoolArray = (
        ~weather.missing
        & np.isfinite(strengths.shape).all(axis=(0, 1))
        & np.isfinite(background.o3)
        & np.isfinite(background.no2)
    )
    return known & ~weather.calm


def _verdicts(
    scenario: Scenario, present: BoolArray, statistics: Statistics, worst: Statistics | None
) -> tuple[Verdicts, ...]:
    complete = completeness(present, scenario.clock)
    return tuple(
        judge(
            standard(name),
            statistics,
            worst,
            kinds=scenario.receptors.kind,
            on_road=scenario.receptors.on_road,
            completeness=complete,
        )
        for name in scenario.options.standards
    )


def _counts(
    scenario: Scenario,
    strengths: LinkStrengths,
    weather: WeatherHours,
    states: WeatherStates,
    segments: Segments,
    present: BoolArray,
) -> dict[str, Any]:
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


def _raised_hours(scenario: Scenario, statistics: Statistics) -> dict[str, Any]:
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


def _versions() -> dict[str, str]:
    """Versions of what the numbers rest on."""
    from roaddisp import __version__

    libraries = ("numpy", "scipy", "numba", "pandas", "shapely", "pyproj", "geopandas", "rasterio")
    return {
        "roaddisp": __version__,
        "python": python_version(),
        "processor": machine(),
        **{name: version(name) for name in libraries},
    }
