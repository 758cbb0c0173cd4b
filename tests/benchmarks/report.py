"""Figures of `measure.py` as Markdown: what was asked, what was reached, where time goes."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

Figures = dict[str, Any]
RUNS = ("lines", "fine winds", "hourly lids", "network", "many receptors")
Row = tuple[str, str, str, bool | None]
"""Work, target, reached, and whether the target was met (None: reported only)."""


def markdown(told: Figures) -> str:
    rows = [row for part in (_kernels, _runs, _what_if, _help) for row in part(told)]
    lines = [_machine(told["machine"])]
    if told["quick"]:
        lines.append("**Quick: everything scaled down. The targets do not apply.**\n")
    lines += ["| work | target | reached | |", "|---|---|---|---|"]
    for work, target, reached, met in rows:
        verdict = "" if met is None or told["quick"] else "met" if met else "**missed**"
        lines.append(f"| {work} | {target} | {reached} | {verdict} |")
    lines += list(_where_time_goes(told))
    return "\n".join(lines)


def _machine(of: Figures) -> str:
    versions = ", ".join(f"{name} {number}" for name, number in of["versions"].items())
    return (
        f"{of['date']}; {of['processor']}, {of['processors']} processors, {of['threads']} threads;"
        f" {of['system']}; Python {of['python']}, {versions}; {of['compiler']};"
        f" load before the start {of['load_before']:g}.\n"
    )


def _kernels(told: Figures) -> Iterator[Row]:
    if "kernels" not in told:
        return
    of = told["kernels"]
    ns = of["ns"]
    ours = ns["response_table"]
    receptors, segments, directions = of["case"]
    work = f"{receptors:,} receptors x {segments} segments x {6 * directions} states"
    live = f", {of['live_share']:.0%} live" if "live_share" in of else ""
    each = (
        f"{ours['wall_ns'] * of['pair_states'] / 1e9:.2f} s; {ours['wall_ns']:.1f} ns a pair and "
        f"state by the clock, {ours['processor_ns']:.1f} of processor time"
    )
    yield f"`response_table`, {work} ({of['pair_states']:.3g} pair-states{live})", "", each, None
    if "C kernel" in ns:
        other = ns["C kernel"]
        by_clock = ours["wall_ns"] / other["wall_ns"]
        busy = ours["processor_ns"] / other["processor_ns"]
        yield (
            f"... against the C kernel ({other['wall_ns']:.1f} ns, "
            f"{other['processor_ns']:.1f} of processor time; "
            f"{of['nodes_per_live']:.1f} nodes a live pair)",
            "<= 1.5 x, aim 1.2",
            f"{by_clock:.2f} x by the clock, {busy:.2f} x in processor time",
            busy <= 1.5,
        )
    for name, pairs, target in (
        ("numpy", of["numpy_pair_states"], 2000.0),
        ("numpy, not blocked", of["numpy_pair_states"], None),
        ("loop", of["loop_pair_states"], None),
    ):
        other = ns[name]
        by_clock = other["wall_ns"] / ours["wall_ns"]
        busy = other["processor_ns"] / ours["processor_ns"]
        yield (
            f"... against {_YARDSTICK[name]} ({other['wall_ns']:,.0f} ns; a share of "
            f"{pairs:,} pair-states, scaled)",
            f">= {target:,.0f} x" if target else "",
            f"{by_clock:,.0f} x by the clock, {busy:,.0f} x in processor time",
            by_clock >= target if target else None,
        )
    for name, label in (("urban", "urban"), ("lids", "with a lid in every state")):
        ratio = of["variants"][name]["processor_ns"] / of["variants"]["open"]["processor_ns"]
        yield (
            f"`response_table`, {label}, against open without a lid",
            "<= 2 x",
            f"{ratio:.2f} x in processor time",
            ratio <= 2.0,
        )


_YARDSTICK = {
    "numpy": "numpy, 200 points a segment, one thread, blocked",
    "numpy, not blocked": "the same, all receptors at once",
    "loop": "a compiled double loop of 64 nodes, all threads",
}


def _seconds(run: Figures) -> float:
    """Reading, running and writing, from a started interpreter."""
    total: float = sum(run["wall_s"].values())
    return total


def _peak(run: Figures) -> float:
    peak: float = max(run["peak_mb"].values())
    return peak


def _size(run: Figures) -> str:
    counts = run["counts"]
    return (
        f"{counts['receptors']:,} receptors, {counts['links']} links as {counts['segments']:,} "
        f"lines in {counts['groups_of_links']} groups, {counts['hours']:,} hours, "
        f"{counts['weather_states']:,} weather states, {run['calm_hours']} calm hours"
    )


def _runs(told: Figures) -> Iterator[Row]:
    if "lines" in told:
        run = told["lines"]
        yield (
            f"engine: {_size(run)}; ozone-limited, all statistics",
            "<= 6 s",
            f"{run['wall_s']['run']:.1f} s ({run['processor_s']['run']:.1f} s processor)",
            run["wall_s"]["run"] <= 6.0,
        )
        seconds = _seconds(run)
        yield (
            "whole `run`: imports, reading, engine, writing",
            "<= 12 s",
            f"{seconds:.1f} s",
            seconds <= 12.0,
        )
        yield "... peak memory", "<= 1.2 GB", f"{_peak(run) / 1024:.2f} GB", _peak(run) <= 1228.8
    if "fine winds" in told and "lines" in told:
        run = told["fine winds"]
        ratio = run["wall_s"]["run"] / told["lines"]["wall_s"]["run"]
        busy = run["processor_s"]["run"] / told["lines"]["processor_s"]["run"]
        yield (
            f"1-degree winds: {run['counts']['weather_states']:,} weather states",
            "<= 12 x the 10-degree run",
            f"{busy:.1f} x in processor time, {ratio:.1f} x by the clock "
            f"({run['wall_s']['run']:.1f} s; peak {_peak(run) / 1024:.2f} GB)",
            busy <= 12.0,
        )
    if "hourly lids" in told:
        run = told["hourly lids"]
        ratio = run["wall_s"]["run"] / run["without"]["wall_s"]["run"]
        yield (
            f"a lid of its own in every hour: {_size(run)}",
            "reported",
            f"{ratio:.1f} x the run without lids by the clock ({run['wall_s']['run']:.1f} s; "
            f"peak {_peak(run) / 1024:.2f} GB)",
            None,
        )
    if "network" in told:
        run = told["network"]
        yield (
            f"realistic network: {_size(run)}",
            "reported",
            f"{_seconds(run):.1f} s in all, engine {run['wall_s']['run']:.1f} s, "
            f"peak {_peak(run) / 1024:.2f} GB",
            None,
        )
    if "many receptors" in told:
        run = told["many receptors"]
        yield (
            f"{run['counts']['receptors']:,} receptors, no hours kept: peak memory",
            "<= 1.5 GB",
            f"{_peak(run) / 1024:.2f} GB ({_seconds(run):.0f} s in all)",
            _peak(run) <= 1536.0,
        )


def _what_if(told: Figures) -> Iterator[Row]:
    if "what-if" not in told:
        return
    for case, target in zip(told["what-if"]["cases"], (0.05, 0.15, 5.0), strict=True):
        groups = "every link apart" if case["apart"] else "links in 5 groups"
        took = case["wall_s"]
        yield (
            f"what-if on kept responses: {case['receptors']:,} receptors, {groups} "
            f"({case['kept_mb']:.0f} MB kept)",
            f"<= {1000 * target:.0f} ms",
            f"{1000 * took:.0f} ms ({1000 * case['processor_s']:.0f} ms processor; of it "
            f"engine {1000 * case['engine_s']:.0f} ms)",
            took <= target,
        )


def _help(told: Figures) -> Iterator[Row]:
    if "help" in told:
        of = told["help"]
        loaded = "numpy loaded" if of["numpy_loaded"] else "numpy not loaded"
        yield (
            "`roaddisp --help`",
            "<= 0.6 s, numpy not loaded",
            f"{of['least_s']:.2f} s, {loaded}",
            of["least_s"] <= 0.6 and not of["numpy_loaded"],
        )


def _where_time_goes(told: Figures) -> Iterator[str]:
    names = [name for name in RUNS if name in told]
    if not names:
        return
    yield "\nWhere the time of whole runs goes, seconds by the clock:\n"
    yield f"| | {' | '.join(names)} |"
    yield f"|---|{'---|' * len(names)}"
    first = told[names[0]]
    for table, mark in (("wall_s", ""), ("stages_s", "in run: "), ("inside_s", "in the engine: ")):
        for step in first[table]:
            cells = [f"{told[name][table].get(step, 0.0):.2f}" for name in names]
            yield f"| {mark}{step} | {' | '.join(cells)} |"
    yield "\nPeak memory, MB:\n"
    yield f"| | {' | '.join(names)} |"
    yield f"|---|{'---|' * len(names)}"
    for step in first["peak_mb"]:
        cells = [f"{told[name]['peak_mb'][step]:.0f}" for name in names]
        yield f"| {step} | {' | '.join(cells)} |"
    if "kernels" in told:
        yield "\nVariants of the fast path, processor time of a pair and state in ns:\n"
        yield "| | response_table | C kernel |"
        yield "|---|---|---|"
        variants = told["kernels"]["variants"]
        for name in ("open", "urban", "lids"):
            other = variants.get(f"{name}, C kernel")
            beside = f"{other['processor_ns']:.1f}" if other else "no gcc"
            yield f"| {name} | {variants[name]['processor_ns']:.1f} | {beside} |"
