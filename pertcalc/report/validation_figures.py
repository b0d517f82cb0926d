"""Figure of a validation: ours against measured on logarithmic scales, and the histogram of the pulls."""

from __future__ import annotations

import math
from collections.abc import Sequence
from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from pertcalc.errors import InputError
from pertcalc.measured import QUANTITIES
from pertcalc.report.curve_figures import RC, figure_format, write_figure
from pertcalc.species import READ, SPECIES_GASES
from pertcalc.validation.scores import Score

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

SHAPES = {
    "fwhm": ("o", "full width"),
    "shift": ("^", "|shift|"),
    "transfer": ("s", "transfer"),
    "multipole_loss": ("D", "multipole loss"),
}
# One dark-to-light scale (viridis without its pale end), so that the gases stay ordered on grey paper.
SHADES = dict(zip(SPECIES_GASES, ("#440154", "#46327e", "#365c8d", "#277f8e", "#2fb47c", "#93c83a"), strict=True))
VERMILION = "#d55e00"
BAND = 2.0
# The histogram: bins of this width [combined errors] out to END; what lies further is counted in the last bin.
BIN, END = 0.5, 4.0


def pulls(scores: Sequence[Score]) -> list[float]:
    """Deviations in combined errors [1] of the measurements with a value and an estimated error; bounds have none."""
    values = [one for one in scores if one.measurement.kind == "value"]
    return [one.deviation for one in values if one.deviation is not None]


def share_within_one(scores: Sequence[Score]) -> float | None:
    """Share [1] of the pulls within one combined error, its end included; None without a pull."""
    found = pulls(scores)
    return sum(abs(x) <= 1 for x in found) / len(found) if found else None


def own_error(one: Score) -> float | None:
    """Relative error of ours [1], numerical and model in quadrature; None where it is not estimated."""
    return None if one.model_error is None else math.hypot(one.numerical_error or 0.0, one.model_error)


def drawable(scores: Sequence[Score]) -> list[Score]:
    """The scores with a point on logarithmic scales: both values known and not zero."""
    return [one for one in scores if one.ratio]


def draw_validation(scores: Sequence[Score], title: str = "") -> Figure:
    """The two-panel figure: |ours| against |measured| with both errors; pulls with the normal curve.

    Bars reach a factor exp(+-relative error), as the deviation of widths and cross sections is counted. InputError
    where no score has a ratio.
    """
    import matplotlib
    from matplotlib.figure import Figure

    shown = drawable(scores)
    if not shown:
        raise InputError(
            "figure of the validation: no measurement has a computed value beside it; compute a pair first"
        )
    with matplotlib.rc_context(RC):
        figure = Figure(figsize=(13.0, 6.6), layout="constrained")
        left, right = figure.subplots(1, 2, width_ratios=(1.25, 1.0))
        _compare(left, shown, len(scores))
        _histogram(right, scores)
        if title:
            figure.suptitle(title, fontsize=11)
    return figure


def save_validation(scores: Sequence[Score], path: str | PathLike[str], title: str = "") -> Path:
    """Write the figure as PNG or SVG by the suffix; the same scores give the same bytes.

    Raises
    ------
    InputError
        Another suffix, nothing to draw, or the place cannot be written.
    """
    kind = figure_format(path)
    return write_figure(draw_validation(scores, title), path, kind)


def _compare(axes: Axes, shown: Sequence[Score], total: int) -> None:
    axes.set_xscale("log")
    axes.set_yscale("log")
    x = np.abs(np.array([one.measurement.value for one in shown]))
    y = np.abs(np.array([one.ours for one in shown], float))
    limits = 0.4 * min(x.min(), y.min()), 2.5 * max(x.max(), y.max())
    line = np.array(limits)
    axes.fill_between(line, line / BAND, line * BAND, color="#ececec", zorder=0.5, label=f"factor {BAND:g}")
    axes.plot(line, line, color="black", linewidth=0.9, zorder=1, label="equal")
    for one, theirs, ours in zip(shown, x, y, strict=True):
        _point(axes, one, float(theirs), float(ours))
    flipped = np.array([one.opposite for one in shown])
    if flipped.any():
        axes.plot(x[flipped], y[flipped], "x", color=VERMILION, markersize=11, zorder=4, label="opposite signs")
    axes.set_xlim(limits)
    axes.set_ylim(limits)
    units = r"[$10^{-9}$ rad s$^{-1}$ cm$^3$: width, shift;  $\mathrm{\AA}^2$: transfer, loss]"
    axes.set_xlabel(f"measured, absolute value\n{units}")
    axes.set_ylabel(f"ours, absolute value\n{units}")
    axes.set_title(f"{len(shown)} of {total} measured rows (a bound has no point)", fontsize=10)
    _legends(axes, shown)
    _close_up(axes, [one for one in shown if one.measurement.quantity == "fwhm"])


