"""Fleet mix and emission factors, and the checks that need both and the roads."""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from roaddisp.emissions.factors import built_in_factors
from roaddisp.model import BoolArray, Counts, FactorTable, Fleet, FloatArray, Network
from roaddisp.study.columns import TableView
from roaddisp.study.problems import Problems, listed, nearest
from roaddisp.study.table_types import CLASSES, LIGHT_CLASSES
from roaddisp.traffic.fleet import HEAVY_CLASSES, WITHOUT_MIX, fleet_without_mix

_SUM = 1e-3
_SLACK = 1e-6


def read_factors(view: TableView, year: int | None) -> FactorTable | None:
    """Make the factor table of the year nearest to the study's; None where a row was refused."""
    classes_at, groups = view.words("vehicle_class"), view.words("group")
    speed, nox = view.numbers("speed"), view.numbers("nox")
    fraction, years = view.numbers("no2_fraction"), view.numbers("year")
    if not (view.complete and view.clean):
        return None
    kept, chosen = _rows_of_year(view, years, year)
    classes = tuple(dict.fromkeys(classes_at))
    heavy = [_is_heavy(view, name, classes_at, groups) for name in classes]
    rows_of = {name: [r for r in kept if classes_at[r] == name] for name in classes}
    for name, rows in rows_of.items():
        _check_class(view, name, rows, speed, chosen)
    if not view.clean:
        return None
    ordered = [sorted(rows_of[name], key=lambda row: speed[row]) for name in classes]
    return FactorTable(
        classes,
        np.array(heavy),
        tuple(speed[rows] for rows in ordered),
        tuple(nox[rows] for rows in ordered),
        tuple(fraction[rows] for rows in ordered),
        chosen,
        built_in=False,
        sources=(),
    )


def _rows_of_year(
    view: TableView, years: FloatArray, year: int | None
) -> tuple[list[int], int | None]:
    given = sorted({int(each) for each in years[np.isfinite(years)]})
    if not given:
        return list(range(len(view))), None
    wanted = given[-1] if year is None else year
    chosen = min(given, key=lambda each: (abs(each - wanted), -each))
    if year is not None and chosen != year:
        view.caution(
            f"no factors for {year}: those of {chosen} are taken",
            "year",
            value=listed(map(str, given)),
            allowed=str(year),
            mend="add factors of the year, or accept the nearest",
        )
    return [row for row in range(len(view)) if np.isnan(years[row]) or years[row] == chosen], chosen


def _is_heavy(view: TableView, name: str, classes: list[str], groups: list[str]) -> bool:
    rows = [row for row, each in enumerate(classes) if each == name]
    said = {groups[row] for row in rows} - {""}
    expected = {"heavy"} if name in HEAVY_CLASSES else {"light"} if name in LIGHT_CLASSES else said
    if len(expected) != 1:
        near = nearest(name, CLASSES)
        view.error(
            f"class {name!r} is not one of ours and declares no group"
            if not said
            else f"class {name!r} is in both groups",
            "vehicle_class",
            rows[0],
            value=name,
            allowed=f"{listed(CLASSES)}, or another with light or heavy in a column 'group'",
            mend=f"did you mean {near!r}?" if near else "add the column 'group'",
            count=len(rows),
        )
        return False
    if said and said != expected:
        view.error(
            f"class {name!r} is {next(iter(expected))}",
            "group",
            rows[0],
            value=listed(sorted(said)),
            allowed=next(iter(expected)),
            mend="correct the group, or give the class another name",
        )
    return expected == {"heavy"}


def _check_class(
    view: TableView, name: str, rows: list[int], speed: FloatArray, year: int | None
) -> None:
    if not rows:
        row = view.words("vehicle_class").index(name)
        view.error(
            f"class {name!r} has no factors for the year taken",
            "year",
            row,
            value=str(year),
            allowed="rows of every class in every year",
            mend="add the rows",
        )
        return
    ordered = sorted(rows, key=lambda row: speed[row])
    for before, after in pairwise(ordered):
        if speed[after] - speed[before] < 1e-9:
            view.error(
                f"class {name!r} has the same speed twice",
                "speed",
                after,
                value=f"{speed[after] * 3.6:g} km/h",
                allowed="each speed once",
                mend="delete one of the rows",
            )
            return


def screening_factors(problems: Problems, *, file: str, place: str) -> FactorTable:
    """Take the built-in factors, with the caution that goes with them."""
    problems.caution(
        "fleet.factors: the built-in factors are for screening, from published averages quoted "
        "from memory",
        file=file,
        place=place,
        value="built-in",
        mend="bring the factors that the reviewing agency approves",
    )
    return built_in_factors()


