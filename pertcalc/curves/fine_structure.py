"""Adiabatic fine-structure curves of the first P level, and the difference curves that shape the D lines.

All functions take arrays of any (common) shape in hartree. Energies of the P level count from its fine-structure-free
position, so at R -> infinity P1/2 lies at -2 s/3 and P3/2 at +s/3 where s is the splitting.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from pertcalc.constants import HARTREE_CM1
from pertcalc.curves.base import Array, Curve
from pertcalc.curves.curveset import CurveSet
from pertcalc.species import alkali


def coupling(splitting: float) -> float:
    """Spin-orbit constant a of ``a l.s`` [hartree] for a splitting P3/2 - P1/2 [hartree]: a = splitting/1.5."""
    return splitting / 1.5


def _parts(V_sigma: ArrayLike, V_pi: ArrayLike, splitting: float) -> tuple[Array, Array, Array]:
    """Mean of the diagonal, half its difference, half the distance of the eigenvalues."""
    a = coupling(splitting)
    sigma = np.asarray(V_sigma, dtype=np.float64)
    pi = np.asarray(V_pi, dtype=np.float64) - a / 2
    half = (sigma - pi) / 2
    return (sigma + pi) / 2, half, np.hypot(half, a / np.sqrt(2.0))


def lower(V_sigma: ArrayLike, V_pi: ArrayLike, splitting: float) -> Array:
    """Lower Omega = 1/2 curve (tends to P1/2): smaller eigenvalue of [[V_S, a/sqrt2], [a/sqrt2, V_P - a/2]].

    Parameters
    ----------
    V_sigma, V_pi : array_like, any common shape
        Spin-free curves of B (2Sigma+) and A (2Pi) [hartree].
    splitting : float
        P3/2 - P1/2 of the free atom [hartree]; >= 0.

    Returns
    -------
    ndarray, same shape
        Energy from the fine-structure-free P level [hartree].
    """
    mean, _, root = _parts(V_sigma, V_pi, splitting)
    return mean - root


def upper(V_sigma: ArrayLike, V_pi: ArrayLike, splitting: float) -> Array:
    """Upper Omega = 1/2 curve (tends to P3/2) [hartree]; arguments and shape as ``lower``."""
    mean, _, root = _parts(V_sigma, V_pi, splitting)
    return mean + root


def omega32(V_pi: ArrayLike, splitting: float) -> Array:
    """Omega = 3/2 curve V_P + a/2 (tends to P3/2) [hartree], shape of V_pi."""
    return np.asarray(V_pi, dtype=np.float64) + coupling(splitting) / 2


def sigma_weight(V_sigma: ArrayLike, V_pi: ArrayLike, splitting: float) -> Array:
    """Weight [1] of the Sigma state in the lower Omega = 1/2 state, 0 to 1; 1/3 at R -> infinity.

    Arguments and shape as ``lower``. Where both curves and the splitting vanish it is 1/2.
    """
    _, half, root = _parts(V_sigma, V_pi, splitting)
    return 0.5 * (1.0 - np.divide(half, root, out=np.zeros_like(root), where=root > 0))


def lower_derivative(
    V_sigma: ArrayLike, V_pi: ArrayLike, dV_sigma: ArrayLike, dV_pi: ArrayLike, splitting: float
) -> Array:
    """dR derivative of ``lower`` [hartree/bohr], ``w V_S' + (1 - w) V_P'`` with w the Sigma weight (Hellmann-Feynman).

    Parameters
    ----------
    V_sigma, V_pi, dV_sigma, dV_pi : array_like, any common shape
        Curves [hartree] and their R-derivatives [hartree/bohr].
    splitting : float
        [hartree]; >= 0.

    Returns
    -------
    ndarray, same shape
    """
    w = sigma_weight(V_sigma, V_pi, splitting)
    return w * np.asarray(dV_sigma) + (1.0 - w) * np.asarray(dV_pi)


def upper_derivative(
    V_sigma: ArrayLike, V_pi: ArrayLike, dV_sigma: ArrayLike, dV_pi: ArrayLike, splitting: float
) -> Array:
    """dR derivative of ``upper`` [hartree/bohr]: Sigma weight 1 - w; arguments as ``lower_derivative``."""
    w = sigma_weight(V_sigma, V_pi, splitting)
    return (1.0 - w) * np.asarray(dV_sigma) + w * np.asarray(dV_pi)


def omega32_derivative(dV_pi: ArrayLike) -> Array:
    """dR derivative of ``omega32`` [hartree/bohr]: that of V_P."""
    return np.asarray(dV_pi, dtype=np.float64)


@dataclass(frozen=True, slots=True)
class LineDifferences:
    """Excited minus ground curve, each from its own line centre [hartree]; > 0 is a blue shift. Arrays, shape of R.

    ``d1``: P1/2 (lower Omega = 1/2) - X. ``d2_half``: P3/2, Omega = 1/2 (upper) - X. ``d2_three_half``: P3/2,
    Omega = 3/2 - X.
    """

    d1: Array
    d2_half: Array
    d2_three_half: Array


def line_differences(X: Curve, A: Curve, B: Curve, R: ArrayLike, splitting: float) -> LineDifferences:
    """The difference curves of the D lines at R.

    Parameters
    ----------
    X, A, B : Curve
        Ground 2Sigma+, excited 2Pi and excited 2Sigma+ curves without spin-orbit.
    R : array_like, any shape
        [bohr]; > 0.
    splitting : float
        [hartree]; >= 0.

    Returns
    -------
    LineDifferences
        Arrays [hartree], shape of R; all go to 0 at R -> infinity.
    """
    ground, pi, sigma = X(R), A(R), B(R)
    a = coupling(splitting)
    return LineDifferences(
        lower(sigma, pi, splitting) + a - ground,
        upper(sigma, pi, splitting) - a / 2 - ground,
        pi - ground,
    )


def splitting_of(curves: CurveSet) -> float:
    """P3/2 - P1/2 [hartree] of a curve set: its own override, else that of the species table."""
    own = curves.splitting_cm1
    return (alkali(curves.alkali).fine_structure_cm1.value if own is None else own) / HARTREE_CM1
