"""The sudden limit: fine structure too small to matter during a collision, so the spin is a spectator.

Everything about the levels J = 1/2, 3/2 of a 2P term then follows from two numbers, the orientation and alignment
cross sections s1 and s2 of the orbital L = 1. Exact algebra, valid for any collision matrix of the orbital: the test of
every method at zero splitting. Derivation: notes/closed-form.md.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.angular import six_j
from pertcalc.errors import InputError

Array = NDArray[np.float64]


def recoupling_weights(J_final: float, J: float, k: int, L: float = 1, S: float = 0.5) -> dict[int, float]:
    """Weights W_kappa of G^k(J -> J_final) = sum_kappa W_kappa g_kappa, g_kappa the survival of the orbital multipoles.

    W_kappa = (2J+1)(2J'+1)(2kappa+1) (-1)^(k+kappa+J+J')
              sum_x (2x+1) {J J k; J' J' x} {L L kappa; L L x} {L J S; J' L x}^2,
    x the rank of the collision operator in the orbital. They sum to 1 for J' = J and to 0 otherwise.

    Parameters
    ----------
    J_final, J : float
        Level after and before [hbar]; both between |L-S| and L+S.
    k : int
        Rank, 0 ... 2 min(J, J_final).
    L, S : float
        Orbital momentum and spin of the term [hbar].

    Returns
    -------
    weights : dict of kappa to float
        kappa = 0 ... 2L [1].

    Raises
    ------
    InputError
        Not angular momenta, or k does not exist in both levels.

    Source
    ------
    Method of Grawert, Z. Phys. 225, 283 (1969), from memory; equals the sum over squared 9j symbols (tested).
    """
    if k != int(k) or not 0 <= k <= 2 * min(J, J_final):
        raise InputError(f"k = {k!r} must be an integer from 0 to {2 * min(J, J_final):g} for these levels")
    if any(six_j(L, j, S, j, L, 0) == 0 for j in (J, J_final)):
        raise InputError(f"J = {J:g} and {J_final:g} must both lie between |L-S| and L+S in whole steps")
    ranks = range(round(2 * L) + 1)
    common = (-1.0) ** round(k + J + J_final) * (2 * J + 1) * (2 * J_final + 1)

    def path_ranks(kappa: int) -> float:
        spectator = [(2 * x + 1) * six_j(L, J, S, J_final, L, x) ** 2 * six_j(L, L, kappa, L, L, x) for x in ranks]
        return sum(share * six_j(J, J, k, J_final, J_final, x) for x, share in zip(ranks, spectator, strict=True))

    return {kappa: (-1) ** kappa * common * (2 * kappa + 1) * path_ranks(kappa) for kappa in ranks}


def sudden_transfer(
    J_final: float, J: float, k: int, losses: Mapping[int, ArrayLike], L: float = 1, S: float = 0.5
) -> Array:
    """Gain of rank k in J_final from rank k in J != J_final, or loss of rank k for J_final = J, of a spectator spin.

    Gain = -sum_kappa W_kappa s_kappa, loss = +sum_kappa W_kappa s_kappa, with s_0 = 0 (the orbital is not lost).

    Parameters
    ----------
    J_final, J : float
        Level after and before [hbar].
    k : int
        Rank.
    losses : mapping of kappa to array
        Loss cross sections or rates s_kappa of the orbital multipoles, kappa = 1 ... 2L [any unit].
    L, S : float
        Orbital momentum and spin of the term [hbar].

    Returns
    -------
    result : array
        [unit of losses]; orthonormal tensor operators.

    Raises
    ------
    InputError
        As `recoupling_weights`, or a kappa is missing.
    """
    weights = recoupling_weights(J_final, J, k, L, S)
    missing = [f"losses has no entry for kappa = {kappa}" for kappa in weights if kappa and kappa not in losses]
    if missing:
        raise InputError(missing)
    total = sum((w * np.asarray(losses[kappa], float) for kappa, w in weights.items() if kappa in losses), np.zeros(()))
    return total if J_final == J else -total


@dataclass(frozen=True, slots=True)
class SuddenLimit:
    """Cross sections (or rates) of a 2P term in the sudden limit, in the unit of s1 and s2.

    ``multipole_loss[level][K]`` includes outflow (K = 0 is the outflow); ``transfer[level]`` is the population outflow
    of that level; ``multipole_transfer[K]`` the gain between the levels with orthonormal tensors, the same both ways.
    """

    multipole_loss: dict[str, dict[int, Array]]
    transfer: dict[str, Array]
    multipole_transfer: dict[int, Array]


def sudden_limit(s1: ArrayLike, s2: ArrayLike) -> SuddenLimit:
    """All cross sections of the levels of a 2P term from the orientation and alignment cross sections of L = 1.

    P1/2: loss_0 = (2/3) s1, loss_1 = (2/9) s1 + (20/27) s2. P3/2: loss_0 = s1/3, loss_1 = (5/9) s1 + (2/27) s2,
    loss_2 = (2/3) s1 + (1/3) s2, loss_3 = s2. Transfer: rank 0 (sqrt(2)/3) s1, rank 1 -sqrt(10) (s1/9 - 2 s2/27).

    Parameters
    ----------
    s1, s2 : array, shape (...)
        Loss of orbital orientation and alignment [any unit]; cross sections or rates.

    Returns
    -------
    limit : SuddenLimit
        [unit of s1].

    Raises
    ------
    InputError
        Not finite.

    Source
    ------
    Exact recoupling, method of Grawert (1969, from memory); agrees with `recoupling_weights` to rounding (tested).
    """
    a, b = np.asarray(s1, dtype=float), np.asarray(s2, dtype=float)
    if not (np.all(np.isfinite(a)) and np.all(np.isfinite(b))):
        raise InputError("s1 and s2 must be finite")
    half = {0: 2 / 3 * a, 1: 2 / 9 * a + 20 / 27 * b}
    three_halves = {0: a / 3, 1: 5 / 9 * a + 2 / 27 * b, 2: 2 / 3 * a + b / 3, 3: b}
    return SuddenLimit(
        multipole_loss={"P1/2": half, "P3/2": three_halves},
        transfer={"P1/2": half[0], "P3/2": three_halves[0]},
        multipole_transfer={0: math.sqrt(2) / 3 * a, 1: -math.sqrt(10) * (a / 9 - 2 * b / 27)},
    )
