"""Curves X, A, B of a pair from the one-electron model: electronic energies, core and gas, long range.

``V(R) = E(R) - E(free) + V_core-gas(R) + long-range correction``. Atomic units; notes/model-curves.md.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache

import numpy as np
from numpy.typing import ArrayLike, NDArray
from threadpoolctl import ThreadpoolController

from pertcalc import __version__
from pertcalc.constants import HARTREE_CM1
from pertcalc.curves.base import Well
from pertcalc.curves.tabulated import MIN_POINTS, Tabulated
from pertcalc.errors import InputError, OutOfRangeError
from pertcalc.one_electron.atom import Atom, build_atom
from pertcalc.one_electron.core_gas import CoreGas, core_gas
from pertcalc.one_electron.dispersion import RELATIVE_ERROR, dispersion
from pertcalc.one_electron.gas_electron import GasElectron, gas_electron
from pertcalc.one_electron.long_range import ORBITALS, ORDERS, correction, model_coefficients
from pertcalc.one_electron.pair import Basis, Energies, energies
from pertcalc.species import alkali_symbol, noble_gas_symbol

Array = NDArray[np.float64]
STATES = tuple(ORBITALS)
# Radial functions of the pair: a box that holds the np orbitals and every Gaussian of a gas up to LARGEST_R.
SIZE, R_MAX, LARGEST_R, SMALLEST_BOX = 44, 60.0, 30.0, 55.0
# The table begins where the wall reaches this [hartree] (50,000 cm^-1): no thermal collision needs more.
WALL_TOP = 0.228
# Last distance of the default table [bohr], where every curve is its C_n tail to a few per cent.
LAST_R = 26.0
# B is called np sigma while this much of it is; below WARN_BELOW [hartree] (10,000 cm^-1) it matters to rates.
MOSTLY, WARN_BELOW = 0.5, 0.0456


@dataclass(frozen=True, slots=True, eq=False)
class ModelCurves:
    """Curves of one pair with what is needed to judge them; energies [hartree], distances [bohr].

    ``R`` (nR,); ``V`` state -> (nR,); ``basis_error`` state -> (nR,), what smaller bases change; ``quadrature_error``
    largest change with half the nodes; ``correction`` state -> (nR,), the long-range part of V; ``character`` weight of
    np sigma in B (nR,); ``next_gap`` third Sigma above B (nR,). ``dispersion`` and ``own`` state -> n -> C_n
    [hartree bohr^n], of the sum over states (which the tail has) and of the model by itself. ``work`` counts,
    ``warnings`` in words.
    """

    alkali: str
    gas: str
    R: Array
    V: dict[str, Array]
    basis_error: dict[str, Array]
    quadrature_error: float
    correction: dict[str, Array]
    character: Array
    next_gap: Array
    dispersion: dict[str, dict[int, float]]
    own: dict[str, dict[int, float]]
    basis: Basis
    atom: Atom
    electron: GasElectron
    core: CoreGas
    work: dict[str, int]
    warnings: tuple[str, ...]
    version: str = __version__

    def table(self, state: str) -> tuple[Array, Array]:
        """R [bohr] and V [hartree] of the points a curve is made of: from the wall's top outwards.

        Points above WALL_TOP and, on the way in, points after the wall has turned over are left out.
        """
        V = self.V[state]
        start = int(np.argmax(V <= WALL_TOP))
        well = start + int(np.argmin(V[start:]))
        while start < well and not V[start] > V[start + 1]:
            start += 1
        return self.R[start:], V[start:]

    def curve(self, state: str) -> Tabulated:
        """The curve: spline inside, exponential wall, tail with the dispersion coefficients.

        InputError when the points do not make one, for instance all of them beyond the well.
        """
        C = self.dispersion[state]
        return Tabulated(*self.table(state), *(C[n] for n in ORDERS))

    def well(self, state: str) -> Well | None:
        """Depth [hartree] and position [bohr] of the minimum."""
        return self.curve(state).well()

    def numerical_error(self, state: str) -> Array:
        """Basis and quadrature [hartree], shape (nR,)."""
        return self.basis_error[state] + self.quadrature_error


def default_distances(core: CoreGas) -> Array:
    """R [bohr] of a table: from the wall of core and gas to LAST_R, dense where the curves bend.

    Parameters
    ----------
    core : CoreGas

    Returns
    -------
    ndarray, shape (nR,)
        [bohr]
    """
    inside = np.linspace(core.r_min * (1.0 + 1e-9), 12.0, 2000)
    V = core(inside)
    first = float(inside[max(int(np.argmax(V <= 1.3 * WALL_TOP)) - 1, 0)])
    first = np.ceil(first / 0.05) * 0.05
    steps = [np.arange(first, 9.0, 0.2), np.arange(9.0, 17.0, 0.5), np.arange(17.0, LAST_R + 0.1, 1.0)]
    return np.round(np.concatenate([steps[0][steps[0] < 8.9], *steps[1:]]), 10)


def compute_model(
    alkali: str,
    gas: str,
    distances: ArrayLike | None = None,
    basis: Basis | None = None,
    *,
    model: str | None = None,
    atom: Atom | None = None,
    electron: GasElectron | None = None,
    core: CoreGas | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> ModelCurves:
    """Compute X, A and B of an alkali with a noble gas.

    Parameters
    ----------
    alkali, gas : str
        Symbols; "3He" has the curves of helium.
    distances : array_like, optional
        R [bohr], rising; None: `default_distances`.
    basis : Basis, optional
        Size of the calculation.
    model : str, optional
        Electron-gas model; None: the default one.
    atom, electron, core : optional
        An atom, an electron-gas potential and a core-gas potential of your own in place of the shipped ones. The atom
        needs l_max >= 6 and a box of at least 60 bohr.
    progress : callable, optional
        progress(done, total).

    Returns
    -------
    ModelCurves
        Curves and errors [hartree].

    Raises
    ------
    UnknownNameError
        Another alkali, gas or model.
    InputError
        Distances that are not finite and rising; a basis beyond the atom's.
    OutOfRangeError
        A distance inside the alkali core or beyond 30 bohr, where the tail rules.
    """
    a, label = alkali_symbol(alkali), noble_gas_symbol(gas)
    g = label.removeprefix("3")  # the nucleus plays no part
    basis = basis or Basis()
    electron = electron or (gas_electron(g) if model is None else gas_electron(g, model))
    core = core or core_gas(a, g, electron)
    R = default_distances(core) if distances is None else _checked(distances, core)
    own_atom = atom or build_atom(a, basis.l_max, SIZE, R_MAX)
    if own_atom.r[-1] < SMALLEST_BOX:
        raise InputError(
            f"atom: its box ends at {own_atom.r[-1]:.3g} bohr, at least {SMALLEST_BOX:g} are needed; build it with "
            f"r_max = {R_MAX:g} or more."
        )
    with _threads().limit(limits=1, user_api="blas"):
        found = energies(own_atom, electron, R, basis, progress)
        quadrature = _quadrature_error(own_atom, electron, R, basis)
    wanted = {s: dict(zip(ORDERS, c, strict=True)) for s, c in dispersion(atom or build_atom(a), g).items()}
    own = model_coefficients(own_atom, electron, {6: core.C6.value, 8: core.C8})
    kappa = {s: float(np.sqrt(-2.0 * own_atom.energies[l][0])) for s, (l, _) in ORBITALS.items()}
    added = {s: correction(R, kappa[s], wanted[s], own[s]) for s in STATES}
    V = {s: getattr(found, s) + core(R) + added[s] for s in STATES}
    return ModelCurves(
        a, label, R, V, found.error, quadrature, added, found.character, found.next_gap, wanted, own, basis, own_atom,
        electron, core, _work(found, R, basis), _warnings(R, V, found, wanted),
    )  # fmt: skip


@cache
def _threads() -> ThreadpoolController:
    """Pools of the linear algebra: matrices of 250 rows are slower on two threads than on one."""
    return ThreadpoolController()


def _checked(distances: ArrayLike, core: CoreGas) -> Array:
    R = np.atleast_1d(np.asarray(distances, dtype=np.float64))
    if R.ndim != 1 or R.size == 0 or not np.all(np.isfinite(R)) or not np.all(np.diff(R) > 0):
        raise InputError("distances [bohr] must be finite and rise strictly; sort them and drop repeats.")
    if R[-1] > LARGEST_R:
        raise OutOfRangeError(
            "distance", float(R[-1]), core.r_min, LARGEST_R, "bohr", "Farther out the C_n tail is the curve."
        )
    core(R)  # OutOfRangeError for a distance inside the core
    return R


def _quadrature_error(atom: Atom, electron: GasElectron, R: Array, basis: Basis) -> float:
    """Largest change of an energy with half the angular nodes, at three distances [hartree]."""
    sample = R[np.unique(np.linspace(0, len(R) - 1, 3).astype(int))]
    small = replace(basis, n_states=min(basis.n_states, 16))
    fine, coarse = (
        energies(atom, electron, sample, replace(small, nodes=n), estimate=False)
        for n in (basis.nodes, basis.nodes // 2)
    )
    return max(float(np.max(np.abs(getattr(fine, s) - getattr(coarse, s)))) for s in STATES)


def _work(found: Energies, R: Array, basis: Basis) -> dict[str, int]:
    ways = 1 + len(basis.smaller())
    return {
        "distances": len(R),
        "sigma_functions": found.size[0],
        "pi_functions": found.size[1],
        "diagonalisations": 2 * ways * len(R) + 12,
    }


def _warnings(R: Array, V: dict[str, Array], found: Energies, wanted: dict[str, dict[int, float]]) -> tuple[str, ...]:
    """What the user should know, in words."""
    notes = []
    mixed = R[(found.character < MOSTLY) & (V["B"] < WARN_BELOW)]
    if mixed.size:
        notes.append(
            f"B is less than half np sigma at {mixed[0]:.3g} .. {mixed[-1]:.3g} bohr below "
            f"{WARN_BELOW * HARTREE_CM1:.0f} cm^-1: it is the second Sigma curve there, not the np sigma one"
        )
    for state in STATES:
        k = int(np.argmin(V[state]))
        if not (0 < k < len(R) - 1 and V[state][k] < 0):
            notes.append(f"{state} has no minimum inside the table")
        elif found.error[state][k] > 0.02 * -V[state][k]:
            notes.append(
                f"{state}: the basis is converged to {found.error[state][k] / -V[state][k]:.1%} of the well only"
            )
        last = sum(wanted[state][n] / R[-1] ** n for n in ORDERS)
        if R[-1] >= LAST_R and abs(-V[state][-1] / last - 1.0) > 0.2:
            notes.append(f"{state}: at {R[-1]:.3g} bohr the curve is {-V[state][-1] / last:.2f} of its C_n tail")
    if len(R) < MIN_POINTS:
        notes.append(f"{len(R)} distances make no curve; at least {MIN_POINTS} are needed")
    return tuple(notes)


__all__ = ["RELATIVE_ERROR", "STATES", "ModelCurves", "compute_model", "default_distances"]
