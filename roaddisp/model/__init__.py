"""The central types: what each stage of a run hands to the next.

Read from top to bottom they tell the way of the data: what the user brought,
made sure of and in SI (`inputs`: `Study`, `Scenario`), what is derived from it hour by
hour (`LinkStrengths`, `WeatherHours`), what the engine makes (`Segments`,
`WeatherStates`, `Responses`, `HourlyBlock`) and what is left at the end
(`Statistics`, `Result`).

Letters used for array shapes, everywhere in the package:
``L`` links, ``S`` segments, ``R`` receptors, ``T`` hours, ``W`` weather states,
``G`` groups of links, ``C`` vehicle classes, ``K`` tracers (NOx, primary NO2),
``P`` profiles, ``F`` fleets. Missing is NaN until a named rule replaces it.
"""

from __future__ import annotations

from roaddisp.model.hours import (
    HourlyBlock,
    LidStates,
    LinkStrengths,
    Responses,
    Segments,
    WeatherHours,
    WeatherStates,
    looked_up,
)
from roaddisp.model.inputs import (
    Background,
    Clock,
    Counts,
    FactorTable,
    Fleet,
    Grid,
    InputFile,
    Network,
    Options,
    Profiles,
    Receptors,
    Scenario,
    Site,
    StationHours,
    Study,
)
from roaddisp.model.result import (
    Result,
    Statistics,
    Verdicts,
)
from roaddisp.model.types import (
    STABILITY_CLASSES,
    TRACERS,
    BoolArray,
    CalmRule,
    Float32Array,
    FloatArray,
    IntArray,
    Terrain,
    TimeArray,
    WindHeight,
)

__all__ = [
    "STABILITY_CLASSES",
    "TRACERS",
    "BoolArray",
    "CalmRule",
    "Float32Array",
    "FloatArray",
    "IntArray",
    "Terrain",
    "TimeArray",
    "WindHeight",
    "Background",
    "Clock",
    "Counts",
    "FactorTable",
    "Fleet",
    "Grid",
    "InputFile",
    "Network",
    "Options",
    "Profiles",
    "Receptors",
    "Scenario",
    "Site",
    "StationHours",
    "Study",
    "HourlyBlock",
    "LidStates",
    "LinkStrengths",
    "Responses",
    "Segments",
    "WeatherHours",
    "WeatherStates",
    "looked_up",
    "Result",
    "Statistics",
    "Verdicts",
]
