"""A good study becomes a Scenario in SI, on one clock."""

from __future__ import annotations

import hashlib
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from roaddisp.study.read import read_study


def test_worked_days_are_read(worked_days: Path) -> None:
    """Values of the folder's own files, by eye."""
    study = read_study(worked_days / "study.toml")
    base = study.scenarios["base"]
    assert study.crs == "EPSG:25833"
    assert study.cautions == ()
    assert base.network.link == ("main", "side")
    assert base.network.width.tolist() == [14.4, 7.2]
    assert base.network.speed == pytest.approx([80 / 3.6, 50 / 3.6], rel=1e-12)
    assert base.network.heavy_share == pytest.approx([0.10, 0.04], rel=1e-12)
    assert base.receptors.receptor == ("yard", "gate", "far")
    assert base.options.reference == "20 C"
    assert base.options.ugm3_per_ppb == 1.9125
    assert base.options.calms == "leave-out"
    # 48 hours of standard time; the civil clock skips 02:00 on 26 March 2023
    assert base.clock.standard.size == 48
    civil = [str(hour) for hour in base.clock.civil[25:27]]
    assert civil == ["2023-03-26T01:00", "2023-03-26T03:00"]
    assert base.station.temperature[0] == pytest.approx(282.15)
    assert base.background.o3[:2].tolist() == [17.4, 15.0]
    assert base.background.no is None
    # Berlin: the roads' middle lies near 52.52 N, 13.38 E
    assert base.station.latitude == pytest.approx(52.52, abs=0.01)
    assert base.station.longitude == pytest.approx(13.38, abs=0.01)


def test_folder_and_file_name_the_same_study(study: Any) -> None:
    by_file = read_study(str(study.path / "study.toml"))
    assert by_file.path == study.read().path
    assert by_file.folder == study.path.resolve()


def test_files_have_their_fingerprints(study: Any) -> None:
    files = {each.role: each for each in study.base().files}
    assert list(files) == [
        "settings", "roads", "profiles", "mix", "factors", "weather", "air", "points",
    ]  # fmt: skip
    content = (study.path / "air.csv").read_bytes()
    assert files["air"].sha256 == hashlib.sha256(content).hexdigest()
    assert files["air"].size == len(content)


def test_settings_are_kept_with_defaults_as_text(study: Any) -> None:
    settings = study.base().settings
    assert settings["weather"]["wind_floor"] == "1 m/s"
    assert settings["conversion"] == {"method": "ozone-limited"}
    assert settings["roads"]["columns"]["speed"] == "SPD [km/h]"


def test_utm_zone_is_the_default_crs(study: Any) -> None:
    """13.4 deg E lies in UTM zone 33, whose central meridian is 15 deg E."""
    study.edit("study.toml", 'crs = "EPSG:25833"\n', "")
    read = study.read()
    assert read.crs == "EPSG:32633"


@pytest.mark.parametrize(
    ("columns", "width"),
    [({"WID": None, "lanes": 4}, 14.4), ({"WID": None}, 7.2), ({"WID": 9.5, "lanes": 4}, 9.5)],
)
def test_width_is_given_or_of_lanes_or_of_two(
    study: Any, columns: dict[str, object], width: float
) -> None:
    """3.6 m a lane, the 12 ft lane of road design (common practice, no source)."""
    changed = [(name, line, {**given, **columns}) for name, line, given in study.links]
    study.write("roads.geojson", study.geojson(changed))
    assert study.base().network.width.tolist() == [width, width]


def test_scenario_overrides_keys_dotted_or_nested(study: Any) -> None:
    """Keys laid over the base keep its other keys; a table in braces replaces it."""
    study.add(
        '[scenario.dotted]\nweather.calms = "leave-out"\n'
        '[scenario.nested.weather]\ncalms = "worst-direction"\n'
        '[scenario.whole]\nair = { constant = { o3 = "60 ug/m3", no2 = "19.125 ug/m3" } }\n'
        '[scenario.turned]\nair.constant = { o3 = "0.03 ppm", no2 = "9 ppb", nox = "12 ppb" }\n'
    )
    read = study.read()
    assert list(read.scenarios) == ["base", "dotted", "nested", "whole", "turned"]
    assert read.scenarios["dotted"].options.calms == "leave-out"
    assert read.scenarios["dotted"].settings["weather"]["clock"] == "standard"
    assert read.scenarios["nested"].options.calms == "worst-direction"
    whole = read.scenarios["whole"]
    # 1.9953 and 1.9125 ug/m3 in one ppb at 20 C (methods dossier 3.7)
    assert whole.background.o3 == pytest.approx(np.full(48, 60 / 1.9953), rel=1e-4)
    assert whole.background.no2 == pytest.approx(np.full(48, 10.0), rel=1e-12)
    assert whole.settings["air"]["clock"] == "local"
    turned = read.scenarios["turned"].background
    assert turned.no is not None
    assert [turned.o3[0], turned.no2[0], turned.no[0]] == pytest.approx([30.0, 9.0, 3.0])


