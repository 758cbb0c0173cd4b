"""Line strengths, worked by hand on small networks."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from roaddisp.emissions.strength import line_strength, link_strengths
from roaddisp.model import Clock, Counts, FactorTable, Fleet, LinkStrengths, Network, Profiles
from roaddisp.traffic.fleet import fleet_without_mix

HOURS = np.datetime64("2024-05-14T00:00", "m") + np.arange(24) * np.timedelta64(60, "m")
CLOCK = Clock(HOURS, HOURS, utc_offset=0.0, timezone="UTC")

# Two classes at 50 and 80 km/h; at 50: car 0.2 g/km with 20 % NO2, truck 3 g/km with 10 %.
FACTORS = FactorTable(
    classes=("articulated_truck", "car"),
    heavy=np.array([True, False]),
    speed=(np.array([50.0, 80.0]) / 3.6, np.array([50.0, 80.0]) / 3.6),
    nox=(np.array([3.0, 2.0]), np.array([0.2, 0.25])),
    no2_fraction=(np.array([0.1, 0.1]), np.array([0.2, 0.2])),
    year=None,
    built_in=False,
    sources=("", ""),
)


def network(count: int, **changes: object) -> Network:
    made = Network(
        link=tuple(f"L{index}" for index in range(count)),
        name=("",) * count,
        lines=((np.array([[0.0, 0.0], [100.0, 0.0]]),),) * count,
        width=np.full(count, 7.2),
        aadt=np.full(count, 24_000.0),
        speed=np.full(count, 50 / 3.6),
        heavy_share=np.full(count, 0.1),
        profile=np.full(count, -1),
        fleet=np.full(count, -1),
    )
    return replace(made, **changes)  # type: ignore[arg-type]


def profiles(*names: str) -> Profiles:
    share = np.full((len(names), 12, 3, 24), 1 / 24)
    for place in range(1, len(names)):
        share[place, ..., 0], share[place, ..., 8] = 0.0, 2 / 24
    return Profiles(names, share, np.ones((len(names), 12, 3)))


def strengths(roads: Network, **changes: object) -> LinkStrengths:
    arguments = {
        "profiles": profiles("flat"),
        "counts": None,
        "fleet": fleet_without_mix(),
        "factors": FACTORS,
        "clock": CLOCK,
    } | changes
    return link_strengths(roads, **arguments)  # type: ignore[arg-type]


def test_mixed_traffic_by_hand() -> None:
    """1,000 veh/h, 10 % trucks, at 50 km/h.

    NOx 0.9 x 0.2 + 0.1 x 3 = 0.48 g/km: 1000 x 0.48 / 3.6e6 = 1.33333e-4 g/m/s.
    NO2 0.18 x 0.2 + 0.3 x 0.1 = 0.066 g/km: 1.83333e-5 g/m/s.
    Trucks emit 0.3 / 0.48 = 0.625 of the NOx: height 1.3 x 0.375 + 3.4 x 0.625 = 2.6125 m,
    initial sigma_z 1.2 x 0.375 + 3.2 x 0.625 = 2.45 m, wind at 2.6 m.
    """
    made = strengths(network(1))
    hourly = made.hourly()
    assert hourly.shape == (2, 1, 24)
    assert hourly[0, 0] == pytest.approx(np.full(24, 4.8e2 / 3.6e6), rel=1e-12)
    assert hourly[1, 0] == pytest.approx(np.full(24, 66 / 3.6e6), rel=1e-12)
    assert made.release_height == pytest.approx([2.6125])
    assert made.sigma_z0 == pytest.approx([2.45])
    assert made.wind_height.tolist() == [2.6]


def test_speed_sets_the_factor() -> None:
    """At 80 km/h, cars alone: 1000 x 0.25 / 3.6e6 g/m/s, at 1.3 m with the wind of 2 m."""
    made = strengths(network(1, speed=np.array([80 / 3.6]), heavy_share=np.array([0.0])))
    assert made.hourly()[0, 0] == pytest.approx(np.full(24, 250 / 3.6e6), rel=1e-12)
    assert made.release_height.tolist() == [1.3]
    assert made.wind_height.tolist() == [2.0]


def test_links_share_a_group_where_profile_and_wind_height_agree() -> None:
    roads = network(
        5,
        aadt=np.array([24_000.0, 6_000.0, 12_000.0, 9_000.0, 3_000.0]),
        heavy_share=np.array([0.1, 0.1, 0.0, 0.1, 0.0]),
        profile=np.array([0, 0, 0, 1, 1]),
    )
    made = strengths(roads, profiles=profiles("flat", "morning"))
    assert made.group[0] == made.group[1]
    assert len(set(made.group)) == made.shape.shape[1] == len(made.wind_height) == 4
    assert made.wind_height[made.group].tolist() == [2.6, 2.6, 2.0, 2.6, 2.0]
    # AADT is conserved: each link's day adds up to AADT x 0.48 g/km, or 0.2 g/km
    daily = made.hourly()[0].sum(axis=1) * 3600
    expected = roads.aadt * np.where(roads.heavy_share > 0, 0.48, 0.2) / 1000
    assert daily == pytest.approx(expected, rel=1e-12)
    assert made.hourly()[0, 3, 0] == 0.0
    assert made.hourly()[0, 3, 8] == pytest.approx(750 * 0.48 / 3.6e6)


@pytest.mark.parametrize(
    ("height", "rounded"),
    # the weighting gives 2.15, 2.95 and 3.05 as 2.1499999999999995 and so on
    [(2.15, 2.2), (2.24, 2.2), (2.25, 2.3), (2.95, 3.0), (3.05, 3.1)],
)
def test_wind_height_rounds_half_up(height: float, rounded: float) -> None:
    """The heavy share of vehicles that puts the release there, by NOx of 3 and 0.2 g/km."""
    part = (height - 1.3) / 2.1
    heavy = part * 0.2 / (part * 0.2 + (1 - part) * 3.0)
    made = strengths(network(1, heavy_share=np.array([heavy])))
    assert made.release_height == pytest.approx([height], abs=1e-12)
    assert made.wind_height.tolist() == [rounded]


def test_counts_give_what_the_same_profile_gives() -> None:
    counted = Counts(vehicles=np.full((1, 24), 1000.0), classes=None, speed=None)
    by_profile = strengths(network(1))
    by_count = strengths(network(1, aadt=np.array([np.nan])), profiles=None, counts=counted)
    assert by_count.hourly() == pytest.approx(by_profile.hourly(), rel=1e-12)
    assert by_count.release_height == pytest.approx(by_profile.release_height)


def test_counts_by_class_with_hourly_speed() -> None:
    """Hour 0: 600 cars, 20 trucks at 50 km/h; hour 1: 300 cars at 80 km/h.

    NOx (600 x 0.2 + 20 x 3) / 3.6e6 = 5.0e-5 and 300 x 0.25 / 3.6e6 = 2.08333e-5 g/m/s;
    NO2 (120 x 0.2 + 60 x 0.1) / 3.6e6 = 8.3333e-6 and 75 x 0.2 / 3.6e6 = 4.16667e-6.
    Trucks emit 60 of 120 + 60 + 75 = 255 g/km.
    """
    clock = Clock(HOURS[:2], HOURS[:2], utc_offset=0.0, timezone="UTC")
    counted = Counts(
        vehicles=np.array([[[600.0, 300.0], [20.0, 0.0]]]),
        classes=("car", "articulated_truck"),
        speed=np.array([[50.0, 80.0]]) / 3.6,
    )
    made = strengths(
        network(1, aadt=np.array([np.nan])), profiles=None, counts=counted, clock=clock
    )
    assert made.hourly()[0, 0] == pytest.approx([180 / 3.6e6, 75 / 3.6e6], rel=1e-12)
    assert made.hourly()[1, 0] == pytest.approx([30 / 3.6e6, 15 / 3.6e6], rel=1e-12)
    assert made.amplitude[:, 0] == pytest.approx([127.5 / 3.6e6, 22.5 / 3.6e6], rel=1e-12)
    assert made.release_height == pytest.approx([1.3 + 2.1 * 60 / 255])


def test_an_hour_not_counted_is_missing_and_leaves_the_mean() -> None:
    vehicles = np.full((2, 24), 1000.0)
    vehicles[0, 5] = np.nan
    counted = Counts(vehicles=vehicles, classes=None, speed=None)
    made = strengths(network(2, aadt=np.full(2, np.nan)), profiles=None, counts=counted)
    assert np.isnan(made.hourly()).sum(axis=(0, 2)).tolist() == [2, 0]
    assert made.amplitude[0, 0] == pytest.approx(made.amplitude[0, 1], rel=1e-12)
    assert made.group.tolist() == [0, 1]


def test_profiles_and_counts_side_by_side() -> None:
    roads = network(3, aadt=np.array([np.nan, 24_000.0, np.nan]))
    vehicles = np.array([[500.0] * 24, [np.nan] * 24, [2000.0] * 24])
    made = strengths(roads, counts=Counts(vehicles=vehicles, classes=None, speed=None))
    assert made.hourly()[0, :, 3] * 3.6e6 / 0.48 == pytest.approx([500.0, 1000.0, 2000.0])
    assert sorted(made.group) == [0, 1, 2]


def test_a_link_without_traffic_emits_nothing_and_no_nan() -> None:
    roads = network(2, aadt=np.array([0.0, np.nan]))
    vehicles = np.array([[np.nan] * 24, [0.0] * 24])
    made = strengths(roads, counts=Counts(vehicles=vehicles, classes=None, speed=None))
    assert made.hourly().tolist() == np.zeros((2, 2, 24)).tolist()
    # by AADT its fleet still says how high; counts of nothing are taken as light
    assert made.release_height == pytest.approx([2.6125, 1.3])
    assert made.sigma_z0 == pytest.approx([2.45, 1.2])


def test_a_link_never_counted_is_missing_throughout() -> None:
    counted = Counts(vehicles=np.full((1, 24), np.nan), classes=None, speed=None)
    made = strengths(network(1, aadt=np.array([np.nan])), profiles=None, counts=counted)
    assert np.isnan(made.hourly()).all()


def test_a_class_that_does_not_run_needs_no_factor_at_that_speed() -> None:
    trucks_slow = replace(FACTORS, speed=(np.array([50.0, 60.0]) / 3.6, FACTORS.speed[1]))
    roads = network(1, speed=np.array([80 / 3.6]), heavy_share=np.array([0.0]))
    made = strengths(roads, factors=trucks_slow)
    assert made.amplitude[0, 0] == pytest.approx(24_000 * 0.25 / 3.6e6)
    with pytest.raises(ValueError, match="factor table of articulated_truck"):
        strengths(replace(roads, heavy_share=np.array([0.1])), factors=trucks_slow)


@pytest.mark.parametrize(
    ("changes", "roads", "message"),
    [
        ({"profiles": None}, {}, "needs profiles or hourly counts"),
        ({}, {"aadt": np.array([np.nan, 5.0])}, "without hourly counts: L0"),
        (
            {"fleet": Fleet(("x",), ("car", "tram"), np.array([[0.9, 0.1]]))},
            {},
            "no emission factors for tram",
        ),
        ({"profiles": profiles("a", "b")}, {}, "link 0 names no profile and there are 2"),
        ({}, {"heavy_share": np.array([0.1, 1.5])}, "allowed: 0 to 1"),
    ],
)
def test_what_cannot_be_worked_out_is_said(
    changes: dict[str, object], roads: dict[str, object], message: str
) -> None:
    with pytest.raises(ValueError, match=message):
        strengths(network(2, **roads), **changes)


def test_line_strength_keeps_shapes_and_refuses_negatives() -> None:
    assert isinstance(line_strength(1200, 0.4), float)
    assert line_strength([1200.0, 600.0], [[0.4], [0.2]]).shape == (2, 2)
    assert np.isnan(line_strength(np.nan, 0.4))
    with pytest.raises(ValueError, match="vehicles_per_hour is -5"):
        line_strength([3, -5], 0.4)
    with pytest.raises(ValueError, match=r"grams_per_kilometre is -0\.4"):
        line_strength(3, -0.4)
