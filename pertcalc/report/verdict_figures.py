"""Figure of a verdict: the rates of the excited and of the ground level against fill pressure, and where they meet."""

from __future__ import annotations

from os import PathLike
from pathlib import Path
from textwrap import wrap
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from pertcalc.errors import InputError
from pertcalc.report.curve_figures import BLACK, BLUE, RC, SKY, VERMILION, figure_format, write_figure
from pertcalc.report.tables import number, percent
from pertcalc.report.verdict_lines import GAS, SUM, WALLS, GroundLines, ground_lines
from pertcalc.report.verdict_words import ROUGH, VISIBLE, caveats
from pertcalc.species import Sourced
from pertcalc.vapour.excited import DECAY, FIELD, RankBalance
from pertcalc.vapour.fill import IMPACT_LIMIT
from pertcalc.vapour.ground import TRANSIT, WALL
from pertcalc.vapour.ground_balance import PUMPING, GroundBalance
from pertcalc.vapour.pairs import PAIRS
from pertcalc.vapour.spin_destruction import BY_ALKALI, BY_GAS, EXCHANGE
from pertcalc.vapour.verdict import Verdict, impact_pressure

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

Array = NDArray[np.float64]

# The axis runs from 1/SPAN to SPAN times the pressure of the cell, and further to crossovers within REACH of it, with
# ROOM beyond them for their words.
SPAN, REACH, ROOM = 100.0, 1e4, 15.0
_GREY, _SHADE = "#808080", "#dedede"
_LABEL_WIDTH = 36
# Lower edge of an error band over its line where the error is as large as the rate: a log axis has no zero.
_LOWEST = 1e-3
# Hue for the eye, lightness, width and dashes for grey paper: colour, dashes, width.
_LEVELS: dict[str, tuple[str, float, dict[str, Any]]] = {
    "P3/2": (BLUE, 2.4, {"collisions": "-", DECAY: (0, (7, 2)), FIELD: (0, (1, 1.3))}),
    "P1/2": (VERMILION, 1.5, {"collisions": (0, (9, 1.5)), DECAY: (0, (3, 2)), FIELD: (0, (5, 1.5, 1, 1.5))}),
}
_GROUND: dict[str, tuple[str, Any, float]] = {
    SUM: (BLACK, "-", 4.2),
    WALL: (VERMILION, (0, (6, 2)), 2.0),
    TRANSIT: ("#e69f00", (0, (1, 1.2)), 2.6),
    BY_GAS: (BLUE, "-", 1.8),
    PAIRS: (SKY, (0, (6, 1.5, 1, 1.5)), 2.2),
    BY_ALKALI: ("#009e73", (0, (3, 1.5)), 1.6),
    PUMPING: ("#cc79a7", (0, (10, 2, 2, 2, 2, 2)), 2.0),
    EXCHANGE: (_GREY, "-", 0.9),
    WALLS: (BLACK, (0, (1, 3)), 1.1),
    GAS: (BLACK, (0, (4, 3)), 1.1),
}


def save_rates(found: Verdict, path: str | PathLike[str]) -> Path:
    """Write the figure as PNG or SVG by the suffix; the SVG of one verdict repeats byte for byte.

    Parameters
    ----------
    found : Verdict
    path : str or path
        Ends in .png or .svg; an existing file is replaced (asking first is the caller's business).

    Returns
    -------
    Path

    Raises
    ------
    InputError
        Another suffix, a place that cannot be written, or a verdict without a gas.
    """
    kind = figure_format(path)
    return write_figure(draw_rates(found), path, kind)


