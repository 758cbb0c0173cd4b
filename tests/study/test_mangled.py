"""Whatever bytes a study holds, reading it answers with a Study or with problems."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from roaddisp.errors import StudyError
from roaddisp.study.read import read_study

FILES = ["study.toml", "weather.csv", "air.csv", "points.csv", "mix.csv", "factors.csv",
         "profiles.csv", "roads.geojson"]  # fmt: skip

steady = settings(
    max_examples=25,
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow],
)


def answer(study: Any) -> None:
    """Read; only StudyError may come, and then with problems that say something."""
    problems = study.problems()
    assert all(problem.message for problem in problems)


@pytest.mark.parametrize("name", FILES)
@steady
@given(data=st.data())
def test_mangled_bytes_are_answered(study: Any, name: str, data: Any) -> None:
    path = study.path / name
    before = path.read_bytes()
    mangled = bytearray(before)
    for _ in range(data.draw(st.integers(1, 4))):
        at = data.draw(st.integers(0, max(len(mangled) - 1, 0)))
        how = data.draw(st.sampled_from(["flip", "cut", "insert", "repeat"]))
        if how == "flip":
            mangled[at : at + 1] = bytes([data.draw(st.integers(0, 255))])
        elif how == "cut":
            del mangled[at : at + data.draw(st.integers(1, 60))]
        elif how == "insert":
            mangled[at:at] = data.draw(st.binary(max_size=12))
        else:
            mangled[at:at] = mangled[at : at + data.draw(st.integers(1, 80))]
    path.write_bytes(bytes(mangled))
    try:
        answer(study)
    finally:
        path.write_bytes(before)


@steady
@given(
    words=st.recursive(
        st.one_of(st.booleans(), st.integers(), st.floats(), st.text(max_size=8)).map(repr)
        .map(lambda each: each.replace("'", '"').replace("True", "true").replace("False", "false")),
        lambda inner: st.lists(inner, max_size=3).map(lambda each: f"[{', '.join(each)}]"),
        max_leaves=4,
    ),
    key=st.sampled_from(["study.crs", "study.title", "roads.file", "roads.columns", "roads.layer",
                         "traffic.columns.profiles", "air.constant", "receptors.grid",
                         "receptors.grid.spacing", "standards.use", "outputs.hourly",
                         "fleet.year", "scenario", "scenario.a", "scenario.a.roads",
                         "scenario.a.air.constant.o3", "weather.hour_ending", "study"]),
)  # fmt: skip
def test_any_value_of_a_key_is_answered(study: Any, words: str, key: str) -> None:
    table, _, rest = key.partition(".")
    text = study.text("study.toml")
    lines = [line for line in text.splitlines() if not (rest and line.startswith(f"{rest} ="))]
    changed = "\n".join(lines)
    if rest and f"[{table}]" in changed:
        changed = changed.replace(f"[{table}]", f"[{table}]\n{rest} = {words}")
    else:
        changed = f"{key} = {words}\n{changed}"
    study.write("study.toml", changed)
    try:
        answer(study)
    finally:
        study.write("study.toml", text)


@pytest.mark.parametrize(
    "content",
    [
        b"x = " + b"[" * 50_000,
        b"x = " + b"[" * 5_000 + b"]" * 5_000,
        b"a" + b".a" * 20_000 + b" = 1",
        b"x = " + b"9" * 10_000,
        b"\xff\xfe",
        b"",
        b'[scenario]\n"" = {}',
        b"[[study]]\ntitle = 'x'\n[[study]]",
        b"'' = 1\n\"a\\nb\" = 2",
    ],
)
def test_hostile_settings_are_answered(study: Any, content: bytes) -> None:
    study.write("study.toml", content)
    with pytest.raises(StudyError):
        read_study(study.path)


@pytest.mark.parametrize(
    ("name", "content"),
    [
        ("roads.geojson", b'{"type":"FeatureCollection","features":' + b"[" * 100_000),
        ("roads.geojson", b'{"type":"Topology","objects":{}}'),
        ("roads.geojson", b'{"type":"FeatureCollection","features":[]}'),
        ("roads.geojson", b'<?xml version="1.0"?><!DOCTYPE a [<!ENTITY b "c">]><a>&b;</a>'),
        ("roads.geojson", b"PK\x03\x04" + bytes(200)),
        ("roads.gpkg", b"PK\x03\x04" + bytes(200)),
        ("roads.fgb", b"fgb\x03fgb\x00" + b"\xff" * 300),
        ("roads.shp", b"\x00\x00\x27\x0a" + b"\xff" * 300),
        ("roads.zip", b"PK\x03\x04" + bytes(200)),
    ],
)  # fmt: skip
def test_hostile_layers_are_answered(study: Any, name: str, content: bytes) -> None:
    study.write(name, content)
    if name != "roads.geojson":
        study.edit("study.toml", '"roads.geojson"', f'"{name}"')
    if name.endswith(".shp"):
        study.write("roads.shx", content)
        study.write("roads.dbf", content)
    assert any(problem.file == name for problem in study.errors())
