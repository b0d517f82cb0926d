"""Regular and outgoing solutions of many (N, E) at once on one logarithmic grid: resonance energies, widths, delays.

Everything is in the variables of `numerov`. The outgoing wave starts where WKB of second order holds (local wave
number K with ``K = sqrt(k2) - [k2''/(8 k2^{3/2}) - 5 k2'^2/(32 k2^{5/2})]``, amplitude K^{-1/2}) and runs inwards.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares

from pertcalc.molecules.levels import Ints
from pertcalc.molecules.numerov import LogGrid, log_grid
from pertcalc.molecules.radial import Array, RadialProblem

Complex = NDArray[np.complex128]

# The outgoing wave starts at k R = START[0] (N + 1/2) + START[1]: well outside the outer turning point.
START = (1.5, 15.0)
_ITERATIONS = 12
# Newton steps end at this part of the barrier's height.
_PRECISION = 1e-11
# A step never changes the energy by more than this part of the barrier's height.
_LONGEST = 0.1
# Energies below this part of the barrier's height are not looked at.
_LEAST = 1e-7
# Columns integrated in one sweep: bounds the memory.
_COLUMNS = 1500
# Energies of the delay in units of the width, around the level.
_OFFSETS = np.linspace(-2.5, 2.5, 21)
_LOWEST = 0.05


@dataclass(frozen=True, slots=True)
class Resonances:
    """Arrays (n,): ``energy``, ``width`` [hartree], ``nodes`` inside the barrier, ``converged``, ``error`` [hartree].

    ``error`` is the change of the energy by a step half as long (fifteen sixteenths of the whole numerical error).
    """

    energy: Array
    width: Array
    nodes: Ints
    converged: NDArray[np.bool_]
    error: Array


@dataclass(frozen=True, slots=True)
class Match:
    """Regular and outgoing solution at the matching point, one column per (N, E); F = (1 - h^2 Q/12) w.

    ``mismatch`` complex, zero when the two fit; ``norm`` Int |w|^2 R^2 dx up to the outer turning point over |F_m|^2
    [bohr^2]; ``flux`` Im(w* dw/dx) of the outgoing wave over |F_m|^2 [1]; ``phase`` of both at m, free
    motion being zero [rad, modulo 2 pi]; ``nodes`` of the solution inside the barrier.
    """

    mismatch: Complex
    norm: Array
    flux: Array
    phase: Array
    nodes: Ints


def solve(problem: RadialProblem, N: Ints, guess: Array, r_top: Array, height: Array, r_well: Array) -> Resonances:
    """Newton's method on the energies of all quasi-bound levels together.

    Parameters
    ----------
    problem : RadialProblem
    N : ndarray of int, shape (n,)
        Rotation [1].
    guess : ndarray, shape (n,)
        Energies to start from [hartree].
    r_top, height : ndarray, shape (n,)
        Barrier top [bohr] and its energy [hartree].
    r_well : ndarray, shape (n,)
        Bottom of the well [bohr].

    Returns
    -------
    Resonances
        Width by outgoing flux over the probability inside the outer turning point.
    """
    energy = guess.copy()
    width, done = np.zeros(len(N)), np.zeros(len(N), dtype=bool)
    nodes = np.zeros(len(N), dtype=np.int64)
    for _ in range(_ITERATIONS):
        active = np.flatnonzero(~done)
        if not active.size:
            break
        at = match(problem, N[active], energy[active], r_top[active], r_well[active])
        # d(mismatch)/dE = h^2 2 mu norm/h by the Wronskian of neighbouring energies.
        slope = 2 * problem.reduced_mass * at.norm
        step = at.mismatch.real / slope
        limit = _LONGEST * height[active]
        step = np.clip(step, -limit, limit)
        width[active] = at.flux / (problem.reduced_mass * at.norm)
        nodes[active] = at.nodes
        done[active] = np.abs(step) < np.maximum(_PRECISION * height[active], 1e-3 * width[active] * 1e-3)
        # A level above the top or below the limit is none; let the search run out there.
        energy[active] = np.clip(energy[active] + step, _LEAST * height[active], 1.2 * height[active])
    at = match(problem, N, energy, r_top, r_well, finer=2.0)
    error = np.abs(at.mismatch.real / (2 * problem.reduced_mass * at.norm))
    return Resonances(energy, width, nodes, done, error)


def delays(
    problem: RadialProblem, N: Ints, energy: Array, width: Array, r_top: Array, r_well: Array
) -> tuple[Array, Array]:
    """Energies and full widths from a Lorentzian with smooth background fitted to d(phase)/dE.

    Parameters
    ----------
    problem : RadialProblem
    N, energy, width : ndarray, shape (n,)
        Level [1], [hartree] and its width to first order [hartree].
    r_top, r_well : ndarray, shape (n,)
        Barrier top and bottom of the well [bohr].

    Returns
    -------
    energy, width : ndarray, shape (n,)
        [hartree]; nan where the fit fails: the delay has no peak of its own.
    """
    if not len(N):
        return np.zeros(0), np.zeros(0)
    low = np.minimum(2.5, (1 - _LOWEST) * energy / width)
    E = energy[:, None] + width[:, None] * np.where(_OFFSETS < 0, _OFFSETS * low[:, None] / 2.5, _OFFSETS)
    size = _OFFSETS.size
    at = match(problem, np.repeat(N, size), E.ravel(), np.repeat(r_top, size), np.repeat(r_well, size))
    # delta = -arg of the Jost function, which is mismatch times F_m of the outgoing wave.
    delta = -np.unwrap((np.angle(at.mismatch) + at.phase).reshape(E.shape), axis=1)
    fits = np.array([_fit(*row) for row in zip(E, delta, energy, width, strict=True)])
    return fits[:, 0], fits[:, 1]


def _fit(E: Array, delta: Array, energy: float, width: float) -> tuple[float, float]:
    """Energy and width of the best Breit-Wigner phase plus a linear background."""
    x = (E - energy) / width

    def model(p: Array) -> Array:
        return np.arctan2(x - p[0], 0.5 * abs(p[1])) + p[2] + p[3] * x - delta

    start = np.array([0.0, 1.0, delta[len(x) // 2], 0.0])
    best = least_squares(model, start, method="lm")
    shift, ratio = best.x[0], abs(best.x[1])
    if not best.success or abs(shift) > 2 or not 0.1 < ratio < 10:
        return np.nan, np.nan
    return float(energy + shift * width), float(ratio * width)


def match(problem: RadialProblem, N: Ints, energy: Array, r_top: Array, r_well: Array, finer: float = 1.0) -> Match:
    """Integrate the regular solution outwards and the outgoing wave inwards to a point near the barrier.

    Parameters
    ----------
    problem : RadialProblem
    N, energy, r_top, r_well : ndarray, shape (n,)
        [1], [hartree], [bohr], [bohr].
    finer : float
        Factor on the number of steps [1].

    Returns
    -------
    Match
    """
    parts = []
    for i in range(0, len(N), _COLUMNS):
        here = slice(i, i + _COLUMNS)
        parts.append(_match(problem, N[here], energy[here], r_top[here], r_well[here], finer))
    return Match(*(np.concatenate([getattr(p, name) for p in parts]) for name in Match.__dataclass_fields__))


def _match(problem: RadialProblem, N: Ints, energy: Array, r_top: Array, r_well: Array, finer: float) -> Match:
    k = np.sqrt(2 * problem.reduced_mass * energy)
    start = np.maximum((START[0] * (N + 0.5) + START[1]) / k, 1.5 * r_top)
    grid = log_grid(problem, 1.02 * float(start.max()), finer)
    last = np.searchsorted(grid.R, start)
    meet, end = _turning_indices(problem, grid, N, energy, r_top, r_well, start)
    half = N.astype(np.float64) + 0.5
    centrifugal, k2 = half * half, k * k
    ratio, inner_norm, nodes = _outwards(grid, centrifugal, k2, meet)
    back, outer_norm, log_amplitude, phase, outer_nodes, wave = _inwards(grid, centrifugal, k2, meet, end, last)
    U, T = _coefficients(grid, meet, centrifugal, k2)
    h = grid.step
    mismatch = (U - 1 / ratio - back) / h
    at_meet = grid.R[meet] ** 2 * h / T**2
    norm = inner_norm + outer_norm + at_meet
    flux = wave * np.exp(2 * np.minimum(log_amplitude, 300.0))
    # The regular solution is real: its sign at m is that of (-1)^nodes.
    phase = phase + _free_phase(k * grid.R[last], half) + np.pi * nodes
    return Match(mismatch, norm, flux, phase, nodes + outer_nodes)


def _free_phase(kR: Array, l: Array) -> Array:
    """Phase of the free outgoing wave of angular momentum l = N + 1/2 at kR > l [rad], Debye's two leading terms."""
    root = np.sqrt(kR * kR - l * l)
    return root - l * np.arccos(l / kR) - np.pi / 4 - (1 / 8 + 5 * l * l / (24 * root * root)) / root


