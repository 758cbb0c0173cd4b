"""NOx and NO2 beside roads, from traffic counts to a verdict.

The public names, each loaded when it is first used, so that importing the
package stays light.

>>> import roaddisp as rd
>>> round(rd.line_strength(10_000 / 24, 0.5) * 1e6, 2)  # ug/m/s
57.87
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from roaddisp.analysis.what_if import keep_responses as keep_responses
    from roaddisp.analysis.what_if import link_contributions as link_contributions
    from roaddisp.chemistry.ozone_limiting import ozone_limited_no2 as ozone_limited_no2
    from roaddisp.chemistry.reaction import reaction_limited_no2 as reaction_limited_no2
    from roaddisp.dispersion.kernel import response_table as response_table
    from roaddisp.dispersion.reference import unit_concentration as unit_concentration
    from roaddisp.emissions.strength import line_strength as line_strength
    from roaddisp.engine.kept_file import read_responses as read_responses
    from roaddisp.engine.kept_file import write_responses as write_responses
    from roaddisp.errors import NotYetError as NotYetError
    from roaddisp.errors import OutputError as OutputError
    from roaddisp.errors import Problem as Problem
    from roaddisp.errors import RoaddispError as RoaddispError
    from roaddisp.errors import StudyError as StudyError
    from roaddisp.model import Result as Result
    from roaddisp.model import Study as Study
    from roaddisp.pipeline import run as run
    from roaddisp.pipeline import run_all as run_all
    from roaddisp.study.read import read_study as read_study
    from roaddisp.weather.stability import turner_class as turner_class

__version__ = "0.1.0"

_HOME = {
    "read_study": "roaddisp.study.read",
    "run": "roaddisp.pipeline",
    "run_all": "roaddisp.pipeline",
    "keep_responses": "roaddisp.analysis.what_if",
    "link_contributions": "roaddisp.analysis.what_if",
    "read_responses": "roaddisp.engine.kept_file",
    "write_responses": "roaddisp.engine.kept_file",
    "unit_concentration": "roaddisp.dispersion.reference",
    "response_table": "roaddisp.dispersion.kernel",
    "ozone_limited_no2": "roaddisp.chemistry.ozone_limiting",
    "reaction_limited_no2": "roaddisp.chemistry.reaction",
    "line_strength": "roaddisp.emissions.strength",
    "turner_class": "roaddisp.weather.stability",
    "Study": "roaddisp.model",
    "Result": "roaddisp.model",
    "Problem": "roaddisp.errors",
    "RoaddispError": "roaddisp.errors",
    "StudyError": "roaddisp.errors",
    "NotYetError": "roaddisp.errors",
    "OutputError": "roaddisp.errors",
}

__all__ = [*_HOME, "__version__"]


def __getattr__(name: str) -> object:
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(import_module(_HOME[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(set(globals()) | set(_HOME))
