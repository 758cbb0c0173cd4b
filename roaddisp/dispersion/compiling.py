"""How numeric code is compiled: where the machine code is kept, and one call at a time.

numba keeps compiled functions on disk, and notices a change in a function's own
file but not in what it calls from another. The folder they are kept in therefore
bears the fingerprint of all sources of this package.
"""

from __future__ import annotations

import hashlib
import os
import tempfile
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
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
    return _jit(function)


def fast_compiled(function: Callable[P, T]) -> Callable[P, T]:
    """Compile on first use, with the rounding freedoms of `FAST`."""
    return _jit(function, fastmath=FAST)


def parallel_compiled(function: Callable[P, T]) -> Callable[P, T]:
    """As `fast_compiled`, for a function that shares its work among threads."""
    return _jit(function, fastmath=FAST, parallel=True)


def parallel_sums_compiled(function: Callable[P, T]) -> Callable[P, T]:
    """As `parallel_compiled`, and sums may be taken in an order that vectorises."""
    return _jit(function, fastmath=FAST | {"reassoc"}, parallel=True)


def _jit(function: Callable[P, T], **options: Any) -> Callable[P, T]:
    settings: Any = numba.config
    standing = settings.CACHE_DIR
    settings.CACHE_DIR = str(_FOLDER) if _FOLDER else standing
    try:
        made: Callable[P, T] = numba.njit(
            cache=_FOLDER is not None, error_model="numpy", nogil=True, **options
        )(function)
    finally:
        settings.CACHE_DIR = standing
    return made


@contextmanager
def using_threads(wanted: int | None) -> Iterator[None]:
    """Let compiled code of this thread share its work among so many threads.

    Parameters
    ----------
    wanted : int or None
        None leaves all that numba was started with; more than those are not to be had.

    Raises
    ------
    ValueError
        Where fewer than 1 are wanted.
    """
    if wanted is None:
        yield
        return
    if wanted < 1:
        raise ValueError(f"threads: {wanted}; allowed: 1 and more, or None for all")
    standing, settings = numba.get_num_threads(), vars(numba.config)
    numba.set_num_threads(min(wanted, int(settings["NUMBA_NUM_THREADS"])))
    try:
        yield
    finally:
        numba.set_num_threads(standing)


def is_kept(function: Callable[..., Any]) -> bool:
    """Whether machine code of a compiled function is at hand, in memory or on disk."""
    if function.signatures:  # type: ignore[attr-defined]
        return True
    if _FOLDER is None:
        return False
    module = function.__module__.rpartition(".")[2]
    return any(_FOLDER.rglob(f"{module}.{function.__name__}-*.nbi"))


def _writable(folder: Path) -> bool:
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return True
    except OSError:
        return False


def _fingerprint() -> str:
    digest = hashlib.sha256(numba.__version__.encode())
    for source in sorted(Path(__file__).parent.glob("*.py")):
        digest.update(source.read_bytes())
    return digest.hexdigest()[:16]


def _folder() -> Path | None:
    """Choose where machine code is kept; None where nothing can be written.

    As the user says, else beside the package, else in the user's cache folder.
    """
    candidates = [Path(__file__).parent / "__pycache__"]
    if wished := os.environ.get("NUMBA_CACHE_DIR"):
        candidates.insert(0, Path(wished))
    users = os.environ.get("XDG_CACHE_HOME") or os.environ.get("LOCALAPPDATA")
    if users:
        candidates.append(Path(users) / "roaddisp")
    elif home := os.environ.get("HOME"):
        candidates.append(Path(home) / ".cache" / "roaddisp")
    for candidate in candidates:
        folder = candidate / f"compiled-{_fingerprint()}"
        if _writable(folder):
            return folder
    return None


_FOLDER: Final = _folder()
