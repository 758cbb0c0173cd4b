"""The text of ``roaddisp inputs``, made from the schema and the tables themselves."""

from __future__ import annotations

import inspect
import textwrap
from typing import Any

from pydantic.fields import FieldInfo

from roaddisp.quantities import INSIDE, UNITLESS, UNITS, spellings
from roaddisp.study.keys import allowed_text, submodel
from roaddisp.study.schema import NEEDED, SECTIONS, Section
from roaddisp.study.table_types import Column, Table
from roaddisp.study.tables import TABLES

_WIDTH = 96


def document_inputs() -> str:
    """Describe every file, key and column of a study, in Markdown.

    Returns
    -------
    str

    Examples
    --------
    >>> "## Table `weather`" in document_inputs()
    True
    """
    parts = [_opening()]
    for name, section in SECTIONS.items():
        parts.append(_section(name, section))
    parts.append(_scenarios())
    for section_name, tables in TABLES.items():
        for key, table in tables.items():
            parts.append(_table(section_name, key, table))
    return "\n".join(parts)


def _opening() -> str:
    units = "\n".join(f"- {name}: {spellings(name)}" for name in UNITS)
    return f"""# What a study may hold

A study is a folder with `study.toml` and the files it names, all inside the folder.

Units. In study.toml a quantity is a text with its unit ("45 mph"). In a CSV the header carries
the unit in brackets (`speed [mph]`). In a vector layer `columns` carries it, or the header, or
every value does ("45 mph"). Counts, ids, names and fractions take no bracket; `[%]` divides by
100. A number without a unit where one is needed is an error. The spellings:

{units}

CSV files are UTF-8, parted by commas, with decimal points. Lines above the header that begin
with `#` are notes. Other columns may stand beside those listed and are not read. Times are
ISO 8601, on the whole hour. By the local clock a repeated hour is daylight time first, and an
hour that the clock skips is an error. An empty cell is a missing value.
"""


def _section(name: str, section: type[Section]) -> str:
    lines = [f"## `[{name}]` in study.toml ({'required' if name in NEEDED else 'optional'})", ""]
    lines += [inspect.cleandoc(section.__doc__ or ""), ""]
    for key, field in section.model_fields.items():
        default = field.get_default()
        if field.is_required():
            status = "required"
        elif default is None:
            status = "optional"
        else:
            status = f"default {_toml(default)}"
        allowed = allowed_text(field)
        text = f"- `{key}` ({status}): {field.description}." + (f" {allowed}." if allowed else "")
        lines.append(_wrapped(text))
        lines += _inner(field)
    return "\n".join(lines) + "\n"


def _inner(field: FieldInfo) -> list[str]:
    model = submodel(field.annotation)
    if model is None:
        return []
    return [
        _wrapped(
            f"  - `{key}` ({'required' if inner.is_required() else 'optional'}): "
            f"{inner.description}. {allowed_text(inner)}.",
            "    ",
        )
        for key, inner in model.model_fields.items()
    ]


def _scenarios() -> str:
    return """## `[scenario.<name>]` in study.toml (optional)

The keys outside `[scenario]` are the scenario "base". Each further scenario overrides any of
them, as `roads.file = "build.gpkg"` below `[scenario.build]`, or below `[scenario.build.roads]`.
A table given whole, in braces, replaces the base's: `air = { file = "air2.csv" }` keeps none of
the base's keys of `[air]`. Giving one of the two alternatives of `[air]`, file or constant,
removes the other. `[study]` keys are the study's own: `timezone` and `crs` are the same in all.
"""


def _table(section: str, key: str, table: Table) -> str:
    named = f"named by `{key}` in `[{section}]`"
    geometry = f" Geometry: {table.geometry}." if table.geometry else ""
    lines = [f"## Table `{table.name}`", ""]
    lines += [_wrapped(f"{table.meaning}; {table.forms}, {named}.{geometry}", ""), ""]
    lines += [_wrapped(_column(column)) for column in table.columns]
    return "\n".join(lines) + "\n"


def _column(column: Column) -> str:
    head = f"- `{column.name}`{_bracket(column)} ({'required' if column.required else 'optional'})"
    text = f"{head}: {column.meaning}."
    if column.later:
        return f"{text} Not in this version: must be empty or zero."
    if column.choices:
        text += f" One of {', '.join(column.choices)}."
    if column.low is not None and column.high is not None:
        unit = INSIDE.get(column.quantity, "")
        text += f" {column.low:g} to {column.high:.10g}{' ' + unit if unit else ''}."
    return text + (f" Empty: {column.empty}." if column.empty else "")


def _bracket(column: Column) -> str:
    if column.quantity not in UNITS:
        return ""
    if column.quantity in UNITLESS:
        return " or `[%]`"
    return f" `[{spellings(column.quantity)}]`"


def _wrapped(text: str, indent: str = "  ") -> str:
    return textwrap.fill(
        text, _WIDTH, subsequent_indent=indent, break_long_words=False, break_on_hyphens=False
    )


def _toml(value: Any) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    return f'"{value}"' if isinstance(value, str) else str(value)
