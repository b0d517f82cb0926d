"""Every bound level E(v, N) of one electronic state by a spectral method on the mapped grid of `grid`."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pertcalc.constants import HARTREE_CM1
from pertcalc.errors import InputError, NotConvergedError, OutOfRangeError
from pertcalc.molecules.grid import DENSITY, R_OUT, MappedGrid, mapped_grid, points_needed
from pertcalc.molecules.radial import R_FAR, Array, Potential, RadialProblem
from pertcalc.molecules.spectrum import eigen

Ints = NDArray[np.int64]

# More points than this are refused: a well that needs them holds levels by the thousand for every N.
MAX_POINTS = 1200
# The energies are compared with those of a grid this much denser, at up to so many values of N.
REFINEMENT = 1.3
_SAMPLES = 4
# A grid that is not dense enough grows by this factor.
GROWTH = 1.5
# Largest change allowed in that comparison, in units of the well depth.
TOLERANCE = 1e-4
# The extent is the radius that holds this part of the probability.
HELD = 0.999
# Matrices diagonalised in one call: bounds the memory.
_BATCH_NUMBERS = 4_000_000
_SCAN = 1500
_BISECTIONS = 60


@dataclass(frozen=True, slots=True)
class Levels:
    """Bound levels, lowest N first and v rising; all arrays of shape (n,).

    ``v``, ``N`` quantum numbers; ``energy`` [hartree, < 0] from the limit; ``rotation`` B_v = <1/(2 mu R^2)> [hartree];
    ``inner``, ``outer`` turning points and ``extent``, the radius that holds 99.9 % of the probability [bohr];
    ``model_error`` first-order change of the energy by the curves' stated uncertainties [hartree], None where none is
    stated; ``numerical_error`` [hartree] the largest change of a level on a denser grid; ``points`` of the grid.
    """

    v: Ints
    N: Ints
    energy: Array
    rotation: Array
    inner: Array
    outer: Array
    extent: Array
    model_error: Array | None
    numerical_error: float
    points: int

    @property
    def count_by_rotation(self) -> Ints:
        """Number of levels for N = 0, 1, ... up to the highest N with a level; empty without levels."""
        return np.bincount(self.N) if self.N.size else np.zeros(0, dtype=np.int64)


def bound_levels(
    problem: RadialProblem,
    points: int | None = None,
    deformed: Mapping[str, tuple[Potential, float]] | None = None,
) -> Levels:
    """All bound levels of a radial problem.

    Parameters
    ----------
    problem : RadialProblem
    points : int, optional
        Grid points; None takes what the well needs.
    deformed : mapping, optional
        Name -> (changed V(R) [hartree], its C6), from ``radial.deformed_potentials``; gives the model error.

    Returns
    -------
    Levels
        Empty for a curve without well.

    Raises
    ------
    InputError
        Fewer points than the well needs.
    OutOfRangeError
        A well that needs more than MAX_POINTS.
    NotConvergedError
        A denser grid moves a level by more than TOLERANCE of the depth.
    """
    if not problem.has_well:
        return _collect([], problem, deformed, 0.0, 0)
    n = grid_size(problem, points)
    while True:
        grid = mapped_grid(problem, n)
        blocks = _diagonalise(problem, grid, range(problem.largest_rotation + 1))
        error = _grid_error(problem, n, blocks)
        if error <= TOLERANCE * problem.depth:
            break
        # Curves with kinks (a spline's knots, an avoided crossing that is hardly avoided) need more than smooth ones.
        if points is not None or GROWTH * n > MAX_POINTS:
            best = float(blocks[0][1][0]) * HARTREE_CM1 if blocks else 0.0
            what = f"the lowest level [cm^-1] on {n} grid points (errors in units of the well depth)"
            raise NotConvergedError(what, best, error / problem.depth, TOLERANCE)
        n = int(GROWTH * n)
    return _collect(blocks, problem, deformed, error, n, grid)


def grid_size(problem: RadialProblem, points: int | None) -> int:
    """Grid points [1] for a well, those asked for or those it needs; errors as ``bound_levels``."""
    needed = points_needed(problem, DENSITY)
    if needed > MAX_POINTS:
        raise OutOfRangeError(
            "grid points that this well needs",
            needed,
            1,
            MAX_POINTS,
            "points",
            "The well is too deep or too wide for the mass: check the units of the curve, or give a shallower one.",
        )
    if points is None:
        return needed
    least = points_needed(problem, 1.2)
    if not least <= points <= MAX_POINTS:
        raise InputError(
            f"points = {points} must lie in {least} .. {MAX_POINTS}: the well is too deep for fewer; {needed} are the "
            "default."
        )
    return points


Block = tuple[int, Array, Array]


def _diagonalise(problem: RadialProblem, grid: MappedGrid, wanted: range | list[int]) -> list[Block]:
    """(N, energies < 0, squared coefficients (n, levels)) for every wanted N that has a level."""
    n = len(grid.R)
    batch = max(1, _BATCH_NUMBERS // (n * n))
    start = grid.kinetic + np.diag(problem.potential(grid.R))
    centrifugal = 1 / (2 * problem.reduced_mass * grid.R**2)
    diagonal = np.arange(n)
    found: list[Block] = []
    for first in range(0, len(wanted), batch):
        group = np.array(wanted[first : first + batch])
        H = np.repeat(start[None], len(group), axis=0)
        H[:, diagonal, diagonal] += (group * (group + 1))[:, None] * centrifugal
        energies, vectors = eigen(H)
        for N, E, c in zip(group, energies, vectors, strict=True):
            bound = E < 0
            if not bound.any():
                return found  # the number of levels never rises with N
            found.append((int(N), E[bound], c[:, bound] ** 2))
    return found


def _grid_error(problem: RadialProblem, n: int, blocks: list[Block]) -> float:
    """Largest change of the energies [hartree] of some N, lowest and highest included, on a denser grid."""
    if not blocks:
        return 0.0
    finer = mapped_grid(problem, int(REFINEMENT * n))
    error = 0.0
    energies = {N: E for N, E, _ in blocks}
    for N in sorted({blocks[round(i)][0] for i in np.linspace(0, len(blocks) - 1, _SAMPLES)}):
        again = next(iter(_diagonalise(problem, finer, [N])), (N, np.zeros(0), None))[1]
        common = min(len(again), len(energies[N]))
        error = max(error, float(np.max(np.abs(again[:common] - energies[N][:common]), initial=0.0)))
        # A level that is there on one grid only lies as close to the limit as the other levels are uncertain.
        extra = np.concatenate([again[common:], energies[N][common:]])
        error = max(error, float(np.max(np.abs(extra), initial=0.0)))
    return error


def _collect(
    blocks: list[Block],
    problem: RadialProblem,
    deformed: Mapping[str, tuple[Potential, float]] | None,
    error: float,
    n: int,
    grid: MappedGrid | None = None,
) -> Levels:
    """Expectation values and turning points of all levels."""
    N = np.array([N for N, E, _ in blocks for _ in E], dtype=np.int64)
    v = np.array([v for _, E, _ in blocks for v in range(len(E))], dtype=np.int64)
    energy = np.concatenate([E for _, E, _ in blocks] or [np.zeros(0)])
    if grid is None or not blocks:
        none = np.zeros(0)
        return Levels(v, N, energy, none, none, none, none, None, error, n)
    density = np.concatenate([weights for *_, weights in blocks], axis=1)
    rotation = (1 / (2 * problem.reduced_mass * grid.R**2)) @ density
    model = None
    if deformed:
        V = problem.potential(grid.R)
        changes = np.stack([changed(grid.R) - V for changed, _ in deformed.values()])
        model = np.sqrt(np.sum((changes @ density) ** 2, axis=0))
    inner, outer = turning_points(problem, N.astype(float), energy)
    return Levels(v, N, energy, rotation, inner, outer, _extent(grid, density), model, error, n)


def _extent(grid: MappedGrid, density: Array) -> Array:
    """Radius [bohr] that holds HELD of each level's probability; the sum is interpolated between the points."""
    sums = np.cumsum(density, axis=0)
    k = np.argmax(sums >= HELD, axis=0)
    columns = np.arange(density.shape[1])
    before = np.where(k > 0, sums[k - 1, columns], 0.0)
    part = (HELD - before) / np.maximum(sums[k, columns] - before, 1e-300)
    # Half a step outwards: a point stands for the interval around it.
    log_R = np.log(np.append(grid.R, R_OUT))
    edges = 0.5 * (log_R[:-1] + log_R[1:])
    low = np.where(k > 0, edges[k - 1], log_R[0])
    return np.exp(low + part * (edges[k] - low))


