"""Relaxation of hyperfine multipoles from electronic rates: the nuclear spin is a spectator of every collision.

rho = sum rho^K_Q(F1,F2) T_KQ(F1,F2) with orthonormal T_KQ(F1,F2) = sum (-1)^(F2-M2) <F1 M1 F2 -M2|K Q> |F1 M1><F2 M2|.
Collisions relax T_k(J) x T_kappa(I) with the electronic rate gamma_k, whatever kappa and K; both bases are joined by

    U(F1 F2; k kappa) = sqrt((2F1+1)(2F2+1)(2k+1)(2kappa+1)) {J I F1; J I F2; k kappa K}   (9j), orthogonal,

so that d rho^K/dt = -M rho^K, M = U gamma U^T + i omega + decay. Secular (hyperfine structure resolved, omega far
above gamma): only F1 = F2 is kept. Everything is in s^-1 and, for energies, MHz. notes/hyperfine-recoupling.md;
Omont, Prog. Quantum Electron. 5, 69 (1977); Happer, Rev. Mod. Phys. 44, 169 (1972).
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.angular import nine_j
from pertcalc.constants import MHZ_RAD_S
from pertcalc.errors import InputError
from pertcalc.species import Isotope
from pertcalc.vapour.hyperfine import check_momenta, f_values, isotope_energies
from pertcalc.vapour.level_rates import J_OF, OTHER_LEVEL, P_LEVELS, LevelRates
from pertcalc.vapour.relaxation_matrix import Pair, Product, Relaxation

Rates = Mapping[int, float] | Sequence[float]


def _ranks(name: str, given: Rates, top: int, signed: bool = False) -> NDArray[np.float64]:
    """Rates of the ranks 0 ... top as an array [s^-1]; InputError that lists every bad one."""
    rates = dict(given) if isinstance(given, Mapping) else dict(enumerate(given))
    problems = []
    if set(rates) != set(range(top + 1)):
        problems.append(f"{name} has ranks {sorted(rates)}: it must have 0 ... {top}, one rate each")
    for k, rate in rates.items():
        known = isinstance(rate, int | float | np.number) and math.isfinite(rate)
        if not known or (rate < 0 and not signed):
            rule = "a finite number" if signed else "a finite number >= 0"
            problems.append(f"{name}[{k}] = {rate!r} must be {rule} [s^-1]")
    if problems:
        raise InputError(problems)
    return np.array([rates[k] for k in range(top + 1)], dtype=float)


@lru_cache(maxsize=512)
def _recoupling(J: float, I: float, K: int) -> tuple[tuple[Pair, ...], tuple[Product, ...], NDArray[np.float64]]:
    F = [float(f) for f in f_values(J, I)]
    pairs = tuple(Pair(J, a, b) for a in F for b in F if abs(a - b) <= K <= a + b)
    ranks = [(k, kappa) for k in range(round(2 * J) + 1) for kappa in range(round(2 * I) + 1)]
    products = tuple(Product(J, k, kappa) for k, kappa in ranks if abs(k - kappa) <= K <= k + kappa)
    U = np.empty((len(pairs), len(products)))
    for row, (_, a, b) in enumerate(pairs):
        for column, (_, k, kappa) in enumerate(products):
            root = math.sqrt((2 * a + 1) * (2 * b + 1) * (2 * k + 1) * (2 * kappa + 1))
            U[row, column] = root * nine_j(J, I, a, J, I, b, k, kappa, K)
    U.flags.writeable = False
    return pairs, products, U


def recoupling(J: float, I: float, K: int) -> tuple[tuple[Pair, ...], tuple[Product, ...], NDArray[np.float64]]:
    """Orthogonal matrix between hyperfine multipoles and products of electronic and nuclear multipoles of rank K.

    [T_k(J) x T_kappa(I)]_KQ = sum_{F1 F2} U(F1 F2; k kappa) T_KQ(F1,F2).

    Parameters
    ----------
    J, I : float
        Electronic angular momentum and nuclear spin [hbar].
    K : int
        Rank, 0 ... 2(J+I).

    Returns
    -------
    pairs : tuple of Pair
        The rows.
    products : tuple of Product
        The columns.
    U : array, shape (n, n)
        Orthogonal, real, read-only (cached) [1].

    Raises
    ------
    InputError
        J or I is no angular momentum, or K does not exist.
    """
    check_momenta(I, [J], K)
    return _recoupling(float(J), float(I), int(K))


def relaxation(
    loss: Mapping[float, Rates],
    I: float,
    K: int,
    *,
    gain: Mapping[tuple[float, float], Rates] | None = None,
    decay: Mapping[float, float] | None = None,
    energies_MHz: Mapping[float, ArrayLike] | None = None,
    secular: bool = False,
) -> Relaxation:
    """Relaxation matrix of the hyperfine multipoles of rank K of one or several electronic levels.

    M = U [loss_k] U^T within J, -U' [gain_k] U^T from J to J', + decay(J) + 2 pi i 10^6 (E(F1)-E(F2)) on the diagonal.

    Parameters
    ----------
    loss : mapping of J to rates
        Total electronic loss of rank k = 0 ... 2J [s^-1], outflow included; a mapping from k or a sequence.
    I : float
        Nuclear spin [hbar].
    K : int
        Rank, 0 ... 2(J+I) of the largest J.
    gain : mapping of (J, J') to rates, or None
        Gain of orthonormal electronic rank k = 0 ... 2 min(J, J') in J' from J [s^-1], signed. The trace is conserved
        if gain_0 = loss_0 sqrt((2J+1)/(2J'+1)).
    decay : mapping of J to float, or None
        Radiative decay, the same for every multipole of J [s^-1].
    energies_MHz : mapping of J to array, or None
        Energies of the F levels, ascending F [MHz]; None or a missing J means degenerate (structure unresolved).
    secular : bool
        Keep F1 = F2 only, as for hyperfine frequencies far above every rate; energies then play no part.

    Returns
    -------
    Relaxation

    Raises
    ------
    InputError
        Lists every quantum number, rank or rate that breaks a rule.

    Source
    ------
    Omont, Prog. Quantum Electron. 5, 69 (1977); Happer, Rev. Mod. Phys. 44, 169 (1972), spectator nuclear spin.
    """
    check_momenta(I, list(loss), K)
    _check_levels(loss, gain or {}, decay or {}, energies_MHz or {})
    levels = [float(J) for J in loss]
    blocks = {J: _recoupling(J, float(I), int(K)) for J in levels}
    pairs = [pair for J in levels for pair in blocks[J][0]]
    products = [product for J in levels for product in blocks[J][1]]
    U = np.zeros((len(pairs), len(products)))
    for J in levels:
        U[np.ix_([p.J == J for p in pairs], [p.J == J for p in products])] = blocks[J][2]
    matrix: NDArray = U @ _electronic(products, loss, gain or {}) @ U.T
    matrix += np.diag([(decay or {}).get(pair.J, 0.0) for pair in pairs])
    if secular:
        kept = [row for row, pair in enumerate(pairs) if pair.F1 == pair.F2]
        pairs, matrix, U = [pairs[row] for row in kept], matrix[np.ix_(kept, kept)], U[kept]
    elif energies_MHz:
        matrix = matrix + 1j * np.diag(_frequencies(pairs, float(I), energies_MHz))
    return Relaxation(float(I), int(K), tuple(pairs), matrix, tuple(products), U)


def _check_levels(
    loss: Mapping[float, Rates],
    gain: Mapping[tuple[float, float], Rates],
    decay: Mapping[float, float],
    energies_MHz: Mapping[float, ArrayLike],
) -> None:
    """InputError that lists every level that is not in ``loss`` and every bad decay rate."""
    problems = [
        f"gain[{key}] must lead from one level of loss to another"
        for key in gain
        if key[0] == key[1] or not {*key} <= {*loss}
    ]
    named: tuple[tuple[str, Mapping], ...] = (("decay", decay), ("energies_MHz", energies_MHz))
    problems += [f"{name}[{J!r}] belongs to no level of loss" for name, given in named for J in given if J not in loss]
    problems += [
        f"decay[{J!r}] = {rate!r} must be a finite number >= 0 [s^-1]"
        for J, rate in decay.items()
        if not (math.isfinite(rate) and rate >= 0)
    ]
    if problems:
        raise InputError(problems)


def _electronic(
    products: Sequence[Product], loss: Mapping[float, Rates], gain: Mapping[tuple[float, float], Rates]
) -> NDArray[np.float64]:
    """The relaxation matrix in the basis of products, where the nucleus is untouched [s^-1]."""
    rates = {(J, J): _ranks(f"loss[{J:g}]", given, round(2 * J)) for J, given in loss.items()}
    for (J, J_to), given in gain.items():
        rates[J, J_to] = -_ranks(f"gain[{J:g}, {J_to:g}]", given, round(2 * min(J, J_to)), signed=True)
    matrix = np.zeros((len(products), len(products)))
    for row, to in enumerate(products):
        for column, origin in enumerate(products):
            if to[1:] == origin[1:] and (origin.J, to.J) in rates:
                matrix[row, column] = rates[origin.J, to.J][to.k]
    return matrix


def _frequencies(pairs: Sequence[Pair], I: float, energies_MHz: Mapping[float, ArrayLike]) -> list[float]:
    """Angular frequency of each pair, 2 pi (E(F1) - E(F2)) [rad/s]."""
    energy: dict[tuple[float, float], float] = {}
    for J, given in energies_MHz.items():
        F, E = f_values(J, I), np.atleast_1d(np.asarray(given, dtype=float))
        if E.shape != F.shape or not np.all(np.isfinite(E)):
            raise InputError(
                f"energies_MHz[{J:g}] must hold {F.size} finite energies [MHz], one for each F, not {given!r}"
            )
        energy |= {(J, float(f)): float(e) for f, e in zip(F, E, strict=True)}
    zero = 0.0
    return [MHZ_RAD_S * (energy.get((p.J, p.F1), zero) - energy.get((p.J, p.F2), zero)) for p in pairs]


def relaxation_matrix(J: float, I: float, gamma: Rates, K: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Secular relaxation matrix of the multipoles of rank K of the F levels of one level J.

    d rho^K(F)/dt = -sum_F' M(F,F') rho^K(F') for orthonormal tensors T_KQ(F), where M is symmetric:
    M = sum_{k kappa} (2F+1)(2F'+1)(2k+1)(2kappa+1) {J I F; J I F; k kappa K}{J I F'; J I F'; k kappa K} gamma_k.
    For the populations N_F = sqrt(2F+1) rho^0(F) it becomes sqrt((2F+1)/(2F'+1)) M (`Relaxation.population_matrix`).

    Parameters
    ----------
    J, I : float
        Electronic angular momentum and nuclear spin [hbar].
    gamma : mapping of k to float, or sequence
        Total electronic loss of rank k = 0 ... 2J [s^-1].
    K : int
        Rank, 0 ... 2(J+I).

    Returns
    -------
    F : array, shape (n,)
        The levels that carry rank K (2F >= K), ascending [hbar].
    M : array, shape (n, n)
        Relaxation matrix [s^-1]; its diagonal is the total loss of rank K of each F.

    Raises
    ------
    InputError
        As `relaxation`.
    """
    found = relaxation({J: gamma}, I, K, secular=True)
    return np.array([pair.F1 for pair in found.pairs]), found.matrix


def p_levels_relaxation(
    rates: LevelRates, isotope: Isotope, K: int, *, secular: bool = False, structure: bool = True, decay: bool = True
) -> Relaxation:
    """Hyperfine multipoles of rank K of P1/2 and P3/2 of one isotope in a cell, coupled by fine-structure transfer.

    Parameters
    ----------
    rates : LevelRates
        Decay, losses and gains of both levels [s^-1].
    isotope : Isotope
    K : int
        Rank, 0 ... 2(I + 3/2).
    secular, structure, decay : bool
        Drop coherences; use the hyperfine energies (False: unresolved); include radiative decay.

    Returns
    -------
    Relaxation

    Raises
    ------
    InputError
        As `relaxation`.
    """
    return relaxation(
        {J_OF[level]: rates.loss[level] for level in P_LEVELS},
        isotope.nuclear_spin,
        K,
        gain={(J_OF[level], J_OF[OTHER_LEVEL[level]]): rates.gain[level] for level in P_LEVELS},
        decay={J_OF[level]: rates.decay[level] for level in P_LEVELS} if decay else None,
        energies_MHz={J_OF[level]: isotope_energies(isotope, level) for level in P_LEVELS} if structure else None,
        secular=secular,
    )
