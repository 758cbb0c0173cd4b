"""Shapes, sums, windows and refusals of the response table."""

from __future__ import annotations

import threading

import numba
import numpy as np
import pytest

from roaddisp.dispersion import compiling, kernel
from roaddisp.dispersion.kernel import needs_compiling, response_table, windowed_table
from roaddisp.dispersion.lids import lid_is_felt
from roaddisp.dispersion.reference import unit_concentration

RANDOM = np.random.default_rng(7)
SEGMENTS = np.stack([RANDOM.uniform(-500, 500, (9, 2)), RANDOM.uniform(-500, 500, (9, 2))], axis=1)
RECEPTORS = np.column_stack([RANDOM.uniform(-700, 700, (70, 2)), RANDOM.uniform(0, 9, 70)])
STATES = {"wind_from": [20.0, 145.0, 260.0, 333.0], "stability": list("AFDC")}
STRENGTH = RANDOM.uniform(0.1, 2.0, 9)
GROUP = np.array([0, 2, 2, 0, 3, 0, 2, 3, 3])


def table(**changes):
    arguments = {
        **STATES,
        "strength": STRENGTH,
        "group": GROUP,
        "sigma_y0": 2.5,
        "terrain": "urban",
    } | changes
    return response_table(
        arguments.pop("receptors", RECEPTORS), arguments.pop("segments", SEGMENTS), **arguments
    )


def test_values_are_sums_over_groups_of_strength_times_concentration():
    """1e-3 is the accuracy promised; an empty group is zero."""
    made = table()
    assert made.shape == (4, 4, 70)
    assert made.dtype == np.float32
    for state, (direction, letter) in enumerate(zip(*STATES.values(), strict=True)):
        exact = STRENGTH * unit_concentration(
            RECEPTORS, SEGMENTS, wind_from=direction, wind_speed=1.0, stability=letter,
            terrain="urban", sigma_y0=2.5,
        )  # fmt: skip
        for group in range(4):
            expected = exact[:, group == GROUP].sum(axis=1)
            gap = np.abs(made[state, group] - expected)
            assert np.all(gap <= 1e-3 * np.maximum(expected, 1e-4))


def test_tracers_are_carried_side_by_side():
    both = table(strength=np.stack([STRENGTH, 0.3 * STRENGTH]))
    assert both.shape == (4, 2, 4, 70)
    assert np.array_equal(both[:, 0], table())
    assert both[:, 1] == pytest.approx(0.3 * both[:, 0], rel=1e-5)


def test_doubling_strength_doubles_the_table():
    assert table(strength=2.0 * STRENGTH) == pytest.approx(2.0 * table(), rel=1e-5)


def test_order_of_receptors_does_not_matter():
    order = np.random.default_rng(1).permutation(70)
    assert table(receptors=RECEPTORS[order]) == pytest.approx(table()[..., order], rel=2e-5)


@pytest.mark.parametrize("threads", [1, 2, 99])
def test_same_bytes_whatever_the_number_of_threads(threads):
    standing = numba.get_num_threads()
    assert table(threads=threads).tobytes() == table().tobytes()
    assert numba.get_num_threads() == standing


def test_no_threads_are_refused():
    with pytest.raises(ValueError, match="threads: 0; allowed: 1 and more"):
        table(threads=0)


@pytest.mark.parametrize(("pairs", "blocks"), [(1, 1), (1000, 1), (1000, 2), (10**9, 8)])
def test_same_bytes_however_the_work_is_parted(pairs, blocks, monkeypatch):
    expected = table().tobytes()
    monkeypatch.setattr(kernel, "PAIRS_AT_ONCE", pairs)
    monkeypatch.setattr(kernel, "BLOCKS_TOGETHER", blocks)
    assert table().tobytes() == expected


