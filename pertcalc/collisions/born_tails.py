"""First-order (Born) contributions of large impact parameters, in closed form on straight paths.

Atomic units, hbar = 1. The difference potentials are -dC6/R^6 - dC8/R^8 - dC10/R^10 (isotropic, upper minus ground
level) and -D/R^6 times the anisotropy, D = C6(Sigma) - C6(Pi). Each effect has its value at one impact parameter
(`..._probability`, `phase`) and its integral 2 pi Int_b0^inf b db (`..._tail`). Derivations: notes/closed-form.md.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.errors import InputError
from pertcalc.quadrature import gauss_legendre_panels

Array = NDArray[np.float64]

# Loss of rank K without outflow, in units of (7 pi^2/128) (D/(v b^5))^2; the J = 1 row has no spin.
ELASTIC_SHARE: dict[str, dict[int, float]] = {
    "P1/2": {0: 0.0, 1: 0.0},
    "P3/2": {0: 0.0, 1: 2 / 15, 2: 4 / 15, 3: 2 / 15},
    "P1": {0: 0.0, 1: 1 / 2, 2: 3 / 10},
}
OUTFLOW_SHARE: dict[str, float] = {"P1/2": 1 / 3, "P3/2": 1 / 6}
_F0 = 7 * math.pi**2 / 128
# F(x)/pi^2 = e^-2x times this polynomial in x (rank-2 coupling R^-6 at the frequency of the splitting).
_F_POLYNOMIAL = (7 / 128, 7 / 64, 7 / 64, 7 / 96, 13 / 384, 1 / 96, 1 / 576)


def _positive(**values: ArrayLike) -> list[Array]:
    """Arrays that must be finite and > 0; one InputError names every bad one."""
    arrays = [np.asarray(value, dtype=float) for value in values.values()]
    bad = [name for name, a in zip(values, arrays, strict=True) if not np.all((a > 0) & (a < np.inf))]
    if bad:
        raise InputError([f"{name} must be positive and finite" for name in bad])
    return arrays


def _share(table: dict[str, dict[int, float]], level: str, K: int) -> float:
    try:
        return table[level][K]
    except KeyError:
        known = "; ".join(f"{name} with K = {', '.join(map(str, ranks))}" for name, ranks in table.items())
        raise InputError(f"level {level!r} with K = {K!r} is not covered: use {known}") from None


def phase(v: ArrayLike, b: ArrayLike, dC6: float, dC8: float = 0.0, dC10: float = 0.0) -> Array:
    """Phase Int dV dt of the isotropic difference potential on a straight path; its negative is the Born shift.

    (1/v) [ (3 pi/8) dC6/b^5 + (5 pi/16) dC8/b^7 + (35 pi/128) dC10/b^9 ]; positive when the upper level is more
    attracted.

    Parameters
    ----------
    v : array, shape (...)
        Relative speed [au]; > 0.
    b : array, shape (...)
        Impact parameter [bohr]; > 0, broadcast against v.
    dC6, dC8, dC10 : float
        Dispersion coefficients, upper minus ground level [au].

    Returns
    -------
    eta : array
        Phase [rad].

    Raises
    ------
    InputError
        v or b not positive.

    Source
    ------
    a_n = sqrt(pi) Gamma((n-1)/2)/Gamma(n/2), Hindmarsh and Farr, Prog. Quantum Electron. 2, 141 (1972), from memory.
    """
    v_, b_ = _positive(v=v, b=b)
    return math.pi * (3 / 8 * dC6 / b_**5 + 5 / 16 * dC8 / b_**7 + 35 / 128 * dC10 / b_**9) / v_


def shift_tail(
    v: ArrayLike, b0: ArrayLike, dC6: float, dC8: float = 0.0, dC10: float = 0.0, R_max: float | None = None
) -> Array:
    """Shift cross section of all impact parameters beyond b0; times v it is a shift rate independent of T.

    -(pi^2/4) dC6/(v b0^3) - (pi^2/8) dC8/(v b0^5) - (5 pi^2/64) dC10/(v b0^7), the same for both lines.

    Parameters
    ----------
    v : array, shape (...)
        Relative speed [au].
    b0 : array, shape (...)
        Largest impact parameter already counted [bohr].
    dC6, dC8, dC10 : float
        Dispersion coefficients, upper minus ground level [au].
    R_max : float or None
        Distance at which the counted paths were cut [bohr], >= b0; adds what lies at b < b0 beyond it.

    Returns
    -------
    sigma : array
        Shift cross section [bohr^2]; negative is red.

    Raises
    ------
    InputError
        v, b0 not positive, or R_max < b0.

    Source
    ------
    (1/v) Int (V_upper - V_ground) d^3R over b > b0, or R > R_max.
    """
    v_, b_ = _positive(v=v, b0=b0)
    terms = ((6, dC6), (8, dC8), (10, dC10))
    share = {6: math.pi / 4, 8: math.pi / 8, 10: 5 * math.pi / 64}
    if R_max is not None and not np.all(R_max >= b_):
        raise InputError(f"R_max = {R_max:g} bohr must not be smaller than b0")
    total = np.zeros(b_.shape)
    for n, C in terms:
        inside = 0.0 if R_max is None else _inside(n, b_, float(R_max))
        total = total - C * (math.pi * share[n] / b_ ** (n - 3) + inside)
    return total / v_


def _inside(n: int, b0: Array, R_max: float) -> Array:
    """Int R^-n d^3R over R > R_max and b < b0, with u = 1/R: 4 pi Int u^(n-4) (1 - sqrt(1 - b0^2 u^2)) du."""
    # b0 u = sin(theta) removes the square root at R = b0.
    theta, weights = gauss_legendre_panels([0.0, 1.0], 40)
    top = np.arcsin(np.minimum(b0 / R_max, 1.0))[..., None]
    s, c = np.sin(theta * top), np.cos(theta * top)
    # 1 - cos = s^2/(1 + cos) keeps its digits when R_max >> b0.
    integral = (s ** (n - 2) / (1 + c) * c) @ weights * top[..., 0]
    return 4 * math.pi * integral / b0 ** (n - 3)


def adiabatic_factor(x: ArrayLike) -> Array:
    """F(x): strength of the rank-2 R^-6 coupling at the frequency of the splitting, x = splitting b/(hbar v).

    F = pi^2 e^-2x (7/128 + 7x/64 + 7x^2/64 + 7x^3/96 + 13x^4/384 + x^5/96 + x^6/576).

    Parameters
    ----------
    x : array, shape (...)
        Massey parameter [1]; >= 0.

    Returns
    -------
    F : array, shape (...)
        Strength [1]; F(0) = 7 pi^2/128.

    Raises
    ------
    InputError
        x negative or not finite.

    Source
    ------
    Squared Fourier transforms of the rank-2 components of R^-6 on a straight path; notes/closed-form.md.
    """
    x_ = np.asarray(x, dtype=float)
    if not np.all((x_ >= 0) & (x_ < np.inf)):
        raise InputError("x must be finite and not negative")
    return math.pi**2 * np.exp(-2 * x_) * np.polynomial.polynomial.polyval(x_, _F_POLYNOMIAL)


def adiabatic_tail_factor(x0: ArrayLike) -> Array:
    """h(x0) = 8 x0^8 Int_x0^inf t^-9 F(t)/F(0) dt: how much of the outflow tail survives the splitting.

    Exactly 8 sum_k c_k x0^k E_{9-k}(2 x0) with the exponential integrals E_n and c_k the polynomial of F/F(0).

    Parameters
    ----------
    x0 : array, shape (...)
        Massey parameter at b0 [1]; >= 0.

    Returns
    -------
    h : array, shape (...)
        Factor [1]; h(0) = 1.

    Raises
    ------
    InputError
        x0 negative or not finite.

    Source
    ------
    Integral of `adiabatic_factor` over b, term by term (Abramowitz and Stegun, 5.1.4).
    """
    from scipy.special import expn

    x = np.asarray(x0, dtype=float)
    if not np.all((x >= 0) & (x < np.inf)):
        raise InputError("x0 must be finite and not negative")
    total = sum(c * x**k * expn(9 - k, 2 * x) for k, c in enumerate(_F_POLYNOMIAL))
    return np.asarray(8 * total / _F_POLYNOMIAL[0])


def _strength(v: Array, b: Array, D: float) -> Array:
    return (D / (v * b**5)) ** 2


def _massey(v: Array, b: Array, splitting: float) -> Array:
    if not 0 <= abs(splitting) < math.inf:
        raise InputError(f"splitting = {splitting!r} hartree must be finite")
    return abs(splitting) * b / v


def _outflow_share(level: str) -> float:
    return _share({name: {0: c} for name, c in OUTFLOW_SHARE.items()}, level, 0)


def outflow_probability(v: ArrayLike, b: ArrayLike, D: float, splitting: float, level: str) -> Array:
    """First-order probability to leave `level` for the other fine-structure level, c (D/(v b^5))^2 F(x).

    Parameters
    ----------
    v, b : array, shape (...)
        Relative speed [au] and impact parameter [bohr], broadcast against each other.
    D : float
        Anisotropy C6(Sigma) - C6(Pi) [au].
    splitting : float
        Fine-structure splitting [hartree]; its sign does not matter.
    level : str
        "P1/2" (c = 1/3) or "P3/2" (c = 1/6).

    Returns
    -------
    probability : array
        [1].

    Raises
    ------
    InputError
        v, b not positive; unknown level.
    """
    share = _outflow_share(level)
    v_, b_ = _positive(v=v, b=b)
    return share * _strength(v_, b_, D) * adiabatic_factor(_massey(v_, b_, splitting))


def outflow_tail(v: ArrayLike, b0: ArrayLike, D: float, splitting: float, level: str) -> Array:
    """Outflow cross section of all impact parameters beyond b0: c (7 pi^3/512) D^2/(v^2 b0^8) h(x0).

    Parameters
    ----------
    v, b0 : array, shape (...)
        Relative speed [au] and first impact parameter [bohr].
    D, splitting : float
        Anisotropy [au] and fine-structure splitting [hartree].
    level : str
        "P1/2" or "P3/2".

    Returns
    -------
    sigma : array
        [bohr^2].

    Raises
    ------
    InputError
        As `outflow_probability`.
    """
    share = _outflow_share(level)
    v_, b_ = _positive(v=v, b0=b0)
    whole = _over_b(_F0 * _strength(v_, b_, D), b_)
    return share * whole * adiabatic_tail_factor(_massey(v_, b_, splitting))


def _over_b(probability: Array, b0: Array) -> Array:
    """2 pi Int_b0^inf b db of a probability that falls as b^-10, from its value at b0."""
    return math.pi / 4 * b0**2 * probability


def multipole_loss_probability(v: ArrayLike, b: ArrayLike, D: float, splitting: float, level: str, K: int) -> Array:
    """First-order loss of rank K at one impact parameter: c_K (7 pi^2/128) (D/(v b^5))^2 plus the outflow.

    Parameters
    ----------
    v, b : array, shape (...)
        Relative speed [au] and impact parameter [bohr].
    D, splitting : float
        Anisotropy [au] and fine-structure splitting [hartree].
    level : str
        "P1/2", "P3/2", or "P1" (a P term without spin: no outflow).
    K : int
        Rank; 0 is the outflow itself.

    Returns
    -------
    probability : array
        [1]; exactly the outflow for P1/2, whose orientation has no first-order loss of its own.

    Raises
    ------
    InputError
        v, b not positive; unknown level or rank.
    """
    share = _share(ELASTIC_SHARE, level, K)
    v_, b_ = _positive(v=v, b=b)
    elastic = share * _F0 * _strength(v_, b_, D)
    return elastic + (outflow_probability(v_, b_, D, splitting, level) if level in OUTFLOW_SHARE else 0.0)


def multipole_loss_tail(v: ArrayLike, b0: ArrayLike, D: float, splitting: float, level: str, K: int) -> Array:
    """Loss cross section of rank K beyond b0: c_K (7 pi^3/512) D^2/(v^2 b0^8) plus the outflow tail.

    Parameters
    ----------
    v, b0 : array, shape (...)
        Relative speed [au] and first impact parameter [bohr].
    D, splitting : float
        Anisotropy [au] and fine-structure splitting [hartree].
    level : str
        "P1/2", "P3/2" or "P1".
    K : int
        Rank.

    Returns
    -------
    sigma : array
        [bohr^2].

    Raises
    ------
    InputError
        As `multipole_loss_probability`.
    """
    share = _share(ELASTIC_SHARE, level, K)
    v_, b_ = _positive(v=v, b0=b0)
    elastic = _over_b(share * _F0 * _strength(v_, b_, D), b_)
    return elastic + (outflow_tail(v_, b_, D, splitting, level) if level in OUTFLOW_SHARE else 0.0)


def _anisotropic_width(v: Array, b: Array, D: float, level: str) -> Array:
    """Half-width probability from the anisotropic phases inside P3/2; the mean over Omega of their square / 2."""
    return 7 * math.pi**2 / 1536 * _strength(v, b, D) if level == "P3/2" else np.zeros(np.broadcast(v, b).shape)


def half_width_probability(v: ArrayLike, b: ArrayLike, dC6: float, D: float, splitting: float, level: str) -> Array:
    """Real part of 1 - S S_g* to second order: phase^2/2, plus the anisotropic part of P3/2, plus half the outflow.

    Parameters
    ----------
    v, b : array, shape (...)
        Relative speed [au] and impact parameter [bohr].
    dC6 : float
        Isotropic C6, upper minus ground level [au].
    D, splitting : float
        Anisotropy [au] and fine-structure splitting [hartree].
    level : str
        Upper level, "P1/2" or "P3/2".

    Returns
    -------
    probability : array
        [1].

    Raises
    ------
    InputError
        v, b not positive; unknown level.
    """
    outflow = outflow_probability(v, b, D, splitting, level)
    v_, b_ = _positive(v=v, b=b)
    return phase(v_, b_, dC6) ** 2 / 2 + _anisotropic_width(v_, b_, D, level) + outflow / 2


def half_width_tail(v: ArrayLike, b0: ArrayLike, dC6: float, D: float, splitting: float, level: str) -> Array:
    """Half-width cross section beyond b0: (9 pi^3/512) dC6^2/(v^2 b0^8) [+ (7 pi^3/6144) D^2/(v^2 b0^8)] + outflow/2.

    Parameters
    ----------
    v, b0 : array, shape (...)
        Relative speed [au] and first impact parameter [bohr].
    dC6 : float
        Isotropic C6, upper minus ground level [au].
    D, splitting : float
        Anisotropy [au] and fine-structure splitting [hartree].
    level : str
        Upper level, "P1/2" (no bracket) or "P3/2".

    Returns
    -------
    sigma : array
        [bohr^2].

    Raises
    ------
    InputError
        As `half_width_probability`.
    """
    outflow = outflow_tail(v, b0, D, splitting, level)
    v_, b_ = _positive(v=v, b0=b0)
    return _over_b(phase(v_, b_, dC6) ** 2 / 2 + _anisotropic_width(v_, b_, D, level), b_) + outflow / 2