def test_scenarios_share_grid_and_default_crs(study: Any) -> None:
    """The grid and the UTM zone follow the roads of all scenarios."""
    longer = [*study.links, ("new", [(391000, 5820200), (391400, 5820300)], study.links[0][2])]
    study.write("roads_build.geojson", study.geojson(longer))
    study.edit("study.toml", 'height = "1.5 m"', 'grid = { spacing = "100 m", within = "300 m" }')
    alone = study.base().receptors.grid
    study.add('[scenario.build]\nroads.file = "roads_build.geojson"\n')
    read = study.read()
    base, build = read.scenarios["base"].receptors, read.scenarios["build"].receptors
    assert base.grid == build.grid
    assert base.receptor == build.receptor
    assert base.grid.columns > alone.columns
    assert build.on_road.sum() >= base.on_road.sum()


def test_columns_of_a_section_with_several_files(study: Any) -> None:
    """A mapping holds for every file of the section, or for one under its key."""
    study.edit("mix.csv", "vehicle_class", "KLASS")
    study.edit("factors.csv", "vehicle_class,speed [km/h]", "KLASS,KMH")
    study.edit(
        "study.toml", 'mix = "mix.csv"',
        'mix = "mix.csv"\ncolumns = { vehicle_class = "KLASS", factors.vehicle_class = "KLASS", '
        'factors.speed = "KMH [km/h]" }',
    )  # fmt: skip
    base = study.base()
    assert base.fleet.classes == ("car", "van", "rigid_truck")
    assert base.factors.heavy.tolist() == [False, False, True]
    study.edit("study.toml", '{ vehicle_class = "KLASS"', '{ group = "GRP"')
    study.edit("mix.csv", "KLASS", "vehicle_class")
    (problem,) = study.errors()
    assert problem.message == "fleet.columns: no file of the section has this column"


def test_factors_of_the_nearest_year(study: Any) -> None:
    rows = study.text("factors.csv").splitlines()
    years = [f"{row},{year}" for year in (2020, 2025) for row in rows[1:]]
    study.write("factors.csv", "\n".join([rows[0] + ",year", *years]) + "\n")
    (caution,) = study.problems()
    assert caution.message == "no factors for 2023: those of 2025 are taken"
    base = study.base()
    assert base.factors.year == 2025
    assert base.options.year == 2023
    study.edit("study.toml", "year = 2023\n", "")
    assert study.base().options.year == 2025


def test_built_in_factors_are_marked(study: Any) -> None:
    study.edit("study.toml", '"factors.csv"', '"built-in"')
    (caution,) = study.problems()
    assert "the built-in factors are for screening" in caution.message
    assert study.base().factors.built_in


def test_own_class_declares_its_group(study: Any) -> None:
    study.edit("factors.csv", "rigid_truck,30", "coach,30")
    study.edit("factors.csv", "rigid_truck,100", "coach,100")
    study.edit("mix.csv", "rigid_truck", "coach")
    rows = study.text("factors.csv").splitlines()
    with_group = [row + (",heavy" if "coach" in row else ",") for row in rows[1:]]
    study.write("factors.csv", "\n".join([rows[0] + ",group", *with_group]) + "\n")
    assert study.base().factors.heavy.tolist() == [False, False, True]


def test_without_a_mix_heavy_share_is_needed(study: Any) -> None:
    study.edit("study.toml", 'mix = "mix.csv"\n', "")
    study.write("factors.csv", study.text("factors.csv").replace("rigid", "articulated"))
    base = study.base()
    assert base.fleet.classes == ("car", "articulated_truck")
    changed = [(name, line, {**given, "HGV": None}) for name, line, given in study.links]
    study.write("roads.geojson", study.geojson(changed))
    (problem,) = study.errors()
    assert problem.message == "a link without heavy_share, in a study without a mix"
    assert problem.count == 2


