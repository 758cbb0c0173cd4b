"""Time `response_table` against the yardsticks, in one process and one run."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import kernel_c
import numba
import numpy as np
import yardstick_loop
from cases import Case, single_lines

import roaddisp as rd

Figures = dict[str, Any]


def all_kernels(*, quick: bool) -> Figures:
    """Nanoseconds for a receptor, a segment and a state, by wall and by processor."""
    size = (2000, 100, 36) if quick else (10_000, 500, 36)
    case = single_lines(*size)
    threads = numba.get_num_threads()
    warm = single_lines(64, 5, 2)
    ours(warm)
    yardstick_loop.response_table(warm)
    with_c: dict[str, Callable[[Case], object]] = {"response_table": ours}
    if kernel_c.why_not() is None:
        kernel_c.response_table(warm, threads)
        with_c["C kernel"] = lambda given: kernel_c.response_table(given, threads)
    told: Figures = {"threads": threads, "pair_states": case.pair_states, "case": size}
    told["ns"] = _in_turn(with_c, case, times=5 if quick else 3)
    if kernel_c.why_not() is None:
        told |= agreement(case.share(1000, 100, 24), threads)
    part = case.share(2000, 25, 18)
    told["loop_pair_states"] = part.pair_states
    told["ns"] |= _in_turn({"loop": yardstick_loop.response_table}, part, times=2)
    by_numpy = _numpy_apart()
    told["ns"] |= by_numpy["ns"]
    told["numpy_pair_states"] = by_numpy["numpy_pair_states"]
    told["variants"] = variants((2000, 100, 36) if quick else (6000, 200, 36), threads)
    return told


def ours(case: Case) -> object:
    return rd.response_table(case.receptors, case.segments, **case.options())


def agreement(case: Case, threads: int) -> Figures:
    """Share of pairs that live, nodes each takes, and how far the C kernel is from ours."""
    table, live, nodes = kernel_c.response_table(case, threads)
    expected = np.asarray(ours(case))
    seen = expected > 1e-4 * expected.max()
    worst = float(np.abs(table[seen] / expected[seen] - 1.0).max())
    if not worst < 1e-3:
        raise AssertionError(f"the C kernel is {worst:.1e} from response_table: not timed")
    return {
        "live_share": live / case.pair_states,
        "nodes_per_live": nodes / max(live, 1),
        "c_kernel_apart": worst,
    }


def variants(size: tuple[int, int, int], threads: int) -> dict[str, Figures]:
    """Urban terrain and lids beside open terrain without, on a smaller case."""
    cases = {
        "open": single_lines(*size),
        "urban": single_lines(*size, terrain="urban"),
        "lids": single_lines(*size, lids=True),
    }
    runs: dict[str, Callable[[], object]] = {}
    for name, case in cases.items():
        runs[name] = lambda case=case: ours(case)
        if kernel_c.why_not() is None:
            runs[f"{name}, C kernel"] = lambda case=case: kernel_c.response_table(case, threads)
    return _timed(runs, cases["open"].pair_states, times=3)


def numpy_alone() -> None:
    """Print the numpy yardstick's time on a small share; run in a process of its own."""
    import yardstick_numpy

    case = single_lines(10_000, 500, 36).share(640, 10, 18)
    yardstick_numpy.response_table(case.share(64, 2, 6))
    runs: dict[str, Callable[[], object]] = {
        "numpy": lambda: yardstick_numpy.response_table(case),
        "numpy, not blocked": lambda: yardstick_numpy.response_table(case, len(case.receptors)),
    }
    told: Figures = {"ns": _timed(runs, case.pair_states, times=2)}
    sys.stdout.write(json.dumps(told | {"numpy_pair_states": case.pair_states}))


def _numpy_apart() -> Figures:
    """Run the numpy yardstick with its linear algebra library free to choose its kernels."""
    unset = ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE")
    free = {name: value for name, value in os.environ.items() if name not in unset}
    told = subprocess.run(
        [sys.executable, str(Path(__file__)), "numpy"],
        env=free, capture_output=True, text=True, check=True,
    )  # fmt: skip
    figures: Figures = json.loads(told.stdout)
    return figures


def _in_turn(
    runs: dict[str, Callable[[Case], object]], case: Case, *, times: int
) -> dict[str, Figures]:
    return _timed(
        {name: (lambda run=run: run(case)) for name, run in runs.items()}, case.pair_states, times
    )


def _timed(
    runs: dict[str, Callable[[], object]], pair_states: int, times: int
) -> dict[str, Figures]:
    """Least of several runs, taken in turn so that a busy spell meets all alike."""
    wall: dict[str, list[float]] = {name: [] for name in runs}
    processor: dict[str, list[float]] = {name: [] for name in runs}
    for _ in range(times):
        for name, run in runs.items():
            start, busy = time.perf_counter(), time.process_time()
            run()
            wall[name].append(time.perf_counter() - start)
            processor[name].append(time.process_time() - busy)
    return {
        name: {
            "wall_ns": 1e9 * min(wall[name]) / pair_states,
            "processor_ns": 1e9 * min(processor[name]) / pair_states,
        }
        for name in runs
    }


if __name__ == "__main__":
    if sys.argv[1:] == ["numpy"]:
        numpy_alone()
    else:
        sys.stdout.write(json.dumps(all_kernels(quick="--quick" in sys.argv[1:]), indent=1) + "\n")
