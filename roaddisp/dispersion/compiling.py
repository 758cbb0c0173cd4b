"""How numeric code is compiled: where the machine code is kept, and one call at a time."""

from __future__ import annotations

import os
import tempfile
import threading
from collections.abc import Callable
from pathlib import Path
from typing import Any, Final, ParamSpec, TypeVar

import numba

P = ParamSpec("P")
T = TypeVar("T")

ONE_AT_A_TIME: Final = threading.Lock()
"""Held around parallel calls: a threading layer of numba aborts on concurrent ones."""

FAST: Final = {"contract", "nsz", "arcp"}
"""Rounding freedoms that keep infinities and the order of sums."""


def compiled(function: Callable[P, T]) -> Callable[P, T]:
    """Compile on first use, in full precision."""
    made: Callable[P, T] = numba.njit(cache=_CACHE, error_model="numpy", nogil=True)(function)
    return made


def fast_compiled(function: Callable[P, T]) -> Callable[P, T]:
    """Compile on first use, with the rounding freedoms of `FAST`."""
    made: Callable[P, T] = numba.njit(
        cache=_CACHE, error_model="numpy", nogil=True, fastmath=FAST
    )(function)
    return made


def parallel_compiled(function: Callable[P, T]) -> Callable[P, T]:
    """As `fast_compiled`, for a function that shares its work among threads."""
    made: Callable[P, T] = numba.njit(
        cache=_CACHE, error_model="numpy", nogil=True, fastmath=FAST, parallel=True
    )(function)
    return made


def is_kept(function: Callable[..., Any]) -> bool:
    """Whether machine code of a compiled function is at hand, in memory or on disk."""
    if function.signatures:  # type: ignore[attr-defined]
        return True
    folder = function.stats.cache_path  # type: ignore[attr-defined]
    if folder is None:
        return False
    source = Path(function.__code__.co_filename)
    pattern = f"{source.stem}.{function.__name__}-*.nbi"
    changed = source.stat().st_mtime
    return any(index.stat().st_mtime >= changed for index in Path(folder).glob(pattern))


def _writable(folder: Path) -> bool:
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return True
    except OSError:
        return False


def _choose_cache() -> bool:
    """Keep machine code beside the package, else in the user's cache folder, else nowhere."""
    if os.environ.get("NUMBA_CACHE_DIR") or _writable(Path(__file__).parent / "__pycache__"):
        return True
    root = os.environ.get("XDG_CACHE_HOME") or os.environ.get("LOCALAPPDATA")
    try:
        folder = (Path(root) if root else Path.home() / ".cache") / "roaddisp"
    except RuntimeError:
        return False
    if not _writable(folder):
        return False
    numba.config.CACHE_DIR = str(folder)
    return True


_CACHE: Final = _choose_cache()
