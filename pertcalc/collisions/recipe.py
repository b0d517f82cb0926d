"""Which family of paths answers for which rate of the semiclassical method: the empirical rule in one place.

P1/2: the lower adiabatic curve. P3/2 starts on two curves: V_Pi for width, shift and rank 1; 2/3 V_Pi + 1/3 upper
curve for rank 2; equal weights for rank 3 (weights on results, not on curves). Transfer and outflow: the lower curve
at the mean energy of the two levels, both directions from one integral (detailed balance is exact). The outflow inside
a multipole loss is replaced by that transfer. Reasons and numbers: notes/semiclassical.md.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.pair import CollisionPair
from pertcalc.collisions.semiclassical import CrossSections, cross_sections
from pertcalc.constants import AMU_AU, KELVIN_HARTREE
from pertcalc.thermal import LOG_SPACING, Average, balanced_transfer, effort, energy_grid, maxwell

Array = NDArray[np.float64]
Progress = Callable[[int, int], None]
Key = tuple[str, ...]
ThermalRates = Callable[[Mapping[str, CrossSections], float, float, float], dict[Key, Average]]

FAMILIES = ("lower", "pi", "upper")
# Reduced mass [u] from which the standard spacing of energies is dense enough.
HEAVY = 10.0
# Share of the standard steps: only the transfer, taken from the lower curve, needs every one of them.
STEP_SHARE = {"lower": 1.0, "pi": 0.6, "upper": 0.6}
# Weights of (pi, upper) for rank K of P3/2.
P32_WEIGHTS = {1: (1.0, 0.0), 2: (2 / 3, 1 / 3), 3: (0.5, 0.5)}


def _sum(parts: list[tuple[float, Average]]) -> Average:
    """Weighted sum of rates; exponents average with the rates as weights."""
    rate = sum(weight * part.rate for weight, part in parts)
    slope = sum(weight * part.rate * part.exponent for weight, part in parts)
    return Average(rate, slope / rate if rate else 0.0)


def thermal_rates(
    tables: Mapping[str, CrossSections], splitting: float, temperature: float, reduced_mass: float
) -> dict[Key, Average]:
    """Every rate [au] at one temperature from the tables of the three families.

    Parameters
    ----------
    tables : mapping
        CrossSections by family ("lower", "pi", "upper").
    splitting : float
        [hartree].
    temperature : float
        [K].
    reduced_mass : float
        [electron masses].

    Returns
    -------
    dict
        Keys ("fwhm", line), ("shift", line), ("loss", level, K), ("transfer", level), ("gain", level, K).
    """
    lower, pi, upper = (tables[name] for name in FAMILIES)

    def mean(table: CrossSections, name: str) -> Average:
        return maxwell(table.energy, table.column(name), temperature, reduced_mass)

    outflow = 2 * lower.column("P3/2.outflow")  # from P1/2 = twice that from P3/2
    ratio = lower.column("gain1") / np.maximum(outflow, 1e-300)
    plain = balanced_transfer(lower.energy, outflow, splitting, temperature, reduced_mass)
    gain = balanced_transfer(lower.energy, outflow, splitting, temperature, reduced_mass, 1.0, ratio)
    rates: dict[Key, Average] = {
        ("transfer", "P1/2"): plain.up,
        ("transfer", "P3/2"): plain.down,
        ("gain", "P1/2", "1"): gain.up,
        ("gain", "P3/2", "1"): gain.down,
    }
    for line, level, table in (("D1", "P1/2", lower), ("D2", "P3/2", pi)):
        # The cross section belongs to the half width, an angular frequency.
        rates["fwhm", line] = _sum([(2.0, mean(table, f"{level}.width"))])
        rates["shift", line] = mean(table, f"{level}.shift")

    def elastic(level: str, K: int, parts: list[tuple[float, CrossSections]], inflow: Average) -> Average:
        terms = [(1.0, inflow)]
        for weight, table in parts:
            terms += [(weight, mean(table, f"{level}.loss{K}")), (-weight, mean(table, f"{level}.outflow"))]
        return _sum(terms)

    rates["loss", "P1/2", "1"] = elastic("P1/2", 1, [(1.0, lower)], plain.up)
    for K, (on_pi, on_upper) in P32_WEIGHTS.items():
        parts = [(w, t) for w, t in ((on_pi, pi), (on_upper, upper)) if w]
        rates["loss", "P3/2", str(K)] = elastic("P3/2", K, parts, plain.down)
    return rates


def family_tables(
    pair: CollisionPair,
    temperatures: Array,
    progress: Progress | None = None,
    families: Iterable[str] = FAMILIES,
    quick: bool = False,
) -> dict[str, CrossSections]:
    """Cross sections of the path families, on grids made for these temperatures.

    Parameters
    ----------
    pair : CollisionPair
    temperatures : ndarray, shape (n,)
        [K].
    progress : callable or None
        Called with (done, total).
    families : iterable of str
        Which of FAMILIES.
    quick : bool
        Half the energies and fewer impact parameters and steps, without error estimate: about a sixth of the work,
        for differences between curves.

    Returns
    -------
    dict
        CrossSections by family.
    """
    # In light pairs few partial waves take part and sigma(E) undulates: they are cheap and get more energies.
    spacing = LOG_SPACING * min(1.0, float(np.sqrt(pair.reduced_mass / (HEAVY * AMU_AU))))
    energy = energy_grid(temperatures, 2 * spacing if quick else spacing)
    density = effort(energy, temperatures, 0.35, 0.3) * (0.6 if quick else 1.0)
    # Fast collisions carry the transfer of widely split levels: they keep every step.
    fast = energy > KELVIN_HARTREE * temperatures.min()
    steps = np.where(fast, 1.0, effort(energy, temperatures, 0.2, 0.5)) * (0.8 if quick else 1.0)
    names = list(families)
    tables = {}
    for i, family in enumerate(names):

        def report(done: int, total: int, i: int = i) -> None:
            if progress is not None:
                progress(i * total + done, len(names) * total)

        tables[family] = cross_sections(pair, family, energy, density, steps * STEP_SHARE[family], not quick, report)
    return tables


def averaged(
    average: ThermalRates, pair: CollisionPair, temperatures: Array, tables: Mapping[str, CrossSections]
) -> dict[Key, list[Average]]:
    """Every thermal rate [au] at every temperature [K] from the tables of a method and its `thermal_rates`."""
    rows = [average(tables, pair.splitting, float(T), pair.reduced_mass) for T in temperatures]
    return {key: [row[key] for row in rows] for key in rows[0]}
