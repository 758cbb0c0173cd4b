"""The standards built in: what each asks, read from ``data/standards.toml``."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, fields
from functools import cache
from importlib.resources import files
from types import MappingProxyType
from typing import Any, Literal

from roaddisp.errors import NotYetError

KINDS = (
    "classroom",
    "playground",
    "home",
    "facade",
    "intake",
    "roadside",
    "vegetation",
    "grid",
)
"""Kinds of receptor that the rules tell apart; points of a grid are judged by none."""


@dataclass(frozen=True)
class Standard:
    """One air-quality standard, as its law writes it.

    Attributes
    ----------
    name, title, law : str
    status : str
        How far the entry was checked against a public text.
    pollutant, averaging, form : str
    statistic : str
        Field of `roaddisp.model.Statistics` that is judged [ppb].
    over_years : "mean" or "worst"
        Of the annual values.
    level : float
        Met at or below it, after rounding.
    unit : str
    ugm3_per_ppb : float
        The standard's own conversion, at ``state``.
    state : str
    decimals : int
        To which values are rounded, halves up.
    completeness : "days-of-quarters" or "hours-of-year"
    share_required : float
        Of the days of each quarter, or of the hours of the calendar year.
    required : str
        The same in words.
    years_asked : int
        A result from fewer is provisional.
    day : str
        The clock of its days.
    health : bool
        Judges receptors that name no kind.
    kinds : tuple of str
        Kinds of receptor it judges.
    """

    name: str
    title: str
    law: str
    status: str
    pollutant: str
    averaging: str
    form: str
    statistic: str
    over_years: Literal["mean", "worst"]
    level: float
    unit: Literal["ppb", "ug/m3"]
    ugm3_per_ppb: float
    state: str
    decimals: int
    completeness: Literal["days-of-quarters", "hours-of-year"]
    share_required: float
    required: str
    years_asked: int
    day: str
    health: bool
    kinds: tuple[str, ...]

    @property
    def unit_per_ppb(self) -> float:
        """The standard's unit in one ppb."""
        return 1.0 if self.unit == "ppb" else self.ugm3_per_ppb

    def judges(self, kind: str) -> bool:
        """Whether it judges receptors of a kind; every health standard judges no kind.

        Parameters
        ----------
        kind : str
            Empty where the receptor names none.

        Returns
        -------
        bool

        Examples
        --------
        >>> standard("us-naaqs-annual").judges("roadside")
        False
        """
        return self.health if not kind else kind in self.kinds

    def description(self) -> dict[str, str]:
        """Say what it asks, line by line, for people.

        Returns
        -------
        dict of str
            Heading to text, in reading order.

        Examples
        --------
        >>> standard("eu-2008-annual").description()["level"]
        '40 ug/m3'
        """
        years = f"{self.years_asked} year" + ("s" if self.years_asked > 1 else "")
        across = "mean of the years" if self.over_years == "mean" else "the worst year"
        return {
            "standard": self.name,
            "title": self.title,
            "pollutant": self.pollutant,
            "averaging": self.averaging,
            "level": f"{self.level:.{self.decimals}f} {self.unit}",
            "form": self.form,
            "over several years": across,
            "years asked": f"{years}; fewer are provisional" if self.years_asked > 1 else years,
            "complete data": self.required,
            "day": self.day,
            "rounding": f"half up to {self.decimals} decimals; met at or below the level",
            "conversion": f"{self.ugm3_per_ppb:.4f} ug/m3 in 1 ppb of NO2 ({self.state})",
            "judges": ", ".join(self.kinds) + (", and no kind given" if self.health else ""),
            "law": self.law,
            "checked": self.status,
        }


def standard(name: str) -> Standard:
    """Return a standard by its name.

    Parameters
    ----------
    name : str

    Returns
    -------
    Standard

    Raises
    ------
    NotYetError
        Where this version knows the name and does not judge it yet.
    ValueError
        Where there is no such standard.

    Examples
    --------
    >>> standard("us-naaqs-1h").level
    100.0
    """
    if name in standards():
        return standards()[name]
    delivered = ", ".join(standards())
    if name in later_standards():
        raise NotYetError(
            f"standard {name!r} comes with a later version of roaddisp; now: {delivered}"
        )
    raise ValueError(f"there is no standard {name!r}; allowed: {delivered}")


@cache
def standards() -> Mapping[str, Standard]:
    """Every standard this version judges, by name, in the order of the data file.

    Examples
    --------
    >>> list(standards())[:2]
    ['us-naaqs-1h', 'us-naaqs-annual']
    """
    tables = {name: table for name, table in _data().items() if name != "later"}
    return MappingProxyType({name: _from_table(name, table) for name, table in tables.items()})


def later_standards() -> tuple[str, ...]:
    """Names of the standards that a later version judges.

    Examples
    --------
    >>> "who-2021-annual" in later_standards()
    True
    """
    return tuple(_data()["later"]["names"])


@cache
def _data() -> Mapping[str, Any]:
    text = files("roaddisp").joinpath("data/standards.toml").read_text(encoding="utf-8")
    return tomllib.loads(text)


def _from_table(name: str, table: Mapping[str, Any]) -> Standard:
    known = {field.name for field in fields(Standard)}
    unknown = sorted(set(table) - known)
    if unknown:
        raise ValueError(f"standard {name!r} has unknown keys: {', '.join(unknown)}")
    values = dict(table) | {
        "name": name,
        "level": float(table["level"]),
        "kinds": tuple(table["kinds"]),
    }
    return Standard(**values)
