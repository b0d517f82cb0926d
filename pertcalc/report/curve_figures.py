"""Figure of one pair: the curves X, A1/2, A3/2, B1/2 and the difference curves that shape the D lines."""

from __future__ import annotations

from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.curves import fine_structure
from pertcalc.curves.curveset import CurveSet
from pertcalc.errors import InputError

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

FORMATS = ("png", "svg")
# Colours that differ in hue for the colour-blind and in lightness on grey paper; the dash pattern says it a third time.
BLACK, VERMILION, BLUE, SKY = "#000000", "#d55e00", "#0072b2", "#56b4e9"
STYLES = {
    "X": (BLACK, "-", 1.6, r"X $^2\Sigma_{1/2}$ (ground)"),
    "A1/2": (VERMILION, "-", 2.4, r"A $^2\Pi_{1/2}$ $\to$ P$_{1/2}$"),
    "A3/2": (BLUE, (0, (5, 2)), 1.8, r"A $^2\Pi_{3/2}$ $\to$ P$_{3/2}$"),
    "B1/2": (SKY, (0, (1, 1.2)), 2.4, r"B $^2\Sigma_{1/2}$ $\to$ P$_{3/2}$"),
    "D1": (VERMILION, "-", 2.4, r"D1:  A $^2\Pi_{1/2}$ $-$ X"),
    "D2 3/2": (BLUE, (0, (5, 2)), 1.8, r"D2:  A $^2\Pi_{3/2}$ $-$ X"),
    "D2 1/2": (SKY, (0, (1, 1.2)), 2.4, r"D2:  B $^2\Sigma_{1/2}$ $-$ X"),
}
RC: Any = {"font.size": 10.0, "axes.grid": True, "grid.color": "#e4e4e4", "grid.linewidth": 0.6, "axes.axisbelow": True}
# Half width of the linear part of the scale of differences [cm^-1]; beyond it the scale is logarithmic.
LINEAR_PART = 1.0
# Differences are drawn where the ground curve lies below this [cm^-1] (kT is 350 at 500 K): further in, no vapour goes
# and the wall of X is only the continuation of its form.
GROUND_LIMIT = 3000.0


def curve_data(curves: CurveSet, R: np.ndarray) -> dict[str, np.ndarray]:
    """Every line of the figure at R [bohr], in cm^-1, each from its own limit at infinite separation; shape of R."""
    s = fine_structure.splitting_of(curves)
    differences = fine_structure.line_differences(curves.X, curves.A, curves.B, R, s)
    ground = curves.X(R)
    lines = {
        "X": ground,
        "A1/2": differences.d1 + ground,
        "A3/2": differences.d2_three_half + ground,
        "B1/2": differences.d2_half + ground,
        "D1": differences.d1,
        "D2 3/2": differences.d2_three_half,
        "D2 1/2": differences.d2_half,
    }
    return {name: values * HARTREE_CM1 for name, values in lines.items()}


def draw_curves(curves: CurveSet) -> Figure:
    """The two-panel figure: V(R) above, difference curves below, R in angstrom (bohr on the upper edge)."""
    import matplotlib
    from matplotlib.figure import Figure

    start = 0.75 * min(_well_position(curves, name) for name in ("X", "A"))
    R = np.geomspace(start, 30.0, 1200)
    data = curve_data(curves, R)
    x = R * BOHR_ANGSTROM
    with matplotlib.rc_context(RC):
        figure = Figure(figsize=(7.2, 8.2), layout="constrained")
        top, bottom = figure.subplots(2, 1, sharex=True)
        for name in ("D1", "D2 3/2", "D2 1/2"):
            data[name] = np.where(data["X"] < GROUND_LIMIT, data[name], np.nan)
        for axes, names in ((top, ("X", "A1/2", "A3/2", "B1/2")), (bottom, ("D1", "D2 3/2", "D2 1/2"))):
            for name in names:
                colour, dashes, width, label = STYLES[name]
                axes.plot(x, data[name], color=colour, linestyle=dashes, linewidth=width, label=label)
            axes.axhline(0.0, color="#808080", linewidth=0.8, zorder=1)
        _finish_top(top, curves, data)
        _finish_bottom(bottom, data)
        bottom.set_xlim(x[0], 0.95 * x[-1])
        marks = ", ".join(f"{name}: {state.mark}" for name, state in curves.states.items())
        figure.suptitle(f"{curves.alkali}\u2013{curves.noble_gas}   ({curves.id})\n{marks}", fontsize=11)
    return figure


