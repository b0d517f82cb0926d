"""Cheap tables of cross sections for pairs that differ little: one set of grids, many curves.

Made for ratios to the same table of an undistorted pair (a control variate): what the grids miss is nearly the same
for both and cancels. Energies, impact parameters and steps are chosen once, on the undistorted pair; only turning
points and S-matrices are computed again. notes/ensemble.md has the accuracy and the cost.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.impact import ImpactGrid, impact_grid
from pertcalc.collisions.pair import CollisionPair
from pertcalc.collisions.paths import PathFamily
from pertcalc.collisions.recipe import (
    FAMILIES,
    MIXED_SPACING,
    R_COLLISION,
    XI_MIXED,
    Key,
    averaged,
    thermal_rates,
)
from pertcalc.collisions.semiclassical import CrossSections, path_values, reach, tails
from pertcalc.constants import KELVIN_HARTREE
from pertcalc.thermal import effort, energy_spacing, mean_speed

Array = NDArray[np.float64]

# First and last energy [kT]: transfer (the lower curve) lives on fast collisions, the rest does not.
RANGE = {"lower": (0.12, 14.0), "pi": (0.12, 9.0), "upper": (0.12, 9.0)}
# Steps of ln E (widely split pairs, and those whose levels mix: Li to K) and numbers of impact parameters, in units of
# those of the full tables.
SPACING_WIDE = 2.0
SPACING_MIXED = 1.6
DENSITY = 0.65
# Steps in units of the standard ones: widths, shifts and losses do with few; the transfer of widely split levels, on
# the lower curve, needs every one of them at energies that reach it (it begins at splitting/2; a spline looks further).
STEPS = 0.2
STEPS_LOWER = 0.4
STEPS_MIXED = 0.6
STEPS_WIDE = 1.0
REACHING = 0.3


@dataclass(frozen=True, slots=True)
class FamilyGrid:
    """Energies (n,) [hartree], multipliers of their steps (n,) [1] and impact parameters of one path family."""

    energy: Array
    steps: Array
    impact: tuple[ImpactGrid, ...]


def coarse_grids(pair: CollisionPair, temperatures: Array) -> dict[str, FamilyGrid]:
    """Grids made for a pair and its neighbours.

    Parameters
    ----------
    pair : CollisionPair
    temperatures : ndarray, shape (n,)
        [K].

    Returns
    -------
    dict
        FamilyGrid by path family.
    """
    mixed = pair.splitting * R_COLLISION / float(mean_speed(temperatures.min(), pair.reduced_mass)) < XI_MIXED
    spacing = energy_spacing(pair.reduced_mass) * (SPACING_MIXED * MIXED_SPACING if mixed else SPACING_WIDE)
    cold, hot = (KELVIN_HARTREE * float(T) for T in (temperatures.min(), temperatures.max()))
    grids = {}
    for name in FAMILIES:
        low, high = RANGE[name][0] * cold, RANGE[name][1] * hot
        energy = np.geomspace(low, high, int(np.ceil(np.log(high / low) / spacing)) + 1)
        steps = np.full(energy.shape, STEPS)
        if name == "lower":
            full = STEPS_MIXED if mixed else STEPS_WIDE
            steps = np.where(energy < REACHING * pair.splitting, STEPS_LOWER, full)
        family = PathFamily(pair, name)
        density = DENSITY * effort(energy, temperatures, 0.35, 0.3)
        impact = tuple(
            impact_grid(family, float(E), reach(pair, float(v)), float(d))
            for E, v, d in zip(energy, family.speed(energy), density, strict=True)
        )
        grids[name] = FamilyGrid(energy, steps, impact)
    return grids


def coarse_tables(pair: CollisionPair, grids: Mapping[str, FamilyGrid]) -> dict[str, CrossSections]:
    """Cross sections of a pair on grids made for one like it, by path family; no error estimate."""
    tables = {}
    for name, grid in grids.items():
        family = PathFamily(pair, name)
        speed = family.speed(grid.energy)
        impact = [
            replace(one, turning_point=family.turning_points(float(E), one.b))
            for E, one in zip(grid.energy, grid.impact, strict=True)
        ]
        work = {"paths": 0, "exponentials": 0}
        values = path_values(family, grid.energy, impact, grid.steps, work)
        sigma = np.array(
            [
                one.full @ value + tails(pair, float(v), one.last)
                for one, value, v in zip(impact, values, speed, strict=True)
            ]
        )
        tables[name] = CrossSections(grid.energy, sigma, sigma, np.zeros_like(sigma), work)
    return tables


def coarse_rates(
    pair: CollisionPair, temperatures: Array, grids: Mapping[str, FamilyGrid]
) -> tuple[dict[Key, Array], dict[str, int]]:
    """Every rate [au], shape (n,) for temperatures [K], shape (n,), from coarse tables, and their work counts.

    Keys as in `recipe.thermal_rates`.
    """
    tables = coarse_tables(pair, grids)
    found = averaged(thermal_rates, pair, temperatures, tables)
    work = {name: sum(table.work[name] for table in tables.values()) for name in ("paths", "exponentials")}
    return {key: np.array([average.rate for average in row]) for key, row in found.items()}, work
