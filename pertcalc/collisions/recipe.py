"""Which family of paths answers for which rate of the semiclassical method: the empirical rule in one place.

One classical path must serve states that move on different curves. With xi = splitting R/vbar, R = 10 bohr (the phase
the splitting turns during a collision), the two ends are clear: xi >> 1, the levels stay on their adiabatic curves
(P1/2 on the lower Omega = 1/2, P3/2 on V_Pi and the upper one); xi << 1, the spin is a spectator and both levels are
the same mixture of V_Pi and V_Sigma. Rates are weighted means of results (not of curves) on V_Pi, upper and lower
curve, with weights that pass from one end to the other; fitted to quantum close coupling of the 25 default pairs at
300, 400 and 500 K, notes/method-comparison.md. Transfer and outflow: the lower curve at the mean energy of the two
levels, both directions from one integral (detailed balance is exact); the outflow inside a multipole loss is replaced
by that transfer.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.pair import CollisionPair
from pertcalc.collisions.semiclassical import CrossSections, cross_sections
from pertcalc.constants import KELVIN_HARTREE
from pertcalc.thermal import Average, balanced_transfer, effort, energy_grid, energy_spacing, maxwell, mean_speed

Array = NDArray[np.float64]
Progress = Callable[[int, int], None]
Key = tuple[str, ...]
ThermalRates = Callable[[Mapping[str, CrossSections], float, float, float], dict[Key, Average]]

FAMILIES = ("lower", "pi", "upper")
# Below this Massey parameter (Li, Na, K) energies lie closer by MIXED_SPACING.
XI_MIXED = 15.0
MIXED_SPACING = 0.6
# Share of the standard steps: only the transfer, taken from the lower curve, needs every one of them.
STEP_SHARE = {"lower": 1.0, "pi": 0.6, "upper": 0.6}
R_COLLISION = 10.0
# Weight of V_Pi (the rest is the upper curve) in the loss of rank K of P3/2, for xi << and >> XI_P32.
P32_SUDDEN = {1: 0.87, 2: 0.90, 3: 0.72}
P32_ADIABATIC = {1: 0.80, 2: 0.50, 3: 0.42}
XI_P32 = 3.0
# P1/2: the lower curve for xi >> XI_P12; for xi << XI_P12 V_Pi for the line, and this weight of V_Pi for rank 1.
P12_SUDDEN = 0.70
XI_P12 = 0.15


def p32_weights(K: int, xi: float) -> tuple[float, float]:
    """Weights of V_Pi and of the upper curve in the loss of rank K of P3/2 at Massey parameter xi [1]."""
    sudden = XI_P32 / (xi + XI_P32)
    on_pi = P32_ADIABATIC[K] + sudden * (P32_SUDDEN[K] - P32_ADIABATIC[K])
    return on_pi, 1 - on_pi


def p12_weights(xi: float, line: bool) -> tuple[float, float, float]:
    """Weights of the lower curve, V_Pi and the upper curve for P1/2 at Massey parameter xi [1]: its line or rank 1."""
    sudden = XI_P12 / (xi + XI_P12)
    on_pi = 1.0 if line else P12_SUDDEN
    return 1 - sudden, sudden * on_pi, sudden * (1 - on_pi)


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
    xi = splitting * R_COLLISION / float(mean_speed(temperature, reduced_mass))

    def weighted(name: str, parts: Iterable[tuple[float, CrossSections]]) -> list[tuple[float, Average]]:
        return [(weight, mean(table, name)) for weight, table in parts if weight]

    def elastic(level: str, K: int, parts: list[tuple[float, CrossSections]], inflow: Average) -> Average:
        leaving = [(-weight, table) for weight, table in parts]
        return _sum([(1.0, inflow), *weighted(f"{level}.loss{K}", parts), *weighted(f"{level}.outflow", leaving)])

    low = list(zip(p12_weights(xi, line=True), (lower, pi, upper), strict=True))
    for line, level, parts in (("D1", "P1/2", low), ("D2", "P3/2", [(1.0, pi)])):
        # The cross section belongs to the half width, an angular frequency.
        rates["fwhm", line] = _sum([(2 * weight, part) for weight, part in weighted(f"{level}.width", parts)])
        rates["shift", line] = _sum(weighted(f"{level}.shift", parts))
    low = list(zip(p12_weights(xi, line=False), (lower, pi, upper), strict=True))
    rates["loss", "P1/2", "1"] = elastic("P1/2", 1, low, plain.up)
    for K in (1, 2, 3):
        high = list(zip(p32_weights(K, xi), (pi, upper), strict=True))
        rates["loss", "P3/2", str(K)] = elastic("P3/2", K, high, plain.down)
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
    spacing = energy_spacing(pair.reduced_mass)
    # Where the levels mix strongly, transfer undulates with E (two passages of the coupling interfere).
    slowest = float(mean_speed(temperatures.min(), pair.reduced_mass))
    if pair.splitting * R_COLLISION / slowest < XI_MIXED:
        spacing *= MIXED_SPACING
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
                progress(100 * i + 100 * done // total, 100 * len(names))

        tables[family] = cross_sections(pair, family, energy, density, steps * STEP_SHARE[family], not quick, report)
    return tables


def averaged(
    average: ThermalRates, pair: CollisionPair, temperatures: Array, tables: Mapping[str, CrossSections]
) -> dict[Key, list[Average]]:
    """Every thermal rate [au] at every temperature [K] from the tables of a method and its `thermal_rates`."""
    rows = [average(tables, pair.splitting, float(T), pair.reduced_mass) for T in temperatures]
    return {key: [row[key] for row in rows] for key in rows[0]}