@pytest.mark.parametrize("states", [6, 216, 1862])
@pytest.mark.parametrize("receptors", [10_000, 100_000])
def test_a_call_is_short_enough_to_be_stopped_within_a_second(receptors, states):
    """20 ns a pair and state is three times what a pair takes."""
    parts = list(kernel._parts(receptors, 1024, 500, states))
    longest = max((b1 - b0) * 1024 * (s1 - s0) * states for b0, b1, s0, s1 in parts)
    assert longest * 20e-9 < 1.0
    done = sum((b1 - b0) * (s1 - s0) for b0, b1, s0, s1 in parts)
    assert done == -(-receptors // 1024) * 500


def test_a_stopped_call_leaves_the_next_one_free(monkeypatch):
    def stop(*_):
        raise KeyboardInterrupt

    expected, standing = table(), numba.get_num_threads()
    with monkeypatch.context() as patch:
        patch.setattr(kernel.stages, "fill_table", stop)
        with pytest.raises(KeyboardInterrupt):
            table(threads=1)
    assert numba.get_num_threads() == standing
    assert np.array_equal(table(), expected)


def test_calls_from_several_threads_give_the_same():
    expected, made = table().tobytes(), []
    callers = [threading.Thread(target=lambda: made.append(table().tobytes())) for _ in range(4)]
    for caller in callers:
        caller.start()
    for caller in callers:
        caller.join()
    assert made == [expected] * 4


def test_mixing_height_goes_with_the_state():
    per_state = table(mixing_height=[np.inf, 60.0, 90.0, np.inf])
    assert np.array_equal(per_state[[0, 3]], table()[[0, 3]])
    assert np.array_equal(per_state[1], table(mixing_height=60.0)[1])


def test_above_the_lid_nothing_is_received_or_given():
    high = np.array([[0.0, 0.0, 61.0]])
    assert not table(receptors=high, mixing_height=60.0).any()
    assert not table(height=61.0, mixing_height=60.0).any()


def test_a_segment_without_length_gives_nothing():
    still = SEGMENTS.copy()
    still[4, 1] = still[4, 0]
    assert table(segments=still)[:, 0] == pytest.approx(table()[:, 0])
    without = np.delete(np.arange(9), 4)
    assert np.array_equal(
        table(segments=still),
        table(segments=SEGMENTS[without], strength=STRENGTH[without], group=GROUP[without]),
    )


def test_empty_input_gives_an_empty_table():
    assert table(receptors=np.zeros((0, 3))).shape == (4, 4, 0)
    assert table(segments=np.zeros((0, 2, 2)), strength=[], group=[]).shape == (4, 0, 70)


def windowed(near, far, **changes):
    ones = np.ones(9)
    arguments = {
        "wind_from": np.array(STATES["wind_from"]),
        "stability_codes": np.array([0, 5, 3, 2]),
        "strength": STRENGTH[None],
        "group": GROUP,
        "n_groups": 4,
        "terrain": "urban",
        "height": 1.3 * ones,
        "sigma_z0": 1.2 * ones,
        "sigma_y0": 2.5 * ones,
        "mixing_height": np.full(4, np.inf),
        "piece": SEGMENTS,
        "near": near * ones,
        "far": far * ones,
    } | changes
    return windowed_table(RECEPTORS, SEGMENTS, **arguments)[:, 0]


def test_windows_share_out_the_receptors():
    """Two windows that meet hold every receptor once."""
    assert np.array_equal(windowed(0.0, np.inf), table())
    assert windowed(0.0, 150.0) + windowed(150.0, np.inf) == pytest.approx(table(), rel=1e-5)
    assert np.any(windowed(0.0, 150.0) != table())


def test_the_window_is_taken_from_the_piece():
    far_off = np.tile([[[9e4, 9e4], [9e4, 9.1e4]]], (9, 1, 1))
    assert not windowed(0.0, 5e4, piece=far_off).any()
    assert np.array_equal(windowed(5e4, np.inf, piece=far_off), table())


LIDS = np.array([60.0, 8.0, np.inf, 130.0])


@pytest.mark.parametrize("terrain", ["open", "urban"])
def test_the_change_that_lids_make(terrain):
    """Free sums and change make the table under lids; 8 m leaves a receptor above."""
    free = windowed(0.0, np.inf, terrain=terrain)
    change = windowed(0.0, np.inf, terrain=terrain, mixing_height=LIDS, touched_only=True)
    under = windowed(0.0, np.inf, terrain=terrain, mixing_height=LIDS)
    assert not change[2].any()
    assert change[[0, 1, 3]].any(axis=(1, 2)).all()
    gap = np.abs(free + change - under)
    assert np.all(gap <= 2e-6 * (np.abs(free) + np.abs(under)))


def test_pairs_that_feel_no_lid_change_by_nothing():
    change = windowed(0.0, np.inf, mixing_height=np.full(4, 120.0), touched_only=True)
    free, under = table(), table(mixing_height=120.0)
    still = change == 0.0
    assert np.array_equal(free[still], under[still])
    assert 0.1 < still.mean() < 0.99


def test_above_the_lid_the_change_takes_all_away():
    low = {"mixing_height": np.full(4, 1.0), "touched_only": True}
    assert np.array_equal(windowed(0.0, np.inf, **low), -table())


@pytest.mark.parametrize("terrain", ["open", "urban"])
def test_a_lid_said_not_to_be_felt_changes_nothing(terrain):
    farthest = 2000.0  # no receptor and segment are farther apart
    codes, lid = np.repeat(np.arange(6), 40), np.tile(np.geomspace(5.0, 5000.0, 40), 6)
    felt = lid_is_felt(
        codes, lid, terrain=terrain, sigma_z0=1.2, heights=1.3,
        receptor_z=RECEPTORS[:, 2], farthest=farthest,
    )  # fmt: skip
    change = windowed(
        0.0, np.inf, terrain=terrain, wind_from=np.full(240, 145.0), stability_codes=codes,
        mixing_height=lid, touched_only=True,
    ).any(axis=(1, 2))  # fmt: skip
    assert not change[~felt].any()
    assert change.sum() > 0.6 * felt.sum()


def test_spread_across_the_segment_alone():
    """With the wind along a segment the plume gets all of it, across none."""
    line = np.array([[[0.0, -300.0], [0.0, 300.0]]])
    at = np.array([[25.0, 310.0, 1.5]])
    one = np.ones(1)

    def value(direction, spread, **changes):
        return windowed_table(
            at, line, wind_from=direction * one, stability_codes=np.array([4]),
            strength=np.ones((1, 1)), group=np.array([0]), n_groups=1, terrain="open",
            height=1.3 * one, sigma_z0=1.2 * one, sigma_y0=spread * one,
            mixing_height=np.inf * one, piece=line, near=0 * one, far=np.inf * one, **changes,
        )[0, 0, 0, 0]  # fmt: skip

    assert value(180.0, 6.0, across_only=True) == value(180.0, 6.0)
    assert value(270.0, 6.0, across_only=True) == pytest.approx(value(270.0, 0.0), rel=1e-5)
    assert value(270.0, 6.0) > 1.5 * value(270.0, 0.0)
    assert value(240.0, 6.0, across_only=True) == pytest.approx(value(240.0, 3.0), rel=1e-5)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"stability": list("AFD")}, "stability: 3 values; allowed: one for each of the 4"),
        ({"stability": list("AFDX")}, r"stability\[3\]: 'X'; allowed: one of A, B, C, D, E, F"),
        ({"wind_from": [[1.0]]}, r"wind_from: shape \(1, 1\); allowed: \(W,\)"),
        ({"strength": np.ones(8)}, r"strength: shape \(8,\); allowed: \(9,\) or \(K, 9\)"),
        ({"strength": np.full(9, np.nan)}, r"strength\[0\]: nan; allowed: a finite number"),
        ({"group": np.zeros(8)}, r"group: shape \(8,\); allowed: \(9,\)"),
        ({"group": np.full(9, -1)}, "group: -1; allowed: whole numbers from 0"),
        ({"group": np.full(9, 0.5)}, "group: 0.5; allowed: whole numbers from 0"),
        ({"mixing_height": [60.0, 70.0]}, r"mixing_height: shape \(2,\); allowed"),
        ({"sigma_z0": 0.0}, "sigma_z0: 0; allowed: above 0"),
        ({"terrain": "rural"}, "terrain: 'rural'; allowed: 'open', 'urban'"),
    ],
)
def test_arguments_out_of_range_are_refused(changes, message):
    with pytest.raises(ValueError, match=message):
        table(**changes)


def test_a_receptor_on_a_line_without_width_is_refused_by_name():
    middle = np.append(SEGMENTS[3].mean(axis=0), 1.5)
    with pytest.raises(ValueError, match=r"receptors\[0\] lies on segments\[3\] in plan"):
        table(receptors=[middle], sigma_y0=0.0)


def test_internal_codes_are_checked():
    with pytest.raises(ValueError, match="stability_codes: from 0 to 6; allowed: 0 to 5"):
        windowed(0.0, np.inf, stability_codes=np.array([0, 6, 1, 2]))
    with pytest.raises(ValueError, match="group: from 0 to 3; allowed: 0 to 1"):
        windowed(0.0, np.inf, n_groups=2)


def test_compiled_code_is_kept():
    table()
    assert not needs_compiling()


def test_a_read_only_installation_keeps_compiled_code_with_the_user(monkeypatch, tmp_path):
    monkeypatch.delenv("NUMBA_CACHE_DIR", raising=False)
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path))
    monkeypatch.setattr(compiling, "_writable", lambda folder: tmp_path in folder.parents)
    assert compiling._folder().parent == tmp_path / "roaddisp"
    monkeypatch.setattr(compiling, "_writable", lambda _: False)
    assert compiling._folder() is None
