"""Build ``kernel.c`` with gcc and call it: a hand-written yardstick of the same scheme."""

from __future__ import annotations

import ctypes
import shutil
import subprocess
import tempfile
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
from cases import Case

from roaddisp.dispersion.curves import coefficients
from roaddisp.model import Float32Array, IntArray

FLAGS = ("-O3", "-march=native", "-fopenmp", "-ffast-math", "-std=gnu11", "-fPIC")
"""To compile with. Linking is a step of its own, without -ffast-math, which would set the
whole process to flush small numbers to zero."""

RULES = (1, 2, 3, 4, 5, 6, 8, 10, 13, 17, 24, 36)
NO_LID = 1e30


def why_not() -> str | None:
    """Say why there is no C kernel on this machine; None where there is one."""
    return None if shutil.which("gcc") else "gcc is not on the path"


def compiler() -> str:
    told = subprocess.run(["gcc", "--version"], capture_output=True, text=True, check=True)
    return told.stdout.splitlines()[0]


@cache
def library() -> ctypes.CDLL:
    with tempfile.TemporaryDirectory(prefix="kernel-") as folder:
        part, built = Path(folder) / "kernel.o", Path(folder) / "kernel.so"
        source = Path(__file__).with_name("kernel.c")
        subprocess.run(["gcc", *FLAGS, "-c", "-o", str(part), str(source)], check=True)
        link = ["gcc", "-shared", "-fopenmp", "-o", str(built), str(part), "-lm"]
        subprocess.run(link, check=True)
        return ctypes.CDLL(str(built))


def response_table(case: Case, threads: int) -> tuple[Float32Array, int, int]:
    """Table (W, G, R) at 1 m/s, the live pair-states, and the nodes they took."""
    order = _along_curve(case.receptors[:, :2])
    by_group = np.argsort(case.group, kind="stable")
    groups = int(case.group.max()) + 1
    count, states = len(case.segments), len(case.wind_from)
    codes = np.array(["ABCDEF".index(letter) for letter in case.stability])
    curves = _curves(case)
    by_wind = np.lexsort((-curves[codes, 0], case.wind_from))
    turns = np.flatnonzero(np.diff(case.wind_from[by_wind], prepend=np.nan, append=np.nan) != 0)
    table = np.zeros((states, groups, len(order)), dtype=np.float32)
    lids = np.where(np.isfinite(case.mixing_height), case.mixing_height, NO_LID)
    nodes, weights = _rules()
    counted = np.zeros(2, dtype=np.int64)
    failed = library().fill_table(
        _given(table, np.float32),
        _given(case.receptors[order, 0], np.float64),
        _given(case.receptors[order, 1], np.float64),
        _given(case.receptors[order, 2], np.float32),
        len(order),
        _given(case.segments[by_group], np.float64),
        count,
        _given(case.strength[by_group], np.float32),
        _given(case.group[by_group], np.int32),
        groups,
        _given(np.full(count, case.height), np.float32),
        _given(np.full(count, case.sigma_z0), np.float32),
        _given(np.full(count, case.sigma_y0), np.float32),
        _given(np.radians(case.wind_from[by_wind]), np.float64),
        _given(codes[by_wind], np.int32),
        _given(lids[by_wind], np.float32),
        _given(turns, np.int32),
        len(turns) - 1,
        _given(curves, np.float32),
        _given(nodes, np.float32),
        _given(weights, np.float32),
        threads,
        _given(counted, np.int64),
    )
    if failed:
        raise MemoryError("the C kernel found no memory")
    in_place = np.empty_like(table)
    in_place[np.ix_(by_wind, np.arange(groups), order)] = table
    return in_place, int(counted[0]), int(counted[1])


def _given(values: Any, kind: Any) -> Any:
    """Hand an array over as a pointer that keeps it alive."""
    array = np.ascontiguousarray(values, dtype=kind)
    return array.ctypes.data_as(ctypes.c_void_p)


def _rules() -> tuple[Float32Array, Float32Array]:
    """Gauss-Legendre on (0, 1), one rule a row."""
    nodes = np.zeros((len(RULES), RULES[-1]), dtype=np.float32)
    weights = np.zeros_like(nodes)
    for row, size in enumerate(RULES):
        x, w = np.polynomial.legendre.leggauss(size)
        nodes[row, :size], weights[row, :size] = 0.5 * (x + 1.0), 0.5 * w
    return nodes, weights


def _curves(case: Case) -> Float32Array:
    """Briggs' curves as fractions: a, b, then e1, e2, a^2, g (see kernel.c)."""
    rows = []
    for (a, b, _), (az, bz, power) in coefficients(case.terrain):
        under = {-1.0: (2.0 * bz, bz * bz), -0.5: (bz, 0.0)}.get(power, (0.0, 0.0))
        rows.append((a, b, *under, az * az, bz if power == 0.5 else 0.0))
    return np.array(rows, dtype=np.float32)


def _along_curve(plan: Any) -> IntArray:
    """Order of points by the interleaved bits of their cells."""
    low = plan.min(axis=0)
    cell = ((plan - low) / max(float(np.ptp(plan, axis=0).max()), 1.0) * 1023).astype(np.int64)
    place = np.zeros(len(plan), dtype=np.int64)
    for bit in range(10):
        place |= ((cell[:, 0] >> bit) & 1) << (2 * bit) | ((cell[:, 1] >> bit) & 1) << (2 * bit + 1)
    return np.argsort(place, kind="stable").astype(np.int64)
