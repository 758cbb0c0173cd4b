"""`read_study`: from a folder to a checked `Study`, or every problem of it at once."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

from roaddisp.errors import StudyError
from roaddisp.model import Study
from roaddisp.study.assemble import Assembly
from roaddisp.study.files import LARGEST_SETTINGS, Folder, decode
from roaddisp.study.problems import Problems
from roaddisp.study.scenarios import Settings, read_settings
from roaddisp.study.sources import Sources
from roaddisp.study.toml_places import TomlPlaces, find_places

SETTINGS = "study.toml"


def read_study(path: str | Path) -> Study:
    """Read a study folder and check everything in it.

    Parameters
    ----------
    path : str or Path
        The folder, or its ``study.toml``.

    Returns
    -------
    Study
        With a `Scenario` for the base and each scenario: in SI, on one clock.

    Raises
    ------
    StudyError
        Where the study cannot be run. Its ``problems`` are all that were found,
        each with file, place, value, what is allowed and the mend.

    Examples
    --------
    >>> import tempfile
    >>> from roaddisp.study.new import new_study
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     written = new_study(folder)
    ...     list(read_study(folder).scenarios)
    ['base']
    """
    problems = Problems()
    settings_path = _locate(Path(path), problems)
    document, places = _load(settings_path, problems)
    settings = read_settings(document, places, settings_path.name, problems)
    sources = Sources(Folder(settings_path.parent, problems), settings_path, problems)
    assembly = Assembly(sources, settings)
    scenarios = assembly.scenarios()
    problems.refuse()
    return Study(
        settings_path,
        _title(settings[0], settings_path),
        assembly.crs.to_string(),
        {scenario.name: scenario for scenario in scenarios},
        problems.all,
    )


def _locate(path: Path, problems: Problems) -> Path:
    try:
        found = path / SETTINGS if path.is_dir() else path
        there = found.is_file()
        size = found.stat().st_size if there else 0
    except (OSError, ValueError) as error:
        problems.error(f"the study cannot be reached ({error})", file=str(path))
        raise StudyError(problems.all) from error
    if not there:
        problems.error(
            "there is no study here",
            file=str(path),
            allowed=f"a folder with a {SETTINGS}, or it",
            mend="name the folder, or start a study with `roaddisp new DIR`",
        )
    elif size > LARGEST_SETTINGS:
        problems.error(
            "the file is too large for settings",
            file=found.name,
            value=f"{size} bytes",
            allowed=f"at most {LARGEST_SETTINGS} bytes",
            mend="name the study.toml",
        )
    problems.refuse()
    return found.resolve()


def _load(path: Path, problems: Problems) -> tuple[dict[str, Any], TomlPlaces]:
    try:
        content = path.read_bytes()
    except OSError as error:
        problems.error(f"the file cannot be read ({error.strerror})", file=path.name)
        raise StudyError(problems.all) from error
    text = decode(content, problems, path.name)
    problems.refuse()
    text = (text or "").replace("\r\n", "\n")
    try:
        return tomllib.loads(text), find_places(text)
    except RecursionError:
        problems.error("the settings are nested too deeply", file=path.name)
    except ValueError as error:
        message, place = _syntax(str(error), text)
        problems.error(
            f"not TOML: {message}",
            file=path.name,
            place=place,
            allowed="TOML 1.0",
            mend="look at the line; texts stand in quotation marks, a table in one line",
        )
    raise StudyError(problems.all)


def _syntax(message: str, text: str) -> tuple[str, str]:
    """Part tomllib's message into what is wrong and where."""
    what, _, where = message.rpartition(" (at ")
    if not what:
        return message, "line 1"
    place = where.rstrip(")")
    if place == "end of document":
        lines = text.rstrip("\n").split("\n")
        place = f"line {len(lines)}, column {len(lines[-1]) + 1}"
    return what[:1].lower() + what[1:], place


def _title(settings: Settings, path: Path) -> str:
    section = settings.section("study")
    return str(section.title) or path.parent.name
