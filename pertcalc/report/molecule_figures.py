"""Figure of one state of a pair: the curve with its levels of N = 0, and every level over N under the barrier."""

from __future__ import annotations

from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.errors import InputError
from pertcalc.molecules.molecule import Molecule
from pertcalc.report.curve_figures import BLACK, BLUE, RC, VERMILION, figure_format, write_figure

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# The curve is drawn to where it has come back to this part of its depth.
_SHALLOW = 0.004


def save_levels(found: Molecule, path: str | PathLike[str]) -> Path:
    """Write the figure as PNG or SVG by the suffix.

    Parameters
    ----------
    found : Molecule
    path : str or path
        Ends in .png or .svg; an existing file is replaced (asking first is the caller's business).

    Returns
    -------
    Path

    Raises
    ------
    InputError
        Another suffix, a place that cannot be written, or a curve without a well.
    """
    kind = figure_format(path)
    if not found.problem.has_well:
        raise InputError("--plot: the curve is purely repulsive, there are no levels to draw; leave --plot out.")
    return write_figure(draw_levels(found), path, kind)


def draw_levels(found: Molecule) -> Figure:
    """The two-panel figure: V(R) with the levels of one N on the left, E over N with the barrier's top on the right."""
    import matplotlib
    from matplotlib.figure import Figure

    with matplotlib.rc_context(RC):
        figure = Figure(figsize=(10.0, 5.4), layout="constrained")
        left, right = figure.subplots(1, 2)
        _draw_well(left, found)
        _draw_ladder(right, found)
        isotopes = f", {', '.join(found.isotopes)}" if found.isotopes else ""
        figure.suptitle(
            f"{found.alkali}\u2013{found.noble_gas}, state {found.state}{isotopes}   ({found.curves.id})", fontsize=11
        )
    return figure


def _draw_well(axes: Axes, found: Molecule) -> None:
    problem, N = found.problem, found.rotation or 0
    levels, quasi = found.levels, found.quasi
    depth = problem.depth * HARTREE_CM1
    R = np.geomspace(problem.r_in, 400.0, 6000)
    V = problem.potential(R) * HARTREE_CM1
    far = R[np.flatnonzero(np.abs(V) > _SHALLOW * depth)[-1]]
    x = R * BOHR_ANGSTROM
    axes.axhline(0.0, color="#808080", linewidth=0.8, zorder=1)
    axes.plot(x, V, color=BLACK, linewidth=1.8, label="V(R)")
    above = quasi.N == N
    top = max(0.15 * depth, 1.3 * float(quasi.barrier[above].max(initial=0.0)) * HARTREE_CM1)
    if N:
        effective = problem.effective(R, float(N)) * HARTREE_CM1
        axes.plot(x, effective, color="#808080", linewidth=1.6, label=f"with the rotation N = {N}")
    here = levels.N == N
    axes.hlines(
        levels.energy[here] * HARTREE_CM1,
        levels.inner[here] * BOHR_ANGSTROM,
        levels.outer[here] * BOHR_ANGSTROM,
        color=BLUE,
        linewidth=1.1,
        label=f"{int(here.sum())} bound levels of N = {N}",
    )
    if above.any():
        axes.hlines(
            quasi.energy[above] * HARTREE_CM1,
            quasi.inner[above] * BOHR_ANGSTROM,
            quasi.outer[above] * BOHR_ANGSTROM,
            color=VERMILION,
            linestyle=(0, (4, 2)),
            linewidth=1.4,
            label=f"{int(above.sum())} quasi-bound",
        )
    axes.set_xlim(0.95 * x[np.argmax(V < depth)], far * BOHR_ANGSTROM)
    axes.set_ylim(-1.08 * depth, top)
    axes.set_xlabel(r"R  [$\mathrm{\AA}$]")
    axes.set_ylabel(r"energy from the limit  [cm$^{-1}$]")
    axes.legend(loc="lower right", framealpha=1.0)


def _draw_ladder(axes: Axes, found: Molecule) -> None:
    levels, quasi = found.levels, found.quasi
    from matplotlib.ticker import MaxNLocator

    axes.axhline(0.0, color="#808080", linewidth=0.8, zorder=1)
    axes.xaxis.set_major_locator(MaxNLocator(integer=True))
    if not (levels.N.size or quasi.N.size):
        axes.set_ylim(-1.08 * found.problem.depth * HARTREE_CM1, 0.15 * found.problem.depth * HARTREE_CM1)
    highest = max(int(levels.N.max(initial=3)), int(quasi.N.max(initial=3)))
    axes.set_xlim(-0.04 * highest - 0.2, 1.04 * highest + 0.2)
    many = len(levels.N) > 500
    size = 2.0 if many else 9.0
    axes.scatter(
        levels.N, levels.energy * HARTREE_CM1, s=size, color=BLUE, linewidths=0, label=f"{len(levels.N)} bound"
    )
    if quasi.N.size:
        axes.scatter(
            quasi.N,
            quasi.energy * HARTREE_CM1,
            s=2.5 * size,
            facecolors="none",
            edgecolors=VERMILION,
            linewidths=0.6,
            label=f"{len(quasi.N)} quasi-bound",
        )
        N, first = np.unique(quasi.N, return_index=True)
        axes.plot(N, quasi.barrier[first] * HARTREE_CM1, color=BLACK, linewidth=1.0, label="top of the barrier")
    axes.set_xlabel("rotation N")
    axes.set_ylabel(r"energy from the limit  [cm$^{-1}$]")
    axes.legend(loc="best", framealpha=1.0)
