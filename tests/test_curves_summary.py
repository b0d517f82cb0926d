"""Rows, descriptions and figures of curve sets."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from pertcalc.curves import fine_structure as fs
from pertcalc.curves.files import load_default
from pertcalc.curves.summary import COLUMNS, adiabatic_wells, describe, list_summaries
from pertcalc.errors import InputError
from pertcalc.report.curve_figures import curve_data, draw_curves, save_figure


def test_all_default_states_are_listed_with_mark_and_source() -> None:
    rows = list_summaries()
    first = [(row.pair, row.state) for row in rows[:4]]
    assert first == [("Li-He", "X"), ("Li-He", "A"), ("Li-He", "B"), ("Li-Ne", "X")]
    assert len(rows) == len({(row.pair, row.state) for row in rows}) == 75
    for row in rows:
        assert row.mark in ("READ", "FROM MEMORY", "COMPUTED")
        assert row.source and row.De_error_cm1 and row.Re_error_angstrom and row.C6_error_au
    assert sum(row.mark == "READ" for row in rows) == 2  # A of Na-Ar and Na-Ne
    assert COLUMNS[:2] == ("pair", "state")


def test_a_description_shows_unit_error_mark_and_source() -> None:
    text = describe(load_default("Na", "Ne"))
    assert "De    145 +- 5 cm^-1" in text
    assert "Re    2.7 +- 0.05 angstrom" in text
    assert "J. Chem. Phys. 73, 5419 (1980)" in text
    assert text.count("READ (published)") == 1 and text.count("COMPUTED (model)") == 2
    assert "perturber mass [u] set here: 3.016" in describe(load_default("Na", "3He"))


def test_adiabatic_wells_are_minima_of_the_adiabatic_curves() -> None:
    curves = load_default("Cs", "Ar")
    wells = adiabatic_wells(curves)
    data = curve_data(curves, np.linspace(3.8, 40.0, 40001))
    for name, well in wells.items():
        assert well is not None
        assert -data[name].min() == pytest.approx(well[0], rel=1e-6)
    # Without fine structure the lower curve is the lower of A and B.
    bare = adiabatic_wells(replace(curves, splitting_cm1=0.0))
    assert bare["A1/2"] == pytest.approx(bare["A3/2"], rel=1e-6)


def test_the_figure_shows_what_its_labels_say() -> None:
    curves = load_default("K", "Ar")
    figure = draw_curves(curves)
    top, bottom = figure.axes
    assert [len(axes.get_legend().get_texts()) for axes in (top, bottom)] == [4, 3]
    for axes in (top, bottom):
        assert re.search(r"\[cm", axes.get_ylabel())
    assert "[" in bottom.get_xlabel()
    # The D1 line of the figure, point by point, from the curves themselves.
    x, y = bottom.get_lines()[0].get_data()
    assert bottom.get_lines()[0].get_label().startswith("D1")
    s = fs.splitting_of(curves)
    R = np.asarray(x) / 0.529177210544
    expected = fs.lower(curves.B(R), curves.A(R), s) + 2 * s / 3 - curves.X(R)
    drawn = np.isfinite(y)
    assert drawn.sum() > 1000
    assert np.asarray(y)[drawn] == pytest.approx(expected[drawn] * 219474.6313, rel=1e-6, abs=1e-9)


def test_figures_are_written_and_repeat(tmp_path: Path) -> None:
    curves = load_default("Rb", "Xe")
    first = save_figure(curves, tmp_path / "a.svg").read_bytes()
    assert save_figure(curves, tmp_path / "b.svg").read_bytes() == first
    assert b"<svg" in first and b"dc:date" not in first
    png = save_figure(curves, tmp_path / "a.png").read_bytes()
    assert png.startswith(b"\x89PNG") and save_figure(curves, tmp_path / "b.png").read_bytes() == png
    with pytest.raises(InputError, match=r"\.png or \.svg"):
        save_figure(curves, tmp_path / "a.pdf")
    with pytest.raises(InputError, match="cannot be written"):
        save_figure(curves, tmp_path / "absent" / "a.svg")