def _coefficients(grid: LogGrid, n: Ints | int, centrifugal: Array, k2: Array) -> tuple[Array, Array]:
    """U and T = 1 - h^2 Q/12 at grid points."""
    T = 1 - grid.step**2 / 12 * (grid.strength[n] + centrifugal - k2 * grid.R[n] ** 2)
    return 12 / T - 10, T


def _turning_indices(
    problem: RadialProblem, grid: LogGrid, N: Ints, energy: Array, r_top: Array, r_well: Array, start: Array
) -> tuple[Ints, Ints]:
    """Grid indices of the barrier's inner turning point, near which a quasi-bound level has no node, and its outer."""
    inner, outer, top = r_well.copy(), start.copy(), r_top.copy()
    high = r_top.copy()
    for _ in range(30):
        left, right = 0.5 * (inner + high), 0.5 * (outer + top)
        inside = problem.effective(left, N.astype(float)) < energy
        outside = problem.effective(right, N.astype(float)) < energy
        inner, high = np.where(inside, left, inner), np.where(inside, high, left)
        outer, top = np.where(outside, right, outer), np.where(outside, top, right)
    meet = np.clip(np.searchsorted(grid.R, inner), 3, len(grid.R) - 3)
    return meet, np.searchsorted(grid.R, outer)


