"""Density of saturated alkali vapour from published vapour-pressure formulas, over the solid and over the liquid.

    log10 P = a + b/T + c T + d log10 T,    n = P/(kT)

The formulas are ``pertcalc/data/vapour/vapour_pressure.csv``, made by notes/scripts/make_vapour.py.
notes/vapour-density.md.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache
from numbers import Real

from pertcalc import species
from pertcalc.constants import BOLTZMANN_J_K, TORR_PA
from pertcalc.errors import InputError, OutOfRangeError
from pertcalc.shipped import shipped_rows
from pertcalc.species import Sourced

SOLID, LIQUID = "solid", "liquid"


@dataclass(frozen=True, slots=True)
class VapourDensity:
    """Saturated vapour of one alkali at one temperature, by one published formula.

    ``pressure_torr`` [Torr] and ``density_cm3`` [cm^-3] with the formula's source, mark and absolute error;
    ``phase`` "solid" | "liquid", what the vapour is in equilibrium with; ``formula`` as printed; ``others`` the same by
    the other published formulas that cover this temperature, each with the error it states (None where it states none);
    ``warnings`` what a reader must know.
    """

    pressure_torr: Sourced
    density_cm3: Sourced
    phase: str
    formula: str
    others: tuple[VapourDensity, ...] = ()
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Formula:
    """One vapour-pressure formula, ``log10(quantity) = a + b/T + c T + d log10 T``.

    ``quantity`` "P/Pa" | "P/Torr" | "n/cm^-3"; ``low_K``, ``high_K`` range [K], infinite where none is stated;
    ``warn_above_K`` [K] where the source names a lower end of validity too; ``error_relative`` [1] as stated, or None.
    """

    alkali: str
    phase: str
    is_default: bool
    quantity: str
    coefficients: tuple[float, float, float, float]
    error_relative: float | None
    low_K: float
    high_K: float
    warn_above_K: float
    published: str
    source: str
    mark: str
    grade: str
    note: str

    def density_cm3(self, temperature_K: float) -> float:
        """Density [cm^-3] at a temperature [K], which is not checked against the range."""
        a, b, c, d = self.coefficients
        value = 10 ** (a + b / temperature_K + c * temperature_K + d * math.log10(temperature_K))
        if self.quantity == "n/cm^-3":
            return value
        pascal = value * (TORR_PA if self.quantity == "P/Torr" else 1.0)
        return pascal / (BOLTZMANN_J_K * temperature_K) * 1e-6


def formulas(alkali: str) -> tuple[Formula, ...]:
    """All published formulas of an alkali, solid and liquid; UnknownNameError for another name."""
    symbol = species.alkali_symbol(alkali)
    return tuple(one for one in _all() if one.alkali == symbol)


def alkali_density(alkali: str, temperature_K: float) -> VapourDensity:
    """Pressure and density of the saturated vapour of an alkali.

    The vapour of a closed cell is saturated at the temperature of its coldest point, where the metal sits: give that
    one. If the rest of the cell is hotter the density there is lower, n T being the same everywhere.

    Parameters
    ----------
    alkali : str
        "Li", "Na", "K", "Rb" or "Cs".
    temperature_K : float
        Temperature of the coldest point [K]; 298 up to the end of the formula's range.

    Returns
    -------
    VapourDensity
        Alcock, Itkin and Horrigan. Errors: the 5 % they state and half the range of all formulas that cover this
        temperature, in quadrature.

    Raises
    ------
    UnknownNameError
        Another alkali.
    InputError
        A temperature that is no finite number.
    OutOfRangeError
        A temperature the default formula does not cover.
    """
    known = formulas(alkali)
    default = _default_at([one for one in known if one.is_default], temperature_K)
    others = tuple(
        _evaluated(one, temperature_K, one.error_relative)
        for one in known
        if not one.is_default and one.phase == default.phase and one.low_K <= temperature_K <= one.high_K
    )
    densities = [default.density_cm3(temperature_K), *(float(one.density_cm3) for one in others)]
    spread = 0.5 * (max(densities) - min(densities)) / densities[0]
    warnings = []
    if temperature_K > default.warn_above_K:
        warnings.append(
            f"{temperature_K:g} K is above {default.warn_above_K:g} K: the source prints the end of the range of its "
            f"formula for {default.alkali} as {default.warn_above_K:g}/{default.high_K:g} K, so 5 % may not hold here."
        )
    if spread > 2 * (default.error_relative or 0.0):
        times = " and ".join(f"{n / densities[0]:.2f}" for n in densities[1:])
        formula = "other published formulas give" if len(densities) > 2 else "another published formula gives"
        warnings.append(f"{default.alkali} vapour: {formula} {times} times this density.")
    error = math.hypot(default.error_relative or 0.0, spread)
    return _evaluated(default, temperature_K, error, others, tuple(warnings))


def _default_at(defaults: list[Formula], temperature_K: float) -> Formula:
    """The default formula that covers a temperature: the solid's below the melting point, else the liquid's."""
    if not (isinstance(temperature_K, Real) and math.isfinite(temperature_K)):
        raise InputError(f"temperature = {temperature_K!r} must be a finite number [K]; give another value.")
    low, high = min(one.low_K for one in defaults), max(one.high_K for one in defaults)
    if not low <= temperature_K <= high:
        raise OutOfRangeError(
            f"temperature of the {defaults[0].alkali} vapour",
            temperature_K,
            low,
            high,
            "K",
            "The vapour-pressure formula does not hold there: choose a temperature inside.",
        )
    solid = next(one for one in defaults if one.phase == SOLID)
    return solid if temperature_K < solid.high_K else next(one for one in defaults if one.phase == LIQUID)


def _evaluated(
    formula: Formula,
    temperature_K: float,
    error: float | None,
    others: tuple[VapourDensity, ...] = (),
    warnings: tuple[str, ...] = (),
) -> VapourDensity:
    density = formula.density_cm3(temperature_K)
    torr = density * 1e6 * BOLTZMANN_J_K * temperature_K / TORR_PA

    def sourced(value: float, unit: str) -> Sourced:
        return Sourced(value, unit, formula.source, formula.mark, None if error is None else error * value)

    return VapourDensity(
        sourced(torr, "Torr"), sourced(density, "cm^-3"), formula.phase, formula.published, others, warnings
    )


@cache
def _all() -> tuple[Formula, ...]:
    return shipped_rows("vapour", "vapour_pressure.csv", _formula)


def _formula(cells: dict[str, str]) -> Formula:
    def number(name: str, missing: float) -> float:
        return float(cells[name]) if cells[name] else missing

    return Formula(
        cells["alkali"],
        cells["phase"],
        cells["formula"] == "default",
        cells["quantity"],
        (float(cells["a"]), float(cells["b"]), float(cells["c"]), float(cells["d"])),
        float(cells["error_relative"]) if cells["error_relative"] else None,
        number("low_K", 0.0),
        number("high_K", math.inf),
        number("warn_above_K", math.inf),
        *(cells[name] for name in ("published", "source", "mark", "grade", "note")),
    )
