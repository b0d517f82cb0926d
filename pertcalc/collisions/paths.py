"""Classical paths of one collision: turning points and a smooth coordinate along the outgoing half.

A path is fixed by the asymptotic kinetic energy E, the impact parameter b and one potential U(R). With

    B(R) = R^2 (1 - U(R)/E)                                  [bohr^2]

the radial speed is v sqrt(B - b^2)/R: the turning point R0 is the outermost root of B = b^2, and orbiting happens
where B has a minimum. The outgoing half is followed in s,

    R^2 = R0^2 + y^2,  y = L sinh(s),  dt/ds = L cosh(s) y / (v sqrt(B - b^2)),

which is regular at the turning point, uniform in time inside the collision and geometric outside; on a straight path
t = (L/v) sinh(s) exactly. See notes/semiclassical.md.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.pair import R_END, R_SMALLEST, CollisionPair

Array = NDArray[np.float64]

# Inside y < PATH_SCALE [bohr] equal steps of s are equal steps of time.
PATH_SCALE = 4.0
_SEARCH_POINTS = 2500
_BISECTIONS = 46


@dataclass(frozen=True, slots=True)
class PathFamily:
    """All classical paths of a pair on one of its potentials ("lower", "pi", "upper", "straight")."""

    pair: CollisionPair
    path: str

    def speed(self, energy: Array) -> Array:
        """Asymptotic relative speed of kinetic energies [hartree], their shape [atomic units]."""
        return np.sqrt(2 * energy / self.pair.reduced_mass)

    def _barrier(self, energy: float) -> tuple[Array, Array]:
        """Search grid R (rising) and the running minimum of B from outside, both shape (n,)."""
        R = np.geomspace(R_SMALLEST, R_END, _SEARCH_POINTS)
        B = R**2 * (1 - self.pair.path_function(self.path)(R) / energy)
        return R, np.minimum.accumulate(B[::-1])[::-1]

    def orbiting_impact_parameters(self, energy: float) -> list[float]:
        """Impact parameters [bohr] at which the turning point jumps, rising; empty above all barriers.

        Parameters
        ----------
        energy : float
            Kinetic energy [hartree].
        """
        if self.path == "straight":
            return []
        _, lowest = self._barrier(energy)
        flat = np.diff(lowest) == 0
        starts = np.flatnonzero(flat & ~np.concatenate(([False], flat[:-1])))
        # A flat piece of the running minimum is a local minimum of B; below zero nothing gets that far in.
        return [float(np.sqrt(lowest[i])) for i in starts if lowest[i] > 0]

    def turning_points(self, energy: float, b: Array) -> Array:
        """Outermost turning points [bohr] by bisection to rounding, shape of b.

        Parameters
        ----------
        energy : float
            Kinetic energy [hartree].
        b : ndarray, shape (n,)
            Impact parameters [bohr].
        """
        if self.path == "straight":
            return b.copy()
        potential = self.pair.path_function(self.path)
        R, lowest = self._barrier(energy)
        inside = np.clip(np.searchsorted(lowest, b**2, side="right"), 1, R.size - 1)
        low, high = R[inside - 1], R[inside]
        for _ in range(_BISECTIONS):
            middle = 0.5 * (low + high)
            outside = middle**2 * (1 - potential(middle) / energy) >= b**2
            high = np.where(outside, middle, high)
            low = np.where(outside, low, middle)
        return high

    def last_coordinate(self, turning_point: Array) -> Array:
        """The coordinate s at which a path reaches R_END, shape of turning_point [bohr]; dimensionless."""
        return np.arcsinh(np.sqrt(R_END**2 - turning_point**2) / PATH_SCALE)

    def rate_of_time(self, energy: Array, b: Array, R: Array, y: Array, potential: Array) -> Array:
        """dt/ds at points (R, y) where the driving potential is `potential`; all broadcast [atomic units of time].

        Parameters
        ----------
        energy : ndarray
            Kinetic energy [hartree].
        b, R, y : ndarray
            Impact parameter, distance and sqrt(R^2 - R0^2) [bohr].
        potential : ndarray
            [hartree].
        """
        clear = R**2 * (1 - potential / energy) - b**2
        # Rounding can leave B - b^2 a hair below zero at the turning point of a path that nearly orbits.
        slowness = y / np.sqrt(np.maximum(clear, 1e-12 * R**2))
        return slowness * np.sqrt(PATH_SCALE**2 + y**2) / self.speed(energy)
