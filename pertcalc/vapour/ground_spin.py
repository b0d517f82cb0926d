"""Spin of the ground level under randomisation of the electron: observable decay rates and slowing-down factors.

Collisions relax the electron spin at a rate G (d<S>/dt = -G <S>) and leave the nucleus alone; the hyperfine coupling
shares what is left between both. How fast the vapour loses its spin then depends on what else happens meanwhile:
without spin exchange each F decays by itself (`ground_relaxation`); with fast alkali-alkali spin exchange the
populations stay at a spin temperature (`slowing_down`). Happer, Rev. Mod. Phys. 44, 169 (1972); Appelt et al., Phys.
Rev. A 58, 1412 (1998); Anderson, Pipkin and Baird, Phys. Rev. 116, 87 (1959); notes/hyperfine-recoupling.md.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.angular import projections
from pertcalc.errors import InputError
from pertcalc.vapour.hyperfine import check_momenta
from pertcalc.vapour.recoupling import recoupling, relaxation
from pertcalc.vapour.relaxation_matrix import Pair, Relaxation

_J = 0.5


def ground_relaxation(I: float, G: float, K: int = 1, *, secular: bool = True) -> Relaxation:
    """Relaxation of rank K of the two ground hyperfine levels by electron randomisation, **without spin exchange**.

    gamma_0 = 0, gamma_1 = G. K = 1, secular: eigenrates G and 2G/(2I+1)^2 (8:1, 18:1, 32:1 for I = 3/2, 5/2, 7/2), the
    slow one being the decay of the longitudinal spin that is left. K = 0: 0 and G, the latter for the population
    difference of the two F. Secular is right: ground hyperfine frequencies (0.2 to 9 GHz) exceed every collision rate
    of the ground spin in a vapour.

    Parameters
    ----------
    I : float
        Nuclear spin [hbar].
    G : float
        Electron randomisation rate [s^-1]; >= 0.
    K : int
        Rank, 0 ... 2I+1.
    secular : bool
        False keeps the coherences between the two F as well (their frequency not included).

    Returns
    -------
    Relaxation
        Its `eigenrates` and `losses` [s^-1].

    Raises
    ------
    InputError
        I, G or K breaks a rule.

    Source
    ------
    Bouchiat, Bouchiat and Pottier, Phys. Rev. 181, 144 (1969); Happer (1972), both from memory; eigenrates recomputed.
    """
    if not (math.isfinite(G) and G >= 0):
        raise InputError(f"G = {G!r} must be a finite rate >= 0 [s^-1]")
    return relaxation({_J: (0.0, G)}, I, K, secular=secular)


def observable_rates(I: float, G: float) -> tuple[float, float]:
    """The two decay rates of longitudinal spin under electron randomisation, **without spin exchange**.

    Eigenvalues of `ground_relaxation` with K = 1: G and 2G/(2I+1)^2 for I >= 1. Only one F carries orientation at
    I = 0 (rate G) and I = 1/2 (G/2): the same number twice.
    Not to be mixed with G/q of `slowing_down`, which belongs to a spin temperature: 1/8 is not 1/6 at I = 3/2.

    Parameters
    ----------
    I : float
        Nuclear spin [hbar].
    G : float
        Electron randomisation rate [s^-1]; >= 0.

    Returns
    -------
    fast, slow : float
        Eigenrates [s^-1].

    Raises
    ------
    InputError
        I or G breaks a rule.
    """
    values = ground_relaxation(I, G).eigenvalues().real
    return float(values[-1]), float(values[0])


def slowing_down(I: float, P: ArrayLike = 0.0) -> NDArray[np.float64]:
    """Slowing-down factor q = <F_z>/<S_z> at a **spin temperature** (spin exchange faster than every relaxation).

    rho ~ exp(beta F_z) with tanh(beta/2) = P = 2<S_z>, so q = 1 + <I_z>/<S_z> and d<F_z>/dt = -(G/q) <F_z>.
    P -> 0: q = [4I(I+1)+3]/3 (6, 38/3, 22 for I = 3/2, 5/2, 7/2); P -> 1: q = 2I+1. It says nothing about a vapour
    without spin exchange, whose spin decays with the eigenrates of `observable_rates`.

    Parameters
    ----------
    I : float
        Nuclear spin [hbar].
    P : array_like, shape (...)
        Electron polarisation 2<S_z> [1]; -1 to 1.

    Returns
    -------
    q : array, shape (...)
        Slowing-down factor [1].

    Raises
    ------
    InputError
        I is no angular momentum, or a P is outside -1 ... 1.

    Source
    ------
    Appelt et al., Phys. Rev. A 58, 1412 (1998), and Anderson, Pipkin and Baird (1959), from memory; direct sums.
    """
    check_momenta(I, [_J])
    m = projections(I)
    m = m[m > 0]
    polarisation = np.abs(np.asarray(P, dtype=float))
    if not np.all(polarisation <= 1):
        raise InputError(f"P = {P!r} must lie between -1 and 1: it is the electron polarisation 2<S_z>")
    low = 1 + 4 * I * (I + 1) / 3
    if m.size == 0:
        return np.full(polarisation.shape, low)
    tiny = polarisation < 1e-8  # q is even in P: the limit is exact to rounding here
    safe = np.where(tiny, 0.5, polarisation)[..., None]
    with np.errstate(divide="ignore"):
        beta = 2 * np.arctanh(safe)  # inf at P = 1: only m = I is populated
    ratio = (1 - safe) / (1 + safe)  # exp(-beta)
    # Pairs m, -m of weight exp(beta m) over exp(beta I): no cancellation at small beta, no overflow at large.
    up = ratio ** (I - m)
    mean = np.sum(m * up * -np.expm1(-2 * m * beta), axis=-1)
    norm = np.sum(up + ratio ** (I + m), axis=-1)
    if float(I).is_integer():
        norm = norm + ratio[..., 0] ** I
    return np.where(tiny, low, 1 + 2 * mean / norm / safe[..., 0])


def exchange_broadening(I: float) -> float:
    """Damping of the precession of F = I + 1/2 by spin exchange, per unit exchange rate [1], at low polarisation.

    ``sum_{kappa > 0} U(FF; 1 kappa)^2``: exchange destroys the products T_1(S) x T_kappa(I) and gives back what it
    takes of <S>. Holds while the levels F = I +- 1/2, which turn opposite ways, separate faster than exchange mixes
    them (Larmor frequency above the exchange rate); below, the damping falls towards zero with the field.

    Parameters
    ----------
    I : float
        Nuclear spin [hbar].

    Returns
    -------
    factor : float
        2I(2I-1)/[3(2I+1)^2] [1].

    Raises
    ------
    InputError
        I is no angular momentum.

    Source
    ------
    Happer and Tam, Phys. Rev. A 16, 1877 (1977), FROM MEMORY; here from the recoupling matrix.
    """
    pairs, products, U = recoupling(_J, I, 1)
    row = pairs.index(Pair(_J, I + _J, I + _J))
    lost = [column for column, product in enumerate(products) if product.k == 1 and product.kappa > 0]
    return float(np.sum(U[row, lost] ** 2))
