"""The Hanle figure: what is drawn is what was computed, with units on the axes, and the file repeats."""

from __future__ import annotations

import numpy as np
import pytest

from pertcalc.errors import InputError
from pertcalc.report.hanle_figures import draw_hanle, save_hanle
from pertcalc.species import alkali
from pertcalc.vapour.hanle import field_grid, ground_hanle, hanle_curves
from pertcalc.vapour.hanle_fields import ground_hanle_field
from pertcalc.vapour.level_rates import free_rates
from tests.vapour_cases import invented

RB = alkali("Rb")
GROUND_FIELD = ground_hanle_field(RB.isotopes[1], 3000.0).field_G
FIELDS = np.concatenate([[-1.0, 0.0], field_grid(3.2, GROUND_FIELD, points=24)])


def computed(line: str = "D2"):
    ground = ground_hanle(RB.isotopes[1], invented(3000.0, "s^-1"), FIELDS, "walls")
    return hanle_curves(RB, line, free_rates(RB), FIELDS, "linear"), ground


def test_each_panel_shows_its_numbers_and_units():
    curves, ground = computed()
    degree, angle, below = draw_hanle(curves, ground).axes
    for n, name in enumerate(("beam", "sight", "normal")):
        assert degree.lines[n].get_ydata() == pytest.approx(100 * curves.curves[name].degree[2:])
        assert angle.lines[n].get_ydata() == pytest.approx(curves.curves[name].angle_deg[2:])
    assert below.lines[0].get_ydata() == pytest.approx(100 * ground.remaining[2:])
    assert below.get_xlabel().endswith("[G]")
    assert "[%]" in degree.get_ylabel() and "[%]" in below.get_ylabel() and "\u00b0" in angle.get_ylabel()
    low, high = degree.get_xlim()
    assert low < GROUND_FIELD < 0.01 < 3.2 < high  # both scales are in sight
    marked = {float(line.get_xdata()[0]) for line in degree.lines[3:]}
    assert marked == {one.field_G for one in curves.fields if one.rank == 2 and one.F in (None, 4.0)}


def test_every_value_lies_inside_its_panel():
    curves, ground = computed()
    for axes in draw_hanle(curves, ground).axes:
        low, high = axes.get_ylim()
        for line in axes.lines[: 3 if axes is not axes.figure.axes[2] else 1]:
            assert low <= np.nanmin(line.get_ydata()) and np.nanmax(line.get_ydata()) <= high


def test_without_polarisation_the_angle_says_why_it_is_missing():
    curves, _ = computed("D1")
    figure = draw_hanle(curves, None)
    assert len(figure.axes) == 2
    assert "P = 0" in figure.axes[1].texts[0].get_text()


def test_file_repeats_and_a_bad_place_is_refused(tmp_path):
    curves, ground = computed()
    first = save_hanle(curves, ground, tmp_path / "a.svg").read_bytes()
    assert save_hanle(curves, ground, tmp_path / "b.svg").read_bytes() == first
    assert save_hanle(curves, None, tmp_path / "c.png").stat().st_size > 10_000
    with pytest.raises(InputError, match=r"\.png or \.svg"):
        save_hanle(curves, ground, tmp_path / "a.pdf")
    with pytest.raises(InputError, match="cannot be written"):
        save_hanle(curves, ground, tmp_path / "missing" / "a.png")