def test_particular_rows_of_a_profile_come_first(study: Any) -> None:
    """Month before none, day type before all; day factors go with them."""
    rows = ["profile,day_type,hour,share,month,day_factor"]
    for day, month, peak in (("all", "", 3), ("weekday", "", 8), ("all", 7, 11), ("sunday", 7, 14)):
        for hour in range(24):
            share = 0.54 if hour == peak else 0.02
            rows.append(f"town,{day},{hour},{share},{month},1")
    study.write("profiles.csv", "\n".join(rows) + "\n")
    peaks = study.base().profiles.share[0].argmax(axis=-1)
    assert peaks[0].tolist() == [8, 3, 3]  # January: weekday, saturday, sunday
    assert peaks[6].tolist() == [11, 11, 14]  # July


def test_counts_stand_in_for_volumes(study: Any) -> None:
    """Counted links take counts, the others their AADT; classes that never run are zero."""
    study.edit("study.toml", 'profiles = "profiles.csv"',
               'profiles = "profiles.csv"\ncounts = "counts.csv"\nclock = "standard"')  # fmt: skip
    rows = ["link,time,vehicle_class,vehicles,speed [km/h]"]
    for n, time in enumerate(study.hours(48)):
        rows.append(f"main,{time},car,{1000 + n},{60 + n % 3}")
        if n != 5:
            rows.append(f"main,{time},rigid_truck,{100 + n},{60 + n % 3}")
    study.write("counts.csv", "\n".join(rows) + "\n")
    base = study.base()
    assert np.isnan(base.network.aadt[0])
    assert base.network.aadt[1] == 9000
    counts = base.counts
    assert counts.classes == ("car", "rigid_truck")
    assert counts.vehicles.shape == (2, 2, 48)
    assert counts.vehicles[0, 0, 7] == 1007
    assert np.isnan(counts.vehicles[0, 1, 5])
    assert np.isnan(counts.vehicles[1]).all()
    assert counts.speed[0, 4] == pytest.approx(61 / 3.6)
    assert counts.speed[1, 4] == pytest.approx(50 / 3.6)
    messages = [problem.message for problem in study.problems()]
    assert messages == [
        "links with AADT and counts: the counts are taken",
        "hours without a count: 1 of 48 hours of the links counted",
    ]


def test_counts_alone_must_be_of_every_link(study: Any) -> None:
    study.edit("study.toml", 'profiles = "profiles.csv"', 'counts = "counts.csv"')
    rows = [f"{link},{time},50" for link in ("main", "side") for time in study.hours(48)]
    study.write("counts.csv", "\n".join(["link,time,vehicles", *rows]) + "\n")
    base = study.base()
    assert base.profiles is None
    assert base.counts.classes is None
    assert base.counts.vehicles.shape == (2, 48)
    study.write("counts.csv", "\n".join(["link,time,vehicles", *rows[:48]]) + "\n")
    (problem,) = study.errors()
    assert problem.message == "a link without counts, in a study without profiles"
    assert problem.value == "side"


def test_gaps_and_empty_cells_are_missing_hours(study: Any) -> None:
    """A missing row, an empty cloud and an empty ceiling: missing, missing, no ceiling."""
    lines = study.text("weather.csv").splitlines()
    head = lines[0].replace("stability", "cloud [oktas],ceiling [ft]")
    rows = [line.rsplit(",", 1)[0] + ",4,2000" for line in lines[1:]]
    rows[3] = rows[3].replace(",4,2000", ",,2000")
    rows[4] = rows[4].replace(",4,2000", ",4,")
    del rows[10]
    study.write("weather.csv", "\n".join([head, *rows]) + "\n")
    station = study.base().station
    assert station.stability is None
    assert np.flatnonzero(np.isnan(station.cloud)).tolist() == [3, 10]
    assert station.cloud[0] == 5.0  # four oktas are half a sky
    assert station.ceiling[0] == pytest.approx(609.6)
    assert np.flatnonzero(np.isinf(station.ceiling)).tolist() == [4, 10]
    messages = [problem.message for problem in study.problems()]
    assert messages == [
        "a row is missing in 1 of 48 hours",
        "cloud is missing in 1 of 48 hours",
    ]


