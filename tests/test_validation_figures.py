"""The figure of a validation: what is drawn is what was scored, with units on the axes, and the file repeats."""

from __future__ import annotations

import dataclasses
import math

import numpy as np
import pytest
from click.testing import CliRunner
from matplotlib.colors import to_hex

import pertcalc.rates
from pertcalc.cli import cli
from pertcalc.errors import InputError
from pertcalc.measured import measurements
from pertcalc.report.validation_figures import (
    SHADES,
    SHAPES,
    draw_validation,
    drawable,
    pulls,
    save_validation,
    share_within_one,
)
from pertcalc.validation.scores import score
from tests.test_validation import balanced

ROWS = measurements()


def invented():
    """Every measurement with an answer of ours scattered about it, 10 % numerical and 24 % model error."""
    factors = np.exp(np.random.default_rng(7).normal(0.0, 0.5, len(ROWS)))
    found = [score(row, row.value * factor, 0.1, 0.24) for row, factor in zip(ROWS, factors, strict=True)]
    shift = next(n for n, row in enumerate(ROWS) if row.quantity == "shift" and row.kind == "value")
    return [*found[:shift], score(ROWS[shift], -ROWS[shift].value, 0.1, 0.24), *found[shift + 1 :]]


SCORES = invented()


def test_every_measured_value_is_a_point_at_its_place():
    left = draw_validation(SCORES).axes[0]
    shown = drawable(SCORES)
    assert len(shown) == sum(row.kind == "value" for row in ROWS) == len(left.containers)
    low, high = left.get_xlim()
    assert left.get_ylim() == (low, high)  # the line of equality is the diagonal
    for one, bars in zip(shown, left.containers, strict=True):
        m, marker = one.measurement, bars.lines[0]
        assert marker.get_xdata() == pytest.approx([abs(m.value)]) and marker.get_ydata() == pytest.approx(
            [abs(one.ours)]
        )
        assert low < marker.get_xdata()[0] < high and low < marker.get_ydata()[0] < high
        assert marker.get_marker() == SHAPES[m.quantity][0] and to_hex(marker.get_color()) == SHADES[m.noble_gas]
        filled = to_hex(marker.get_markerfacecolor()) == SHADES[m.noble_gas]
        assert filled == (m.mark == "READ")


def test_bars_hold_the_errors_as_factors():
    one = next(one for one in SCORES if one.measurement.quantity == "fwhm" and one.measurement.error)
    across, upright = draw_validation([one]).axes[0].containers[0].lines[2]
    (x_low, _), (x_high, _) = across.get_segments()[0]
    (_, y_low), (_, y_high) = upright.get_segments()[0]
    assert math.log(x_high / x_low) / 2 == pytest.approx(one.measurement.error / one.measurement.value)
    assert math.log(y_high / y_low) / 2 == pytest.approx(0.26)  # 10 % and 24 % in quadrature
    unknown = dataclasses.replace(one, model_error=None, deviation=None)
    figure = draw_validation([unknown])
    assert len(figure.axes[0].containers[0].lines[2]) == 1  # an error that is not estimated has no bar
    assert "not estimated" in figure.axes[1].texts[0].get_text()


def test_the_close_up_holds_every_width():
    (inset,) = draw_validation(SCORES).axes[0].child_axes
    widths = [one for one in SCORES if one.measurement.quantity == "fwhm"]
    drawn = [(bars.lines[0].get_xdata()[0], bars.lines[0].get_ydata()[0]) for bars in inset.containers]
    assert drawn == [(one.measurement.value, one.ours) for one in widths]
    low, high = inset.get_xlim()
    assert all(low < value < high for point in drawn for value in point) and "rad s$^{-1}$" in inset.get_title()
    assert not draw_validation([one for one in SCORES if one not in widths]).axes[0].child_axes