def draw_rates(found: Verdict) -> Figure:
    """Rates against the fill pressure, log-log: excited levels above, ground level below, shaded past the impact limit.

    Raises InputError for a verdict without a gas.
    """
    if found.rates is None or found.question.gas is None:
        raise InputError(
            "--plot draws rates against pressure, and without a gas nothing depends on pressure; "
            "leave --plot out, or name a gas."
        )
    import matplotlib
    from matplotlib.figure import Figure

    low, high = pressure_range(found)
    lines = ground_lines(found, low, high)
    with matplotlib.rc_context(RC):
        figure = Figure(figsize=(10.0, 8.6), layout="constrained")
        top, bottom = figure.subplots(2, 1, sharex=True, height_ratios=[1.0, 1.15])
        for axes in (top, bottom):
            axes.set_xscale("log")
            axes.set_yscale("log")
        top.set_xlim(low, high)
        notes = _mark_conditions((top, bottom), found, low, high)
        _draw_excited(top, found, np.array([low, high]), notes)
        _draw_ground(bottom, found, lines)
        at = found.question.fill.fill_temperature_K
        bottom.set_xlabel(f"fill pressure (read at {at:g} K)  [Torr]")
        figure.suptitle(_title(found), fontsize=11)
    return figure


def pressure_range(found: Verdict) -> tuple[float, float]:
    """Ends of the pressure axis [Torr]: SPAN around the cell, widened to ROOM around crossovers within REACH."""
    p = found.question.fill.pressure_torr
    meets = [found.balances[level][K].crossover_pressure_torr for level, K in VISIBLE.items()]
    meets.append(found.ground.crossover_pressure_torr)
    near = [one for one in meets if one is not None and p / REACH <= one <= p * REACH]
    return min([p / SPAN, *(one / ROOM for one in near)]), max([p * SPAN, *(one * ROOM for one in near)])


def _mark_conditions(panels: tuple[Axes, ...], found: Verdict, low: float, high: float) -> list[str]:
    """Upright line at the cell and shade past the impact limit; returns what did not fit on the axis, in words."""
    p = found.question.fill.pressure_torr
    limited = impact_pressure(found)
    assert limited is not None  # no figure without a gas
    line, limit = limited
    words = f"above {_torr(limit)} collisions overlap (width x duration of {line} > {IMPACT_LIMIT:g}): rates doubtful"
    for axes in panels:
        axes.axvline(p, color=_GREY, linewidth=1.2, linestyle=(0, (4, 3)), zorder=1)
        if limit < high:
            label = _label(words) if axes is panels[0] else None
            axes.axvspan(max(limit, low), high, facecolor=_SHADE, edgecolor="none", zorder=0, label=label)
    where = panels[0].get_xaxis_transform()
    panels[0].text(p, 1.01, f"this cell: {p:g} Torr", transform=where, ha="center", va="bottom", fontsize=9)
    if limit < high:
        return []
    return [f"{words} (off the axis)"]


def _draw_excited(axes: Axes, found: Verdict, pressures: Array, notes: list[str]) -> None:
    """Decay, collisions and Larmor frequency of the visible rank of both P levels."""
    p = found.question.fill.pressure_torr
    dots = []
    for level, K in reversed(VISIBLE.items()):
        balance = found.balances[level][K]
        colour, width, dashes = _LEVELS[level]
        loss = balance.collisional
        relative = None if loss.error is None or loss.value == 0 else loss.error / loss.value
        field = f"{level} Larmor frequency at {found.question.fill.field_G:g}\u00a0G [rad/s], {balance.field_with}"
        field += ", neither g holds" if found.regimes[level].g_factor is None else ""
        field += f", {balance.g_factor.mark}".replace(" M", "\u00a0M")
        for effect, value, words in (
            ("collisions", loss.value * pressures / p, f"{level} loss of K={K} by collisions, {_origin(loss)}"),
            (DECAY, np.full(2, balance.radiative.value), f"{level} radiative decay, {_origin(balance.radiative)}"),
            (FIELD, np.full(2, balance.larmor), field),
        ):
            if value[0] > 0:  # a logarithmic axis has no place for zero
                style = {"color": colour, "linestyle": dashes[effect], "linewidth": width}
                axes.plot(pressures, value, label=_label(words), **style)
            else:
                notes.append(f"{words}: zero")
        if relative is not None and loss.value > 0:
            central = loss.value * pressures / p
            lower = central * max(1 - relative, _LOWEST)
            axes.fill_between(pressures, lower, central * (1 + relative), color=colour, alpha=0.2, lw=0)
        if balance.crossover_pressure_torr is not None:
            dots.append((balance.crossover_pressure_torr, balance))
    notes.append("Larmor frequencies: g factors as at the pressure of this cell")
    _mark_excited(axes, sorted(dots, key=lambda dot: dot[0]), notes)
    axes.margins(y=0.08)
    axes.set_ylabel("rates of the P levels  [s$^{-1}$]")
    _legend(axes, notes)


