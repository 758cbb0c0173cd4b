"""The map: legible in greyscale, complete in its words, right in its places."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from roaddisp.model import Result
from roaddisp.outputs import palette
from roaddisp.outputs.figures import draw_map, write_map
from roaddisp.outputs.mapframe import frame_of, scale_length
from roaddisp.outputs.maplayers import MARKS, named_points


def words_of(result: Result) -> str:
    figure = draw_map(result)
    texts = [text.get_text() for text in figure.texts]
    texts += [text.get_text() for axes in figure.axes for text in axes.texts]
    texts += [text.get_text() for legend in figure.legends for text in legend.get_texts()]
    return "\n".join(texts)


def lightness(code: str) -> float:
    """L* of CIE 1976 from sRGB (IEC 61966-2-1; formulas from memory)."""
    channels = np.array([int(code[i : i + 2], 16) / 255 for i in (1, 3, 5)])
    linear = np.where(channels <= 0.04045, channels / 12.92, ((channels + 0.055) / 1.055) ** 2.4)
    luminance = float(linear @ [0.2126, 0.7152, 0.0722])
    return 116 * luminance ** (1 / 3) - 16 if luminance > 0.008856 else 903.3 * luminance


def test_lightness_falls_evenly_from_low_to_high() -> None:
    scale = np.array([lightness(palette.shade(place)) for place in np.linspace(0, 1, 41)])
    steps = np.diff(scale)
    assert (steps < 0).all()
    assert scale[0] > 90
    assert scale[-1] < 30
    assert steps.min() > 2.5 * steps.mean()


@pytest.mark.parametrize(
    ("low", "high", "count"), [(11.0, 48.0, 8), (0.0, 0.003, 6), (19.98, 20.01, 8), (5.0, 5.0, 8)]
)
def test_levels_are_round_and_cover_the_bulk(low: float, high: float, count: int) -> None:
    values = np.append(np.linspace(low, high, 500), np.nan)
    limits = palette.levels(values, count)
    assert (np.diff(limits) > 0).all()
    assert limits[0] <= np.nanpercentile(values, 1) <= np.nanpercentile(values, 99) <= limits[-1]
    assert 2 <= len(limits) <= count + 2
    lead = float(f"{limits[1] - limits[0]:.2e}".split("e")[0])
    assert lead in (1.0, 2.0, 2.5, 5.0)


def test_levels_without_values_still_make_a_scale() -> None:
    assert (np.diff(palette.levels(np.array([np.nan]))) > 0).all()


def test_verdicts_differ_in_shape_not_only_in_colour() -> None:
    assert len({mark.shape for mark in MARKS.values()}) == len(MARKS)


def test_picture_is_as_wide_as_a_readme_wants(result: Result, tmp_path: Path) -> None:
    write_map(result, tmp_path / "map.png")
    with Image.open(tmp_path / "map.png") as image:
        assert 1600 <= image.width <= 2000
        grey = np.asarray(image.convert("L"), dtype=float)
    assert grey.std() > 20


def test_map_says_what_when_how_and_how_far_to_trust_it(result: Result) -> None:
    words = words_of(result)
    for phrase in (
        "School at Larch Field (invented)",
        "mean of 2027 [\u00b5g/m\u00b3]",
        "1.5 to 6 m above ground",
        "25 \u00b0C",
        "scenario base",
        "Larch Freeway",
        "us-naaqs-1h: not met",
        "us-naaqs-1h: undetermined",
        "us-naaqs-1h at its limit,\n100 ppb",
        "highest 118 ppb, edge",
        "100 m",
        "\nN",
        "beyond the grid",
        "licensed practitioner",
    ):
        assert phrase in words, phrase
    assert "built-in" not in words


def test_built_in_factors_are_marked(make_result) -> None:
    assert "built-in emission factors" in words_of(make_result(built_in=True))


def test_several_years_are_named(make_result) -> None:
    assert "worst year of 2027 to 2028" in words_of(make_result(years=2))


def test_points_of_the_user_are_named_and_others_not(result: Result) -> None:
    named = named_points(result)
    names = np.array(result.scenario.receptors.receptor)
    assert set(names[named]) == {"room", "yard", "edge", "attic", "median"}
    words = words_of(result)
    assert "School-1" not in words.replace("highest 0.012 ppm, School-1", "")
    assert "yard" in words


def test_shading_lies_where_the_grid_is(result: Result) -> None:
    """Cell edges are half a spacing beyond the outer cell centres."""
    image = draw_map(result).axes[0].images[0]
    assert image.get_extent() == [619_690.0, 620_390.0, 4_439_690.0, 4_440_310.0]
    assert image.origin == "upper"


def test_frame_holds_sites_and_points(result: Result) -> None:
    frame = frame_of(result, 1.25)
    receptors = result.scenario.receptors
    placed = receptors.cell[:, 0] < 0
    assert frame.holds(receptors.x, receptors.y)[placed].all()
    assert (frame.east - frame.west) / (frame.north - frame.south) == pytest.approx(1.25)


@pytest.mark.parametrize(
    ("width", "length"), [(950.0, 200.0), (430.0, 100.0), (24_000.0, 5000.0), (80.0, 20.0)]
)
def test_scale_bar_is_round_and_fits(width: float, length: float) -> None:
    assert scale_length(width) == length


@pytest.mark.parametrize(
    "kinds",
    [
        {"grid": False},
        {"points": False},
        {"sites": False},
        {"sites": False, "points": False},
        {"title": "Schule \u6821 $x_1$ & <b>\n" + "a long title " * 20},
    ],
)
def test_every_kind_of_study_can_be_drawn(make_result, tmp_path: Path, kinds) -> None:
    if kinds.get("points") is False:
        kinds = {**kinds, "kept": ()}
    write_map(make_result(**kinds), tmp_path / "map.png")
    assert (tmp_path / "map.png").stat().st_size > 10_000
