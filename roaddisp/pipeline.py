"""The whole way, from a checked study to its result.

Read `run` from top to bottom: it is the method statement in code.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field, replace

import numpy as np

from roaddisp.dispersion.compiling import using_threads
from roaddisp.emissions.strength import link_strengths
from roaddisp.engine.fold import Folded, fold
from roaddisp.engine.hours import Conversion, hours
from roaddisp.engine.kept import KeptResponses, fingerprint, regrouped
from roaddisp.engine.responses import responses as compute_responses
from roaddisp.engine.states import weather_states
from roaddisp.engine.tally import counts, kept_note, raised_hours, versions
from roaddisp.errors import Problem, StudyError
from roaddisp.geometry.segments import road_segments
from roaddisp.model import (
    BoolArray,
    HourlyBlock,
    LinkStrengths,
    Responses,
    Result,
    Scenario,
    Segments,
    Study,
    Verdicts,
    WeatherHours,
    WeatherStates,
)
from roaddisp.standards.rules import standard
from roaddisp.standards.verdicts import judge
from roaddisp.standards.years import completeness
from roaddisp.weather.wind import weather_hours

Progress = Callable[[str, int, int], None]
"""Called with a stage's name, the steps done and the steps in all."""


@dataclass
class Timer:
    """Seconds spent in each stage."""

    seconds: dict[str, float] = field(default_factory=dict)

    @contextmanager
    def stage(self, name: str) -> Iterator[None]:
        """Time what is done within."""
        start = time.perf_counter()
        yield
        self.seconds[name] = round(time.perf_counter() - start, 3)


@dataclass(frozen=True)
class Prepared:
    """All that comes before the engine."""

    strengths: LinkStrengths
    weather: WeatherHours
    states: WeatherStates
    segments: Segments


