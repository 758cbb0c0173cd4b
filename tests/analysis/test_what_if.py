"""Kept responses give what a run computes anew gives."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import h5py
import numpy as np
import pytest

import roaddisp as rd
from roaddisp.model import Network
from roaddisp.study.new import new_study

COLUMNS = ("nox_road_mean_ugm3", "no2_mean_ppb", "no2_1h_max_ppb", "no2_1h_p98_ppb")


@pytest.fixture(scope="module")
def study(tmp_path_factory: pytest.TempPathFactory) -> rd.Study:
    folder = tmp_path_factory.mktemp("kept")
    new_study(folder)
    return rd.read_study(folder)


@pytest.fixture(scope="module")
def kept(study: rd.Study):
    return rd.keep_responses(study)


def changed(study: rd.Study, **network: object) -> rd.Study:
    base = study.scenarios["base"]
    other = replace(base, network=replace(base.network, **network))
    return replace(study, scenarios={"base": other})


def busier(network: Network, factors: list[float]) -> np.ndarray:
    return network.aadt * np.array(factors)


def same(seen: rd.Result, expected: rd.Result) -> None:
    for column in COLUMNS:
        np.testing.assert_allclose(
            seen.summary[column], expected.summary[column], rtol=1e-5, err_msg=column
        )
    assert seen.worst is not None
    np.testing.assert_allclose(seen.worst.no2_1h_max_ppb, expected.worst.no2_1h_max_ppb, rtol=1e-5)
    assert [v.met for v in seen.verdicts] == [v.met for v in expected.verdicts]


def test_the_same_study_gives_the_same_run(study: rd.Study, kept) -> None:
    same(rd.run(study, responses=kept), rd.run(study))


def test_other_volumes_on_each_link_follow(study: rd.Study, kept) -> None:
    network = study.scenarios["base"].network
    other = changed(study, aadt=busier(network, [1.7, 0.4]))
    seen = rd.run(other, responses=kept)
    same(seen, rd.run(other))
    assert seen.record["responses"]["largest_change_of_release_height_m"] == 0.0


def test_another_background_follows(study: rd.Study, kept) -> None:
    base = study.scenarios["base"]
    air = replace(base.background, o3=base.background.o3 * 0.5, no2=base.background.no2 + 4.0)
    other = replace(study, scenarios={"base": replace(base, background=air)})
    same(rd.run(other, responses=kept), rd.run(other))


def test_another_fleet_follows_but_for_the_sources_height(study: rd.Study, kept) -> None:
    """The NOx is that of the new fleet; the record says how far its sources moved."""
    network = study.scenarios["base"].network
    other = changed(study, heavy_share=network.heavy_share + 0.05)
    seen, expected = rd.run(other, responses=kept), rd.run(other)
    moved = seen.record["responses"]["largest_change_of_release_height_m"]
    assert 0.01 < moved < 0.6
    ratio = seen.summary["nox_road_mean_ugm3"] / expected.summary["nox_road_mean_ugm3"]
    assert ((ratio - 1).abs() < 0.35).all()


def test_chosen_receptors_alone(study: rd.Study) -> None:
    part = rd.keep_responses(study, receptors=["classroom"])
    seen = rd.run(study, responses=part)
    whole = rd.run(study).summary.set_index("receptor")
    np.testing.assert_allclose(
        seen.summary.set_index("receptor").loc["classroom", list(COLUMNS)].to_numpy(dtype=float),
        whole.loc["classroom", list(COLUMNS)].to_numpy(dtype=float),
        rtol=1e-5,
    )
    with pytest.raises(ValueError, match="no receptor is called 'clasroom'"):
        rd.keep_responses(study, receptors=["clasroom"])


def test_groups_change_together_or_are_refused(study: rd.Study) -> None:
    """Links of one group share a profile and the height at which they feel the wind."""
    network = study.scenarios["base"].network
    alike = {"heavy_share": np.full(2, 0.06), "speed": np.full(2, network.speed[0])}
    even = changed(study, **alike)
    together = rd.keep_responses(even, groups=dict.fromkeys(network.link, "all"))
    assert together.basis.shape == (2, 2)
    both = changed(study, **alike, aadt=busier(network, [1.5, 1.5]))
    same(rd.run(both, responses=together), rd.run(both))
    for other in (changed(study, **alike, aadt=busier(network, [1.5, 1.0])), study):
        with pytest.raises(ValueError, match="no longer scale with the group"):
            rd.run(other, responses=together)
    with pytest.raises(ValueError, match="no group is named"):
        rd.keep_responses(study, groups={network.link[0]: "a"})


def test_contributions_of_links_add_up_to_the_roads_mean(study: rd.Study, kept) -> None:
    result = rd.run(study, responses=kept)
    shares = rd.link_contributions(study, kept)
    assert shares.shape == (2, len(study.scenarios["base"].network.link), len(result.summary))
    np.testing.assert_allclose(
        shares[0].sum(axis=0), result.summary["nox_road_mean_ugm3"], rtol=1e-5
    )
    alone = changed(study, aadt=study.scenarios["base"].network.aadt * np.array([1.0, 0.0]))
    np.testing.assert_allclose(shares[0, 0], rd.run(alone).summary["nox_road_mean_ugm3"], rtol=1e-4)


def test_a_file_keeps_them(study: rd.Study, kept, tmp_path: Path) -> None:
    path = tmp_path / "deep" / "responses.h5"
    rd.write_responses(kept, path)
    assert [entry.name for entry in path.parent.iterdir()] == ["responses.h5"]
    again = rd.read_responses(path)
    same(rd.run(study, responses=again), rd.run(study, responses=kept))
    assert again.fingerprint == kept.fingerprint


def test_what_does_not_fit_is_refused(study: rd.Study, kept, tmp_path: Path) -> None:
    network = study.scenarios["base"].network
    wider = changed(study, width=network.width + 1.0)
    with pytest.raises(rd.StudyError, match="not of this study") as caught:
        rd.run(wider, responses=kept)
    assert caught.value.problems[0].value == "other roads"
    path = tmp_path / "responses.h5"
    with pytest.raises(rd.StudyError, match="cannot be read"):
        rd.read_responses(path)
    path.write_bytes(b"not a file of responses")
    with pytest.raises(rd.StudyError, match="cannot be read"):
        rd.read_responses(path)
    rd.write_responses(kept, path)
    with h5py.File(path, "r+") as file:
        file.attrs["version"] = 99
    with pytest.raises(rd.StudyError, match="version 99"):
        rd.read_responses(path)