def read_mix(view: TableView, factors: FactorTable | None) -> Fleet | None:
    """Make the fleets of a mix; None where a row was refused."""
    names, classes_at = view.words("fleet"), view.words("vehicle_class")
    shares = view.numbers("share")
    if not (view.complete and view.clean):
        return None
    fleets, classes = tuple(dict.fromkeys(names)), tuple(dict.fromkeys(classes_at))
    if factors is not None:
        for name in classes:
            if name not in factors.classes:
                near = nearest(name, factors.classes)
                view.error(
                    "a class that the factors lack",
                    "vehicle_class",
                    classes_at.index(name),
                    value=name,
                    allowed=listed(factors.classes),
                    mend=f"did you mean {near!r}?" if near else "add factors for it",
                    count=classes_at.count(name),
                )
    share = np.zeros((len(fleets), len(classes)))
    seen: dict[tuple[str, str], int] = {}
    for row, key in enumerate(zip(names, classes_at, strict=True)):
        if seen.setdefault(key, row) != row:
            view.error(
                f"fleet {key[0]!r} has the class {key[1]!r} twice",
                "vehicle_class",
                row,
                value=key[1],
                allowed="each class once",
                mend="delete one of the rows",
            )
        share[fleets.index(key[0]), classes.index(key[1])] = shares[row]
    for number, total in enumerate(share.sum(axis=1)):
        if abs(total - 1.0) > _SUM:
            mend = "divide each share by the sum"
            if abs(total - 100.0) < 1.0:
                mend = 'the shares look like percent: write "share [%]"'
            view.error(
                f"fleet {fleets[number]!r}: the shares do not sum to 1",
                "share",
                names.index(fleets[number]),
                value=f"{total:.6g}",
                allowed="1 within 0.001",
                mend=mend,
            )
    return Fleet(fleets, classes, share) if view.clean else None


def check_fleet(
    roads: TableView, network: Network, fleet: Fleet, factors: FactorTable, counts: Counts | None
) -> None:
    """Hold each link's own classes and speeds against the factors."""
    by_class = np.zeros(len(network.link), dtype=bool)
    if counts is not None and counts.classes is not None:
        by_class = np.isnan(network.aadt)
    lacking = [name for name in fleet.classes if name not in factors.classes]
    if lacking and not by_class.all():
        roads.problems.error(
            "the factors lack a class that the traffic has",
            file=roads.table.file,
            value=listed(lacking),
            allowed=listed(factors.classes),
            mend="add factors for it; without a mix, cars and articulated trucks are needed",
        )
        return
    shares = _present(roads, network, fleet, factors, by_class)
    for number, name in enumerate(fleet.classes):
        uses = shares[:, number] & ~by_class
        check_speeds(roads, network, factors, name, uses, counts)
    if counts is not None and counts.classes is not None:
        for number, name in enumerate(counts.classes):
            uses = by_class & (np.nan_to_num(counts.vehicles[:, number]) > 0).any(axis=1)
            check_speeds(roads, network, factors, name, uses, counts)


def _present(
    roads: TableView, network: Network, fleet: Fleet, factors: FactorTable, exempt: BoolArray
) -> BoolArray:
    """(L, C) bool: which classes each link really has."""
    wanted = network.heavy_share
    if fleet.names == (WITHOUT_MIX,):
        without = np.flatnonzero(np.isnan(wanted) & ~exempt)
        if without.size:
            row = int(without[0])
            roads.error(
                "a link without heavy_share, in a study without a mix",
                "heavy_share",
                row,
                value=network.link[row],
                allowed="a share for each link, or a mix",
                mend="add the column, or name a mix in [fleet]",
                count=without.size,
            )
        share = np.nan_to_num(wanted)
        return np.column_stack([share < 1, share > 0])
    index = np.where(network.fleet < 0, 0, network.fleet)
    heavy = np.array([bool(factors.heavy[factors.classes.index(c)]) for c in fleet.classes])
    mix = fleet.share[index] > 0
    for group, name, asked in ((heavy, "heavy", wanted > 0), (~heavy, "light", wanted < 1)):
        lacking = np.flatnonzero(asked & ~mix[:, group].any(axis=1) & ~exempt)
        if lacking.size:
            row = int(lacking[0])
            roads.error(
                f"a heavy_share that asks for {name} vehicles, which the fleet lacks",
                "heavy_share",
                row,
                value=f"{wanted[row]:g}",
                allowed=f"a fleet with a {name} class",
                mend="add the class to the mix, or leave heavy_share empty",
                count=lacking.size,
            )
    mix &= ~(heavy[None, :] & (wanted == 0)[:, None])
    mix &= ~(~heavy[None, :] & (wanted == 1)[:, None])
    return mix


def check_speeds(
    roads: TableView,
    network: Network,
    factors: FactorTable,
    name: str,
    uses: BoolArray,
    counts: Counts | None,
) -> None:
    """Note links whose speed lies beyond a class's factors."""
    speeds = factors.speed[factors.classes.index(name)]
    low, high = float(speeds[0]) * (1 - _SLACK), float(speeds[-1]) * (1 + _SLACK)
    hourly = counts.speed if counts is not None else None
    slowest, fastest = network.speed, network.speed
    if hourly is not None:
        counted = np.isnan(network.aadt)
        slowest = np.where(counted, hourly.min(axis=1), slowest)
        fastest = np.where(counted, hourly.max(axis=1), fastest)
    beyond = np.flatnonzero(uses & ((slowest < low) | (fastest > high)))
    if beyond.size:
        row = int(beyond[0])
        found = slowest[row] if slowest[row] < low else fastest[row]
        roads.error(
            f"a speed beyond the factors of {name!r}",
            "speed",
            row,
            value=f"{found * 3.6:.4g} km/h",
            allowed=f"{speeds[0] * 3.6:.4g} to {speeds[-1] * 3.6:.4g} km/h",
            mend="add factors at that speed, or correct the speed",
            count=beyond.size,
        )


def no_mix() -> Fleet:
    """Take the fleet of a study without a mix: cars, and trucks by heavy_share."""
    return fleet_without_mix()
