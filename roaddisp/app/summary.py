"""The short summary of a run: which standards are met where, and the cautions."""

from __future__ import annotations

import math
from collections import Counter
from typing import Any

import numpy as np

from roaddisp.model import Result, Verdicts

LISTED = 5
"""Receptors named of those that do not meet a standard."""


def summary_data(result: Result) -> dict[str, Any]:
    """Return the summary as plain data, for ``--json``."""
    clock = result.scenario.clock
    return {
        "study": result.study.title,
        "scenario": result.scenario.name,
        "first_hour": str(clock.standard[0]),
        "last_hour": str(clock.standard[-1]),
        "hours": int(clock.standard.size),
        "receptors": len(result.scenario.receptors),
        "standards": {
            verdicts.standard: _standard(result, verdicts) for verdicts in result.verdicts
        },
        "cautions": [str(problem) for problem in result.study.cautions],
    }


def _standard(result: Result, verdicts: Verdicts) -> dict[str, Any]:
    names = result.scenario.receptors.receptor
    counts = Counter(verdicts.met)
    judged = np.array([bool(met) for met in verdicts.met])
    worst = _worst(verdicts, judged)
    return {
        "limit": verdicts.limit,
        "unit": verdicts.unit,
        "met": counts["yes"],
        "not_met": counts["no"],
        "undetermined": counts["undetermined"],
        "not_judged": counts[""],
        "worst_receptor": None if worst is None else names[worst],
        "worst_value": None if worst is None else float(verdicts.value[worst]),
        "not_met_at": [name for name, met in zip(names, verdicts.met, strict=True) if met == "no"],
        "why_undetermined": sorted({reason for reason in verdicts.reason if reason}),
        "provisional": verdicts.provisional,
        "decimals": verdicts.decimals,
    }


def _worst(verdicts: Verdicts, judged: np.ndarray[Any, np.dtype[np.bool_]]) -> int | None:
    value = np.where(judged, verdicts.value, np.nan)
    return None if np.isnan(value).all() else int(np.nanargmax(value))


def summary_text(result: Result) -> str:
    """Return the summary as a person reads it on a terminal."""
    data = summary_data(result)
    lines = [
        f"{data['study']}, scenario {data['scenario']}",
        f"{data['hours']} hours from {data['first_hour']} (local standard time), "
        f"{data['receptors']} receptors",
        "",
    ]
    for name, standard in data["standards"].items():
        lines += _standard_lines(name, standard)
    if data["cautions"]:
        lines += ["", f"{len(data['cautions'])} cautions:"]
        lines += [f"  - {caution}" for caution in data["cautions"]]
    lines += [
        "",
        "Model estimates: to be checked against local codes, the reviewing agency's current "
        "rules and licensed practice.",
    ]
    return "\n".join(lines)


def _standard_lines(name: str, standard: dict[str, Any]) -> list[str]:
    decimals = standard["decimals"]
    parts = [
        f"{standard[key]} {label}"
        for key, label in (
            ("met", "met"),
            ("not_met", "not met"),
            ("undetermined", "undetermined"),
            ("not_judged", "not judged"),
        )
        if standard[key]
    ]
    lines = [
        f"{name} (limit {standard['limit']:.{decimals}f} {standard['unit']}): " + ", ".join(parts)
    ]
    if standard["worst_receptor"] is not None and not math.isnan(standard["worst_value"]):
        lines.append(
            f"  highest judged: {standard['worst_value']:.{decimals}f} {standard['unit']} "
            f"at {standard['worst_receptor']}"
        )
    if standard["not_met_at"]:
        shown = ", ".join(standard["not_met_at"][:LISTED])
        more = len(standard["not_met_at"]) - LISTED
        lines.append(f"  not met at: {shown}" + (f" and {more} more" if more > 0 else ""))
    lines += [f"  undetermined: {reason}" for reason in standard["why_undetermined"]]
    if standard["provisional"]:
        lines.append(f"  provisional: {standard['provisional']}")
    return lines