def test_opposite_signs_are_marked_and_only_they():
    left = draw_validation(SCORES).axes[0]
    marked = next(line for line in left.lines if line.get_label() == "opposite signs")
    expected = [abs(one.measurement.value) for one in SCORES if one.opposite]
    assert len(expected) == 1 and list(marked.get_xdata()) == expected
    agreeing = draw_validation([one for one in SCORES if not one.opposite]).axes[0]
    assert not any(line.get_label() == "opposite signs" for line in agreeing.lines)


def test_the_histogram_counts_every_pull_and_writes_the_share():
    right = draw_validation(SCORES).axes[1]
    found = pulls(SCORES)
    assert len(found) == sum(row.kind == "value" for row in ROWS)
    heights = [patch.get_height() for patch in right.patches]
    assert sum(heights) == len(found)
    inside = sum(patch.get_height() for patch in right.patches if -1.01 < patch.get_x() < 0.99)
    assert inside == sum(abs(x) <= 1 for x in found)
    assert share_within_one(SCORES) == inside / len(found)
    assert f"{100 * inside / len(found):.0f} % within one sigma" in right.texts[0].get_text()
    x, y = right.lines[0].get_data()
    # The normal curve holds as many rows as the histogram, erf(4/sqrt 2) of them inside.
    assert np.trapezoid(y, x) / 0.5 == pytest.approx(len(found) * math.erf(4 / math.sqrt(2)), rel=1e-3)


def test_a_pull_beyond_the_scale_is_in_the_last_bin():
    row = next(row for row in ROWS if row.quantity == "fwhm")
    heights = [
        patch.get_height() for patch in draw_validation([score(row, 1e3 * row.value, 0.01, 0.01)]).axes[1].patches
    ]
    assert heights == [0.0] * 15 + [1.0]


def test_units_on_the_axes():
    left, right = draw_validation(SCORES).axes
    for words in (left.get_xlabel(), left.get_ylabel()):
        assert "rad s$^{-1}$ cm$^3$" in words and r"\mathrm{\AA}^2" in words
    assert left.get_xscale() == left.get_yscale() == "log"
    assert "[1]" in right.get_xlabel() and "[1]" in right.get_ylabel()


def test_file_repeats_and_bad_input_is_refused(tmp_path):
    first = save_validation(SCORES, tmp_path / "a.svg").read_bytes()
    assert save_validation(SCORES, tmp_path / "b.svg").read_bytes() == first
    assert save_validation(SCORES, tmp_path / "c.png").read_bytes()[:4] == b"\x89PNG"
    with pytest.raises(InputError, match=r"\.png or \.svg"):
        save_validation(SCORES, tmp_path / "a.pdf")
    bounds = [one for one in SCORES if one.measurement.kind == "bound"]
    assert bounds
    with pytest.raises(InputError, match="no measurement has a computed value"):
        save_validation(bounds, tmp_path / "d.png")
    assert not (tmp_path / "d.png").exists()


def test_the_command_draws_and_asks_before_it_replaces(tmp_path, monkeypatch):
    monkeypatch.setattr(
        pertcalc.rates, "collision_rates", lambda a, g, T, method="semiclassical", **_: balanced(a, g, T, method)
    )
    picture = tmp_path / "v.svg"
    words = ["validate", "--jobs", "1", "--plot", str(picture), "--json"]
    result = CliRunner().invoke(cli, words)
    assert f"wrote {picture}" in result.stderr and "<svg" in picture.read_text()
    assert result.stdout.startswith("{")
    monkeypatch.setattr(pertcalc.rates, "collision_rates", None)  # refused before any work
    again = CliRunner().invoke(cli, words)
    assert again.exit_code == 2 and "add --force" in again.stderr
    wrong = CliRunner().invoke(cli, ["validate", "--plot", "x.pdf"])
    assert wrong.exit_code == 2
    assert wrong.stderr == "Error: figure file = 'x.pdf': must end in .png or .svg; choose one of these\n"
