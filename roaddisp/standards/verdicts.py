"""Whether a standard is met, where, and why it may not be said."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from roaddisp.model import BoolArray, FloatArray, Statistics, Verdicts
from roaddisp.standards.rules import Standard
from roaddisp.standards.statistics import over_years
from roaddisp.standards.years import Completeness


def rounded_half_up(value: npt.ArrayLike, decimals: int) -> FloatArray:
    """Round as regulations do, halves up.

    Parameters
    ----------
    value : (...)
    decimals : int

    Returns
    -------
    (...)

    Notes
    -----
    First to nine decimals of the last kept digit, so that a decimal half that
    binary numbers cannot hold (1.005 is held as 1.00499999999999989) is still one.

    Examples
    --------
    >>> rounded_half_up([100.5, 52.4999999999999], 0)
    array([101.,  53.])
    """
    scale = 10.0**decimals
    rounded: FloatArray = np.floor(np.round(np.asarray(value) * scale, 9) + 0.5) / scale
    return rounded


def judge(
    standard: Standard,
    regulatory: Statistics,
    worst: Statistics | None,
    *,
    kinds: Sequence[str],
    on_road: BoolArray,
    completeness: Completeness,
) -> Verdicts:
    """Judge one standard at every receptor.

    Parameters
    ----------
    standard : Standard
    regulatory : Statistics
        Calm hours left out.
    worst : Statistics or None
        Calm hours run in the worst direction; None where they were not.
    kinds : (R,) sequence of str
        Empty where a receptor names none.
    on_road : (R,) bool
    completeness : Completeness

    Returns
    -------
    Verdicts
        ``undetermined``, with the reason, where data are incomplete, a year has no
        value, or calm hours in the worst direction would change the answer.

    Examples
    --------
    >>> import numpy as np
    >>> from roaddisp.standards.rules import standard
    >>> year = np.array([2023])
    >>> made = judge(
    ...     standard("eu-2008-annual"),
    ...     Statistics(year, *(np.array([[20.0, 22.0]]) for _ in range(10))),
    ...     None,
    ...     kinds=("home", "roadside"),
    ...     on_road=np.array([False, False]),
    ...     completeness=Completeness(year, np.ones(1), np.ones((1, 4))),
    ... )
    >>> made.value, made.met
    (array([38., 42.]), ('yes', ''))
    """
    value = _in_unit(standard, regulatory)
    yes = value <= standard.level
    lack = completeness.lack(standard)
    without = np.isnan(getattr(regulatory, standard.statistic)).any(axis=0)
    other = value if worst is None else _in_unit(standard, worst)
    differs = (other <= standard.level) != yes

    met: list[str] = []
    reason: list[str] = []
    for r, kind in enumerate(kinds):
        if on_road[r] or not standard.judges(kind):
            met.append("")
            reason.append("")
            continue
        why = []
        if lack:
            why.append(lack)
        if without[r]:
            why.append(_no_value(standard))
        elif differs[r]:
            why.append(
                f"calm hours in the worst direction would make it {other[r]:.{standard.decimals}f} "
                f"{standard.unit}, left out it is {value[r]:.{standard.decimals}f}"
            )
        met.append("undetermined" if why else "yes" if yes[r] else "no")
        reason.append("; ".join(why))
    return Verdicts(
        standard=standard.name,
        value=value,
        limit=standard.level,
        decimals=standard.decimals,
        unit=standard.unit,
        met=tuple(met),
        reason=tuple(reason),
        provisional=_provisional(standard, len(regulatory.years)),
    )


def _in_unit(standard: Standard, statistics: Statistics) -> FloatArray:
    ppb = over_years(statistics, standard.statistic)
    return rounded_half_up(ppb * standard.unit_per_ppb, standard.decimals)


def _no_value(standard: Standard) -> str:
    if standard.statistic == "nox_mean_ppb":
        return "total NOx is not known, for the background gives no NO"
    return f"too few hours for the {standard.form}"


def _provisional(standard: Standard, years: int) -> str:
    if years >= standard.years_asked:
        return ""
    return f"{years} of the {standard.years_asked} years that guidance asks"