def run(
    study: Study,
    *,
    scenario: str | None = None,
    progress: Progress | None = None,
    responses: KeptResponses | None = None,
    threads: int | None = None,
) -> Result:
    """Run one scenario of a study.

    Parameters
    ----------
    study : Study
        From `read_study`.
    scenario : str, optional
        Name of a scenario; the study as it stands (``"base"``) where not given.
    progress : callable, optional
        Called as ``progress(stage, done, total)`` while the run lasts.
    responses : KeptResponses, optional
        From `keep_responses`: the run is then of the receptors kept, and takes a
        blink. The heights of the sources are those of the kept responses; the
        record says by how much this study's differ.
    threads : int, optional
        Threads that share the work, at least 1; all processors where not given. The
        numbers are the same, to the last bit.

    Returns
    -------
    Result

    Raises
    ------
    StudyError
        Where the study has no such scenario, or kept responses do not fit it.
    ValueError
        Where fewer than one thread is asked for.

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
    with using_threads(threads):
        return _run(study, named_scenario(study, scenario or "base"), progress, responses)


def run_all(
    study: Study, *, progress: Progress | None = None, threads: int | None = None
) -> dict[str, Result]:
    """Run every scenario of a study; the first key is ``"base"``.

    Parameters
    ----------
    study : Study
    progress, threads
        As in `run`.

    Returns
    -------
    dict of str to Result
    """
    return {
        name: run(study, scenario=name, progress=progress, threads=threads)
        for name in study.scenarios
    }


def _run(
    study: Study, chosen: Scenario, progress: Progress | None, responses: KeptResponses | None
) -> Result:
    if responses is not None:
        chosen = only(chosen, responses.receptors)
    timer = Timer()
    ready = prepare(chosen, timer)
    with timer.stage("hours and statistics"):
        conversion = _conversion(chosen)
        tables = (
            _tables(chosen, ready)
            if responses is None
            else _kept_tables(study, chosen, ready, responses)
        )
        blocks = hours(tables, ready.strengths, ready.weather, chosen.background, conversion)
        folded = fold(
            _told(blocks, len(chosen.receptors), progress),
            clock=chosen.clock,
            background=chosen.background,
            weather=ready.weather,
            conversion=conversion,
            calms=chosen.options.calms,
            kept=_kept(chosen),
        )
    present = ready.weather.calm | _has_value(chosen, ready)
    return Result(
        study=study,
        scenario=chosen,
        strengths=ready.strengths,
        statistics=folded.statistics,
        worst=folded.worst,
        verdicts=_verdicts(chosen, present, folded),
        kept=_kept(chosen),
        hours=folded.hours,
        record={
            "versions": versions(),
            "inputs": [vars(file) for file in chosen.files],
            "settings": chosen.settings,
            "responses": "computed in this run"
            if responses is None
            else kept_note(responses, ready.strengths),
            "counts": counts(
                chosen, ready.strengths, ready.weather, ready.states, ready.segments, present
            )
            | {"hours_that_make_a_statistic": raised_hours(chosen, folded.statistics)},
            "warnings": [vars(caution) for caution in study.cautions],
            "timings_s": timer.seconds,
        },
    )


def prepare(scenario: Scenario, timer: Timer) -> Prepared:
    """Take a scenario to the door of the engine."""
    with timer.stage("traffic and emissions"):
        strengths = link_strengths(
            scenario.network,
            profiles=scenario.profiles,
            counts=scenario.counts,
            fleet=scenario.fleet,
            factors=scenario.factors,
            clock=scenario.clock,
        )
    with timer.stage("weather"):
        weather = _weather(scenario, strengths)
        states = weather_states(weather, calms=scenario.options.calms)
    with timer.stage("geometry"):
        segments = _segments(scenario)
    return Prepared(strengths, weather, states, segments)


def named_scenario(study: Study, name: str) -> Scenario:
    """Find a scenario of a study.

    Raises
    ------
    StudyError
        Where there is none of this name.
    """
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
        direction_step=options.direction_step,
        direction_seed=options.direction_seed,
    )


def _segments(scenario: Scenario) -> Segments:
    network = scenario.network
    return road_segments(network.lines, network.width + 2.0 * scenario.options.wake_margin)


def _conversion(scenario: Scenario) -> Conversion:
    options = scenario.options
    return Conversion(method=options.conversion, ugm3_per_ppb=options.ugm3_per_ppb)


def _tables(scenario: Scenario, ready: Prepared) -> Iterator[Responses]:
    return compute_responses(
        ready.segments,
        ready.strengths,
        scenario.receptors,
        ready.states,
        terrain=scenario.options.terrain,
        calms_at=calms_at(scenario),
    )


def _kept_tables(
    study: Study, scenario: Scenario, ready: Prepared, kept: KeptResponses
) -> Iterator[Responses]:
    check_fit(study, scenario, ready, kept)
    return regrouped(kept, ready.strengths)


def check_fit(study: Study, scenario: Scenario, ready: Prepared, kept: KeptResponses) -> None:
    """Refuse kept responses that were computed for something else.

    Raises
    ------
    StudyError
        Naming what differs: roads, receptors, weather states, terrain or scheme.
    """
    own = fingerprint(ready.segments, scenario.receptors, ready.states, scenario.options.terrain)
    others = [part for part, value in own.items() if kept.fingerprint.get(part) != value]
    if others:
        problem = Problem(
            severity="error",
            file=study.path.name,
            place=f"scenario {scenario.name}",
            value=f"other {', other '.join(others)}",
            allowed="the roads, receptors, weather and options of the kept responses",
            mend="compute the responses again for this study",
            message="the kept responses are not of this study",
        )
        raise StudyError([problem])


def only(scenario: Scenario, chosen: tuple[int, ...]) -> Scenario:
    """Leave the chosen receptors of a scenario."""
    every = scenario.receptors
    if chosen == tuple(range(len(every))):
        return scenario
    if max(chosen, default=-1) >= len(every):
        return replace(scenario, receptors=every.taken(()))
    receptors = every.taken(chosen)
    wanted = scenario.options.hourly
    names = set(receptors.receptor)
    hourly = wanted if wanted == "all" else tuple(name for name in wanted if name in names)
    return replace(scenario, receptors=receptors, options=replace(scenario.options, hourly=hourly))


def _told(
    blocks: Iterator[HourlyBlock], total: int, progress: Progress | None
) -> Iterator[HourlyBlock]:
    """Hand blocks on and say how far they are."""
    say = progress or (lambda *_: None)
    say("receptors", 0, total)
    for block in blocks:
        yield block
        say("receptors", block.receptors.stop, total)


def calms_at(scenario: Scenario) -> BoolArray:
    """Receptors whose calm hours are run: all, or those that some standard judges."""
    receptors = scenario.receptors
    if scenario.options.calms == "worst-direction":
        return np.ones(len(receptors), dtype=np.bool_)
    rules = [standard(name) for name in scenario.options.standards]
    judged = [any(rule.judges(kind) for rule in rules) for kind in receptors.kind]
    return np.array(judged, dtype=np.bool_) & ~receptors.on_road


def _kept(scenario: Scenario) -> tuple[int, ...]:
    names = scenario.receptors.receptor
    wanted = scenario.options.hourly
    if wanted == "all":
        return tuple(range(len(names)))
    return tuple(names.index(name) for name in wanted)


def _has_value(scenario: Scenario, ready: Prepared) -> BoolArray:
    """Hours that lack neither weather, nor traffic, nor background."""
    background = scenario.background
    known: BoolArray = (
        ~ready.weather.missing
        & np.isfinite(ready.strengths.shape).all(axis=(0, 1))
        & np.isfinite(background.o3)
        & np.isfinite(background.no2)
    )
    return known & ~ready.weather.calm


def _verdicts(scenario: Scenario, present: BoolArray, folded: Folded) -> tuple[Verdicts, ...]:
    complete = completeness(present, scenario.clock)
    return tuple(
        judge(
            standard(name),
            folded.statistics,
            folded.worst,
            kinds=scenario.receptors.kind,
            on_road=scenario.receptors.on_road,
            completeness=complete,
        )
        for name in scenario.options.standards
    )
