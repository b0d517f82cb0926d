"""Semiclassical side of quasi-bound levels: barriers, energies to start from, WKB widths.

With the Langer term (N + 1/2)^2: Phi(E) = Int sqrt(2 mu (E - V_eff)) dR between the inner turning points is
(v + 1/2) pi at a level; Gamma = hbar/T ln(1 + e^{-2 theta}), T = 2 hbar dPhi/dE the round trip and theta the barrier
integral. Source: any text on semiclassical tunnelling (M. S. Child, Semiclassical Mechanics, FROM MEMORY).
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import count

import numpy as np
from numpy.typing import NDArray

from pertcalc.molecules.grid import mapped_grid
from pertcalc.molecules.levels import Ints, Levels, well_and_barrier
from pertcalc.molecules.radial import R_FAR, Array, Potential, RadialProblem
from pertcalc.molecules.spectrum import eigen

_ACTION_ENERGIES = 41
_ACTION_POINTS = 4000
_QUADRATURE = 60
# Candidates are sought to this much above the step of the quantum number at the barrier's top [levels].
_ABOVE = 0.5
# They start this part of the barrier's height below its top.
_BELOW_TOP = 0.02
# A level of the spectrum with the wall is real if no more than this part of it stands at the wall.
_AT_WALL = 1e-3


@dataclass(frozen=True, slots=True)
class Barriers:
    """Centrifugal barriers that stand before a well, rising N; arrays of shape (n,).

    ``N``; ``height`` [hartree, > 0] and ``r_top`` [bohr] of the barrier; ``depth`` V_eff at the bottom of the well
    [hartree] and ``r_well`` [bohr].
    """

    N: Ints
    height: Array
    r_top: Array
    depth: Array
    r_well: Array


def barriers(problem: RadialProblem) -> Barriers:
    """Every N whose effective potential has a well behind a barrier, with its highest point.

    Parameters
    ----------
    problem : RadialProblem

    Returns
    -------
    Barriers
        Empty for a curve without well.
    """
    rows = []
    if problem.has_well:
        for N in count():
            R = np.geomspace(problem.r_in, R_FAR * max(1.0, 20.0 / max(N, 1)), _ACTION_POINTS)
            V = problem.effective(R, float(N))
            bottom, top = well_and_barrier(R, V)
            if bottom < top < len(R) - 1:
                rows.append((N, V[top], R[top], V[bottom], R[bottom]))
            elif N:  # without rotation only a hump of the curve itself is a barrier
                break
    columns = np.array(rows).T if rows else np.zeros((5, 0))
    return Barriers(columns[0].astype(np.int64), columns[1], columns[2], columns[3], columns[4])


@dataclass(frozen=True, slots=True)
class Candidates:
    """Where to seek quasi-bound levels; arrays of shape (n,).

    ``N``, ``v``; ``energy`` [hartree] to start from: that of the spectrum with a hard wall at the barrier's top, and
    besides, where the level reaches the wall, one that fits the WKB phase; ``sure`` marks levels that do not reach the
    wall: they exist whatever the search finds; ``model_error`` first-order change of the energy by the curves'
    uncertainties [hartree], nan where unknown.
    """

    N: Ints
    v: Ints
    energy: Array
    sure: NDArray[np.bool_]
    model_error: Array


def candidates(problem: RadialProblem, found: Barriers, levels: Levels, changes: list[Potential]) -> Candidates:
    """Every (v, N) that may be quasi-bound.

    Parameters
    ----------
    problem : RadialProblem
    found : Barriers
    levels : Levels
        Bound levels of all N: v goes on where they end.
    changes : list of callable
        V(R) [hartree] moved by one standard deviation each; may be empty.

    Returns
    -------
    Candidates
    """
    grid = mapped_grid(problem, max(levels.points, 1))
    potential = problem.potential(grid.R)
    moved = np.array([change(grid.R) - potential for change in changes])
    rows = []
    for N, height, r_top, depth in zip(found.N, found.height, found.r_top, found.depth, strict=True):
        inside = int(np.searchsorted(grid.R, r_top))
        H = grid.kinetic[:inside, :inside] + np.diag(problem.effective(grid.R[:inside], float(N)))
        walled, vectors = eigen(H)
        errors = np.full(inside, np.nan)
        if changes:
            errors = np.sqrt(np.sum((moved[:, :inside] @ vectors**2) ** 2, axis=0))
        below = int(np.count_nonzero(walled < height))
        low = max(depth, 0.0)
        E = low + (height - low) * np.linspace(0, 1, _ACTION_ENERGIES)
        number = _wkb_number(problem, N, E, r_top)
        edge = _BELOW_TOP * (height - low)
        # Levels of a further, outer well do not count: v is that of the well inside the barrier.
        bound = int(np.count_nonzero((levels.N == N) & (levels.outer < r_top)))
        for v in range(bound, max(below, int(np.floor(number[-1] + _ABOVE)) + 1)):
            sure = v < below and vectors[-1, v] ** 2 < _AT_WALL
            error = errors[min(v, below - 1)] if below else np.nan
            if v < below and walled[v] > 0:
                rows.append((N, v, walled[v], sure, error))
            if not sure:
                phase = np.clip(np.interp(v, number, E), low + edge, height - edge)
                rows.append((N, v, phase, False, error))
    columns = np.array(rows, dtype=float).reshape(-1, 5).T
    return Candidates(
        columns[0].astype(np.int64), columns[1].astype(np.int64), columns[2], columns[3].astype(bool), columns[4]
    )


def _wkb_number(problem: RadialProblem, N: int, E: Array, r_top: float) -> Array:
    """Phi(E)/pi - 1/2 [1] of the region inside the barrier's top: v where it is a whole number."""
    R = np.linspace(problem.r_in, r_top, _ACTION_POINTS)
    V = problem.potential(R) + (N + 0.5) ** 2 / (2 * problem.reduced_mass * R * R)
    kinetic = np.clip(2 * problem.reduced_mass * (E[:, None] - V), 0, None)
    return np.sqrt(kinetic).sum(axis=1) * (R[1] - R[0]) / np.pi - 0.5


