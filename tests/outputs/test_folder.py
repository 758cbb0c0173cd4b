"""A result is written whole or not at all, and twice the same."""

from __future__ import annotations

import hashlib
import json
import os
import time
from pathlib import Path

import pytest

from roaddisp.errors import OutputError
from roaddisp.model import Result
from roaddisp.outputs import folder
from roaddisp.outputs.folder import write_result
from roaddisp.outputs.record import plain

FILES = [
    "hourly.nc",
    "map.png",
    "no2_mean_ugm3.tif",
    "receptors.csv",
    "receptors.parquet",
    "record.json",
    "study.gpkg",
]


@pytest.fixture
def light_files(monkeypatch: pytest.MonkeyPatch) -> None:
    """Stand-ins for the slow files, where a test is about the folder and not about them."""

    def write(result: Result, path: Path) -> None:
        path.write_text(f"{path.name} of {result.study.title}", encoding="utf-8")

    for name in ("write_geopackage", "write_netcdf", "write_map"):
        monkeypatch.setattr(folder, name, write)


def listing(out: Path) -> list[str]:
    return sorted(path.name for path in out.iterdir())


def contents(out: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in out.iterdir()}


def test_all_files_are_left_and_nothing_else(result: Result, tmp_path: Path) -> None:
    written = result.write(tmp_path / "deep" / "out")
    assert sorted(path.name for path in written) == FILES
    assert all(path.is_file() for path in written)
    assert listing(tmp_path / "deep" / "out") == FILES
    assert listing(tmp_path / "deep") == ["out"]


@pytest.mark.usefixtures("light_files")
def test_folder_has_the_rights_of_any_other(result: Result, tmp_path: Path) -> None:
    (tmp_path / "plain").mkdir()
    result.write(tmp_path / "out")
    assert (tmp_path / "out").stat().st_mode == (tmp_path / "plain").stat().st_mode


@pytest.mark.usefixtures("light_files")
def test_what_was_not_asked_for_is_not_left(make_result, tmp_path: Path) -> None:
    write_result(make_result(grid=False, kept=()), tmp_path / "out")
    assert listing(tmp_path / "out") == [
        name for name in FILES if name not in ("hourly.nc", "no2_mean_ugm3.tif")
    ]


