"""Closed-form rates on straight paths: instant answers, and the limits every other method must meet.

Lindholm-Foley width and shift of a power-law difference potential, the Lennard-Jones form of it, depolarisation by
anisotropic van der Waals coupling. Atomic units, hbar = 1; a rate coefficient [bohr^3 per atomic unit of time] times
`constants.AU_RATE_CM3_S` is in cm^3/s (width and shift: rad/s cm^3). Width is the full width at half maximum; shift > 0
is blue. Derivations and checks: notes/closed-form.md.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike

from pertcalc.collisions.lennard_jones import (
    lennard_jones_alpha,
    lennard_jones_functions,
    lennard_jones_line,
    lennard_jones_line_thermal,
)
from pertcalc.collisions.lindholm_foley import (
    Array,
    lindholm_foley,
    lindholm_foley_constants,
    lindholm_foley_thermal,
    mean_speed,
    phase_constant,
    require_finite,
    require_positive,
    speed_moment,
)
from pertcalc.errors import InputError

__all__ = [
    "DEPOLARISATION_CONSTANTS",
    "DEPOLARISATION_ERROR",
    "ClosedFormRates",
    "closed_form_rates",
    "lennard_jones_alpha",
    "lennard_jones_functions",
    "lennard_jones_line",
    "lennard_jones_line_thermal",
    "lindholm_foley",
    "lindholm_foley_constants",
    "lindholm_foley_thermal",
    "mean_speed",
    "phase_constant",
    "power_law_half_width",
    "speed_moment",
    "van_der_waals_depolarisation",
]

# sigma_K = Lambda_K (D/(hbar v))^(2/5), one level on a straight path, D = C6(Sigma) - C6(Pi).
# COMPUTED by notes/scripts/van_der_waals_lambda.py, +-0.002; an independent integration gives 2.10, 2.575, 2.31 for
# 2P3/2 and 2.80, 2.54 for a P term without spin (+-0.01).
DEPOLARISATION_CONSTANTS: dict[str, dict[int, float]] = {
    "P3/2": {1: 2.102, 2: 2.577, 3: 2.311},
    "P1": {1: 2.805, 2: 2.536},
}
DEPOLARISATION_ERROR = 0.002

_UNKNOWN = {
    "P1/2 K=1": "closed form: J = 1/2 has no rank-2 coupling; its orientation is lost only through the other level",
    "transfer": "closed form: straight paths without fine structure know no energy gap",
}


def van_der_waals_depolarisation(D: float, kT: ArrayLike, reduced_mass: float, level: str = "P3/2") -> dict[int, Array]:
    """Loss rate of each multipole by anisotropic van der Waals coupling, Maxwell average of v Lambda_K (D/v)^(2/5).

    Parameters
    ----------
    D : float
        Anisotropy C6(Sigma) - C6(Pi) [hartree bohr^6]; only its size matters.
    kT : array, shape (...)
        Thermal energy [hartree].
    reduced_mass : float
        [electron masses].
    level : str
        "P3/2", or "P1" for a P term without spin.

    Returns
    -------
    loss : dict of K to array, shape (...)
        Rate coefficients [bohr^3/au time]; Lambda_K is good to +-0.002.

    Raises
    ------
    InputError
        Unknown level; D not finite; kT, reduced_mass not positive.

    Source
    ------
    Straight-path integration, notes/scripts/van_der_waals_lambda.py (COMPUTED); after Omont, Prog. Quantum Electron.
    5, 69 (1977).
    """
    require_finite(D=D)
    if level not in DEPOLARISATION_CONSTANTS:
        raise InputError(f"level {level!r} is not covered: use {' or '.join(DEPOLARISATION_CONSTANTS)}")
    common = abs(D) ** 0.4 * speed_moment(0.6) * mean_speed(kT, reduced_mass) ** 0.6
    return {K: Lambda * common for K, Lambda in DEPOLARISATION_CONSTANTS[level].items()}


def power_law_half_width(sigma0: float, exponent: float, v0: float, kT: ArrayLike, reduced_mass: float) -> Array:
    """Half width per density of a cross section sigma(v) = sigma0 (v/v0)^-exponent, Maxwell average.

    HWHM/N = (4/pi)^(exponent/2) Gamma(2 - exponent/2) v0 sigma0 (vbar/v0)^(1-exponent).

    Parameters
    ----------
    sigma0 : float
        Half-width cross section at v0 [bohr^2].
    exponent : float
        Power of the speed [1]; < 4; 0.4 is van der Waals.
    v0 : float
        Reference speed [au]; the astronomers' tables use 10^4 m/s.
    kT : array, shape (...)
        Thermal energy [hartree].
    reduced_mass : float
        [electron masses].

    Returns
    -------
    half_width : array, shape (...)
        [rad bohr^3/au time].

    Raises
    ------
    InputError
        Not finite, exponent >= 4, v0 not positive.

    Source
    ------
    Anstee and O'Mara, Mon. Not. R. Astron. Soc. 276, 859 (1995); Barklem and O'Mara (1997), from memory.
    """
    require_finite(sigma0=sigma0, exponent=exponent)
    if exponent >= 4:
        raise InputError(f"exponent = {exponent:g} must be below 4: the thermal average diverges otherwise")
    reference = require_positive("v0", v0, "au")
    factor = (4 / math.pi) ** (exponent / 2) * math.gamma(2 - exponent / 2)
    return factor * reference * sigma0 * (mean_speed(kT, reduced_mass) / reference) ** (1 - exponent)


@dataclass(frozen=True, slots=True)
class ClosedFormRates:
    """What the closed form knows about one pair; None with a reason where it knows nothing. Rates in [bohr^3/au time].

    ``fwhm`` and ``shift`` are per line [rad bohr^3/au time]; ``multipole_loss`` per level and rank; ``transfer`` per
    level; ``numerical_error_relative`` per quantity; ``reasons`` says why an entry is None.
    """

    fwhm: dict[str, Array]
    shift: dict[str, Array]
    multipole_loss: dict[str, dict[int, Array | None]]
    transfer: dict[str, Array | None]
    multipole_transfer: dict[str, dict[int, Array | None]]
    numerical_error_relative: dict[str, float]
    reasons: dict[str, str] = field(default_factory=dict)


def _lines(
    kT: ArrayLike, reduced_mass: float, dC6: Mapping[str, float], dC12: Mapping[str, float]
) -> tuple[dict[str, Array], dict[str, Array], dict[str, float]]:
    """Width, shift and relative numerical errors of each line."""
    missing = [f"dC12 has no entry for line {line}: add it or leave dC12 out" for line in dC6 if line not in dC12]
    if missing:
        raise InputError(missing)
    fwhm, shift, errors = {}, {}, {}
    for line, C6 in dC6.items():
        if dC12[line] == 0:
            fwhm[line], shift[line] = lindholm_foley_thermal(C6, kT, reduced_mass)
            error = 1e-14 * fwhm[line]
        else:
            fwhm[line], shift[line], error = lennard_jones_line_thermal(C6, dC12[line], kT, reduced_mass)
        for name, rate in (("fwhm", fwhm[line]), ("shift", np.abs(shift[line]))):
            errors[f"{line} {name}"] = float(np.max(error / np.maximum(rate, 1e-300)))
    return fwhm, shift, errors


def closed_form_rates(
    kT: ArrayLike,
    reduced_mass: float,
    dC6: Mapping[str, float],
    anisotropy: float,
    dC12: Mapping[str, float] | None = None,
) -> ClosedFormRates:
    """All closed-form rates of one alkali-noble-gas pair from its dispersion coefficients.

    Parameters
    ----------
    kT : array, shape (nT,)
        Thermal energies [hartree].
    reduced_mass : float
        Of the pair [electron masses].
    dC6 : mapping of line to float
        Scalar C6, upper minus ground level, (C6_Sigma + 2 C6_Pi)/3 - C6_X [hartree bohr^6], for "D1" and "D2".
    anisotropy : float
        C6(Sigma) - C6(Pi) [hartree bohr^6].
    dC12 : mapping of line to float, or None
        Repulsive part C12/R^12 of the difference potential [hartree bohr^12]; None is pure van der Waals.

    Returns
    -------
    rates : ClosedFormRates
        Rate coefficients per unit density [bohr^3/au time].

    Raises
    ------
    InputError
        Not finite, not positive, or a line of dC6 is missing in dC12.
    """
    fwhm, shift, errors = _lines(kT, reduced_mass, dC6, dict.fromkeys(dC6, 0.0) if dC12 is None else dC12)
    loss: dict[int, Array | None] = {**van_der_waals_depolarisation(anisotropy, kT, reduced_mass)}
    for K, Lambda in DEPOLARISATION_CONSTANTS["P3/2"].items():
        errors[f"P3/2 K={K}"] = DEPOLARISATION_ERROR / Lambda
    none: dict[int, Array | None] = {1: None}
    return ClosedFormRates(
        fwhm=fwhm,
        shift=shift,
        multipole_loss={"P1/2": {1: None}, "P3/2": loss},
        transfer={"P1/2": None, "P3/2": None},
        multipole_transfer={"P1/2": dict(none), "P3/2": dict(none)},
        numerical_error_relative=errors,
        reasons=dict(_UNKNOWN),
    )
