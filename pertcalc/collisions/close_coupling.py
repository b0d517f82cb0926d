"""Quantum close coupling: scattering matrices of the two fine-structure levels at one total energy.

All total angular momenta and both parities are propagated together; the ground level's phases come from the same
propagator with three partial waves to a block. notes/close-coupling.md has the equations.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import spherical_jn, spherical_yn

from pertcalc.collisions.channels import Channels, channels
from pertcalc.collisions.log_derivative import POINTS_PER_RADIAN, Blocks, full, propagate, segments
from pertcalc.collisions.pair import R_END, CollisionPair
from pertcalc.errors import InputError, OutOfRangeError

Array = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

PARITIES = ("e", "f")
# Propagation starts where the largest wave has fallen by exp(-FORBIDDEN) inside its turning point.
FORBIDDEN = 16.0
R_SMALLEST = 1.5
BARRIER = 0.5
LARGEST_DRESSING = 0.1
ADIABATIC = 20.0
# Blocks that share a start: enough to amortise numpy's calls, few enough not to start all at the smallest R.
GROUP = 400


@dataclass(frozen=True, slots=True)
class Matrices:
    """Scattering matrices at one total energy; parities "e" and "f" of `channels.channels`.

    `total` Jt, shape (n,); `S` by parity, shape (n, 3, 3) [1], zero where a channel is closed or does not exist;
    `partial` N by parity, shape (3, n); `momentum2` k^2 of P1/2 and P3/2 [1/bohr^2], negative when closed;
    `inversions` counts work.
    """

    total: Array
    S: dict[str, ComplexArray]
    partial: dict[str, Array]
    momentum2: tuple[float, float]
    inversions: int

    def last_impact(self, level: int) -> float:
        """Impact parameter [bohr] up to which the sums over Jt reach in level 0 (P1/2) or 1 (P3/2)."""
        # sum (2 Jt + 1) = (Jmax + 1)^2 to within 1/4.
        return float((self.total[-1] + 1) / np.sqrt(self.momentum2[level]))


def _start(minimum: Callable[[Array], Array], energy: float, mass: float, least: float, end: float) -> float:
    """Where to begin [bohr]: FORBIDDEN e-folds inside the turning point of the curve `minimum` with N(N+1) = least."""
    R = np.linspace(R_SMALLEST, end, 1500)
    decay = np.sqrt(np.maximum(2 * mass * (minimum(R) - energy) + least / R**2, 0))
    allowed = np.flatnonzero(decay == 0)
    if allowed.size == 0:
        return float(R[0])
    if allowed[0] == 0:
        raise OutOfRangeError(
            "collision energy",
            energy,
            0.0,
            float(minimum(R[:1])[0]),
            "hartree",
            f"The curve has no repulsive wall of that height at {R_SMALLEST} bohr; extend it or lower the energy.",
        )
    inside = np.cumsum(decay[: allowed[0]][::-1]) * (R[1] - R[0])
    steps = int(np.searchsorted(inside, FORBIDDEN))
    return float(R[max(allowed[0] - 1 - steps, 0)])


def _groups(size: int) -> list[NDArray[np.intp]]:
    return np.array_split(np.arange(size), max(1, round(size / GROUP)))


def _free(N: Array, k: Array, R: float) -> tuple[Array, Array, Array, Array]:
    """Riccati-Bessel j, n of unit flux and their R-derivatives at R, shape of N."""
    z, order = k * R, N.astype(int)
    j, n = spherical_jn(order, z), spherical_yn(order, z)
    dj, dn = spherical_jn(order, z, derivative=True), spherical_yn(order, z, derivative=True)
    root = np.sqrt(k)
    return z * j / root, z * n / root, (j + z * dj) * root, (n + z * dn) * root


def _dressed(Y: Array, blocks: Blocks, difference: float, R: float) -> Array:
    """Log-derivatives in the levels as the coupling that is left at R mixes them, shape (n, 3, 3).

    Matched to bare levels, that coupling (2 mu D(R) t_i t_j against the gap of the local momenta) would exchange
    population between P1/2 and P3/2 that it takes back further out; for widely split levels that is all there would be.
    Only levels that follow adiabatically from there on are dressed: splitting R/v above ADIABATIC, and a small angle;
    for others the exchange is real.
    """
    t = blocks.axis
    turn = np.zeros_like(Y)
    local = blocks.momentum2 - blocks.centrifugal / R**2
    for j in (1, 2):
        split = blocks.momentum2[0] - blocks.momentum2[j]
        gap = local[0] - local[j]
        follows = split * R > 2 * ADIABATIC * np.sqrt(np.abs(blocks.momentum2[0]))
        angle = difference * t[0] * t[j] / np.where(gap > 0, gap, 1.0)
        angle = np.where(follows & (gap > 0) & (np.abs(angle) < LARGEST_DRESSING), angle, 0.0)
        turn[:, 0, j], turn[:, j, 0] = -angle, angle
    U = np.eye(3) + turn + 0.5 * turn @ turn
    return U @ Y @ U.swapaxes(1, 2)


def _match(Y: Array, N: Array, momentum2: Array, R: float) -> ComplexArray:
    """S from the log-derivative at R; closed channels fall off by their local decay and drop out (S = 0 there)."""
    # A slow channel whose centrifugal barrier still stands at twice its energy there is not reached either.
    is_open = momentum2 > np.maximum(BARRIER * N * (N + 1) / R**2, 0)
    k = np.sqrt(np.where(is_open, momentum2, np.abs(N * (N + 1) / R**2 - momentum2)))
    regular, other = np.ones_like(k), np.ones_like(k)
    slope, other_slope = k.copy(), -k
    for values, found in zip((regular, other, slope, other_slope), _free(N[is_open], k[is_open], R), strict=True):
        values[is_open] = found

    def diagonal(values: Array) -> Array:
        return values.T[:, :, None] * np.eye(3)

    # psi = regular - other K, and psi' = y psi.
    K = np.linalg.solve(Y @ diagonal(other) - diagonal(other_slope), Y @ diagonal(regular) - diagonal(slope))
    both = (is_open.T[:, :, None] & is_open.T[:, None, :]).astype(float)
    K = K * both
    S = np.linalg.solve(np.eye(3) - 1j * K, np.eye(3) + 1j * K)
    return S * both


def scattering_matrices(
    pair: CollisionPair, energy: float, last: float, r_match: float, points: float = POINTS_PER_RADIAN
) -> Matrices:
    """S for all total angular momenta that reach an impact parameter.

    Parameters
    ----------
    pair : CollisionPair
    energy : float
        Kinetic energy in P1/2 [hartree]; below the splitting P3/2 is closed and kept as such.
    last : float
        Largest impact parameter [bohr].
    r_match : float
        Distance of matching to free waves [bohr].
    points : float
        Points per radian of the shortest local wave [1].

    Returns
    -------
    Matrices
        Unitary and symmetric to about 1e-12.

    Raises
    ------
    InputError
        No open channel, or waves that end beyond the matching distance.
    OutOfRangeError
        A curve without a wall that stops this energy.
    """
    if not energy > 0 or not 0 < last <= r_match:
        raise InputError(
            f"energy = {energy:g} hartree must be > 0, and 0 < last = {last:g} <= r_match = {r_match:g} bohr"
        )
    mass = pair.reduced_mass
    k2 = (2 * mass * energy, 2 * mass * (energy - pair.splitting))
    fastest = np.sqrt(k2[0])
    total = np.arange(0.5, max(fastest * last, 3.0), 1.0)
    found = {parity: channels(total, parity) for parity in PARITIES}
    S = {parity: np.zeros((total.size, 3, 3), dtype=complex) for parity in PARITIES}

    def minimum(R: Array) -> Array:
        _, difference, pi = pair.table(R)
        return pi + np.minimum(difference, 0)

    def potential(R: Array) -> tuple[Array, Array]:
        _, difference, pi = pair.table(R)
        return 2 * mass * pi, 2 * mass * difference

    inversions = 0
    for some in _groups(total.size):
        least = max(total[some[0]] - 1.5, 0.0)
        start = _start(minimum, energy, mass, least * (least + 1), r_match)
        blocks, N = _blocks([found[parity] for parity in PARITIES], some, k2)
        pieces = segments(_local_momentum(minimum, energy, mass), start, r_match, points)
        y, count = propagate(blocks, potential, pieces, 3 * fastest)
        inversions += count
        difference = float(potential(np.array([r_match]))[1][0])
        matrices = _match(_dressed(full(y), blocks, difference, r_match), N, blocks.momentum2, r_match)
        for i, parity in enumerate(PARITIES):
            S[parity][some] = matrices[i * some.size : (i + 1) * some.size]
    return Matrices(total, S, {parity: found[parity].partial for parity in PARITIES}, k2, inversions)


def _local_momentum(minimum: Callable[[Array], Array], energy: float, mass: float) -> Callable[[Array], Array]:
    def local(R: Array) -> Array:
        return np.sqrt(2 * mass * np.maximum(energy - minimum(R), 0.1 * energy))

    return local


def _blocks(parts: list[Channels], some: NDArray[np.intp], momentum2: tuple[float, float]) -> tuple[Blocks, Array]:
    """Blocks of the chosen total angular momenta, both parities side by side, and their N, shape (3, 2 n)."""
    partial = np.concatenate([part.partial[:, some] for part in parts], axis=1)
    axis = np.concatenate([part.axis[:, some] for part in parts], axis=1)
    k2 = np.repeat(np.array([momentum2[0], momentum2[1], momentum2[1]])[:, None], partial.shape[1], axis=1)
    # A channel that does not exist is an uncoupled closed one.
    k2 = np.where(partial < 0, -abs(momentum2[0]), k2)
    N = np.maximum(partial, 0.0)
    return Blocks(k2, N * (N + 1), axis), N


def ground_matrices(
    pair: CollisionPair,
    energy: float,
    highest: int,
    r_match: float,
    step_energy: float,
    points: float = POINTS_PER_RADIAN,
) -> tuple[ComplexArray, int]:
    """S_g(N) = exp(2 i delta_N) of the ground curve for N = 0 ... highest, and the inversions done.

    Parameters
    ----------
    pair : CollisionPair
    energy : float
        Kinetic energy [hartree].
    highest : int
        Largest N.
    r_match : float
        [bohr].
    step_energy : float
        Kinetic energy in P1/2 that the matrices of the upper levels were stepped for [hartree]: equal steps make equal
        phase errors, which cancel in the line.
    points : float
        Points per radian of the shortest local wave [1].

    Returns
    -------
    S : ndarray, shape (highest + 1,)
        [1].
    inversions : int
    """
    mass = pair.reduced_mass
    N = np.arange(3 * (highest // 3 + 1), dtype=float).reshape(-1, 3).T
    S = np.empty(N.shape, dtype=complex)

    def ground(R: Array) -> Array:
        line, _, pi = pair.table(R)
        return pi - line

    def potential(R: Array) -> tuple[Array, Array]:
        return 2 * mass * ground(R), np.zeros_like(R)

    inversions = 0
    for some in _groups(N.shape[1]):
        least = N[0, some[0]]
        start = _start(ground, energy, mass, least * (least + 1), r_match)
        momentum2 = np.full((3, some.size), 2 * mass * energy)
        blocks = Blocks(momentum2, N[:, some] * (N[:, some] + 1), np.zeros((3, some.size)))
        pieces = segments(_local_momentum(ground, step_energy, mass), start, r_match, points)
        y, count = propagate(blocks, potential, pieces, 3 * float(np.sqrt(2 * mass * energy)))
        inversions += count
        S[:, some] = np.einsum("nii->in", _match(full(y), N[:, some], momentum2, r_match))
    return S.T.ravel()[: highest + 1], inversions


def outer_phase(pair: CollisionPair, energy: float, N: Array, r_match: float) -> Array:
    """What matching at r_match leaves out of a line: Int (V_0 - V_X) dR/v_R beyond it, V_0 = (V_Sigma + 2 V_Pi)/3.

    S S_g* of partial wave N lacks the factor exp(-2 i phase).

    Parameters
    ----------
    pair : CollisionPair
    energy : float
        Kinetic energy in the level [hartree].
    N : ndarray, shape (n,)
        Partial waves [1].
    r_match : float
        [bohr].

    Returns
    -------
    phase : ndarray, shape (n,)
        Along free straight paths [radian].
    """
    nodes, weights = np.polynomial.legendre.leggauss(20)
    # u = 1/R from the end of the table, where nothing is left, to r_match.
    inner, outer = 1 / r_match, 0.5 / R_END
    u = outer + 0.5 * (inner - outer) * (nodes + 1)
    line, difference, _ = pair.table(1 / u)
    k = np.sqrt(2 * pair.reduced_mass * energy)
    b = np.minimum((N + 0.5) / k, 0.999 * r_match)
    slowness = 1 / np.sqrt(1 - (b[:, None] * u) ** 2)
    return (slowness * (line + difference / 3) / u**2) @ weights * 0.5 * (inner - outer) * pair.reduced_mass / k
