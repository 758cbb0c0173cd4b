"""The direction of imports: a room imports only from rooms listed above it."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "roaddisp"

FLOORS = [
    {"constants"},
    {"errors"},
    {"quantities"},
    {"model"},
    {"traffic"},
    {"emissions"},
    {"weather"},
    {"air"},
    {"geometry"},
    {"dispersion"},
    {"chemistry"},
    {"standards"},
    {"engine"},
    {"study"},
    {"pipeline"},
    {"analysis"},
    {"region"},
    {"outputs"},
    {"app"},
]
FLOOR = {room: number for number, rooms in enumerate(FLOORS) for room in rooms}

EXCEPTED = {("model", "outputs")}
"""`Result` imports outputs inside its calls (design, floor plan)."""

FRAMES = {
    "pandas": {"study", "outputs", "model"},
    "geopandas": {"study", "outputs"},
    "xarray": {"outputs", "model"},
    "matplotlib": {"outputs"},
    "rasterio": {"outputs"},
}


def room(path: Path) -> str:
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def imported(path: Path) -> set[str]:
    """Return dotted names of all that a module imports, wherever in it."""
    names: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: imports are written in full"
            names.add(node.module or "")
            names |= {f"{node.module}.{alias.name}" for alias in node.names}
    return names


MODULES = sorted(path for path in PACKAGE.rglob("*.py") if path != PACKAGE / "__init__.py")


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_a_room_imports_only_from_rooms_above_it(path: Path) -> None:
    here = room(path)
    assert here in FLOOR, f"{here} has no place in the floor plan"
    for name in imported(path):
        if not name.startswith("roaddisp."):
            continue
        there = name.split(".")[1]
        if there == "__version__" or (here, there) in EXCEPTED:
            continue
        assert FLOOR[there] <= FLOOR[here], f"{here} reaches down into {there}: {name}"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_frames_and_plots_stay_in_their_rooms(path: Path) -> None:
    top = {name.split(".")[0] for name in imported(path)}
    for library, rooms in FRAMES.items():
        assert library not in top or room(path) in rooms, f"{library} in {path}"


def test_modules_form_no_circle() -> None:
    """Within a room, too, imports run one way."""
    files = {
        "roaddisp." + ".".join(path.relative_to(PACKAGE).with_suffix("").parts): path
        for path in MODULES
    }
    graph = {
        name: {other for other in imported(path) if other in files and other != name}
        for name, path in files.items()
        if name != "roaddisp.model.result"
    }
    while graph:
        free = {name for name, others in graph.items() if not others & graph.keys()}
        assert free, f"a circle among {sorted(graph)}"
        for name in free:
            del graph[name]


def test_no_module_is_overlong() -> None:
    for path in MODULES:
        assert len(path.read_text(encoding="utf-8").splitlines()) <= 400, path
