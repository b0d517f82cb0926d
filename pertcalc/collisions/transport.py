"""Elastic and transport cross sections of the ground curve, from the phases of quantum close coupling.

    Q(0) = (4 pi/k^2) sum (2N+1) sin^2 delta_N                       (elastic)
    Q(1) = (4 pi/k^2) sum (N+1) sin^2(delta_{N+1} - delta_N)          (momentum transfer; diffusion)

Source: Hirschfelder, Curtiss and Bird, Molecular Theory of Gases and Liquids (1954), quantum transport cross sections.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.close_coupling import ground_matrices
from pertcalc.collisions.log_derivative import POINTS_PER_RADIAN
from pertcalc.collisions.pair import CollisionPair

Array = NDArray[np.float64]

# Partial waves go on until the straight-path phase of the tail of X has fallen to this [radian]: what is left of the
# elastic sum is then below 1e-3 of it, of momentum transfer far less.
LAST_PHASE = 0.02
_R_LEAST, _R_MOST = 12.0, 140.0


@dataclass(frozen=True, slots=True)
class TransportCrossSections:
    """`elastic` and `momentum_transfer` [bohr^2] at kinetic energies `energy` [hartree], each shape (n,)."""

    energy: Array
    elastic: Array
    momentum_transfer: Array


def _last_impact(pair: CollisionPair, speed: float) -> float:
    """Impact parameter [bohr] at which the phase of X along a straight path is LAST_PHASE."""
    R = np.geomspace(_R_LEAST, _R_MOST, 400)
    line, _, pi = pair.table(R)
    # delta = (1/2) Int V dt, with the path length of a C6 tail: (3 pi/16) |V| R/v.
    phase = 3 * np.pi / 16 * np.abs(pi - line) * R / speed
    strong = np.flatnonzero(phase > LAST_PHASE)
    return float(R[strong[-1]]) if strong.size else _R_LEAST


def transport_cross_sections(
    pair: CollisionPair, energy: Array, points: float = POINTS_PER_RADIAN
) -> TransportCrossSections:
    """Elastic and momentum-transfer cross sections of the ground curve X.

    Parameters
    ----------
    pair : CollisionPair
    energy : ndarray, shape (n,)
        Kinetic energies [hartree].
    points : float
        Points per radian of the shortest local wave [1].

    Returns
    -------
    TransportCrossSections
        Converged to about 1e-3.
    """
    elastic, momentum = [], []
    for E in np.atleast_1d(energy):
        speed = float(np.sqrt(2 * E / pair.reduced_mass))
        k = pair.reduced_mass * speed
        last = _last_impact(pair, speed)
        S, _ = ground_matrices(pair, float(E), int(np.ceil(k * last)) + 3, 1.1 * last, float(E), points)
        N = np.arange(S.size)
        # |1 - S|^2 = 4 sin^2 delta and |S_{N+1} - S_N|^2 = 4 sin^2(delta_{N+1} - delta_N).
        elastic.append(np.pi / k**2 * np.sum((2 * N + 1) * np.abs(1 - S) ** 2))
        momentum.append(np.pi / k**2 * np.sum((N[:-1] + 1) * np.abs(np.diff(S)) ** 2))
    return TransportCrossSections(np.atleast_1d(energy), np.array(elastic), np.array(momentum))
