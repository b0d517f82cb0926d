"""Lindholm-Foley width and shift of a power-law difference potential -C_n/R^n on straight paths.

Atomic units, hbar = 1: rates in bohr^3 per atomic unit of time. Width is the full width at half maximum; shift > 0 is
blue. Derivation and checks: notes/closed-form.md.
"""

from __future__ import annotations

import math
from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.errors import InputError
from pertcalc.thermal import thermal_speed

Array: TypeAlias = NDArray[np.float64]


def require_finite(**values: float) -> None:
    """InputError that names every value which is not a finite number."""
    bad = [f"{name} = {value!r} must be a finite number" for name, value in values.items() if not _is_finite(value)]
    if bad:
        raise InputError(bad)


def _is_finite(value: float) -> bool:
    return isinstance(value, int | float | np.floating | np.integer) and math.isfinite(value)


def require_positive(name: str, value: ArrayLike, unit: str) -> Array:
    """The value as an array; InputError unless positive and finite everywhere."""
    array = np.asarray(value, dtype=float)
    if not np.all((array > 0) & (array < np.inf)):
        raise InputError(f"{name} must be positive and finite [{unit}]")
    return array


def _power(n: float) -> float:
    if not (_is_finite(n) and n > 3):
        raise InputError(f"n = {n!r} must be above 3: for R^-3 and slower the straight-path shift diverges")
    return float(n)


def phase_constant(n: float) -> float:
    """Constant a_n of the straight-path phase eta = a_n C_n/(hbar v b^(n-1)) of a potential -C_n/R^n.

    a_n = sqrt(pi) Gamma((n-1)/2)/Gamma(n/2); a_6 = 3 pi/8, a_12 = 63 pi/256.

    Parameters
    ----------
    n : float
        Power of the potential [1]; > 1.

    Returns
    -------
    a_n : float
        [1].

    Raises
    ------
    InputError
        n <= 1: the phase of a straight path diverges.

    Source
    ------
    Hindmarsh and Farr, Prog. Quantum Electron. 2, 141 (1972), from memory.
    """
    if not (_is_finite(n) and n > 1):
        raise InputError(f"n = {n!r} must be above 1: the phase of a straight path diverges otherwise")
    return math.sqrt(math.pi) * math.exp(math.lgamma((n - 1) / 2) - math.lgamma(n / 2))


def lindholm_foley_constants(n: float = 6) -> tuple[float, float]:
    """Width and shift constants: FWHM = w (|C_n|/hbar)^p v^(1-p) N, shift = -s sign(C_n) (same factors), p = 2/(n-1).

    w + 2 i s = 2 pi a_n^p Gamma(1-p) [cos(pi p/2) + i sin(pi p/2)]; 8.0828 and 2.9362 for n = 6.

    Parameters
    ----------
    n : float
        Power of the difference potential [1]; > 3.

    Returns
    -------
    w, s : float
        Both [1], positive.

    Raises
    ------
    InputError
        n <= 3.

    Source
    ------
    Lindholm (1945), Foley, Phys. Rev. 69, 616 (1946), from memory; computed from gamma functions.
    """
    p = 2 / (_power(n) - 1)
    whole = 2 * math.pi * phase_constant(n) ** p * math.gamma(1 - p)
    return whole * math.cos(math.pi * p / 2), whole * math.sin(math.pi * p / 2) / 2


def mean_speed(kT: ArrayLike, reduced_mass: float) -> Array:
    """Mean relative speed of a thermal pair, sqrt(8 kT/(pi mu)).

    Parameters
    ----------
    kT : array, shape (...)
        Thermal energy [hartree]; > 0.
    reduced_mass : float
        Reduced mass [electron masses]; > 0.

    Returns
    -------
    v : array, shape (...)
        [au of velocity].

    Raises
    ------
    InputError
        Not positive.
    """
    energy = require_positive("kT", kT, "hartree")
    return thermal_speed(energy, require_positive("reduced_mass", reduced_mass, "electron masses"))


def speed_moment(s: float) -> float:
    """Thermal moment of the relative speed in units of its mean, <v^s>/<v>^s = (2/sqrt(pi))^(1-s) Gamma((3+s)/2).

    Parameters
    ----------
    s : float
        Power [1]; > -3.

    Returns
    -------
    moment : float
        [1]; 0.977486 for s = 3/5.

    Raises
    ------
    InputError
        s <= -3.
    """
    if not (_is_finite(s) and s > -3):
        raise InputError(f"s = {s!r} must be above -3: the moment diverges otherwise")
    return (math.sqrt(math.pi) / 2) ** s * math.gamma((3 + s) / 2) / math.gamma(1.5)


def lindholm_foley(C: float, v: ArrayLike, n: float = 6) -> tuple[Array, Array]:
    """Impact width and shift per perturber density of a line with difference potential -C/R^n, at one speed.

    Parameters
    ----------
    C : float
        Coefficient, upper minus ground level [hartree bohr^n]; either sign.
    v : array, shape (...)
        Relative speed [au]; > 0.
    n : float
        Power [1]; > 3.

    Returns
    -------
    fwhm, shift : array, shape (...)
        Rate coefficients [rad bohr^3/au time]; shift is red (negative) for C > 0.

    Raises
    ------
    InputError
        n <= 3, C not finite, v not positive.

    Source
    ------
    As `lindholm_foley_constants`.
    """
    require_finite(C=C)
    p = 2 / (_power(n) - 1)
    width, shift = lindholm_foley_constants(n)
    common = abs(C) ** p * require_positive("v", v, "au") ** (1 - p)
    return width * common, -math.copysign(shift, C) * common


def lindholm_foley_thermal(C: float, kT: ArrayLike, reduced_mass: float, n: float = 6) -> tuple[Array, Array]:
    """Maxwell average of `lindholm_foley`, exact: <v^(1-p)> with p = 2/(n-1); T^0.3 for n = 6.

    Parameters
    ----------
    C : float
        Coefficient, upper minus ground level [hartree bohr^n].
    kT : array, shape (...)
        Thermal energy [hartree].
    reduced_mass : float
        [electron masses].
    n : float
        Power [1]; > 3.

    Returns
    -------
    fwhm, shift : array, shape (...)
        [rad bohr^3/au time].

    Raises
    ------
    InputError
        As `lindholm_foley`, or kT, reduced_mass not positive.
    """
    moment = speed_moment(1 - 2 / (_power(n) - 1))
    fwhm, shift = lindholm_foley(C, mean_speed(kT, reduced_mass), n)
    return moment * fwhm, moment * shift