def turning_points(problem: RadialProblem, N: Array, energy: Array) -> tuple[Array, Array]:
    """Innermost and outermost classical turning point of levels below their barrier.

    Parameters
    ----------
    problem : RadialProblem
    N, energy : ndarray, shape (n,)
        Rotation [1] and energy [hartree].

    Returns
    -------
    inner, outer : ndarray, shape (n,)
        [bohr]; for E > 0 ``outer`` is the inner side of the barrier.
    """
    R = np.geomspace(problem.r_in, R_OUT, _SCAN)
    R = np.sort(np.append(R, np.linspace(problem.r_in, min(4 * problem.position, R_FAR), _SCAN)))
    rotations, which = np.unique(N, return_inverse=True)
    inner, outer = np.empty_like(energy), np.empty_like(energy)
    for i, rotation in enumerate(rotations):
        here = np.flatnonzero(which == i)
        V = problem.effective(R, float(rotation))
        bottom, top = well_and_barrier(R, V)
        for j in here:
            # Below the limit everything outside the barriers is forbidden; above it only the inside counts.
            allowed = np.flatnonzero(V[: top + 1 if energy[j] > 0 else len(V)] < energy[j])
            first, last = (allowed[0], allowed[-1]) if allowed.size else (bottom, bottom)
            inner[j], outer[j] = max(first, 1), min(last, len(R) - 2)
    left, right = inner.astype(int), outer.astype(int)

    def excess(r: Array) -> Array:
        return problem.effective(r, N) - energy

    return _bisect(excess, R[left - 1], R[left]), _bisect(excess, R[right + 1], R[right])


