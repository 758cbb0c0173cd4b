"""Class shares from a mix and a heavy share."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from roaddisp.model import Fleet
from roaddisp.traffic.fleet import (
    class_shares,
    fleet_without_mix,
    link_shares,
    only_or_named,
    two_class_shares,
)

HEAVY = np.array([False, False, True, True])


def test_heavy_share_rescales_both_groups() -> None:
    """Mix 70 car, 10 van, 4 bus, 16 truck; 30 % heavy asked.

    Light 80 to 70: 61.25 and 8.75; heavy 20 to 30: 6 and 24.
    """
    mix = np.array([[0.70, 0.10, 0.04, 0.16]])
    shares = class_shares(mix, HEAVY, np.array([0.3]))
    assert shares[0] == pytest.approx([0.6125, 0.0875, 0.06, 0.24])


def test_no_heavy_share_leaves_the_mix() -> None:
    mix = np.array([[0.70, 0.10, 0.04, 0.16], [1.0, 0.0, 0.0, 0.0]])
    assert class_shares(mix, HEAVY, np.full(2, np.nan)).tolist() == mix.tolist()


@pytest.mark.parametrize(
    ("mix", "heavy_share", "group"),
    [([1.0, 0.0, 0.0, 0.0], 0.1, "heavy"), ([0.0, 0.0, 0.5, 0.5], 0.9, "light")],
)
def test_a_group_the_mix_lacks_cannot_be_scaled_up(
    mix: list[float], heavy_share: float, group: str
) -> None:
    with pytest.raises(ValueError, match=f"calls for {group} vehicles and its mix has none"):
        class_shares(np.array([mix]), HEAVY, np.array([heavy_share]))


def test_a_group_the_mix_lacks_may_be_asked_for_as_nothing() -> None:
    mix = np.array([[0.9, 0.1, 0.0, 0.0], [0.0, 0.0, 0.25, 0.75]])
    assert class_shares(mix, HEAVY, np.array([0.0, 1.0])) == pytest.approx(mix)


@pytest.mark.parametrize("share", [-0.01, 1.2, np.inf])
def test_heavy_share_is_a_share(share: float) -> None:
    with pytest.raises(ValueError, match="allowed: 0 to 1"):
        two_class_shares(np.array([0.5, share]))


@given(
    weights=st.lists(st.floats(0.01, 1.0), min_size=4, max_size=4),
    heavy_share=st.floats(0, 1),
)
def test_shares_sum_to_one_and_groups_keep_their_proportions(
    weights: list[float], heavy_share: float
) -> None:
    mix = np.array([weights]) / sum(weights)
    car, van, bus, truck = class_shares(mix, HEAVY, np.array([heavy_share]))[0]
    assert car + van + bus + truck == pytest.approx(1.0)
    assert bus + truck == pytest.approx(heavy_share, abs=1e-12)
    assert car * mix[0, 1] == pytest.approx(van * mix[0, 0], abs=1e-12)
    assert bus * mix[0, 3] == pytest.approx(truck * mix[0, 2], abs=1e-12)


def test_without_a_mix_heavy_vehicles_are_articulated_trucks() -> None:
    fleet = fleet_without_mix()
    shares = link_shares(
        fleet,
        np.array([False, True]),
        of_link=np.array([-1, 0]),
        heavy_share=np.array([0.12, np.nan]),
    )
    assert fleet.classes == ("car", "articulated_truck")
    assert shares == pytest.approx(np.array([[0.88, 0.12], [1.0, 0.0]]))


def test_links_take_their_own_fleet() -> None:
    fleet = Fleet(("a", "b"), ("car", "bus"), np.array([[0.9, 0.1], [0.6, 0.4]]))
    shares = link_shares(
        fleet,
        np.array([False, True]),
        of_link=np.array([1, 0]),
        heavy_share=np.array([np.nan, 0.2]),
    )
    assert shares == pytest.approx(np.array([[0.6, 0.4], [0.8, 0.2]]))


def test_a_link_must_name_one_of_several() -> None:
    assert only_or_named(np.array([-1, 0]), ("town",), what="profile").tolist() == [0, 0]
    with pytest.raises(ValueError, match="link 1 names no fleet and there are 2: a, b"):
        only_or_named(np.array([0, -1]), ("a", "b"), what="fleet")
