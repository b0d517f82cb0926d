"""Diffusion of alkali atoms in a noble gas: computed from the ground curve, set beside the measurements, one chosen.

Everything is the product n D [cm^-1 s^-1] of gas density and diffusion coefficient, which does not depend on density:
D = (n D)/n. Computed: Chapman-Enskog, first order, from the momentum-transfer cross section of curve X.
Measured: ``pertcalc/data/vapour/diffusion.csv`` (made by notes/scripts/make_vapour.py). notes/diffusion.md.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache
from numbers import Real

import numpy as np
from numpy.typing import NDArray

from pertcalc import species
from pertcalc.collisions.collision_integrals import (
    POINTS,
    chapman_enskog,
    classical_momentum_transfer,
    collision_integral,
    diffusion_grid,
    momentum_transfer,
    second_order,
)
from pertcalc.collisions.pair import pair_of
from pertcalc.collisions.transport import transport_cross_sections
from pertcalc.constants import AMU_AU, AU_TIME_S, BOHR2_ANGSTROM2, BOHR_CM, BOLTZMANN_J_K, KELVIN_HARTREE, TORR_PA
from pertcalc.curves.curveset import CurveSet
from pertcalc.curves.deform import PARAMETERS
from pertcalc.curves.files import for_pair, load_default
from pertcalc.errors import InputError, OutOfRangeError, UnknownNameError
from pertcalc.model_error import deformed_pair
from pertcalc.shipped import shipped_rows
from pertcalc.species import COMPUTED, READ, Sourced

Array = NDArray[np.float64]

UNIT = "cm^-1 s^-1"
NITROGEN = "N2"
# Temperatures at which curves and energies are sure to be good enough [K].
COLDEST, HOTTEST = 100.0, 2000.0
# What the stated errors of De, Re and C6 leave out: the wall, which an analytic form extrapolates from the well. It is
# the rms deviation of n D from the READ measurements with Tang-Toennies forms through the wells of the default X
# curves, whose own tabulated walls miss them by 6 % (notes/diffusion.md, tests/published).
WALL_ERROR = 0.21
# Error of the exponent d ln D/d ln T that carries a measurement to another temperature: a quarter of the span from
# hard spheres (1.5) to the deepest wells (1.9). The stated errors of the curves move it by 0.04 at most.
EXPONENT_ERROR = 0.1
# Where the source as seen says neither at which temperature nor how D follows from its cross section: +-100 K about
# 400 K, and D = 3 pi/32 vbar/(n sigma) or vbar/(3 n sigma).
ASSUMED_ERROR = math.hypot(0.5 * 100 / 400, 1 - 9 * math.pi / 32)


@dataclass(frozen=True, slots=True)
class MeasuredDiffusion:
    """One published measurement.

    ``own`` n D [cm^-1 s^-1] at its own ``temperature_K`` [K], error as stated (None where none is); ``scaled`` the
    same at the temperature asked for, with the error of the way there, None where there is no computed exponent;
    ``exponent`` d ln D/d ln T at constant pressure [1] where it was measured, with ``exponent_error``; ``standing``
    "usable", "superseded" (newer reduction of the same data exists) or "assumed" (a condition is a guess);
    ``published`` as printed.
    """

    alkali: str
    gas: str
    temperature_K: float
    own: Sourced
    exponent: float | None
    exponent_error: float | None
    standing: str
    year: int
    published: str
    grade: str
    note: str
    scaled: Sourced | None = None


@dataclass(frozen=True, slots=True)
class Diffusion:
    """Diffusion of one alkali in one gas at one temperature.

    ``computed`` n D [cm^-1 s^-1], its error numerical and model error in quadrature (None when the curve states
    none); ``numerical_error``, ``model_error`` their relative parts [1]; ``second_order`` what the next order of
    Chapman and Enskog would add [1], part of the model error; ``exponent`` d ln D/d ln T at constant pressure [1];
    ``measured`` every published value scaled to this temperature; ``chosen`` the value to use and ``reason`` why.
    """

    alkali: str
    gas: str
    temperature_K: float
    computed: Sourced
    numerical_error: float
    model_error: float | None
    second_order: float
    exponent: float
    measured: tuple[MeasuredDiffusion, ...]
    chosen: Sourced
    reason: str


def diffusion_cm2_s(nD: float, density_cm3: float) -> float:
    """Diffusion coefficient D [cm^2/s] from n D [cm^-1 s^-1] and the gas density [cm^-3]; InputError unless n > 0."""
    if not (math.isfinite(density_cm3) and density_cm3 > 0):
        raise InputError(
            f"density = {density_cm3!r} cm^-3 must be finite and > 0; a cell without gas has no diffusion."
        )
    return nD / density_cm3


def measured_diffusion(alkali: str, gas: str) -> tuple[MeasuredDiffusion, ...]:
    """Published measurements of a pair, not scaled; "N2" is a gas here, "He" and "3He" are two.

    Raises UnknownNameError for another alkali or gas. An empty tuple: nothing usable is known.
    """
    symbol = species.alkali_symbol(alkali)
    known = (*species.SPECIES_GASES, NITROGEN)
    label = next((one for one in known if isinstance(gas, str) and one.lower() == gas.strip().lower()), None)
    if label is None:
        raise UnknownNameError("gas", str(gas), known)
    return tuple(row for row in _all() if (row.alkali, row.gas) == (symbol, label))


def diffusion(alkali: str, gas: str, temperature_K: float, curves: CurveSet | None = None) -> Diffusion:
    """Diffusion of an alkali in a noble gas: computed, measured and the value to use.

    The value to use is the READ measurement with a stated error and stated conditions, newest set first, then smallest
    relative error; without one, the computed value. Measurements FROM MEMORY are only shown beside it.

    Parameters
    ----------
    alkali, gas : str
        Names that species.alkali and species.noble_gas know, or the pair of ``curves``.
    temperature_K : float
        Temperature of the gas [K]; 100 to 2000.
    curves : CurveSet or None
        None takes the default set.

    Returns
    -------
    Diffusion

    Raises
    ------
    UnknownNameError, InputError, OutOfRangeError
        Names, a temperature that is no number, a temperature out of range.
    """
    curves = load_default(alkali, gas) if curves is None else for_pair(curves, alkali, gas)
    _check_temperature(temperature_K)
    rows = [row for row in _all() if (row.alkali, row.gas) == (curves.alkali, curves.noble_gas)]
    numbers = _Computed(curves, [temperature_K, *(row.temperature_K for row in rows)])
    numerical, model = numbers.numerical_error(temperature_K), numbers.model_error(temperature_K)
    nD, exponent = numbers.nD(temperature_K), numbers.exponent(temperature_K)
    X = curves.states["X"]
    computed = Sourced(
        nD,
        UNIT,
        f"Chapman-Enskog, first order, transport cross section of curve X of {curves.id} ({X.source.status})",
        COMPUTED,
        None if model is None else nD * math.hypot(numerical, model),
    )
    measured = tuple(_scaled(row, temperature_K, nD / numbers.nD(row.temperature_K)) for row in rows)
    chosen, reason = _chosen(computed, measured)
    order = numbers.second_order(temperature_K)
    return Diffusion(
        curves.alkali,
        curves.noble_gas,
        temperature_K,
        computed,
        numerical,
        model,
        order,
        exponent,
        measured,
        chosen,
        reason,
    )


def _check_temperature(temperature_K: float) -> None:
    if not (isinstance(temperature_K, Real) and math.isfinite(temperature_K)):
        raise InputError(f"temperature = {temperature_K!r} must be a finite number [K]; give another value.")
    if not COLDEST <= temperature_K <= HOTTEST:
        step = "Choose a temperature inside; diffusion is computed for gas cells only."
        raise OutOfRangeError("temperature of the gas", temperature_K, COLDEST, HOTTEST, "K", step)


class _Computed:
    """Tabulated momentum transfer of one curve set and what follows from it; temperatures in K."""

    def __init__(self, curves: CurveSet, temperatures: list[float]):
        self.curves, self.pair = curves, pair_of(curves)
        self.energy = diffusion_grid(np.array(temperatures), self.pair.reduced_mass)
        self.sigma = momentum_transfer(self.pair, self.energy)

    def _first_order(self, energy: Array, sigma: Array, temperature: float) -> float:
        omega = collision_integral(energy, sigma, temperature).value
        return chapman_enskog(temperature, self.pair.reduced_mass, omega) / (BOHR_CM * AU_TIME_S)

    def nD(self, temperature: float) -> float:
        """n D [cm^-1 s^-1]."""
        return self._first_order(self.energy, self.sigma, temperature)

    def exponent(self, temperature: float) -> float:
        """d ln D/d ln T at constant pressure [1]: n D goes as sqrt(T)/Omega, 1/n as T."""
        return 1.5 - collision_integral(self.energy, self.sigma, temperature).exponent

    def numerical_error(self, temperature: float) -> float:
        """Relative [1]: every second energy left out, and finer quantum steps where the integrand peaks."""
        nD = self.nD(temperature)
        grid = self._first_order(self.energy[::2], self.sigma[::2], temperature) / nD - 1
        peak = int(np.argmin(np.abs(np.log(self.energy / (3 * KELVIN_HARTREE * temperature)))))
        finer = transport_cross_sections(self.pair, self.energy[peak : peak + 1], 1.5 * POINTS).momentum_transfer[0]
        return math.hypot(grid, finer / self.sigma[peak] - 1)

    def second_order(self, temperature: float) -> float:
        """Relative addition of the second Chapman-Enskog order [1]."""
        one, two, three = (collision_integral(self.energy, self.sigma, temperature, s).value for s in (1, 2, 3))
        atom = self.curves.mass_alkali_u or species.alkali(self.curves.alkali).mass_u.value
        return second_order(one, two, three, self.pair.reduced_mass / (atom * AMU_AU))

    def model_error(self, temperature: float) -> float | None:
        """Relative [1]: stated errors of X in turn (classically), the wall, the next order; None if X states none."""
        X = self.curves.states["X"]
        changes = {name: X.uncertainty[name] for name in PARAMETERS if X.uncertainty.get(name)}
        if not changes:
            return None
        base = self._first_order(self.energy, classical_momentum_transfer(self.pair, self.energy), temperature)
        parts = [self.second_order(temperature), 0.0 if X.form == "table" else WALL_ERROR]
        for name, change in changes.items():
            moved = classical_momentum_transfer(deformed_pair(self.curves, "X", name, change), self.energy)
            parts.append(self._first_order(self.energy, moved, temperature) / base - 1)
        return math.hypot(*parts)


def _scaled(row: MeasuredDiffusion, temperature_K: float, ratio: float) -> MeasuredDiffusion:
    """The row at another temperature, by the computed ratio of n D there and here [1]."""
    if temperature_K == row.temperature_K:
        return replace(row, scaled=row.own)
    error = None
    if row.own.error is not None:
        way = EXPONENT_ERROR * math.log(temperature_K / row.temperature_K)
        error = row.own.value * ratio * math.hypot(row.own.error / row.own.value, way)
    source = f"{row.own.source}; from {row.temperature_K:g} to {temperature_K:g} K by the computed temperature law"
    return replace(row, scaled=Sourced(row.own.value * ratio, UNIT, source, row.own.mark, error))


def _chosen(computed: Sourced, measured: tuple[MeasuredDiffusion, ...]) -> tuple[Sourced, str]:
    """The value to use, its error widened by the spread of what was read, and the reason."""
    read = [row for row in measured if row.own.mark == READ and row.standing == "usable" and row.scaled is not None]
    stated = [row for row in read if row.own.error is not None]
    if not stated:
        return computed, "no measurement that was read states an error and its conditions: computed"
    best = min(stated, key=lambda row: (-row.year, (row.own.error or 0.0) / row.own.value)).scaled
    values = [row.scaled.value for row in read if row.scaled is not None]
    assert best is not None and best.error is not None  # rows without were left out above
    spread = 0.5 * (max(values) - min(values))
    reason = "newest measurement that was read and states its error"
    if len(values) > 1:
        reason += f"; half the range of the {len(values)} that were read is part of the error"
    return replace(best, error=math.hypot(best.error, spread)), reason


@cache
def _all() -> tuple[MeasuredDiffusion, ...]:
    return shipped_rows("vapour", "diffusion.csv", _row)


def _row(cells: dict[str, str]) -> MeasuredDiffusion:
    value, temperature = float(cells["value"]), float(cells["temperature_K"])
    relative = float(cells["error"]) / value if cells["error"] else None
    nD = _TO_ND[cells["quantity"]](value, temperature, cells["alkali"], cells["gas"])
    source = f"{cells['source']}; {cells['quantity']} {value:g} {cells['unit']} at {temperature:g} K"
    if cells["quantity"] == _CROSS_SECTION:
        # Its error holds what had to be assumed; an unsure condition of a D is a matter of `standing`.
        relative = math.hypot(relative or 0.0, ASSUMED_ERROR)
    own = Sourced(nD, UNIT, source, cells["mark"], None if relative is None else relative * nD)
    exponent, exponent_error = (float(cells[key]) if cells[key] else None for key in ("exponent", "exponent_error"))
    return MeasuredDiffusion(
        alkali=cells["alkali"],
        gas=cells["gas"],
        temperature_K=temperature,
        own=own,
        exponent=exponent,
        exponent_error=exponent_error,
        standing=cells["standing"],
        year=int(cells["year"]),
        published=cells["published"],
        grade=cells["grade"],
        note=cells["note"],
    )


def _torr_density(temperature_K: float) -> float:
    """Density of an ideal gas at 1 Torr [cm^-3]."""
    return TORR_PA / (BOLTZMANN_J_K * temperature_K) * 1e-6


def _of_cross_section(sigma: float, temperature_K: float, alkali: str, gas: str) -> float:
    """n D [cm^-1 s^-1] of a thermal momentum-transfer cross section [A^2]."""
    atom, perturber = species.alkali(alkali).mass_u.value, species.noble_gas(gas).mass_u.value
    mu = atom * perturber / (atom + perturber) * AMU_AU
    return chapman_enskog(temperature_K, mu, sigma / BOHR2_ANGSTROM2) / (BOHR_CM * AU_TIME_S)


_CROSS_SECTION = "cross section"
_TO_ND: dict[str, Callable[[float, float, str, str], float]] = {
    "D at 760 Torr": lambda value, T, *_: value * 760 * _torr_density(T),
    "pressure times D": lambda value, T, *_: value * _torr_density(T),
    _CROSS_SECTION: _of_cross_section,
}
