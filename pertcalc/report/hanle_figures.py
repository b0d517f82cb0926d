"""Figure of the Hanle effect: P(B) and angle(B) of a D line, and on the same field axis what the ground level keeps."""

from __future__ import annotations

from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from pertcalc.report.curve_figures import BLACK, BLUE, RC, SKY, VERMILION, figure_format, write_figure
from pertcalc.report.tables import number
from pertcalc.vapour.hanle import GroundHanle, HanleCurves

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Direction of the field -> colour, dashes, width, words: hue for the eye, lightness and dashes for grey paper.
STYLES: dict[str, tuple[str, Any, float, str]] = {
    "beam": (VERMILION, (0, (6, 2)), 2.0, "B along the beam"),
    "sight": (BLUE, "-", 2.2, "B along the line of sight"),
    "normal": (SKY, (0, (1, 1.2)), 2.8, "B normal to both"),
}
BEAM_WORDS = {"unpolarised": "unpolarised beam", "linear": "beam polarised across the scattering plane"}
# Largest turn of the plane worth a scale of its own [deg]; below it the curves are flat.
_SMALLEST_ANGLE = 2.0
_GREY = "#808080"


def save_hanle(curves: HanleCurves, ground: GroundHanle | None, path: str | PathLike[str]) -> Path:
    """Write the figure as PNG or SVG by the suffix.

    Parameters
    ----------
    curves : HanleCurves
    ground : GroundHanle or None
        None leaves the panel of the ground level out.
    path : str or path
        Ends in .png or .svg; an existing file is replaced (asking first is the caller's business).

    Returns
    -------
    Path

    Raises
    ------
    InputError
        Another suffix, or a place that cannot be written.
    """
    kind = figure_format(path)
    return write_figure(draw_hanle(curves, ground), path, kind)


def draw_hanle(curves: HanleCurves, ground: GroundHanle | None) -> Figure:
    """P(B) above, angle(B) in the middle, the ground level below, one logarithmic field axis [G].

    Fields that are not positive are not drawn: the axis has no place for them.
    """
    import matplotlib
    from matplotlib.figure import Figure

    panels = 2 if ground is None else 3
    with matplotlib.rc_context(RC):
        figure = Figure(figsize=(7.2, 3.0 + 2.4 * (panels - 1)), layout="constrained")
        axes = figure.subplots(panels, 1, sharex=True, height_ratios=[1.25, 1.0, 0.9][:panels])
        _draw_degree(axes[0], curves)
        _draw_angle(axes[1], curves)
        fields = curves.fields_G
        if ground is not None:
            _draw_ground(axes[2], ground)
            fields = np.concatenate([fields, ground.fields_G])
        axes[0].set_xscale("log")
        positive = fields[fields > 0]
        if positive.size and positive.min() < positive.max():
            axes[0].set_xlim(positive.min(), positive.max())
        axes[-1].set_xlabel("magnetic field B  [G]")
        what = f"{curves.alkali} {curves.line} (isotopes: {curves.isotope})"
        figure.suptitle(f"{what}, {BEAM_WORDS[curves.beam]}, 90\u00b0 scattering", fontsize=11)
    return figure


def _draw_lines(axes: Axes, curves: HanleCurves, name: str, factor: float) -> None:
    """One line for each direction of the field, of the named array times a factor."""
    drawn = curves.fields_G > 0
    for direction, (colour, dashes, width, label) in STYLES.items():
        values = factor * getattr(curves.curves[direction], name)
        axes.plot(curves.fields_G[drawn], values[drawn], color=colour, linestyle=dashes, linewidth=width, label=label)


def _mark_fields(axes: Axes, curves: HanleCurves) -> None:
    """Upright lines at the Hanle fields with g_J and with g_F of the stretched F of the most abundant isotope."""
    rank = max(one.rank for one in curves.fields if one.F is None and one.rank <= 2)
    electronic = next(one for one in curves.fields if one.F is None and one.rank == rank)
    label = f"{electronic.level} with $g_J$: $B_H$ = {number(electronic.field_G, 2)} G"
    axes.axvline(electronic.field_G, color=_GREY, linewidth=1.0, linestyle=(0, (3, 3)), zorder=1, label=label)
    first = max(curves.weights, key=lambda isotope: curves.weights[isotope])
    stretched = max(
        (one for one in curves.fields if one.isotope == first and one.rank == rank), key=lambda one: one.F or 0
    )
    label = f"{first}, F = {stretched.F:g}, with $g_F$: $B_H$ = {number(stretched.field_G, 2)} G"
    axes.axvline(stretched.field_G, color=_GREY, linewidth=1.2, linestyle=(0, (8, 2, 1, 2)), zorder=1, label=label)


def _draw_degree(axes: Axes, curves: HanleCurves) -> None:
    _draw_lines(axes, curves, "degree", 100.0)
    top = max(float(one.degree.max()) for one in curves.curves.values())
    full = 115.0 * top if top > 1e-6 else 1.0
    axes.set_ylim(-0.04 * full, full)
    _mark_fields(axes, curves)
    axes.set_ylabel("degree of linear\npolarisation P  [%]")
    axes.legend(loc="lower left", framealpha=1.0, fontsize=9)


def _draw_angle(axes: Axes, curves: HanleCurves) -> None:
    _draw_lines(axes, curves, "angle_deg", 1.0)
    angles = np.concatenate([one.angle_deg for one in curves.curves.values()])
    angles = angles[np.isfinite(angles)]
    axes.set_ylabel("angle of its plane\n[\u00b0, counter-clockwise]")
    if not angles.size:
        axes.set_yticks([])
        axes.text(0.5, 0.5, "P = 0 at every field: no plane of polarisation", transform=axes.transAxes, ha="center")
        return
    lowest, highest = float(angles.min()), max(float(angles.max()), _SMALLEST_ANGLE)
    margin = 0.1 * (highest - lowest)
    axes.set_ylim(lowest - margin, highest + margin)


def _draw_ground(axes: Axes, ground: GroundHanle) -> None:
    drawn = ground.fields_G > 0
    axes.plot(ground.fields_G[drawn], 100 * ground.remaining[drawn], color=BLACK, linewidth=2.0)
    axes.set_ylim(0.0, 115.0)
    axes.set_ylabel("ground-level\norientation left  [%]")
    by = f" ({ground.damped_by})" if ground.damped_by else ""
    words = (
        f"{ground.isotope}, B across the pumping beam\n$g_F$ = {ground.field.g:.3f}, "
        f"damping {ground.field.decay:.4g} s$^{{-1}}${by}\n$B_H$ = {number(ground.field.field_G, 2)} G"
    )
    axes.text(0.98, 0.93, words, transform=axes.transAxes, ha="right", va="top", fontsize=9)
    axes.axvline(ground.field.field_G, color=_GREY, linewidth=0.9, linestyle=(0, (3, 3)), zorder=1)