def _mark_excited(axes: Axes, dots: list[tuple[float, RankBalance]], notes: list[str]) -> None:
    """Dots where collisions equal the larger of decay and field; the first is named up left, the second down right."""
    low, high = axes.get_xlim()
    for place, (pressure, balance) in enumerate(dots):
        rival = FIELD if balance.larmor > balance.radiative.value else DECAY
        relative = balance.crossover_pressure_error
        rough = ROUGH in caveats(pressure, relative)
        meets = _torr(pressure, None if relative is None or rough else relative * pressure, rough)
        if not low <= pressure <= high:
            notes.append(f"{balance.level}: collisions equal {rival} at {meets} (off the axis)")
            continue
        value = max(balance.radiative.value, balance.larmor)
        left = place == 0
        _dot(axes, pressure, value, f"{balance.level}, K={balance.rank}\n{meets}", (-7, 6) if left else (8, -7))


def _dot(axes: Axes, pressure: float, value: float, words: str, shift: tuple[float, float]) -> None:
    """A crossover and its words, ``shift`` points away from it."""
    axes.plot([pressure], [value], "o", color=BLACK, markersize=7, markeredgecolor="white", zorder=6)
    axes.annotate(
        words,
        (pressure, value),
        xytext=shift,
        textcoords="offset points",
        ha="left" if shift[0] > 0 else "right" if shift[0] < 0 else "center",
        va="bottom" if shift[1] > 0 else "top",
        fontsize=9,
        zorder=7,
        bbox={"boxstyle": "square,pad=0.15", "facecolor": "white", "edgecolor": "none", "alpha": 0.75},
    )


def _draw_ground(axes: Axes, found: Verdict, lines: GroundLines) -> None:
    """Every known decay of <F_z>, their sum, pumping light and spin exchange."""
    ground, notes = found.ground, []
    words = {one.name: f"{one.name}, {_origin(one.rate)}" for one in ground.decays if one.rate is not None}
    if EXCHANGE in words:
        words[EXCHANGE] += " (destroys none)"
    if ground.total is not None:
        words[SUM] = f"{'sum of the known' if ground.unknown else SUM}, {_origin(ground.total)}"
    if ground.pumping is not None:
        words[PUMPING] = f"{PUMPING}, {_origin(ground.pumping)}"
    words |= {name: name for name in (WALLS, GAS)}
    drawn = [name for name in _GROUND if name in words and np.any(lines.rates.get(name, np.zeros(1)) > 0)]
    x = lines.pressures
    for name in drawn:
        colour, dashes, width = _GROUND[name]
        style = {"color": colour, "linestyle": dashes, "linewidth": width, "zorder": 2 if name == SUM else 3}
        axes.plot(x, lines.rates[name], label=_label(words[name]), **style)
    if SUM in drawn and np.all(np.isfinite(lines.sum_error)):
        lower = np.maximum(lines.rates[SUM] - lines.sum_error, _LOWEST * lines.rates[SUM])
        axes.fill_between(x, lower, lines.rates[SUM] + lines.sum_error, color=BLACK, alpha=0.15, lw=0, zorder=1.5)
    if not drawn:
        axes.text(0.5, 0.5, "no rate is known", transform=axes.transAxes, ha="center")
    if ground.unknown:
        notes.append(f"unknown: {', '.join(ground.unknown)}")
    for what in dict.fromkeys(one for _, _, one in lines.steps):
        sides = [f"{side} {_torr(x)}" for x, side, one in lines.steps if one == what]
        notes.append(f"{what} {' and '.join(sides)} (step in the rates)")
    _mark_ground(axes, ground, lines, notes)
    axes.margins(y=0.08)
    axes.set_ylabel(f"decay of $\\langle F_z\\rangle$, S1/2 of {ground.isotope.label}  [s$^{{-1}}$]")
    _legend(axes, notes)


