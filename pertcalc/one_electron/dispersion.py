"""Dispersion coefficients C6, C8, C10 of X, A and B by second-order sums over states.

``V = -C6/R^6 - C8/R^8 - C10/R^10``. The alkali enters with all states of the one-electron model, its core and the gas
as effective oscillators, one per multipole. An np atom also polarises the gas by its static quadrupole: that induction
is the term of the sum in which the atom stays np. Atomic units. notes/dispersion.md has the formulas and the checks.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pertcalc.errors import InputError
from pertcalc.one_electron.atom import Atom, angular_factor
from pertcalc.species import NobleGas, alkali_symbol, noble_gas

Array = NDArray[np.float64]

STATES = {"X": (0, 0), "A": (1, 1), "B": (1, 0)}  # l and m of the valence electron along the axis
# Relative errors of C6, C8, C10: judged from the pairs with published values (notes/dispersion.md), not derived.
RELATIVE_ERROR = {"X": (0.03, 0.06, 0.10), "A": (0.05, 0.10, 0.15), "B": (0.05, 0.10, 0.15)}
ORDERS = (6, 8, 10)
L_MAX = 5
# Closed shells of the alkali ion, to scale its excitation energies from.
_ISOELECTRONIC = {"Li": "He", "Na": "Ne", "K": "Ar", "Rb": "Kr", "Cs": "Xe"}


class Coefficients(NamedTuple):
    """``C6`` [hartree bohr^6], ``C8`` [hartree bohr^8], ``C10`` [hartree bohr^10]; positive attracts."""

    C6: float
    C8: float
    C10: float


@dataclass(frozen=True, slots=True, eq=False)
class Oscillators:
    """Multipole excitations of an atom in an S state.

    ``frequency`` over the rank k = 1, 2, ... of excitation energies, shape (n_k,) [hartree]; ``strength`` of
    ``|<n|Q_k0|0>|^2``, shape (n_k,) [bohr^(2 k)], so that ``alpha_k = 2 sum strength/frequency``.
    """

    frequency: tuple[Array, ...]
    strength: tuple[Array, ...]

    def ranks(self) -> Iterator[tuple[int, Array, Array]]:
        """(k, frequencies [hartree], strengths [bohr^(2 k)]) of each rank."""
        return zip(range(1, len(self.frequency) + 1), self.frequency, self.strength, strict=False)


def dispersion(atom: Atom, gas: str) -> dict[str, Coefficients]:
    """Dispersion coefficients of the three curves of a pair; COMPUTED, relative errors in RELATIVE_ERROR.

    Parameters
    ----------
    atom : Atom
        States of the alkali with l_max >= 5; InputError otherwise.
    gas : str
        "He", "Ne", "Ar", "Kr", "Xe" or "3He"; UnknownNameError otherwise.

    Returns
    -------
    coefficients : dict of Coefficients
        By state "X", "A", "B" [hartree bohr^n].
    """
    if atom.l_max < L_MAX:
        raise InputError(f"l_max = {atom.l_max}: dispersion coefficients need l_max >= {L_MAX} in build_atom.")
    partner = gas_oscillators(noble_gas(gas))
    core = s_state_coefficients(core_oscillators(atom), partner)
    found = {}
    for name, (l, m) in STATES.items():
        index = (atom.ground if l == 0 else atom.resonance)[0]
        valence = valence_coefficients(atom, index, l, m, partner)
        found[name] = Coefficients(*(v + c for v, c in zip(valence, core, strict=True)))
    return found


def gas_oscillators(gas: NobleGas) -> Oscillators:
    """One oscillator per multipole k = 1, 2, 3 of a noble gas [atomic units].

    The strengths follow from the polarisabilities; the dipole and quadrupole frequencies from C6 and C8 of the like
    pair, ``C6 = (3/4) alpha_1^2 w_1``, ``C8 = (15/2) alpha_1 alpha_2 w_1 w_2/(w_1 + w_2)``. No C10 fixes the octupole
    one: it is set to that of the quadrupole. An alkali's own are so low that 20 % of it is at most 0.6 % of C10.
    """
    alphas = [
        float(a) for a in (gas.polarizability_au, gas.quadrupole_polarizability_au, gas.octupole_polarizability_au)
    ]
    dipole = 4 * float(gas.C6_homonuclear_au) / (3 * alphas[0] ** 2)
    reduced = float(gas.C8_homonuclear_au) / (7.5 * alphas[0] * alphas[1])
    quadrupole = reduced * dipole / (dipole - reduced)
    return _effective(alphas, [dipole, quadrupole, quadrupole])


def core_oscillators(atom: Atom) -> Oscillators:
    """One dipole and one quadrupole oscillator for an alkali core [atomic units].

    ``w_1 = sqrt(N/alpha_1)`` with the effective electron number N of the noble gas of the same shells (Slater and
    Kirkwood); ``w_2/w_1`` as in that gas. An unknown quadrupole polarisability leaves the quadrupole out.
    """
    gas = gas_oscillators(noble_gas(_ISOELECTRONIC[alkali_symbol(atom.symbol)]))
    gas_dipole, gas_quadrupole = (float(w[0]) for w in gas.frequency[:2])
    electrons = 2 * float(gas.strength[0][0]) * gas_dipole  # N = alpha w^2, with alpha = 2 strength/w
    if atom.core.core_polarizability <= 0:
        return Oscillators((), ())
    alphas = [atom.core.core_polarizability]
    frequencies = [math.sqrt(electrons / alphas[0])]
    if atom.core.core_quadrupole is not None:
        alphas.append(atom.core.core_quadrupole)
        frequencies.append(frequencies[0] * gas_quadrupole / gas_dipole)
    return _effective(alphas, frequencies)


def state_oscillators(atom: Atom) -> Oscillators:
    """All valence excitations of rank 1, 2, 3 from the ground state [atomic units]."""
    ground = atom.energies[0][0]
    ranks = range(1, 4)
    return Oscillators(
        tuple(atom.energies[k] - ground for k in ranks),
        tuple(atom.multipole(k, 0, 0, k) ** 2 / (2 * k + 1) for k in ranks),
    )


def s_state_coefficients(first: Oscillators, second: Oscillators) -> Coefficients:
    """Coefficients of two S-state atoms from their oscillators.

    ``C_n = sum_{n = 2j + 2k + 2} (2j + 2k)!/((2j)! (2k)!) sum S_a S_b/(w_a + w_b)``

    Parameters
    ----------
    first, second : Oscillators
        The two atoms [atomic units].

    Returns
    -------
    coefficients : Coefficients
        C6, C8, C10 [hartree bohr^n].
    """
    found = dict.fromkeys(ORDERS, 0.0)
    for j, w_a, s_a in first.ranks():
        for k, w_b, s_b in second.ranks():
            if (order := 2 * j + 2 * k + 2) in found:
                pair_sum = np.sum(s_a[:, None] * s_b / (w_a[:, None] + w_b))
                found[order] += math.comb(2 * j + 2 * k, 2 * j) * float(pair_sum)
    return Coefficients(*found.values())


def valence_coefficients(atom: Atom, index: int, l: int, m: int, partner: Oscillators) -> Coefficients:
    """Coefficients of the valence electron in one state and an S-state partner.

    ``C_n = sum_{n = j + j' + 2k + 2} sum_q c_jkq c_j'kq sum_f <i|Q_jq|f><f|Q_j'q|i> S_k/(E_f - E_i + w_k)``

    Parameters
    ----------
    atom : Atom
        States of the valence electron [atomic units].
    index, l, m : int
        The state; m along the axis.
    partner : Oscillators
        The other atom [atomic units].

    Returns
    -------
    coefficients : Coefficients
        C6, C8, C10 [hartree bohr^n].
    """
    found = dict.fromkeys(ORDERS, 0.0)
    for k, frequency, strength in partner.ranks():
        for order in ORDERS:
            total = order - 2 * k - 2  # j + j'
            for j in range(1, total):
                found[order] += _second_order(atom, (index, l, m), (j, total - j), k, frequency, strength)
    return Coefficients(*found.values())


def _second_order(
    atom: Atom, state: tuple[int, int, int], ranks: tuple[int, int], k: int, frequency: Array, strength: Array
) -> float:
    """Terms of one pair of ranks (j, j') of the atom and rank k of the partner."""
    index, l, m = state
    j, other = ranks
    finals = range(max(abs(l - j), abs(l - other)), min(l + j, l + other) + 1)
    total = 0.0
    for final in finals:
        gaps = atom.energies[final] - atom.energies[l][index]
        radial = atom.multipole(j, index, l, final) * atom.multipole(other, index, l, final)
        share = float(np.sum(radial[:, None] * strength / (gaps[:, None] + frequency)))
        for q in range(-min(j, other, k), min(j, other, k) + 1):
            angular = angular_factor(final, m + q, j, q, l, m) * angular_factor(final, m + q, other, q, l, m)
            total += _coupling(j, k, q) * _coupling(other, k, q) * angular * share
    return total


def _coupling(j: int, k: int, q: int) -> float:
    """Weight ``(j+k)!/sqrt((j+q)! (j-q)! (k+q)! (k-q)!)`` of Q_jq Q_k-q/R^(j+k+1) in the multipole expansion."""
    return math.sqrt(math.comb(j + k, j + q) * math.comb(j + k, j - q))


def _effective(alphas: list[float], frequencies: list[float]) -> Oscillators:
    """Oscillators from polarisabilities and frequencies, one per rank."""
    pairs = zip(alphas, frequencies, strict=True)
    return Oscillators(tuple(np.array([w]) for w in frequencies), tuple(np.array([a * w / 2]) for a, w in pairs))
