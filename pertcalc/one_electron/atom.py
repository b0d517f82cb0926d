"""The alkali atom of the one-electron model: eigenstates of the valence electron and what follows from them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from pertcalc.angular import three_j
from pertcalc.errors import InputError
from pertcalc.one_electron.core import LETTERS, CorePotential, core_potential
from pertcalc.one_electron.radial_basis import R_MAX, SIZE, RadialBasis, bspline_basis, eigenstates
from pertcalc.species import alkali_symbol

Array = NDArray[np.float64]

L_MAX = 8


@dataclass(frozen=True, slots=True, eq=False)
class Atom:
    """Complete set of valence states in a box.

    ``symbol``; ``r``, ``weights`` radial quadrature, shape (nq,) [bohr]; ``energies`` over l of (n_l,) [hartree],
    0 = ionised, lowest first; ``radial`` over l of (n_l, nq), u = r R [bohr^-1/2], orthonormal under the weights;
    ``core`` the core potential.
    """

    symbol: str
    r: Array
    weights: Array
    energies: tuple[Array, ...]
    radial: tuple[Array, ...]
    core: CorePotential

    @property
    def l_max(self) -> int:
        """Highest orbital angular momentum of the set."""
        return len(self.energies) - 1

    def index(self, n: int, l: int) -> int:
        """Position of the state nl among the states of l.

        Raises InputError for an l that is not in the set or an n below the lowest valence state.
        """
        if not 0 <= l <= self.l_max:
            raise InputError(
                f"l = {l}: the set of {self.symbol} has l = 0 .. {self.l_max}; build it with a higher l_max"
            )
        position = n - self.core.principal(l)
        if not 0 <= position < len(self.energies[l]):
            lowest = f"{self.core.principal(l)}{LETTERS[l]}"
            raise InputError(f"n = {n}: the lowest valence state of {self.symbol} with this l is {lowest}.")
        return position

    @property
    def ground(self) -> tuple[int, int]:
        """(index, l) of the ground state ns."""
        return 0, 0

    @property
    def resonance(self) -> tuple[int, int]:
        """(index, l) of the resonance state np: with the same n as the ground state."""
        return self.index(self.core.principal(0), 1), 1

    def dipole_operator(self, r: Array) -> Array:
        """Radial factor of the dipole with the part the electron induces in the core.

        ``d(r) = r - (a_c/r^2) sqrt(1 - exp(-(r/r_c)^6))``

        Parameters
        ----------
        r : ndarray, shape (...)
            Distance of the electron from the core [bohr].

        Returns
        -------
        dipole : ndarray, shape (...)
            The factor [bohr].
        """
        return r - self.core.core_polarizability / r**2 * np.sqrt(self.core.damping(r))

    def multipole(self, rank: int, index: int, l: int, l_final: int) -> Array:
        """Radial integrals ``Int u_f q_k u_i dr`` from one state to all states of l_final.

        ``q_1`` is `dipole_operator`; ``q_k = r^k`` for k > 1, where the share of the core is below 1 %.

        Parameters
        ----------
        rank : int
            Multipole rank k >= 1.
        index, l, l_final : int
            The initial state and the angular momentum of the final ones.

        Returns
        -------
        integrals : ndarray, shape (n_l_final,)
            The integrals [bohr^rank].
        """
        operator = self.dipole_operator(self.r) if rank == 1 else self.r**rank
        return np.asarray(self.radial[l_final] @ (self.weights * operator * self.radial[l][index]))

    def oscillator_strength(self, n: int, l: int, n_final: int, l_final: int) -> float:
        """Absorption oscillator strength nl -> n'l' of the whole multiplet.

        ``f = (2/3) (E' - E) max(l, l')/(2 l + 1) |Int u' d u dr|^2``

        Parameters
        ----------
        n, l, n_final, l_final : int
            The two states; |l - l_final| = 1, InputError otherwise.

        Returns
        -------
        f : float
            The strength [1]; negative for emission.
        """
        if abs(l - l_final) != 1:
            raise InputError(f"l = {l}, l_final = {l_final}: a dipole transition changes l by 1.")
        first, last = self.index(n, l), self.index(n_final, l_final)
        energy = self.energies[l_final][last] - self.energies[l][first]
        integral = self.multipole(1, first, l, l_final)[last]
        return float(2 / 3 * energy * max(l, l_final) / (2 * l + 1) * integral**2)

    def polarizability(self, n: int, l: int, m: int = 0, rank: int = 1) -> float:
        """Static multipole polarisability of the state nlm along the axis of m, core included where it is known.

        ``alpha_k = 2 sum |<n'l'm| q_k C_k0 |nlm>|^2 / (E' - E)`` plus a_c for k = 1

        Parameters
        ----------
        n, l, m : int
            The state.
        rank : int
            Multipole rank k; k + l <= l_max, InputError otherwise.

        Returns
        -------
        alpha : float
            The polarisability [bohr^(2 rank + 1)].
        """
        if l + rank > self.l_max:
            raise InputError(f"rank = {rank}: a state with l = {l} needs l_max >= {l + rank}, not {self.l_max}.")
        index = self.index(n, l)
        total = self.core.core_polarizability if rank == 1 else 0.0
        for final in range(abs(l - rank), l + rank + 1, 2):
            gaps = self.energies[final] - self.energies[l][index]
            integrals = self.multipole(rank, index, l, final)
            if final == l:  # a static moment is first order and degenerate levels do not mix at fixed m
                gaps, integrals = np.delete(gaps, index), np.delete(integrals, index)
            total += 2 * angular_factor(final, m, rank, 0, l, m) ** 2 * float(np.sum(integrals**2 / gaps))
        return total


def angular_factor(l: int, m: int, k: int, q: int, l1: int, m1: int) -> float:
    """Matrix element ``<l m| C_kq |l1 m1>`` of a Racah-normalised spherical harmonic [1]."""
    norm = (-1) ** m * math.sqrt((2 * l + 1) * (2 * l1 + 1))
    return norm * three_j(l, k, l1, 0, 0, 0) * three_j(l, k, l1, -m, q, m1)


@cache
def build_atom(symbol: str, l_max: int = L_MAX, size: int = SIZE, r_max: float = R_MAX) -> Atom:
    """Return the valence states of an alkali in the shipped core potential; cached.

    Parameters
    ----------
    symbol : str
        "Li", "Na", "K", "Rb" or "Cs"; UnknownNameError otherwise.
    l_max : int
        Highest orbital angular momentum.
    size, r_max : int, float
        Number of radial functions per l and radius of the box [bohr]; see `bspline_basis`.

    Returns
    -------
    atom : Atom
        The states [atomic units].
    """
    return solve_atom(core_potential(alkali_symbol(symbol)), l_max, bspline_basis(size, r_max))


def solve_atom(core: CorePotential, l_max: int = L_MAX, basis: RadialBasis | None = None) -> Atom:
    """Return the valence states in any core potential, for instance one from `fit_core_potential`.

    Parameters
    ----------
    core : CorePotential
        The potential [atomic units].
    l_max : int
        Highest orbital angular momentum, 1 .. 11; InputError otherwise.
    basis : RadialBasis or None
        Radial functions [bohr]; None for the default ones.

    Returns
    -------
    atom : Atom
        The states [atomic units].
    """
    if not 1 <= l_max < len(LETTERS):
        raise InputError(f"l_max = {l_max}: must be 1 .. {len(LETTERS) - 1}")
    basis = basis or bspline_basis()
    solved = [eigenstates(basis, l, core(l, basis.r)) for l in range(l_max + 1)]
    energies, radial = zip(*solved, strict=True)
    return Atom(core.symbol, basis.r, basis.weights, tuple(energies), tuple(radial), core)