def _mark_ground(axes: Axes, ground: GroundBalance, lines: GroundLines, notes: list[str]) -> None:
    """Dot where walls and transit relax as much as the gas."""
    meet = ground.crossover_pressure_torr
    if meet is None:
        return
    if not lines.pressures[0] <= meet <= lines.pressures[-1]:
        notes.append(f"walls and gas relax equally at {_torr(meet)} (off the axis)")
        return
    name = WALLS if WALLS in lines.rates else WALL if WALL in lines.rates else TRANSIT
    value = float(lines.rates[name][np.searchsorted(lines.pressures, meet)])
    words = "walls = gas" if ground.crossover_step is None else "larger of walls, gas changes"
    _dot(
        axes,
        meet,
        value,
        f"{words}\n{_torr(meet, rough=ROUGH in caveats(meet, ground.crossover_pressure_error))}",
        (0, -15),
    )


def _legend(axes: Axes, notes: list[str]) -> None:
    """Legend beside the panel, lines in the order of its right edge; ``notes`` in small print at the end."""
    from matplotlib.lines import Line2D

    def right_end(entry: tuple[Any, str]) -> float:
        return float(np.asarray(entry[0].get_ydata())[-1]) if isinstance(entry[0], Line2D) else 0.0

    drawn = sorted(zip(*axes.get_legend_handles_labels(), strict=True), key=right_end, reverse=True)
    handles, labels = [one for one, _ in drawn], [words for _, words in drawn]
    handles += [Line2D([], [], linestyle="none") for _ in notes]
    labels += [_label(one) for one in notes]
    axes.legend(
        handles, labels, loc="upper left", bbox_to_anchor=(1.01, 1.0), fontsize=8.5, handlelength=4.2,
        borderaxespad=0.0, frameon=False, labelspacing=0.6,
    )  # fmt: skip


def _label(words: str) -> str:
    """Words of a legend in lines; a number and its unit stay together (no-break space)."""
    return "\n".join(wrap(words, _LABEL_WIDTH, break_on_hyphens=False))


def _torr(pressure: float, error: float | None = None, rough: bool = False) -> str:
    """A pressure [Torr]; "~" where only its order of magnitude is known."""
    spread = "" if error is None else f"\u00a0\u00b1\u00a0{number(error, 1)}"
    return f"{'~' if rough else ''}{number(pressure, 2)}{spread}\u00a0Torr"


def _origin(rate: Sourced) -> str:
    """Error and mark of a rate, as at the pressure of the cell."""
    relative = None if rate.error is None or rate.value == 0 else rate.error / rate.value
    return f"\u00b1{percent(relative)}, {rate.mark}".replace(" M", "\u00a0M")


def _title(found: Verdict) -> str:
    question = found.question
    cell = "no cell given" if question.cell is None else f"{question.cell.words}, {question.wall} wall"
    light = ""
    if question.light is not None:
        beam = question.light.beam
        light = f"; {question.light.line} light {beam.power_W * 1e3:g} mW in {beam.diameter_cm:g} cm"
    where = f"{question.fill.temperature_K:g} K, {question.fill.field_G:g} G; {cell}{light}"
    return f"{question.alkali} in {question.gas}: rates against pressure, method {question.method}\n{where}"
