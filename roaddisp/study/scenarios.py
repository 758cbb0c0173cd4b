"""Settings of every scenario: the base, and what each scenario overrides in it."""

from __future__ import annotations

import copy
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from pydantic import BaseModel, ValidationError

from roaddisp.study.keys import allowed_text, submodel
from roaddisp.study.problems import Problems, listed, nearest
from roaddisp.study.schema import ALTERNATIVES, AT_LEAST_ONE, NEEDED, SECTIONS, Section
from roaddisp.study.toml_places import KeyPath, TomlPlaces

BASE = "base"


@dataclass(frozen=True)
class Settings:
    """The checked settings of one scenario.

    Attributes
    ----------
    name : str
    sections : mapping of section to its model, None where it cannot be used
    written : mapping
        Text of the settings with defaults filled in, for the record.
    places : TomlPlaces
    """

    name: str
    sections: Mapping[str, Any]
    written: Mapping[str, Any]
    file: str
    places: TomlPlaces

    def section(self, name: str) -> Any:
        """Return the model of a section, None where it cannot be used."""
        return self.sections.get(name)

    def place(self, *path: str | int) -> str:
        """Say where a key stands: in the scenario where it is overridden, else in the base."""
        return _place(self.places, self.name, path)

    def signature(self, *names: str) -> str:
        """Text that is the same for scenarios whose sections are the same."""
        return json.dumps({name: self.written.get(name) for name in names}, default=str)


def _place(places: TomlPlaces, scenario: str, path: KeyPath) -> str:
    for end in range(len(path), 0, -1):
        own = ("scenario", scenario, *path[:end])
        if scenario != BASE and own in places:
            return places.place(own)
        if path[:end] in places:
            return places.place(path[:end])
    return places.place(("scenario", scenario)) if scenario != BASE else ""


def read_settings(
    document: Mapping[str, Any], places: TomlPlaces, file: str, problems: Problems
) -> list[Settings]:
    """Check the settings of the base and of every scenario.

    Parameters
    ----------
    document : mapping
        ``study.toml`` as `tomllib` reads it.
    places : TomlPlaces
    file : str
        Name of the settings file, for messages.
    problems : Problems

    Returns
    -------
    list of Settings
        The base first. Sections with errors keep what could be used of them.
    """
    base = {key: value for key, value in document.items() if key != "scenario"}
    settings = [_checked(BASE, base, places, file, problems)]
    scenarios = document.get("scenario", {})
    if not isinstance(scenarios, dict):
        problems.error(
            "scenario is not a table",
            file=file,
            place=places.place(("scenario",)),
            value=scenarios,
            allowed="[scenario.<name>]",
            mend="give each scenario a name",
        )
        return settings
    for name, overrides in scenarios.items():
        place = places.place(("scenario", name))
        if name == BASE or not name.strip():
            problems.error(
                "the name of this scenario is taken",
                file=file,
                place=place,
                value=name,
                allowed="any other name: the keys outside [scenario] are the scenario 'base'",
                mend="rename the scenario",
            )
        elif not isinstance(overrides, dict):
            problems.error(
                "a scenario is not a table",
                file=file,
                place=place,
                value=overrides,
                allowed=f"[scenario.{name}] and keys below it",
                mend="write it as a table",
            )
        else:
            _refuse_own_crs(name, overrides, places, file, problems)
            merged = _merged(base, overrides, ("scenario", name), places)
            settings.append(_checked(name, merged, places, file, problems))
    return settings


def _refuse_own_crs(
    name: str, overrides: Mapping[str, Any], places: TomlPlaces, file: str, problems: Problems
) -> None:
    study = overrides.get("study")
    for key in ("crs", "timezone"):
        if isinstance(study, dict) and key in study:
            problems.error(
                f"study.{key}: the same in every scenario",
                file=file,
                place=places.place(("scenario", name, "study", key)),
                value=study[key],
                allowed=f"one {key}, in [study]",
                mend="take it out of the scenario",
            )


