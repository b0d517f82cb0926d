"""The long range of the pair model, and what it lacks of the dispersion coefficients.

Far away the model is first order: the polarised gas, averaged over the valence orbital, falls off as
``-C6/R^6 - C8/R^8 - C10/R^10`` with coefficients of its own. They lack the gas atom's own frequency, the core that
moves with the electron and the octupole of the gas. The difference to the coefficients of dispersion.py is added to
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
    """Nodes, weights and reduced radial functions of the atom."""

    @property
    def r(self) -> Array: ...
    @property
    def weights(self) -> Array: ...
    @property
    def radial(self) -> tuple[Array, ...]: ...


def model_coefficients(atom: Orbitals, electron: Polarised, core: Mapping[int, float]) -> dict[str, dict[int, float]]:
    """C6, C8, C10 that the pair model has by itself.

    ``V = -alpha_d/2 |E|^2 - ...`` of core and electron, every term a sum of ``u^-p = sum_j G_j^(p/2)(x) r^j/R^(j+p)``
    (Gegenbauer polynomials), averaged over the ns, np pi and np sigma orbital, plus the dispersion of the core.

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
    dipole, quadrupole = _series(x, electron)
    found = {}
    for state, (l, _) in ORBITALS.items():
        orbital = atom.weights * atom.radial[l][0] ** 2
        powers = [float(np.sum(orbital * atom.r**k)) for k in range(7)]
        angular = w * density[state]
        found[state] = {
            n: core.get(n, 0.0)
            - powers[n - 4] * float(angular @ dipole[n - 4])
            - powers[n - 6] * float(angular @ quadrupole[n - 6])
            for n in ORDERS
        }
    return found


def _series(x: Array, electron: Polarised) -> tuple[Array, Array]:
    """Coefficients of (r/R)^k, k = 0 ... 6, in R^4 V_dipole and R^6 V_quadrupole, shape (7, nx)."""

    def inverse(p: int) -> Array:
        """(R/u)^p as a series in r/R."""
        return np.array([eval_gegenbauer(k, p / 2, x) for k in range(7)])

    def times_axis(series: Array) -> Array:
        """The series times (R - r x)/R."""
        moved = series.copy()
        moved[1:] -= x * series[:-1]
        return moved

    one = np.zeros((7, len(x)))
    one[0] = 1.0
    dipole = -0.5 * electron.alpha_d * (one + inverse(4) - 2.0 * times_axis(inverse(3)))
    mixed = 1.5 * times_axis(times_axis(inverse(5))) - 0.5 * inverse(3)
    quadrupole = -0.5 * electron.alpha_q * (one - 2.0 * mixed) - 0.5 * electron.tail_q * inverse(6)
    return dipole, quadrupole


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