def well_and_barrier(R: Array, V: Array) -> tuple[int, int]:
    """Index of the deepest point of V(R) inside its outermost barrier, and of the highest point outside that.

    Parameters
    ----------
    R, V : ndarray, shape (n,)
        [bohr], [hartree]; V falls from a wall at the first point.

    Returns
    -------
    tuple of int
        Both the last index for a curve that only falls; the second is the last index for a tail that rises for ever.
    """
    falls = V[:-1] > V[1:]
    if falls.all():
        return len(R) - 1, len(R) - 1
    # The last rise, seen from the wall, ends on the top of the outermost barrier.
    outermost = int(np.flatnonzero(~falls)[-1]) + 1
    bottom = int(np.argmin(V[: outermost + 1]))
    return bottom, bottom + int(np.argmax(V[bottom:]))


def _bisect(excess: Potential, forbidden: Array, allowed: Array) -> Array:
    """Where ``excess`` changes sign between a point with excess > 0 and one with excess <= 0 [bohr]."""
    for _ in range(_BISECTIONS):
        middle = 0.5 * (forbidden + allowed)
        outside = excess(middle) > 0
        forbidden, allowed = np.where(outside, middle, forbidden), np.where(outside, allowed, middle)
    return 0.5 * (forbidden + allowed)