def _close_up(axes: Axes, widths: Sequence[Score]) -> None:
    """The full widths again in the free corner: they lie within a factor 3, the whole panel spans many decades."""
    from matplotlib.ticker import NullFormatter, ScalarFormatter

    if len(widths) < 2:
        return
    inset = axes.inset_axes((0.5, 0.09, 0.34, 0.34))
    inset.set_xscale("log")
    inset.set_yscale("log")
    sizes = [abs(value) for one in widths for value in (one.measurement.value, one.ours or math.nan)]
    line = np.array([0.85 * min(sizes), 1.18 * max(sizes)])
    inset.plot(line, line, color="black", linewidth=0.9, zorder=1)
    for one in widths:
        _point(inset, one, abs(one.measurement.value), abs(one.ours or math.nan))
    inset.set_xlim(*line)
    inset.set_ylim(*line)
    for axis in (inset.xaxis, inset.yaxis):
        axis.set_major_formatter(ScalarFormatter())
        axis.set_minor_formatter(NullFormatter())
        if line[1] < 30 * line[0]:
            axis.set_ticks([t for t in (0.5, 1, 2, 3, 4, 5, 6, 8, 10, 20) if line[0] < t < line[1]])
    inset.tick_params(labelsize=7)
    inset.set_title(r"full widths [$10^{-9}$ rad s$^{-1}$ cm$^3$]", fontsize=8)


def _point(axes: Axes, one: Score, x: float, y: float) -> None:
    """One measurement: its marker with both error bars."""
    shape, shade = SHAPES[one.measurement.quantity][0], SHADES[one.measurement.noble_gas]
    own = own_error(one)
    axes.errorbar(
        x, y, xerr=_bar(x, one.theirs_error / x), yerr=None if own is None else _bar(y, own),
        fmt=shape, color=shade, markerfacecolor=shade if one.measurement.mark == READ else "white",
        markersize=6, elinewidth=0.7, zorder=3,
    )  # fmt: skip


def _bar(value: float, relative: float) -> np.ndarray:
    """Lengths below and above a value, shape (2, 1), that reach a factor exp(-+relative)."""
    return value * np.array([[-math.expm1(-relative)], [math.expm1(relative)]])


def _legends(axes: Axes, shown: Sequence[Score]) -> None:
    from matplotlib.lines import Line2D

    def key(shape: str, colour: str, face: str, label: str) -> Line2D:
        return Line2D([], [], marker=shape, color=colour, markerfacecolor=face, linestyle="none", label=label)

    quantities = {one.measurement.quantity for one in shown}
    gases = {one.measurement.noble_gas for one in shown}
    keys: list[Any] = [key(*(SHAPES[q][0], "black", "white", SHAPES[q][1])) for q in QUANTITIES if q in quantities]
    keys += [key("o", "black", "black", "filled: READ"), key("o", "black", "white", "open: FROM MEMORY")]
    keys += axes.get_legend_handles_labels()[0]
    first = axes.legend(handles=keys, loc="upper left", framealpha=1.0, fontsize=9)
    axes.add_artist(first)
    shades = [key("o", SHADES[gas], SHADES[gas], gas) for gas in SPECIES_GASES if gas in gases]
    axes.legend(handles=shades, loc="lower right", framealpha=1.0, fontsize=9, title="gas")


def _histogram(axes: Axes, scores: Sequence[Score]) -> None:
    found = np.array(pulls(scores))
    edges = np.arange(-END, END + BIN / 2, BIN)
    inner = np.clip(found, -END + BIN / 2, END - BIN / 2)
    axes.hist(inner, edges.tolist(), color="#b9cfe4", edgecolor="#365c8d", label=f"{found.size} measured rows")
    x = np.linspace(-END, END, 201)
    normal = found.size * BIN * np.exp(-(x**2) / 2) / math.sqrt(2 * math.pi)
    axes.plot(x, normal, color="black", linewidth=1.4, label="normal, unit variance")
    axes.set_xlim(-END, END)
    axes.set_ylim(bottom=0.0)
    axes.set_xlabel(
        f"pull: deviation / combined error  [1],  > 0 when ours is larger\n(beyond {END:g}: in the last bin)"
    )
    axes.set_ylabel(f"rows per {BIN:g} combined errors  [1]")
    axes.legend(loc="upper left", framealpha=1.0, fontsize=9)
    share = share_within_one(scores)
    words = "no pull: the error of ours is not estimated" if share is None else f"{100 * share:.0f} % within one sigma"
    axes.text(
        0.98, 0.97, f"{words}\n(normal: 68 %)", transform=axes.transAxes, ha="right", va="top",
        bbox={"facecolor": "white", "edgecolor": "#cccccc"},
    )  # fmt: skip
