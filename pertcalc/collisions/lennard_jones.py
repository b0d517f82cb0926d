"""Width and shift of a Lennard-Jones difference potential on straight paths: B(alpha), S(alpha), thermal averages.

With q = 1/x the phase eta = alpha q^11 - q^5 is a polynomial, and one integration by parts gives
    2 B - i S = Int_0^inf x (1 - e^{i eta}) dx = -(i/2) Int_0^inf q^-2 eta'(q) e^{i eta(q)} dq
with an entire integrand. The path of integration is bent into the complex plane so that nothing oscillates:
notes/closed-form.md. Everything is in units of the saddle q_s = (5/(11 |alpha|))^(1/6): p = q/q_s, kappa = q_s^5.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.collisions.lindholm_foley import (
    Array,
    lindholm_foley,
    mean_speed,
    phase_constant,
    require_finite,
    require_positive,
)
from pertcalc.errors import InputError
from pertcalc.quadrature import gauss_legendre_panels, maxwell_average, maxwell_panels

# Legs end where the integrand has fallen by e^-45 = 3e-20.
_DECAY = 45.0
_PANELS, _ORDER = 4, 20
_CHUNK = 2000  # values of alpha at a time: a few tens of MB
# The thermal average doubles its panels until it settles to this; at small alpha B and S oscillate with v.
_THERMAL_TOLERANCE, _THERMAL_PANELS = 1e-8, (24, 48, 96, 192)
# Beyond these the answer is the pure-C6 (relative difference < 1e-9) or would overflow.
_ALPHA_MIN, _ALPHA_MAX = 1e-40, 1e40

_FALL = np.exp(-0.1j * np.pi)  # e^{-i q^5} falls fastest along this ray
_STEEP = np.exp(0.25j * np.pi)  # steepest descent through the saddle
_RISE = np.exp(1j * np.pi / 22)  # e^{i q^11} falls fastest along this ray
_TAN_FALL, _TAN_RISE = math.tan(0.1 * math.pi), math.tan(math.pi / 22)
# Distance from the saddle, along its steepest line, to the two rays.
_BACK = math.sqrt(2) * _TAN_FALL / (1 + _TAN_FALL)
_AHEAD = math.sqrt(2) * _TAN_RISE / (1 - _TAN_RISE)


def _leg(kappa: NDArray, start: NDArray, end: NDArray, sign: float) -> NDArray:
    """Integral of p^-2 eta' e^{i eta} along straight legs, one per kappa; eta = kappa (sign 5/11 p^11 - p^5)."""
    t, weights = gauss_legendre_panels(np.linspace(0.0, 1.0, _PANELS + 1), _ORDER)
    p = start[:, None] + (end - start)[:, None] * t
    p2 = p * p
    p5 = p2 * p2 * p
    p6 = p5 * p
    k = kappa[:, None]
    values = 5 * k * p2 * (sign * p6 - 1) * np.exp(1j * k * (sign * 5 / 11 * p6 * p5 - p5))
    return (values @ weights) * (end - start)


def _bent_path(alpha: NDArray) -> NDArray:
    """2 B - i S for nonzero alpha, shape (n,)."""
    saddle = (5 / (11 * np.abs(alpha))) ** (1 / 6)
    kappa = saddle**5
    zero = np.zeros(alpha.shape, complex)
    one = zero + 1
    total = np.zeros(alpha.shape, complex)
    attract = alpha > 0
    if attract.any():
        k, o, e = kappa[attract], zero[attract], one[attract]
        # A distance s from the saddle |e^{i eta}| < exp(-2.7 kappa s^2) backward, exp(-12 kappa s^2) ahead.
        back, ahead = np.minimum(_BACK, np.sqrt(_DECAY / (2.7 * k))), np.minimum(_AHEAD, np.sqrt(_DECAY / (12 * k)))
        first = np.minimum(abs(1 - _BACK * _STEEP), (_DECAY / k) ** 0.2)
        corner = abs(1 + _AHEAD * _STEEP)
        last = np.maximum(corner, 1.05 * (2.2 * _DECAY / k) ** (1 / 11))
        total[attract] = (
            _leg(k, o, first * _FALL, 1.0)
            + _leg(k, e - back * _STEEP, e, 1.0)
            + _leg(k, e, e + ahead * _STEEP, 1.0)
            + _leg(k, o + corner * _RISE, last * _RISE, 1.0)
        )
    repel = ~attract
    if repel.any():  # both terms of eta are negative: no saddle, one ray on which both fall
        k = kappa[repel]
        last = np.minimum((2.2 * _DECAY / k) ** (1 / 11), (_DECAY / (k * math.sin(5 * math.pi / 22))) ** 0.2)
        total[repel] = _leg(k, zero[repel], last * _RISE.conjugate(), -1.0)
    return -0.5j / saddle**2 * total