def wkb_widths(problem: RadialProblem, N: Ints, energy: Array, inner: Array, outer: Array, r_top: Array) -> Array:
    """Tunnelling widths ``hbar/T ln(1 + exp(-2 theta))`` of levels below their barriers.

    Parameters
    ----------
    problem : RadialProblem
    N, energy : ndarray, shape (n,)
        Rotation [1], energy [hartree].
    inner, outer, r_top : ndarray, shape (n,)
        Turning points of the well and barrier top [bohr].

    Returns
    -------
    ndarray, shape (n,)
        [hartree]; the well's turning points are those without the Langer term, which costs less than WKB itself.
    """
    mu = problem.reduced_mass
    outside = _outside(problem, N, energy, r_top)
    # R = middle - half cos t turns the square roots at both ends into smooth functions of t.
    t = np.pi * (np.arange(_QUADRATURE) + 0.5) / _QUADRATURE

    def squared(low: Array, high: Array) -> tuple[Array, Array]:
        half = 0.5 * (high - low)[:, None]
        R = 0.5 * (high + low)[:, None] - half * np.cos(t)
        return 2 * mu * (energy[:, None] - problem.effective(R, N[:, None].astype(float))), half * np.sin(t)

    step = np.pi / _QUADRATURE
    p2, weight = squared(inner, outer)
    period = 2 * mu * np.sum(weight / np.sqrt(np.maximum(p2, 1e-12 * p2.max(axis=1)[:, None])), axis=1) * step
    p2, weight = squared(outer, outside)
    theta = np.sum(weight * np.sqrt(np.clip(-p2, 0, None)), axis=1) * step
    return np.log1p(np.exp(-2 * theta)) / period


def _outside(problem: RadialProblem, N: Ints, energy: Array, r_top: Array) -> Array:
    """Outer turning point of the barrier [bohr]: V_eff falls from the top to E."""
    low = r_top.copy()
    high = np.maximum(2 * r_top, 2 * (N + 1) / np.sqrt(2 * problem.reduced_mass * energy))
    for _ in range(60):
        middle = 0.5 * (low + high)
        above = problem.effective(middle, N.astype(float)) > energy
        low, high = np.where(above, middle, low), np.where(above, high, middle)
    return 0.5 * (low + high)
