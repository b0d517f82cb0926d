"""Renormalised Numerov integration on a logarithmic grid, for many rotations and energies at once.

With x = ln R and u = sqrt(R) w: ``w'' = Q w``, Q = R^2 2 mu (V - E) + (N + 1/2)^2. F = (1 - h^2 Q/12) w obeys F_{n+1} =
U_n F_n - F_{n-1}; the ratios R_n = F_{n+1}/F_n neither overflow in barriers nor lose the number of nodes. Source: B. R.
Johnson, J. Chem. Phys. 67, 4086 (1977), FROM MEMORY. It shares nothing with the spectral method but the potential.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pertcalc.molecules.radial import R_FAR, Array, RadialProblem

# Step times the largest wave number on the logarithmic scale: 2 pi/STEP points per wavelength.
STEP = 0.2
# A well of long wavelength still has walls: never a coarser step in ln R than this.
LARGEST_STEP = 0.01
# A ratio is kept this far from zero, where a node falls on a grid point.
_TINY = 1e-200


@dataclass(frozen=True, slots=True)
class LogGrid:
    """Points R = exp(x) [bohr] (n,), the step in x [1], and the table 2 mu R^2 V [1] (n,)."""

    R: Array
    step: float
    strength: Array


def log_grid(problem: RadialProblem, r_end: float, finer: float = 1.0) -> LogGrid:
    """A grid from inside the wall to r_end [bohr] with a step ``finer`` times smaller than STEP asks for [1]."""
    look = np.geomspace(problem.r_in, R_FAR, 4000)
    most = np.sqrt(float(np.max(2 * problem.reduced_mass * np.clip(-problem.potential(look), 0, None) * look**2)))
    step = min(STEP / max(most, 1.0), LARGEST_STEP) / finer
    n = int(np.ceil(np.log(r_end / problem.r_in) / step)) + 1
    R = problem.r_in * np.exp(step * np.arange(n))
    return LogGrid(R, step, 2 * problem.reduced_mass * R * R * problem.potential(R))


def zero_energy(problem: RadialProblem, rotations: Array, r_end: float, finer: float = 1.0) -> tuple[NDArray, float]:
    """Nodes of the regular solution at the limit, E = 0, for every N, and the scattering length of the first.

    Parameters
    ----------
    problem : RadialProblem
    rotations : ndarray, shape (n,)
        N [1].
    r_end : float
        Where the integration ends [bohr]; far outside the reach of the potential.
    finer : float
        Factor on the number of steps [1].

    Returns
    -------
    nodes : ndarray of int, shape (n,)
        Nodes [1] inside r_end; by the oscillation theorem the number of bound levels, but for a node further out.
    length : float
        Scattering length [bohr] of the first rotation (only N = 0 has a meaning), from u ~ R - a at r_end and the
        first-order effect of the -C6/R^6 tail beyond.
    """
    grid = log_grid(problem, r_end, finer)
    h2 = grid.step**2 / 12
    centrifugal = (rotations + 0.5) ** 2
    nodes = np.zeros(len(rotations), dtype=np.int64)
    U = 12 / (1 - h2 * (grid.strength[:, None] + centrifugal)) - 10
    ratio = U[0]
    for n in range(1, len(grid.R) - 1):
        ratio = U[n] - 1 / ratio
        negative = ratio < 0
        nodes += negative
        ratio = np.where(np.abs(ratio) < _TINY, _TINY, ratio)
    return nodes, _length(problem, grid, float(ratio[0]), float(centrifugal[0]))


def _length(problem: RadialProblem, grid: LogGrid, ratio: float, centrifugal: float) -> float:
    """Scattering length [bohr] from the last ratio F_{n+1}/F_n."""
    h2 = grid.step**2 / 12
    T = 1 - h2 * (grid.strength[-2:] + centrifugal)
    R1, R2 = grid.R[-2], grid.R[-1]
    u = ratio * T[0] / T[1] * np.sqrt(R2 / R1)  # u(R2)/u(R1)
    a = float((R2 - u * R1) / (1 - u))
    # Beyond R2 the tail still bends u: a -> a - 2 mu C6 Int (R - a)^2 / R^6 dR in first order.
    tail = 1 / (3 * R2**3) - a / (2 * R2**4) + a * a / (5 * R2**5)
    return a - 2 * problem.reduced_mass * problem.C6 * float(tail)