def lennard_jones_functions(alpha: ArrayLike) -> tuple[Array, Array]:
    """Width function B and shift function S of a C12-C6 difference potential.

    B = Int_0^inf x sin^2[(alpha x^-11 - x^-5)/2] dx, S = Int_0^inf x sin(alpha x^-11 - x^-5) dx.

    Parameters
    ----------
    alpha : array, shape (...)
        Strength of the repulsion [1]; negative when C12 has the sign of the attraction. |alpha| <= 1e40.

    Returns
    -------
    B, S : array, shape (...)
        Both [1], accurate to 1e-12 relative to |2B - iS|; S > 0 is a blue shift.

    Raises
    ------
    InputError
        alpha is not finite or too large.

    Source
    ------
    Definition: Hindmarsh, Petford and Smith, Proc. R. Soc. A 297, 296 (1967); Behmenburg, JQSRT 4, 177 (1964), from
    memory. Evaluation: notes/closed-form.md.
    """
    values = np.asarray(alpha, dtype=float)
    if not np.all(np.abs(values) <= _ALPHA_MAX):
        raise InputError(f"alpha must be finite and at most {_ALPHA_MAX:g} in size")
    flat = values.ravel()
    pure = math.gamma(0.6) / 2 * np.exp(0.2j * np.pi)  # alpha = 0: Gamma(3/5) e^{i pi/5} / 2
    used = np.abs(flat) > _ALPHA_MIN
    result = np.full(flat.shape, pure)
    for chunk in np.array_split(np.flatnonzero(used), max(1, used.sum() // _CHUNK)):
        result[chunk] = _bent_path(flat[chunk])
    whole = result.reshape(values.shape)
    return 0.5 * whole.real, -whole.imag


def lennard_jones_alpha(C6: float, C12: float, v: ArrayLike) -> Array:
    """Strength of the repulsion, alpha = (63 pi/256)(3 pi/8)^(-11/5) (hbar v)^(6/5) C12/C6^(11/5) (signs of both: +).

    Parameters
    ----------
    C6, C12 : float
        Difference potential C12/R^12 - C6/R^6 [hartree bohr^6, hartree bohr^12]; C6 not 0.
    v : array, shape (...)
        Relative speed [au].

    Returns
    -------
    alpha : array, shape (...)
        [1]; negative when C6 and C12 differ in sign.

    Raises
    ------
    InputError
        C6 = 0, not finite, v not positive.

    Source
    ------
    Hindmarsh, Petford and Smith, Proc. R. Soc. A 297, 296 (1967), from memory; prefactor 0.5391 computed.
    """
    require_finite(C6=C6, C12=C12)
    if C6 == 0:
        raise InputError("C6 = 0: alpha is not defined; use lindholm_foley with n = 12")
    prefactor = phase_constant(12) * phase_constant(6) ** (-11 / 5)
    sign = math.copysign(1.0, C6)
    return prefactor * require_positive("v", v, "au") ** (6 / 5) * (sign * C12) / abs(C6) ** (11 / 5)


def lennard_jones_line(C6: float, C12: float, v: ArrayLike) -> tuple[Array, Array]:
    """Impact width and shift of a line with difference potential C12/R^12 - C6/R^6, at one speed.

    FWHM = 8 pi (3 pi/8)^(2/5) (C6/hbar)^(2/5) v^(3/5) B(alpha), shift = 2 pi (3 pi/8)^(2/5) (...) S(alpha).

    Parameters
    ----------
    C6, C12 : float
        Upper minus ground level [hartree bohr^6, hartree bohr^12]; any signs. C12 = 0 is Lindholm-Foley.
    v : array, shape (...)
        Relative speed [au].

    Returns
    -------
    fwhm, shift : array, shape (...)
        [rad bohr^3/au time].

    Raises
    ------
    InputError
        Not finite; v not positive.

    Source
    ------
    As `lennard_jones_alpha`.
    """
    require_finite(C6=C6, C12=C12)
    if C12 == 0:
        return lindholm_foley(C6, v)
    speed = require_positive("v", v, "au")
    if C6 == 0:
        return lindholm_foley(-C12, speed, n=12)
    B, S = lennard_jones_functions(lennard_jones_alpha(C6, C12, speed))
    common = 2 * math.pi * (phase_constant(6) * abs(C6)) ** 0.4 * speed**0.6
    # Both coefficients with the opposite sign: every phase changes sign, so the shift does and the width does not.
    return 4 * common * B, math.copysign(1.0, C6) * common * S


def lennard_jones_line_thermal(C6: float, C12: float, kT: ArrayLike, reduced_mass: float) -> tuple[Array, Array, Array]:
    """Maxwell average of `lennard_jones_line` over v, alpha(v) included.

    Parameters
    ----------
    C6, C12 : float
        Upper minus ground level [hartree bohr^6, hartree bohr^12].
    kT : array, shape (...)
        Thermal energy [hartree].
    reduced_mass : float
        [electron masses].

    Returns
    -------
    fwhm, shift : array, shape (...)
        [rad bohr^3/au time].
    error : array, shape (...)
        Numerical error of either [rad bohr^3/au time]: last change on doubling the panels.

    Raises
    ------
    InputError
        As `lennard_jones_line`.
    """
    energy = require_positive("kT", kT, "hartree")
    require_positive("reduced_mass", reduced_mass, "electron masses")
    previous: tuple[Array, Array] | None = None
    for panels in _THERMAL_PANELS:
        x, weights = maxwell_panels(panels, 12)
        v = np.sqrt(2 * energy[..., None] * x / reduced_mass)
        # <v sigma> = vbar Int x e^-x sigma dx; the line rates are v sigma.
        flux = mean_speed(energy, reduced_mass)[..., None] / v
        at_v = lennard_jones_line(C6, C12, v)
        fwhm, shift = (maxwell_average(flux * rate, weights) for rate in at_v)
        if previous is not None:
            error = np.hypot(fwhm - previous[0], shift - previous[1]) + 1e-13 * fwhm
            if np.all(error <= _THERMAL_TOLERANCE * fwhm):
                break
        previous = fwhm, shift
    return fwhm, shift, error