def save_figure(curves: CurveSet, path: str | PathLike[str]) -> Path:
    """Write the figure as PNG or SVG by the suffix; the SVG of one curve set repeats byte for byte.

    Parameters
    ----------
    curves : CurveSet
    path : str or path
        Ends in .png or .svg; an existing file is replaced (asking first is the caller's business).

    Returns
    -------
    Path

    Raises
    ------
    InputError
        Another suffix, or the place cannot be written.
    """
    kind = figure_format(path)
    return write_figure(draw_curves(curves), path, kind)


def figure_format(path: str | PathLike[str]) -> str:
    """The format of a figure file by its suffix, one of FORMATS; InputError for another one."""
    place = Path(path)
    kind = place.suffix.lower().lstrip(".")
    if kind not in FORMATS:
        raise InputError(f"figure file = {place.name!r}: must end in .png or .svg; choose one of these")
    return kind


def write_figure(figure: Figure, path: str | PathLike[str], kind: str) -> Path:
    """Write a figure in a format of FORMATS; the same figure gives the same bytes. InputError where that fails."""
    import matplotlib

    place = Path(path)
    metadata = {"Date": None} if kind == "svg" else {"Software": None}
    try:
        with matplotlib.rc_context({"svg.hashsalt": "pertcalc", **RC}):
            figure.savefig(place, format=kind, dpi=150, metadata=metadata)
    except OSError as error:
        raise InputError(f"figure file = {str(place)!r}: cannot be written ({error.strerror})") from None
    return place


def _well_position(curves: CurveSet, name: str) -> float:
    well = curves.states[name].curve.well()
    return 8.0 if well is None else well.position


def _bohr(x: Any) -> Any:
    return x / BOHR_ANGSTROM


def _angstrom(x: Any) -> Any:
    return x * BOHR_ANGSTROM


def _finish_top(axes: Axes, curves: CurveSet, data: dict[str, np.ndarray]) -> None:
    depth = -min(float(data[name].min()) for name in ("X", "A1/2", "A3/2"))
    axes.set_ylim(-1.15 * depth, 1.6 * depth)
    axes.set_ylabel(r"$V(R) - V(\infty)$  [cm$^{-1}$]")
    axes.legend(loc="upper right", framealpha=1.0)
    other = axes.secondary_xaxis("top", functions=(_bohr, _angstrom))
    other.set_xlabel("R  [bohr]")


def _finish_bottom(axes: Axes, data: dict[str, np.ndarray]) -> None:
    axes.set_yscale("symlog", linthresh=LINEAR_PART, linscale=0.6)
    top = max(float(np.nanmax(data["D2 1/2"])), 10.0)
    bottom = min(float(np.nanmin(data["D1"])), float(np.nanmin(data["D2 3/2"])), -10.0)
    axes.set_ylim(2.0 * bottom, 8.0 * top)
    axes.text(0.99, 0.03, f"drawn where $V_X$ < {GROUND_LIMIT:.0f} cm$^{{-1}}$", transform=axes.transAxes, ha="right")
    axes.set_xlabel(r"R  [$\mathrm{\AA}$]")
    axes.set_ylabel(r"$\Delta V(R)$ from the line centre  [cm$^{-1}$]" + "\nblue shift > 0")
    axes.legend(loc="upper right", framealpha=1.0)
