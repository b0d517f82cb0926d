"""Quantum close coupling as a method: cross sections of both levels on grids of energies, and their thermal rates.

Every level has its own grid of kinetic energies, so that thresholds fall where they belong. Transfer in either
direction comes from the S-matrices of the P3/2 grid: detailed balance is exact by microreversibility.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.close_coupling import ground_matrices, outer_phase, scattering_matrices
from pertcalc.collisions.multipoles import INDEX, OBSERVABLES
from pertcalc.collisions.pair import CollisionPair
from pertcalc.collisions.partial_waves import LEVELS, line_cross_section, multipole_cross_sections
from pertcalc.collisions.semiclassical import CrossSections, reach, tails
from pertcalc.constants import KELVIN_HARTREE
from pertcalc.thermal import Average, effort, energy_grid, energy_spacing, maxwell

Array = NDArray[np.float64]
Key = tuple[str, ...]
Progress = Callable[[int, int], None]

# Partial waves reach LAST_REACH Weisskopf radii and are matched to free waves at MATCH_REACH; Born tails follow.
LAST_REACH = 1.8
MATCH_REACH = 2.2
POINTS = 4.0
# Fast collisions are the costliest and count least: the grid ends here [kT] and the step grows with falling weight.
HIGHEST = 14.0
LEAST_POINTS = 2.8
# The check of every CHECK_EVERY-th energy: fewer points and a shorter reach.
CHECK_EVERY = 3
CHECK_POINTS = 0.8
CHECK_REACH = 0.92


def _sections(pair: CollisionPair, level: str, energy: float, points: float, scale: float) -> tuple[Array, int, int]:
    """Cross sections of one level at one kinetic energy [bohr^2], 3x3 inversions, blocks of (Jt, parity)."""
    index = LEVELS.index(level)
    above = energy + index * pair.splitting
    speed = float(np.sqrt(2 * energy / pair.reduced_mass))
    radius = reach(pair, speed) * scale
    # Partial waves are counted in P1/2, which moves faster than P3/2.
    last = LAST_REACH * radius * float(np.sqrt(energy / above))
    match = MATCH_REACH * radius
    matrices = scattering_matrices(pair, above, last, match, points)
    highest = int(matrices.total[-1] + 2)
    ground, count = ground_matrices(pair, energy, highest, match, above, points)
    beyond = outer_phase(pair, energy, np.arange(ground.size, dtype=float), match)
    line = line_cross_section(matrices, level, ground * np.exp(2j * beyond))
    values = np.zeros(len(OBSERVABLES))
    values[INDEX[f"{level}.width"]], values[INDEX[f"{level}.shift"]] = line.real, line.imag
    for K in range(2 if level == "P1/2" else 4):
        name = f"{level}.loss{K}" if K else f"{level}.outflow"
        values[INDEX[name]] = multipole_cross_sections(matrices, level, level, K)[1]
    if level == "P3/2":
        values[INDEX["gain1"]] = multipole_cross_sections(matrices, level, "P1/2", 1)[0]
    other = "P1/2" if level == "P3/2" else "P3/2"
    tail = tails(pair, speed, matrices.last_impact(index))
    tail[[i for name, i in INDEX.items() if name.startswith(other)]] = 0.0
    return values + tail, matrices.inversions + count, 2 * matrices.total.size


def level_cross_sections(
    pair: CollisionPair, level: str, energy: Array, points: Array, progress: Progress | None = None
) -> CrossSections:
    """Cross sections of one level on a grid of kinetic energies in that level.

    Parameters
    ----------
    pair : CollisionPair
    level : str
        "P1/2" or "P3/2".
    energy, points : ndarray, shape (n,)
        Kinetic energies [hartree]; points per radian of the shortest local wave [1].
    progress : callable or None
        Called with (done, total).

    Returns
    -------
    CrossSections
        Columns of the other level are 0; `half_grid` equals `sigma` (every partial wave counts), `step_change` holds
        the effect of a coarser step and a shorter reach, measured at every third energy.
    """
    rows, changes = [], []
    work = {"energies": int(energy.size), "inversions": 0, "partial_waves": 0}
    relative = np.zeros(len(OBSERVABLES))
    for i, (E, p) in enumerate(zip(energy, points, strict=True)):
        values, count, blocks = _sections(pair, level, float(E), float(p), 1.0)
        work["inversions"] += count
        work["partial_waves"] += blocks
        if i % CHECK_EVERY == CHECK_EVERY // 2:
            check, count, _ = _sections(pair, level, float(E), float(p) * CHECK_POINTS, CHECK_REACH)
            work["inversions"] += count
            relative = np.abs(check - values) / np.maximum(np.abs(values), 1e-300)
        rows.append(values)
        changes.append(relative * np.abs(values))
        if progress is not None:
            progress(i + 1, energy.size)
    sigma = np.array(rows)
    return CrossSections(energy, sigma, sigma, np.array(changes), work)


def level_tables(
    pair: CollisionPair, temperatures: Array, progress: Progress | None = None
) -> dict[str, CrossSections]:
    """Tables of both levels for these temperatures [K]; `progress` is called with (done, total)."""
    energy = energy_grid(temperatures, energy_spacing(pair.reduced_mass), HIGHEST)
    points = np.maximum(LEAST_POINTS, POINTS * effort(energy, temperatures, 0.15, 0.5))
    tables = {}
    for i, level in enumerate(LEVELS):

        def report(done: int, total: int, i: int = i) -> None:
            if progress is not None:
                progress(100 * i + 100 * done // total, 100 * len(LEVELS))

        tables[level] = level_cross_sections(pair, level, energy, points, report)
    return tables


def thermal_rates(
    tables: Mapping[str, CrossSections], splitting: float, temperature: float, reduced_mass: float
) -> dict[Key, Average]:
    """Every rate [au] at one temperature; keys as in `recipe.thermal_rates`.

    Parameters
    ----------
    tables : mapping
        CrossSections by level, from `level_tables`.
    splitting : float
        [hartree].
    temperature : float
        [K].
    reduced_mass : float
        [electron masses].
    """

    def mean(level: str, name: str) -> Average:
        table = tables[level]
        return maxwell(table.energy, table.column(name), temperature, reduced_mass)

    threshold = splitting / (KELVIN_HARTREE * temperature)

    def upward(down: Average, weight: float) -> Average:
        return Average(weight * float(np.exp(-threshold)) * down.rate, down.exponent + threshold)

    down, gain = mean("P3/2", "P3/2.outflow"), mean("P3/2", "gain1")
    rates: dict[Key, Average] = {
        ("transfer", "P1/2"): upward(down, 2.0),
        ("transfer", "P3/2"): down,
        ("gain", "P1/2", "1"): upward(gain, 1.0),
        ("gain", "P3/2", "1"): gain,
        ("loss", "P1/2", "1"): mean("P1/2", "P1/2.loss1"),
    }
    for line, level in (("D1", "P1/2"), ("D2", "P3/2")):
        width = mean(level, f"{level}.width")
        rates["fwhm", line] = Average(2 * width.rate, width.exponent)
        rates["shift", line] = mean(level, f"{level}.shift")
    for K in (1, 2, 3):
        rates["loss", "P3/2", str(K)] = mean("P3/2", f"P3/2.loss{K}")
    return rates