def _merged(
    base: Mapping[str, Any], over: Mapping[str, Any], path: KeyPath, places: TomlPlaces
) -> dict[str, Any]:
    """Lay a scenario over the base, key by key; a whole (inline) table replaces."""
    merged = copy.deepcopy(dict(base))
    for key, value in over.items():
        here = (*path, key)
        below = merged.get(key)
        if isinstance(value, dict) and isinstance(below, dict) and here not in places.inline:
            merged[key] = _merged(below, value, here, places)
        else:
            merged[key] = copy.deepcopy(value)
    pair = ALTERNATIVES.get(str(path[-1])) if len(path) == 3 else None
    if pair is not None and sum(key in over for key in pair) == 1:
        for key in pair:
            if key not in over:
                merged.pop(key, None)
    return merged


def _checked(
    name: str, raw: Mapping[str, Any], places: TomlPlaces, file: str, problems: Problems
) -> Settings:
    for key in raw:
        if key not in SECTIONS:
            near = nearest(key, SECTIONS)
            problems.error(
                "an unknown table",
                file=file,
                place=_place(places, name, (key,)),
                value=key,
                allowed=listed([*SECTIONS, "scenario"]),
                mend=f"did you mean {near!r}?" if near else "remove it",
            )
    sections: dict[str, Any] = {}
    written: dict[str, Any] = {}
    for key, model in SECTIONS.items():
        if key not in raw and key in NEEDED:
            problems.error(
                f"the table [{key}] is missing",
                file=file,
                allowed=f"[{key}] with its keys",
                mend="add it; `roaddisp inputs` describes it",
            )
            sections[key] = None
            continue
        section = _Checker(name, key, model, places, file, problems)
        sections[key] = section.check(raw.get(key, {}))
        written[key] = _with_defaults(model, raw.get(key, {}))
    return Settings(name, sections, written, file, places)


@dataclass(frozen=True)
class _Checker:
    """Checks one section, and keeps what can be used of it."""

    scenario: str
    key: str
    model: type[Section]
    places: TomlPlaces
    file: str
    problems: Problems

    def check(self, raw: Any) -> Section | None:
        if not isinstance(raw, dict):
            self._error((), "not a table", raw, f"[{self.key}] and keys below it", "")
            return None
        usable = copy.deepcopy(raw)
        dropped: set[KeyPath] = set()
        for _attempt in range(50):
            try:
                section = self.model.model_validate(usable)
            except ValidationError as error:
                faults = _one_each(error.errors(), usable)
                for path, fault in faults.items():
                    if fault["type"] != "missing" or path not in dropped:
                        self._report(path, fault)
                if any(
                    fault["type"] == "missing" and len(path) == 1 for path, fault in faults.items()
                ):
                    return None
                for path in faults:
                    _drop(usable, path, dropped)
            else:
                return self._alternatives(section, raw)
        return None

    def _alternatives(self, section: Section, raw: Mapping[str, Any]) -> Section | None:
        pair = ALTERNATIVES.get(self.key)
        if pair is None:
            some = AT_LEAST_ONE.get(self.key)
            if some is None or any(key in raw for key in some):
                return section
            words = listed(repr(key) for key in some)
            self._error((), f"none of {words} is given", "", f"at least one of {words}", "add one")
            return None
        given = [key for key in pair if key in raw]
        if len(given) == 1:
            return section if getattr(section, given[0]) is not None else None
        said = "both" if given else "neither"
        self._error(
            (given[-1],) if given else (),
            f"{said} of {pair[0]!r} and {pair[1]!r} given",
            "",
            f"{pair[0]!r} or {pair[1]!r}",
            "keep one" if given else "add one",
        )
        return None

    def _error(self, path: KeyPath, message: str, value: Any, allowed: str, mend: str) -> None:
        full = (self.key, *path)
        place = _place(self.places, self.scenario, full)
        where = ".".join(str(part) for part in full)
        self.problems.error(
            f"{where}: {message}",
            file=self.file,
            place=place,
            value=value if isinstance(value, str) else _toml(value),
            allowed=allowed,
            mend=mend,
        )

    def _report(self, loc: KeyPath, fault: Any) -> None:
        kind, context = fault["type"], fault.get("ctx", {})
        field, allowed = _field(self.model, loc)
        if kind == "extra_forbidden":
            names = list(_model_at(self.model, loc[:-1]).model_fields)
            near = nearest(str(loc[-1]), names)
            mend = f"did you mean {near!r}?" if near else "remove it"
            self._error(loc, "an unknown key", fault["input"], listed(names), mend)
        elif kind == "missing":
            mend = f"add it: {field}" if field else "add it"
            self._error(loc, "the key is missing", "", allowed, mend)
        elif kind == "study":
            self._error(loc, context["fault"], fault["input"], context["allowed"], context["mend"])
        else:
            message = {
                "string_type": "not a text",
                "bool_type": "not true or false",
                "int_type": "not a whole number",
                "list_type": "not a list",
                "dict_type": "not a table",
                "model_type": "not a table",
            }.get(kind, str(fault["msg"]).lower())
            expects = {
                "string_type": "a text in quotation marks",
                "bool_type": "true, false",
                "int_type": "a whole number",
                "list_type": "a list in square brackets",
            }.get(kind, "")
            self._error(loc, message, fault["input"], allowed or expects, "correct the value")


