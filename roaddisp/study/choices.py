"""The choices of a scenario, in SI, held against what there is to choose from."""

from __future__ import annotations

from typing import Literal

from roaddisp.constants import NO2_UGM3_PER_PPB
from roaddisp.errors import NotYetError
from roaddisp.model import FactorTable, Options, Receptors
from roaddisp.standards.rules import standard, standards
from roaddisp.study.problems import Problems, listed, nearest
from roaddisp.study.scenarios import Settings
from roaddisp.study.weather_table import Weather


def read_options(
    settings: Settings,
    factors: FactorTable | None,
    weather: Weather | None,
    receptors: Receptors | None,
    problems: Problems,
) -> Options | None:
    """Take the options of a scenario; None where something they rest on is missing."""
    names = _standards(settings, problems)
    hourly = _hourly(settings, receptors, problems)
    study, station = settings.section("study"), settings.section("weather")
    spread, convert = settings.section("dispersion"), settings.section("conversion")
    fleet = settings.section("fleet")
    if None in (study, station, spread, convert, fleet) or factors is None or weather is None:
        return None
    return Options(
        terrain=study.terrain,
        ugm3_per_ppb=NO2_UGM3_PER_PPB[study.reference],
        reference=study.reference,
        year=fleet.year or factors.year or weather.first_year,
        anemometer_height=station.anemometer_height,
        wind_height=station.wind_height,
        wind_floor=station.wind_floor,
        calm_threshold=station.calm_threshold,
        calms=station.calms,
        direction_step=station.direction_step or 0.0,
        direction_seed=station.direction_seed,
        curves=spread.curves,
        wake_margin=spread.wake_margin,
        conversion=convert.method,
        standards=names,
        hourly=hourly,
    )


def _standards(settings: Settings, problems: Problems) -> tuple[str, ...]:
    section = settings.section("standards")
    names = section.use if section is not None else []
    for number, name in enumerate(names):
        about = {
            "file": settings.file,
            "place": settings.place("standards", "use", number),
            "value": name,
            "allowed": listed(standards(), 30),
        }
        try:
            standard(name)
        except NotYetError:
            problems.error(
                f"not in this version: the standard {name!r}",
                **about,
                mend="take it out of the list",
            )
        except ValueError:
            near = nearest(name, standards())
            problems.error(
                "an unknown standard",
                **about,
                mend=f"did you mean {near!r}?" if near else "choose of the list",
            )
    return tuple(dict.fromkeys(names))


def _hourly(
    settings: Settings, receptors: Receptors | None, problems: Problems
) -> tuple[str, ...] | Literal["all"]:
    section = settings.section("outputs")
    asked = section.hourly if section is not None else []
    if asked == "all":
        return "all"
    if receptors is not None:
        known = set(receptors.receptor)
        for number, name in enumerate(asked):
            if name not in known:
                near = nearest(name, receptors.receptor[:20_000])
                problems.error(
                    "outputs.hourly: no receptor has this id",
                    file=settings.file,
                    place=settings.place("outputs", "hourly", number),
                    value=name,
                    allowed=listed(receptors.receptor),
                    mend=f"did you mean {near!r}?" if near else "name receptors of the study",
                )
    return tuple(dict.fromkeys(asked))