def _outwards(grid: LogGrid, centrifugal: Array, k2: Array, meet: Ints) -> tuple[Array, Array, Ints]:
    """F_m/F_{m-1} of the regular solution, its norm inside m over F_m^2, its nodes."""
    ratio = _coefficients(grid, 0, centrifugal, k2)[0]
    norm, nodes = np.zeros(len(k2)), np.zeros(len(k2), dtype=np.int64)
    for n in range(1, int(meet.max())):
        active = n < meet
        U, T = _coefficients(grid, n, centrifugal, k2)
        inside = grid.R[n] ** 2 * grid.step / (T * T)
        new = U - 1 / ratio
        new = np.where(np.abs(new) < 1e-200, 1e-200, new)
        # The norm is carried in units of F at the current point.
        norm = np.where(active, (norm + inside) / (new * new), norm)
        nodes += active & (new < 0)
        ratio = np.where(active, new, ratio)
    return ratio, norm, nodes


def _inwards(
    grid: LogGrid, centrifugal: Array, k2: Array, meet: Ints, end: Ints, last: Ints
) -> tuple[Complex, Array, Array, Array, Ints, Array]:
    """F_{m+1}/F_m of the outgoing wave, norm from m to the end of the barrier, ln|F_start/F_m|, phase, nodes, flux."""
    columns = len(k2)
    start_ratio, flux = _outgoing(grid, centrifugal, k2, last)
    ratio: Complex = np.ones(columns, dtype=np.complex128)  # F_n/F_{n+1}
    norm, log_amplitude, phase = np.zeros(columns), np.zeros(columns), np.zeros(columns)
    nodes = np.zeros(columns, dtype=np.int64)
    for n in range(int(last.max()), int(meet.min()), -1):
        starting = n == last
        active = (n < last) & (n > meet)
        if not (starting | active).any():
            continue
        U, T = _coefficients(grid, n, centrifugal, k2)
        # F_{n-1}/F_n = U_n - F_{n+1}/F_n
        new = np.where(starting & (n > meet), start_ratio, U - 1 / ratio)
        moving = active | (starting & (n > meet))
        size = np.where(moving, np.abs(new), 1.0)
        inside = np.where(n <= end, grid.R[n] ** 2 * grid.step / (T * T), 0.0)
        norm = np.where(moving, (norm + inside) / (size * size), norm)
        log_amplitude -= np.log(size)
        phase += np.where(moving, np.angle(new), 0.0)
        nodes += active & (n < end) & (new.real < 0) & (np.abs(new.imag) < 1e-3 * size)
        ratio = np.where(moving, new, ratio)
    return 1 / ratio, norm, log_amplitude, phase, nodes, flux


def _outgoing(grid: LogGrid, centrifugal: Array, k2: Array, last: Ints) -> tuple[Complex, Array]:
    """F_{n-1}/F_n of the outgoing WKB wave at n = last, and Im(w* dw/dx)/|F_n|^2 there."""
    h = grid.step

    left, centre, right = (grid.strength[last + i] for i in (-1, 0, 1))
    slope, bend = (right - left) / (2 * h), (right - 2 * centre + left) / (h * h)

    def local(offset: float) -> Array:
        """K at x_last + offset h."""
        dx = offset * h
        kinetic = k2 * (grid.R[last] * np.exp(dx)) ** 2
        q = kinetic - centre - dx * slope - 0.5 * dx * dx * bend - centrifugal
        first, second = 2 * kinetic - slope - dx * bend, 4 * kinetic - bend
        return np.sqrt(q) - second / (8 * q**1.5) + 5 * first * first / (32 * q**2.5)

    here, before = local(0.0), local(-1.0)
    middle = local(-0.5)
    between = h * (before + 4 * middle + here) / 6
    T = np.stack([_coefficients(grid, last - i, centrifugal, k2)[1] for i in (0, 1)])
    w = np.exp(-1j * between) * np.sqrt(here / before)
    return T[1] / T[0] * w, here / T[0] ** 2