def test_small_negatives_of_a_monitor_are_zero(study: Any) -> None:
    study.edit("air.csv", "2023-03-01T00:00,20.5,8.25", "2023-03-01T00:00,-1.5,8.25")
    (caution,) = study.problems()
    assert "o3 below zero" in caution.message
    assert caution.place == "row 1, line 2, column 'o3 [ppb]'"
    assert study.base().background.o3[0] == 0.0


def test_air_that_ends_early_is_missing(study: Any) -> None:
    study.write("air.csv", study.air(study.hours(40)))
    messages = [problem.message for problem in study.problems()]
    assert messages == ["o3 is missing in 8 of 48 hours", "no2 is missing in 8 of 48 hours"]
    assert np.isnan(study.base().background.o3[40:]).all()


def test_air_keeps_its_own_reference(study: Any) -> None:
    """1.8804 ug/m3 of NO2 in one ppb at 25 C (40 CFR 50.3), whatever the study's state."""
    study.edit("air.csv", "no2 [ppb]", "no2 [ug/m3]")
    study.edit("study.toml", 'file = "air.csv"', 'file = "air.csv"\nreference = "25 C"')
    assert study.base().background.no2[0] == pytest.approx(8.25 / 1.8804, rel=1e-9)


def test_receptors_on_the_road_and_above_the_lid_are_cautions(study: Any) -> None:
    study.write(
        "points.csv",
        "receptor,height [ft],longitude,latitude\n"
        "lane,,13.37900,52.51800\nyard,100,13.379,52.5195\n",
    )
    lane = read_study(study.path).scenarios["base"].receptors
    assert lane.z == pytest.approx([1.5, 30.48])
    lines = study.text("weather.csv").splitlines()
    rows = [f"{line},{25 if n == 9 else ''}" for n, line in enumerate(lines[1:])]
    study.write("weather.csv", "\n".join([lines[0] + ",mixing_height [m]", *rows]) + "\n")
    study.edit("points.csv", "13.37900,52.51800", "13.3745,52.5181")
    messages = " ".join(problem.message for problem in study.problems())
    assert "above the lid in some hours" in messages


def test_far_receptors_are_doubted(study: Any) -> None:
    study.edit("points.csv", "390000,5820060", "390000,5890060")
    study.edit("points.csv", "390080,5820095", "390080,5890095")
    (caution,) = study.problems()
    assert caution.message == "receptors: roads and receptors do not overlap"


def test_notes_above_a_header_and_a_mark_of_byte_order(study: Any) -> None:
    study.write("mix.csv", b"\xef\xbb\xbf# a note\n\n" + (study.path / "mix.csv").read_bytes())
    assert study.problems() == ()
    study.edit("mix.csv", "0.85", "0.x5")
    (problem,) = study.errors()
    assert problem.place == "row 1, line 4, column 'share'"


def test_near_misses_of_optional_columns_are_doubted(study: Any) -> None:
    study.edit("points.csv", "kind", "Kind")
    (caution,) = study.problems()
    assert caution.message == "a column that is not read"
    assert caution.mend == "did you mean 'kind'? (case matters)"


def test_link_out_of_the_folder_is_refused(study: Any, tmp_path_factory: Any) -> None:
    elsewhere = tmp_path_factory.mktemp("elsewhere") / "air.csv"
    elsewhere.write_text(study.text("air.csv"))
    (study.path / "air.csv").unlink()
    (study.path / "air.csv").symlink_to(elsewhere)
    (problem,) = study.errors()
    assert problem.message == "the path leads out of the study folder (by a link)"


def test_sites_give_their_outline_and_inside(study: Any) -> None:
    """A square of 60 m: 12 points around, and those of the 20 m grid inside."""
    x, y = 390010.0, 5820210.0
    ring = [(x, y), (x + 60, y), (x + 60, y + 60), (x, y + 60), (x, y)]
    shape = {"type": "Polygon", "coordinates": [ring]}
    study.write("sites.geojson", study.geojson([("school", shape, {"kind": "playground"})], "site"))
    study.edit(
        "study.toml", 'points = "points.csv"', 'points = "points.csv"\nsites = "sites.geojson"'
    )
    receptors = study.base().receptors
    assert receptors.receptor[:4] == ("yard", "gate", "school-1", "school-2")
    assert len(receptors) == 2 + 12 + 9
    assert receptors.site[2:] == ("school",) * 21
    assert receptors.x[2:4].tolist() == [390010.0, 390030.0]
    assert receptors.x[14] % 20 == 0
    assert study.base().sites[0].site == "school"