def _key_path(loc: tuple[Any, ...], raw: Any) -> KeyPath:
    """Keep of pydantic's location what are keys: it also names the branch of a union."""
    path: list[str | int] = []
    node = raw
    for number, part in enumerate(loc):
        last = number == len(loc) - 1
        if isinstance(node, dict) and (part in node or not path):
            path.append(part)
            node = node.get(part)
        elif isinstance(node, list) and isinstance(part, int) and part < len(node):
            path.append(part)
            node = node[part]
        elif isinstance(node, dict) and last and not _is_branch(part):
            path.append(part)
    return tuple(path)


def _is_branch(part: object) -> bool:
    """Whether a part of a location is pydantic's name of a union's branch."""
    return "[" in str(part) or part in {"str", "dict", "list", "constrained-int"}


def _one_each(faults: Sequence[Any], raw: dict[str, Any]) -> dict[KeyPath, Any]:
    """Keep one fault for each key: a union reports one for each of its branches."""
    kept: dict[KeyPath, Any] = {}
    for fault in faults:
        kept.setdefault(_key_path(fault["loc"], raw), fault)
    return {
        path: fault
        for path, fault in kept.items()
        if fault["type"] != "literal_error"
        or not any(other != path and other[: len(path)] == path for other in kept)
    }


def _drop(raw: dict[str, Any], path: KeyPath, dropped: set[KeyPath]) -> None:
    """Take out what a fault names: the innermost entry of a table, but a list as a whole."""
    parent: dict[str, Any] = raw
    depth = 0
    while depth < len(path) - 1 and isinstance(parent.get(str(path[depth])), dict):
        parent = parent[str(path[depth])]
        depth += 1
    if path[depth] not in parent and depth > 0:
        _drop(raw, path[:depth], dropped)
        return
    parent.pop(str(path[depth]), None)
    dropped.add(path[: depth + 1])


def _model_at(model: type[BaseModel], path: KeyPath) -> type[BaseModel]:
    for part in path:
        if part in model.model_fields:
            model = submodel(model.model_fields[str(part)].annotation) or model
    return model


def _field(model: type[BaseModel], loc: KeyPath) -> tuple[str, str]:
    if not loc:
        return "", ""
    owner = _model_at(model, loc[:-1])
    field = owner.model_fields.get(str(loc[-1]))
    if field is None and len(loc) > 1:
        field = model.model_fields.get(str(loc[0]))
    return (field.description or "", allowed_text(field)) if field is not None else ("", "")


def _with_defaults(model: type[BaseModel], raw: Any) -> dict[str, Any]:
    """Fill in the defaults as text, leaving out keys that have no value."""
    if not isinstance(raw, dict):
        return {}
    filled: dict[str, Any] = {}
    for key, field in model.model_fields.items():
        value = raw.get(key, field.get_default())
        inner = submodel(field.annotation)
        if inner is not None and isinstance(value, dict):
            value = _with_defaults(inner, value)
        if value is not None and str(value) != "PydanticUndefined":
            filled[key] = copy.deepcopy(value)
    return filled


def _toml(value: Any) -> str:
    return json.dumps(value, default=str, ensure_ascii=False)
