"""Fit of a core potential to term energies: two lowest terms of s, p and d, two parameters each.

The shipped term energies are in data/one_electron/terms.csv. A user's own atom comes in through `fit_core_potential`
and `solve_atom` (atom.py).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh
from scipy.optimize import brentq

from pertcalc.constants import HARTREE_CM1
from pertcalc.errors import InputError, NotConvergedError
from pertcalc.one_electron.core import LETTERS, CorePotential
from pertcalc.one_electron.radial_basis import RadialBasis, bspline_basis
from pertcalc.shipped import shipped_rows
from pertcalc.species import alkali_symbol

Array = NDArray[np.float64]

FITTED_L = 3
# Accepted error of the second term where no width meets it exactly; the terms themselves are known to a tenth of it.
TOLERANCE_CM1 = 1.0
# b_l searched [bohr^-2]: widths of 0.25 to 5 bohr, the size of a core.
EXPONENTS = np.geomspace(0.04, 16.0, 25)
# Strongest core repulsion or attraction tried [hartree]; a higher wall no longer moves the energies.
STRENGTH_LIMIT = 1e5


@dataclass(frozen=True, slots=True)
class Term:
    """Fine-structure averaged energy of a valence state.

    ``n``, ``l`` its quantum numbers; ``energy_cm1`` above the ground level [cm^-1]; ``source``, ``mark`` "READ" |
    "FROM MEMORY".
    """

    n: int
    l: int
    energy_cm1: float
    source: str = ""
    mark: str = ""

    @property
    def label(self) -> str:
        """Name of the state, as "5s"."""
        return f"{self.n}{LETTERS[self.l]}"


def valence_terms(symbol: str) -> tuple[Term, ...]:
    """Return the term energies of an alkali [cm^-1 above the ground level], fine-structure averaged.

    Levels are weighted with 2J + 1. UnknownNameError for an atom that is not one of the five alkalis.
    """
    levels: dict[tuple[str, str], list[dict[str, str]]] = {}
    for row in _rows(alkali_symbol(symbol)):
        if row["n"]:
            levels.setdefault((row["n"], row["l"]), []).append(row)
    return tuple(_averaged(group) for group in levels.values())


def ionisation_energy(symbol: str) -> float:
    """Return the ionisation energy of an alkali [cm^-1] that belongs to its term energies."""
    return next(float(row["energy_cm1"]) for row in _rows(alkali_symbol(symbol)) if not row["n"])


def fit_core_potential(
    symbol: str,
    terms: Sequence[Term],
    ionisation_cm1: float,
    core_polarizability: float,
    cutoff: float,
    basis: RadialBasis | None = None,
) -> CorePotential:
    """Core potential that reproduces the two lowest terms of s, p and d.

    For every b_l the strength A_l follows from the lowest term, which rises with A_l; b_l is where the second term
    agrees too. Of several such b_l the largest is taken: the most compact core.

    Parameters
    ----------
    symbol : str
        Name of the atom; any.
    terms : sequence of Term
        Energies above the ground level [cm^-1], the ground term with energy 0 among them; the two lowest of each of
        l = 0, 1, 2 are used.
    ionisation_cm1 : float
        Ionisation energy [cm^-1].
    core_polarizability, cutoff : float
        a_c >= 0 [bohr^3] and r_c > 0 [bohr].
    basis : RadialBasis or None
        Radial functions [bohr]; None for the default ones.

    Returns
    -------
    potential : CorePotential
        The fitted potential [atomic units].

    Raises
    ------
    InputError
        Lists every argument that breaks its rule.
    NotConvergedError
        Names two terms that no strength and width in the searched range reproduce within 1 cm^-1.
    """
    _check(symbol, terms, ionisation_cm1, core_polarizability, cutoff)
    basis = basis or bspline_basis()
    bare = CorePotential(symbol, core_polarizability, cutoff, (), (), ())
    pairs = [_lowest_two(terms, l) for l in range(FITTED_L)]
    fitted = [_ShortRange(basis, bare, pair, ionisation_cm1).solve() for pair in pairs]
    return CorePotential(
        symbol,
        core_polarizability,
        cutoff,
        tuple(strength for strength, _ in fitted),
        tuple(exponent for _, exponent in fitted),
        tuple(pair[0].n for pair in pairs),
        source="fitted to the terms " + ", ".join(term.label for pair in pairs for term in pair),
        mark="COMPUTED",
    )


class _ShortRange:
    """A_l exp(-b_l r^2) for one l, in the eigenbasis of the potential without it."""

    def __init__(self, basis: RadialBasis, bare: CorePotential, pair: Sequence[Term], ionisation_cm1: float):
        self.basis, self.symbol, self.pair = basis, bare.symbol, pair
        self.wanted = [(term.energy_cm1 - ionisation_cm1) / HARTREE_CM1 for term in pair]
        l = pair[0].l
        energies, vectors = eigh(basis.hamiltonian(l, bare(l, basis.r)), basis.overlap)
        self.bare = np.diag(energies)
        self.radial = vectors.T @ basis.values

    def strength_and_miss(self, exponent: float) -> tuple[float, float]:
        """(A_l with the lowest term exact, error of the second term [hartree]); nan where no A_l does it."""
        gaussian = (self.radial * (self.basis.weights * np.exp(-exponent * self.basis.r**2))) @ self.radial.T

        def misses(t: float) -> Array:
            # sinh: the search is even in the magnitude of A_l, of either sign.
            hamiltonian = self.bare + math.sinh(t) * gaussian
            return np.asarray(eigh(hamiltonian, eigvals_only=True, subset_by_index=[0, 1])) - self.wanted

        end = math.asinh(STRENGTH_LIMIT)
        if not misses(-end)[0] < 0 < misses(end)[0]:
            return math.nan, math.nan
        t = brentq(lambda x: float(misses(x)[0]), -end, end, xtol=1e-13, rtol=1e-14)
        return math.sinh(t), float(misses(t)[1])

    def solve(self) -> tuple[float, float]:
        """(A_l [hartree], b_l [bohr^-2])."""
        misses = np.array([self.strength_and_miss(b)[1] for b in EXPONENTS])
        changes = np.flatnonzero(misses[:-1] * misses[1:] <= 0)
        if changes.size:
            low, high = EXPONENTS[changes[-1]], EXPONENTS[changes[-1] + 1]
            # Five decimals of b cost 0.002 cm^-1 of the second term and make the fit the same on every machine.
            exponent = round(brentq(lambda b: self.strength_and_miss(b)[1], low, high, xtol=1e-9), 5)
            return self.strength_and_miss(exponent)[0], exponent
        if np.isnan(misses).all():
            first = self.pair[0]
            raise InputError(
                f"core potential of {self.symbol}: no core repulsion lifts the lowest level with l = {first.l} to "
                f"{first.label} = {first.energy_cm1:g} cm^-1; check this term and the ionisation energy."
            )
        best = int(np.nanargmin(np.abs(misses)))
        if abs(misses[best]) * HARTREE_CM1 > TOLERANCE_CM1:
            raise self._failure(misses[best])
        return self.strength_and_miss(EXPONENTS[best])[0], float(EXPONENTS[best])

    def _failure(self, miss: float) -> NotConvergedError:
        """Error that names both terms; `miss` [hartree] of the second term with the first exact."""
        first, second = self.pair
        asked = f"{first.label} = {first.energy_cm1:g} and {second.label} = {second.energy_cm1:g} cm^-1"
        return NotConvergedError(
            f"core potential of {self.symbol}: no core gives {asked} together (check both terms, the ionisation "
            f"energy, core_polarizability and cutoff); {second.label} [cm^-1]",
            second.energy_cm1 + miss * HARTREE_CM1,
            abs(miss) * HARTREE_CM1 / second.energy_cm1,
            TOLERANCE_CM1 / second.energy_cm1,
        )


def _lowest_two(terms: Sequence[Term], l: int) -> list[Term]:
    return sorted((term for term in terms if term.l == l), key=lambda term: term.energy_cm1)[:2]


def _check(symbol: str, terms: Sequence[Term], ionisation_cm1: float, polarizability: float, cutoff: float) -> None:
    """Raise one InputError that lists every argument which breaks its rule."""
    problems = []
    if not (math.isfinite(ionisation_cm1) and ionisation_cm1 > 0):
        problems.append(f"ionisation_cm1 = {ionisation_cm1}: must be finite and > 0 [cm^-1]")
    if not (math.isfinite(polarizability) and polarizability >= 0):
        problems.append(f"core_polarizability = {polarizability}: must be finite and >= 0 [bohr^3]")
    if not (math.isfinite(cutoff) and cutoff > 0):
        problems.append(f"cutoff = {cutoff}: must be finite and > 0 [bohr]")
    for term in terms:
        if not (0 <= term.l < term.n and term.l < len(LETTERS)):
            problems.append(f"term n = {term.n}, l = {term.l}: must obey 0 <= l < n, l <= {len(LETTERS) - 1}")
        elif not (math.isfinite(term.energy_cm1) and 0 <= term.energy_cm1 < ionisation_cm1):
            problems.append(
                f"term {term.label} = {term.energy_cm1} cm^-1: must lie between the ground level (0) and the "
                f"ionisation energy ({ionisation_cm1:g} cm^-1)"
            )
    for l in range(FITTED_L):
        pair = _lowest_two(terms, l)
        if len(pair) < 2:
            problems.append(f"terms: {len(pair)} with l = {l} ({LETTERS[l]}); give the two lowest")
        elif pair[1].n != pair[0].n + 1:
            problems.append(
                f"terms {pair[0].label} and {pair[1].label}: the two lowest terms of l = {l} must have successive n"
            )
    if problems:
        raise InputError([f"core potential of {symbol}: {problem}." for problem in problems])


@cache
def _table() -> dict[str, list[dict[str, str]]]:
    """Rows of terms.csv by alkali."""
    rows: dict[str, list[dict[str, str]]] = {}
    for row in shipped_rows("one_electron", "terms.csv", dict):
        rows.setdefault(row["alkali"], []).append(row)
    return rows


def _rows(symbol: str) -> list[dict[str, str]]:
    return _table()[symbol]


def _averaged(levels: list[dict[str, str]]) -> Term:
    """Mean of the fine-structure levels of a state, weighted with 2J + 1."""
    first = levels[0]
    weights = [int(row["two_j"] or 0) + 1 for row in levels]
    energy = sum(w * float(row["energy_cm1"]) for w, row in zip(weights, levels, strict=True)) / sum(weights)
    return Term(int(first["n"]), int(first["l"]), energy, first["source"], first["mark"])
