"""Impact-parameter grids that follow the phase: nested trapezoids, equally spaced in what the integrand turns through.

S oscillates with b as fast as the phases of the adiabatic curves do, and without limit where paths orbit. A cheap scan
of those phases (no amplitudes) gives the density of points; a smooth change of variable makes the trapezoid rule
converge fast; every second point is a grid of its own, so that an error estimate costs nothing.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import PchipInterpolator

from pertcalc.collisions.paths import PATH_SCALE, PathFamily

Array = NDArray[np.float64]

# Points per 2 pi of phase, and per e-fold of b where nothing turns.
POINTS_PER_TURN = 3.0
POINTS_PER_FOLD = 12.0
# A phase that turns faster than this per partial wave (curves without a wall, orbiting) is random: more points would
# only average it better.
MOST_PER_WAVE = 200.0
# The scan and the grid reach this many Weisskopf radii; Born tails follow.
REACH = 3.0
_SCAN_POINTS = 420
_SCAN_NODES = 24


@dataclass(frozen=True, slots=True)
class ImpactGrid:
    """Points b (n,) and turning points (n,) [bohr]; weights (n,) [bohr^2] of 2 pi b db.

    `full` uses every point, `half` every second one, `quarter` every fourth (0 = unused). Born tails start at `last`.
    """

    b: Array
    turning_point: Array
    full: Array
    half: Array
    quarter: Array
    last: float


def _scan_points(family: PathFamily, energy: float, last: float) -> Array:
    """Rising impact parameters [bohr] of the scan: even, with geometric clusters on both sides of orbiting."""
    b = [np.linspace(0.0, last, _SCAN_POINTS)]
    for orbiting in family.orbiting_impact_parameters(energy):
        steps = np.geomspace(1e-4, 1.0, 25)
        b += [orbiting - steps, orbiting + steps]
    b_all = np.unique(np.concatenate(b))
    return b_all[(b_all >= 0) & (b_all <= last)]


def adiabatic_phases(family: PathFamily, energy: float, b: Array) -> Array:
    """Phases of the three adiabatic curves minus the ground curve along the paths.

    Parameters
    ----------
    family : PathFamily
    energy : float
        Kinetic energy [hartree].
    b : ndarray, shape (n,)
        Impact parameters [bohr].

    Returns
    -------
    phases : ndarray, shape (3, n)
        Int (V_k - V_X) dt over half a path [radian], k = lower and upper Omega = 1/2 curve, V_Pi; a few per cent.
    """
    turning_point = family.turning_points(energy, b)
    nodes, weights = np.polynomial.legendre.leggauss(_SCAN_NODES)
    last = family.last_coordinate(turning_point)
    s = 0.5 * (nodes[:, None] + 1) * last
    y = PATH_SCALE * np.sinh(s)
    R = np.sqrt(turning_point**2 + y**2)
    line, anisotropy, pi = family.pair.table(R)
    driving = family.pair.path_potential(family.path, pi, anisotropy)
    time = family.rate_of_time(np.full(b.shape, energy), b, R, y, driving) * 0.5 * last * weights[:, None]
    curves = [family.pair.path_potential(k, pi, anisotropy) - pi for k in ("lower", "upper")] + [0.0]
    return np.stack([np.sum((line + curve) * time, axis=0) for curve in curves])


def impact_grid(family: PathFamily, energy: float, radius: float, density: float = 1.0) -> ImpactGrid:
    """Grid for one energy.

    Parameters
    ----------
    family : PathFamily
    energy : float
        Kinetic energy [hartree].
    radius : float
        Weisskopf radius of the strongest dispersion difference [bohr].
    density : float
        Multiplies the number of points [1].

    Returns
    -------
    ImpactGrid
    """
    last = REACH * radius
    scan = _scan_points(family, energy, last)
    phases = adiabatic_phases(family, energy, scan)
    width = np.diff(scan)
    # Over the whole path: twice the half-path phase.
    turns = 2 * np.abs(np.diff(phases, axis=1)).max(axis=0) / (2 * np.pi)
    middle = 0.5 * (scan[1:] + scan[:-1])
    per_bohr = POINTS_PER_TURN * turns / width + POINTS_PER_FOLD / (middle + 0.3 * radius)
    momentum = float(family.pair.reduced_mass * family.speed(np.array(energy)))
    per_bohr = np.minimum(per_bohr, MOST_PER_WAVE * momentum + POINTS_PER_FOLD)
    for _ in range(3):
        per_bohr[1:-1] = 0.25 * per_bohr[:-2] + 0.5 * per_bohr[1:-1] + 0.25 * per_bohr[2:]
    cumulated = np.concatenate(([0.0], np.cumsum(density * per_bohr * width)))
    count = 4 * int(np.ceil(cumulated[-1] / 4))
    position = PchipInterpolator(cumulated / cumulated[-1], scan)
    j = np.arange(1, count + 1)
    b = np.minimum(position(j / count), last)
    ends = np.where(j == count, 0.5, 1.0)
    full = 2 * np.pi * b * position(j / count, 1) / count * ends
    half, quarter = (np.where(j % skip == 0, skip * full, 0.0) for skip in (2, 4))
    return ImpactGrid(b, family.turning_points(energy, b), full, half, quarter, last)
