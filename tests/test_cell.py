"""Cells from words, their geometry, what a bounce costs, and one clear error for anything else."""

from __future__ import annotations

import math

import pytest

from pertcalc.errors import InputError, UnknownNameError
from pertcalc.vapour.cell import (
    Cell,
    alkali_speed_cm_s,
    coating_warning,
    depolarisation_per_bounce,
    parse_cell,
    transit_rate,
    wall_rate,
)


@pytest.mark.parametrize(
    ("words", "volume", "area"),
    [
        ("sphere 25 mm", 4 / 3 * math.pi * 1.25**3, 4 * math.pi * 1.25**2),
        ("cylinder 25 mm x 50 mm", math.pi * 1.25**2 * 5, 2 * math.pi * 1.25**2 + 2 * math.pi * 1.25 * 5),
        ("Cylinder 1inch × 2 inch", math.pi * 1.27**2 * 5.08, 2 * math.pi * 1.27**2 + 2 * math.pi * 1.27 * 5.08),
        ("  cube 10 mm ", 1.0, 6.0),
    ],
)
def test_words_and_geometry(words, volume, area):
    cell = parse_cell(words)
    assert cell.volume_cm3 == pytest.approx(volume, rel=1e-12)
    assert cell.area_cm2 == pytest.approx(area, rel=1e-12)


def test_cell_in_words():
    assert parse_cell("cylinder 25 mm x 50 mm").words == "cylinder, diameter 2.5 cm, length 5 cm"


@pytest.mark.parametrize(
    ("words", "rule"),
    [
        ("", "must begin with sphere, cylinder, cube"),
        ("ball 25 mm", "must begin with sphere, cylinder, cube"),
        ("sphere", "needs diameter, 1 length, not 0"),
        ("sphere 25", "diameter = '25': a unit is missing"),
        ("sphere 25 mm x 25 mm", "needs diameter, 1 length, not 2"),
        ("cylinder 25 mm", "needs diameter x length, 2 lengths, not 1"),
        ("cube 0 mm", "must be above zero"),
        ("cube -3 mm", "must not be negative|must be above zero"),
        ("cube nan mm", "must be finite"),
        ("cube 10 kg", "must be a length"),
        ("sphere 1e9 km", "must lie between"),
        ("sphere 1 nm", "must lie between"),
        (25.0, "must be text"),
        (None, "must be text"),
        ("sphere " + "9" * 200 + " mm", "longer than"),
    ],
)
def test_bad_words_give_one_clear_error(words, rule):
    with pytest.raises(InputError, match=rule) as caught:
        parse_cell(words)
    message = str(caught.value)
    assert len(caught.value.problems) == 1 and "\n" not in message
    assert message.startswith("--cell") and "'sphere 25 mm'" in message and len(message) < 450


@pytest.mark.parametrize("size", [0.0, -1.0, math.nan, math.inf])
def test_sizes_must_be_positive(size):
    with pytest.raises(InputError, match="must lie between"):
        Cell("cube", (size,))


def test_unknown_shape_and_wall():
    with pytest.raises(UnknownNameError, match="cell shape 'cubes' is not known. Did you mean cube"):
        Cell("cubes", (1.0,))
    with pytest.raises(UnknownNameError, match="wall 'coatd' is not known. Did you mean coated"):
        depolarisation_per_bounce("coatd")
    with pytest.raises(InputError, match="cylinder needs diameter and length"):
        Cell("cylinder", (1.0,))


@pytest.mark.parametrize(
    ("D", "speed", "depolarisation", "name"),
    [
        (0.0, 1.0, 1.0, "diffusion coefficient"),
        (math.nan, 1.0, 1.0, "diffusion coefficient"),
        (1.0, -1.0, 1.0, "mean speed"),
        (None, 1.0, 0.0, "depolarisation"),
        (None, 1.0, 1.5, "depolarisation"),
    ],
)
def test_bad_numbers_are_named(D, speed, depolarisation, name):
    with pytest.raises(InputError, match=name):
        wall_rate(Cell("cube", (1.0,)), D, speed, depolarisation)


def test_beam_must_be_positive():
    with pytest.raises(InputError, match="--beam-diameter"):
        transit_rate(0.0, None, 3e4)


def test_coated_wall_covers_both_published_figures():
    """1e4 bounces (READ: Balabas et al. 2010); 2.0 Hz x 2 pi of K in a 3 cm sphere (READ: Guzman et al. 2006)."""
    coated = depolarisation_per_bounce("coated")
    speed = alkali_speed_cm_s(39.0983, 295.0)
    measured = 2 * math.pi * 2.0 / (speed * 6 / (4 * 3.0))  # A/V = 6/d
    assert measured == pytest.approx(6e-4, rel=0.1)
    for published in (1e-4, measured):
        assert abs(published - coated.value) <= coated.error * (1 + 1e-6)
    assert "arxiv-vanity" in coated.source and "dorsalhub" in coated.source
    assert depolarisation_per_bounce("bare").value == 1.0
    assert "common practice, no source" in depolarisation_per_bounce("bare").source


def test_speed_of_rubidium():
    """sqrt(8 R T/(pi M)) in SI units."""
    assert alkali_speed_cm_s(85.4678, 300.0) == pytest.approx(
        100 * math.sqrt(8 * 8.314462618 * 300 / (math.pi * 0.0854678)), rel=1e-8
    )


def test_only_a_hot_coated_cell_is_warned_of():
    assert coating_warning("coated", 320.0) is None and coating_warning("bare", 450.0) is None
    assert "90 degC" in coating_warning("coated", 363.15) and "--wall bare" in coating_warning("coated", 363.15)