def test_same_result_gives_the_same_bytes(
    make_result, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1700000000")
    write_result(make_result(), tmp_path / "a")
    time.sleep(1.1)
    write_result(make_result(), tmp_path / "b")
    first, second = contents(tmp_path / "a"), contents(tmp_path / "b")
    assert [name for name in FILES if first[name] != second[name]] == []


@pytest.mark.usefixtures("light_files")
def test_an_earlier_run_is_replaced_and_its_leftovers_go(make_result, tmp_path: Path) -> None:
    out = tmp_path / "out"
    write_result(make_result(), out)
    (out / "notes.txt").write_text("mine", encoding="utf-8")
    write_result(make_result(grid=False, kept=(), title="Another"), out)
    assert listing(out) == [
        "map.png", "notes.txt", "receptors.csv", "receptors.parquet", "record.json", "study.gpkg",
    ]  # fmt: skip
    assert json.loads((out / "record.json").read_text(encoding="utf-8"))["title"] == "Another"


@pytest.mark.parametrize(
    "record", [None, "{}", "not json", '["written_by"]', '{"written_by": "someone"}']
)
def test_files_that_are_not_ours_are_left_alone(
    result: Result, tmp_path: Path, record: str | None
) -> None:
    out = tmp_path / "out"
    out.mkdir()
    (out / "map.png").write_bytes(b"a photograph")
    if record is not None:
        (out / "record.json").write_text(record, encoding="utf-8")
    before = contents(out)
    with pytest.raises(OutputError, match=r"holds map\.png.*name another folder") as caught:
        write_result(result, out)
    assert str(out) in str(caught.value)
    assert contents(out) == before


@pytest.mark.usefixtures("light_files")
def test_a_record_cannot_point_out_of_its_folder(make_result, tmp_path: Path) -> None:
    out = tmp_path / "out"
    write_result(make_result(), out)
    (tmp_path / "precious.txt").write_text("keep", encoding="utf-8")
    record = json.loads((out / "record.json").read_text(encoding="utf-8"))
    record["outputs"] += [{"name": "../precious.txt"}, {"name": 7}, {"name": ".."}]
    (out / "record.json").write_text(json.dumps(record), encoding="utf-8")
    write_result(make_result(), out)
    assert (tmp_path / "precious.txt").exists()


@pytest.mark.parametrize("fault", [KeyboardInterrupt, RuntimeError, MemoryError])
@pytest.mark.parametrize("stage", ["write_csv", "write_map", "write_record"])
@pytest.mark.usefixtures("light_files")
def test_a_run_that_stops_leaves_no_trace(
    result: Result, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, fault, stage: str
) -> None:
    def stop(*_: object) -> None:
        raise fault

    monkeypatch.setattr(folder, stage, stop)
    with pytest.raises(fault):
        write_result(result, tmp_path / "out")
    assert listing(tmp_path) == []


@pytest.mark.parametrize("moves", [0, 1, 3, 7, 9, 12])
@pytest.mark.usefixtures("light_files")
def test_a_stop_while_files_change_places_puts_the_old_ones_back(
    make_result, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, moves: int
) -> None:
    out = tmp_path / "out"
    write_result(make_result(), out)
    before = contents(out)
    true_replace, count = Path.replace, [0]

    def replace(self: Path, target: Path) -> Path:
        if count[0] == moves:
            count[0] += 1
            raise KeyboardInterrupt
        count[0] += 1
        return true_replace(self, target)

    monkeypatch.setattr(Path, "replace", replace)
    with pytest.raises(KeyboardInterrupt):
        write_result(make_result(title="Another"), out)
    assert contents(out) == before


@pytest.mark.usefixtures("light_files")
def test_a_full_disk_is_told_with_the_path(
    result: Result, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(folder, "write_parquet", full)
    with pytest.raises(OutputError, match=r"out: .*No space left.*Mend") as caught:
        write_result(result, tmp_path / "out")
    assert isinstance(caught.value, OSError)
    assert listing(tmp_path) == []


def test_a_file_in_place_of_the_folder_is_told(result: Result, tmp_path: Path) -> None:
    (tmp_path / "out").write_text("a file", encoding="utf-8")
    with pytest.raises(OutputError, match="is a file, not a folder"):
        write_result(result, tmp_path / "out")
    with pytest.raises(OutputError, match="Mend"):
        write_result(result, tmp_path / "out" / "below")
    assert (tmp_path / "out").read_text(encoding="utf-8") == "a file"


def test_a_bad_date_stops_before_anything_is_written(
    result: Result, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "soon")
    with pytest.raises(OutputError, match="SOURCE_DATE_EPOCH"):
        write_result(result, tmp_path / "out")
    assert listing(tmp_path) == []


def test_record_lists_the_files_with_their_fingerprints(result: Result, tmp_path: Path) -> None:
    result.write(tmp_path / "out")
    text = (tmp_path / "out" / "record.json").read_text(encoding="utf-8")
    record = json.loads(text, parse_constant=lambda word: pytest.fail(f"{word} in the record"))
    listed = {entry["name"]: entry for entry in record["outputs"]}
    assert sorted(listed) == [name for name in FILES if name != "record.json"]
    for name, entry in listed.items():
        held = (tmp_path / "out" / name).read_bytes()
        assert entry["sha256"] == hashlib.sha256(held).hexdigest()
        assert entry["size"] == len(held)


def test_record_keeps_what_the_pipeline_said_and_adds_cautions(
    result: Result, tmp_path: Path
) -> None:
    result.write(tmp_path / "out")
    record = json.loads((tmp_path / "out" / "record.json").read_text(encoding="utf-8"))
    assert record["counts"]["calm hours"] == 3
    assert record["timings"] == {"all": 1.5, "never ran": None}
    assert any("licensed practitioner" in text for text in record["cautions"])
    assert any("Briggs" in text for text in record["cautions"])
    first = record["verdicts"][0]
    assert first["receptors"] == {"yes": 3, "no": 1, "undetermined": 1}
    assert first["worst_receptor"] == "edge"
    assert first["undetermined_because"] == {"calm hours in the worst direction": 1}
    assert first["provisional"] == "1 year of 3"


def test_what_has_no_plain_form_is_refused() -> None:
    with pytest.raises(TypeError, match="no plain form"):
        plain({"thing": object()})


@pytest.mark.skipif(os.geteuid() == 0, reason="root may write anywhere")
def test_a_folder_without_rights_is_told(result: Result, tmp_path: Path) -> None:
    locked = tmp_path / "locked"
    locked.mkdir(mode=0o500)
    with pytest.raises(OutputError, match="cannot be written"):
        write_result(result, locked / "out")
