"""The electronic Hamiltonian of the pair at each R, in the atomic states |n l m> and Gaussians around the gas.

The alkali core sits at the origin, the gas atom at distance R on the z axis: m is conserved, m = 0 gives Sigma, m = 1
gives Pi. Between atomic states everything local is expanded in Legendre polynomials about the core, everything
separable in partial waves; with a Gaussian around the gas the same nodes serve. notes/model-curves.md has the formulas.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh

from pertcalc.errors import InputError
from pertcalc.one_electron.gas_orbitals import (
    GasOrbital,
    even_tempered,
    harmonics,
    legendre_element,
    own_integrals,
    partial_waves,
    values,
)
from pertcalc.one_electron.interaction import ElectronGas, Grid, RadialStates, make_grid, multipoles, potential

Array = NDArray[np.float64]
SYMMETRIES = {"Sigma": 0, "Pi": 1}
# A Gaussian that the rest of the basis holds but for this squared norm adds nothing but rounding.
INDEPENDENT = 1e-5
# Exponents [bohr^-2] around the gas: l -> lowest, highest, number. notes/model-curves.md shows what each adds.
EXPONENTS = {0: (0.03, 8.0, 8), 1: (0.05, 3.0, 7), 2: (0.08, 0.8, 4)}


@dataclass(frozen=True, slots=True)
class Basis:
    """Size of the calculation: atomic states per l, largest l, nodes per angular integral, Gaussians on the gas."""

    n_states: int = 32
    l_max: int = 6
    nodes: int = 64
    gas_orbitals: tuple[GasOrbital, ...] = even_tempered(EXPONENTS)

    def __post_init__(self) -> None:
        rules = (("n_states", 2, 60), ("l_max", 1, 20), ("nodes", 8, 400))
        problems = [
            f"{name} = {getattr(self, name)!r}: must be a whole number from {low} to {high}; choose one"
            for name, low, high in rules
            if not (isinstance(getattr(self, name), int) and low <= getattr(self, name) <= high)
        ]
        if problems:
            raise InputError(problems)

    def orbitals(self, m: int) -> tuple[GasOrbital, ...]:
        """Gaussians that have a component m."""
        return tuple(orbital for orbital in self.gas_orbitals if orbital.l >= m)

    def smaller(self) -> dict[str, Basis]:
        """For the error estimate: fewer states, lower l_max, the tightest Gaussian of each l left out."""
        tightest = {orbital.l: orbital for orbital in sorted(self.gas_orbitals, key=lambda one: one.gamma)}.values()
        found = {
            "states": replace(self, n_states=max(2 * self.n_states // 3, 2)),
            "l_max": replace(self, l_max=max(self.l_max - 2, 1)),
        }
        if self.gas_orbitals:
            rest = tuple(orbital for orbital in self.gas_orbitals if orbital not in tightest)
            found["gaussians"] = replace(self, gas_orbitals=rest)
        return found


@dataclass(frozen=True, slots=True, eq=False)
class Hamiltonian:
    """H [hartree] and overlap S of one symmetry at one R, shape (N, N); the atomic states come first.

    ``labels`` of the functions: (l, n) of an atomic state, n counting from 0, or its GasOrbital.
    """

    H: Array
    S: Array
    labels: tuple[tuple[int, int] | GasOrbital, ...]

    def part(self, basis: Basis) -> Hamiltonian:
        """The functions that a smaller basis has."""
        keep = [k for k, label in enumerate(self.labels) if _within(label, basis)]
        labels = tuple(self.labels[k] for k in keep)
        return Hamiltonian(self.H[np.ix_(keep, keep)], self.S[np.ix_(keep, keep)], labels)

    def lowest(self, count: int) -> tuple[Array, Array]:
        """Lowest eigenvalues [hartree], shape (count,), and the components of the states along the atomic ones.

        The part of the Gaussians that is orthogonal to all atomic states is orthogonalised; what has a squared norm
        below INDEPENDENT is dropped.
        """
        a = sum(not isinstance(label, GasOrbital) for label in self.labels)
        T = np.eye(a)
        if a < len(self.labels):
            O = self.S[:a, a:]
            norms, vectors = np.linalg.eigh(self.S[a:, a:] - O.T @ O)
            free = vectors[:, norms > INDEPENDENT] / np.sqrt(norms[norms > INDEPENDENT])
            T = np.block([[T, -O @ free], [np.zeros((len(self.labels) - a, a)), free]])
        energies, vectors = eigh(T.T @ self.H @ T, subset_by_index=(0, count - 1), check_finite=False)
        return energies, vectors[:a]


def _within(label: tuple[int, int] | GasOrbital, basis: Basis) -> bool:
    if isinstance(label, GasOrbital):
        return label in basis.gas_orbitals
    return label[0] <= basis.l_max and label[1] < basis.n_states


def hamiltonians(
    states: RadialStates, electron: ElectronGas, R: float, basis: Basis
) -> tuple[Hamiltonian, Hamiltonian]:
    """Electronic Hamiltonians of Sigma and Pi at R.

    Parameters
    ----------
    states : RadialStates
    electron : ElectronGas
    R : float
        [bohr]
    basis : Basis

    Returns
    -------
    tuple of Hamiltonian
        m = 0 and m = 1.
    """
    grid = make_grid(states.r, R, basis.nodes)
    V = potential(states, electron, R, grid)
    W = multipoles(V, grid, 2 * basis.l_max) * states.weights
    return _hamiltonian(states, electron, R, basis, 0, grid, V, W), _hamiltonian(
        states, electron, R, basis, 1, grid, V, W
    )


def _hamiltonian(
    states: RadialStates, electron: ElectronGas, R: float, basis: Basis, m: int, grid: Grid, V: Array, W: Array
) -> Hamiltonian:
    """One symmetry: atomic block, Gaussians, separable terms."""
    atomic = [np.zeros(0)] * m + [e[: basis.n_states] for e in states.energies[: basis.l_max + 1]][m:]
    radial = [u[: basis.n_states] for u in states.radial[: basis.l_max + 1]]
    E, orbitals = np.concatenate(atomic), basis.orbitals(m)
    a, size = len(E), len(E) + len(orbitals)
    H, S = np.zeros((size, size)), np.eye(size)
    H[:a, :a] = np.diag(E) + _atomic_block(radial, W, m)
    if orbitals:
        O, H[:a, a:], H[a:, a:], S[a:, a:] = _gas_blocks(states, radial, R, m, grid, V, orbitals)
        H[:a, a:] += E[:, None] * O
        H[a:, :a], S[:a, a:], S[a:, :a] = H[:a, a:].T, O, O.T
    for term in electron.separable:
        if m <= term.l:
            g = GasOrbital(term.l, term.gamma)
            waves = partial_waves(g, states.r, R, m, basis.l_max) * states.weights
            onto = [u @ wave for u, wave in zip(radial[m:], waves, strict=True)]
            full = np.concatenate([*onto, own_integrals([*orbitals, g])[0][-1, :-1]])
            H += term.strength * np.outer(full, full)
    return Hamiltonian(H, S, (*((l, n) for l, e in enumerate(atomic) for n in range(len(e))), *orbitals))


def _atomic_block(radial: list[Array], W: Array, m: int) -> Array:
    """<n l m|V|k j m> from the multipoles times weights, shape (a, a) [hartree]."""
    start = np.concatenate([[0], np.cumsum([len(u) for u in radial[m:]])])
    block = np.empty((start[-1], start[-1]))
    for l in range(m, len(radial)):
        rows = slice(start[l - m], start[l - m + 1])
        for k in range(l, len(radial)):
            columns = slice(start[k - m], start[k - m + 1])
            orders = np.arange(k - l, k + l + 1, 2)
            factors = np.array([legendre_element(l, int(order), k, m) for order in orders])
            block[rows, columns] = (radial[l] * (factors @ W[orders])) @ radial[k].T
            block[columns, rows] = block[rows, columns].T
    return block


def _gas_blocks(
    states: RadialStates, radial: list[Array], R: float, m: int, grid: Grid, V: Array, orbitals: Sequence[GasOrbital]
) -> tuple[Array, Array, Array, Array]:
    """Of the Gaussians: overlap with the atomic states, V with them, full H and S among themselves.

    The core potential is the local one of high l everywhere plus what is special to low l on their partial waves.
    """
    r, weights, l_max = states.r, states.weights, len(radial) - 1
    waves = np.array([partial_waves(o, r, R, m, l_max) for o in orbitals])
    chi = values(orbitals, np.broadcast_to(grid.r, grid.u.shape), R, grid.u, grid.x, m)
    measure = 2.0 * np.pi * grid.weight * (weights * r)[:, None]
    onto = np.einsum("lij,kij->lki", harmonics(grid.x, m, l_max), chi * (V * measure), optimize=True)
    O = np.concatenate([u @ (waves[:, l - m] * weights).T for l, u in enumerate(radial) if l >= m])
    coupling = np.concatenate([u @ onto[l - m].T for l, u in enumerate(radial) if l >= m])
    common = states.core(l_max + 100, r)
    flat = chi.reshape(len(orbitals), -1)
    S, H = own_integrals(orbitals)
    H = H + flat @ (flat * ((V + common[:, None]) * measure * grid.r).ravel()).T
    for l in range(m, l_max + 1):
        special = (states.core(l, r) - common) * weights
        if np.any(special):
            H += (waves[:, l - m] * special) @ waves[:, l - m].T
    return O, coupling, H, S


def check_basis(states: RadialStates, basis: Basis) -> None:
    """InputError when the atom has fewer partial waves than the basis asks for."""
    if basis.l_max >= len(states.energies):
        raise InputError(
            f"l_max = {basis.l_max}: the atom has partial waves up to l = {len(states.energies) - 1}; "
            "build it with more or lower l_max"
        )


@dataclass(frozen=True, slots=True, eq=False)
class Energies:
    """Electronic energies of the pair at each R minus those of the free atom [hartree], each of shape (nR,).

    ``X``, ``A``, ``B``: lowest Sigma, lowest Pi, second Sigma; ``character`` weight of the atomic np sigma orbital in
    B [1]; ``next_gap`` distance of the third Sigma state above B [hartree]. ``error``: what smaller bases change,
    summed over the ways to make it smaller, for each of X, A, B [hartree]. ``size`` functions in Sigma and Pi.
    """

    X: Array
    A: Array
    B: Array
    character: Array
    next_gap: Array
    error: dict[str, Array]
    size: tuple[int, int]


def energies(
    states: RadialStates,
    electron: ElectronGas,
    distances: Array,
    basis: Basis,
    progress: Callable[[int, int], None] | None = None,
    estimate: bool = True,
) -> Energies:
    """Diagonalise at each R.

    Parameters
    ----------
    states : RadialStates
    electron : ElectronGas
    distances : array, shape (nR,)
        R [bohr].
    basis : Basis
    progress : callable, optional
        progress(done, total).
    estimate : bool
        False leaves the error at 0 and saves two thirds of the time.

    Returns
    -------
    Energies

    Raises
    ------
    InputError
        The atom has too few partial waves.
    """
    check_basis(states, basis)
    smaller = list(basis.smaller().values()) if estimate else []
    rows, change, size = np.empty((len(distances), 5)), np.zeros((len(distances), 3)), (0, 0)
    for k, R in enumerate(distances):
        sigma, pi = hamiltonians(states, electron, float(R), basis)
        size = (len(sigma.labels), len(pi.labels))
        E, vectors = sigma.lowest(3)
        found = np.array([E[0], pi.lowest(1)[0][0], E[1]])
        rows[k] = *found, vectors[sigma.labels.index((1, 0)), 1] ** 2, E[2] - E[1]
        for less in smaller:
            low = sigma.part(less).lowest(2)[0]
            change[k] += np.abs([low[0], pi.part(less).lowest(1)[0][0], low[1]] - found)
        if progress is not None:
            progress(k + 1, len(distances))
    s, p = float(states.energies[0][0]), float(states.energies[1][0])
    error = dict(zip("XAB", change.T, strict=True))
    return Energies(rows[:, 0] - s, rows[:, 1] - p, rows[:, 2] - p, rows[:, 3], rows[:, 4], error, size)
