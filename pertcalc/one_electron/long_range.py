"""The long range of the pair model, and what it lacks of the dispersion coefficients.

Far away the model is first order: the polarised gas, averaged over the valence orbital, falls off as
``-C6/R^6 - C8/R^8 - C10/R^10`` with coefficients of its own. They are adiabatic: but for one term the gas follows the
electron at once, and its octupole is missing. The difference to the coefficients of dispersion.py is added to
the curves, damped inside the charge cloud, so that value and slope stay smooth and the tail becomes the true one.
notes/model-curves.md has the formulas.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Protocol

import numpy as np
from numpy.typing import NDArray
from scipy.special import eval_gegenbauer, gammainc

Array = NDArray[np.float64]
ORDERS = (6, 8, 10)
# l of the valence orbital and m along the axis.
ORBITALS = {"X": (0, 0), "A": (1, 1), "B": (1, 0)}


class Polarised(Protocol):
    """Polarisabilities of the gas as the electron model has them."""

    @property
    def alpha_d(self) -> float: ...
    @property
    def alpha_q(self) -> float: ...
    @property
    def tail_q(self) -> float: ...


class Orbitals(Protocol):
    """Nodes, weights, reduced radial functions and dipole operator of the atom."""

    @property
    def r(self) -> Array: ...
    @property
    def weights(self) -> Array: ...
    @property
    def radial(self) -> tuple[Array, ...]: ...
    def dipole_operator(self, r: Array) -> Array: ...


def model_coefficients(atom: Orbitals, electron: Polarised, core: Mapping[int, float]) -> dict[str, dict[int, float]]:
    """C6, C8, C10 that the pair model has by itself, averaged over the ns, np pi and np sigma orbital.

    Dipole of the gas: ``alpha_d/2 |E|^2`` with the multipoles r - p, r^2, r^3 ... of the atom. Quadrupole: core,
    electron and cross term as series of ``u^-p = sum_j G_j^(p/2)(x) r^j/R^(j+p)`` (Gegenbauer polynomials).

    Parameters
    ----------
    atom : Orbitals
    electron : Polarised
        Polarisabilities [bohr^3], [bohr^5].
    core : mapping
        n -> C_n of core and gas, without what the core's charge induces [hartree bohr^n].

    Returns
    -------
    dict
        state -> n -> C_n [hartree bohr^n].
    """
    x, w = np.polynomial.legendre.leggauss(24)
    density = {"X": np.full_like(x, 0.5), "A": 0.75 * (1.0 - x * x), "B": 1.5 * x * x}
    quadrupole = _quadrupole_series(x, electron)
    moments = [np.zeros(len(atom.r)), atom.dipole_operator(atom.r), *(atom.r**k for k in range(2, 6))]
    found = {}
    for state, (l, _) in ORBITALS.items():
        orbital, angular = atom.weights * atom.radial[l][0] ** 2, w * density[state]
        found[state] = {n: core.get(n, 0.0) for n in ORDERS}
        for n in ORDERS:
            for k in range(1, n - 4):
                field = float(angular @ _field_product(x, k, n - 4 - k))
                found[state][n] += 0.5 * electron.alpha_d * field * float(orbital @ (moments[k] * moments[n - 4 - k]))
            found[state][n] -= float(orbital @ atom.r ** (n - 6)) * float(angular @ quadrupole[n - 6])
    return found


def _field_product(x: Array, k: int, j: int) -> Array:
    """R^(k+j+4) E_k . E_j of axial multipoles of unit strength: (k+1)(j+1) P_k P_j + P_k^1 P_j^1."""
    P_k, P_j = (np.polynomial.legendre.Legendre.basis(order) for order in (k, j))
    return (k + 1) * (j + 1) * P_k(x) * P_j(x) + (1.0 - x * x) * P_k.deriv()(x) * P_j.deriv()(x)


def _quadrupole_series(x: Array, electron: Polarised) -> Array:
    """Coefficients of (r/R)^k, k = 0 ... 4, in R^6 V of the terms with the quadrupole of the gas, shape (5, nx)."""

    def inverse(p: int) -> Array:
        """(R/u)^p as a series in r/R."""
        return np.array([eval_gegenbauer(k, p / 2, x) for k in range(5)])

    def times_axis(series: Array) -> Array:
        """The series times (R - r x)/R."""
        moved = series.copy()
        moved[1:] -= x * series[:-1]
        return moved

    one = np.zeros((5, len(x)))
    one[0] = 1.0
    mixed = 1.5 * times_axis(times_axis(inverse(5))) - 0.5 * inverse(3)
    return -0.5 * electron.alpha_q * (one - 2.0 * mixed) - 0.5 * electron.tail_q * inverse(6)


def correction(R: Array, kappa: float, wanted: Mapping[int, float], own: Mapping[int, float]) -> Array:
    """``-sum_n f_n(kappa R) (C_n - C_n of the model)/R^n``, f_n the Tang-Toennies damping of the valence orbital.

    The orbital decays as exp(-kappa r). Inside the charge cloud the multipole series means nothing and the fitted
    electron-gas and core-gas potentials hold what it would say; f_n takes the difference out there.

    Parameters
    ----------
    R : array, shape (nR,)
        [bohr]
    kappa : float
        sqrt(2 I) of the valence orbital [bohr^-1].
    wanted, own : mapping
        n -> C_n [hartree bohr^n].

    Returns
    -------
    ndarray, shape (nR,)
        [hartree]
    """
    # f_n(x) = 1 - e^-x sum_{k<=n} x^k/k! is the regularised incomplete gamma function P(n+1, x).
    missing = np.array([wanted[n] - own[n] for n in ORDERS])
    return -missing @ np.array([gammainc(n + 1, kappa * R) / R**n for n in ORDERS])
