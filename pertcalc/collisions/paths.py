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

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Potential = Callable[[Array], Array]

# Closest approach ever looked at and end of the outgoing half [bohr].
R_SMALLEST = 0.5
R_END = 150.0
_SEARCH_POINTS = 3000
_BISECTIONS = 48


def straight(R: Array) -> Array:
    """The potential of a straight path: zero, shape of R [hartree]."""
    return np.zeros_like(R)


@dataclass(frozen=True, slots=True)
class PathFamily:
    """All paths on one potential for one reduced mass; see the module for the coordinate s.

    Parameters
    ----------
    potential : callable
        U(R) [hartree] of an array R [bohr], zero at infinity.
    reduced_mass : float
        Reduced mass [electron masses].
    """

    potential: Potential
    reduced_mass: float

    def speed(self, energy: Array) -> Array:
        """Asymptotic relative speed, shape of energy [atomic units]."""
        return np.sqrt(2 * energy / self.reduced_mass)

    def _barrier(self, energy: float) -> tuple[Array, Array]:
        """Search grid R (rising) and the running minimum of B from outside, both shape (n,)."""
        R = np.geomspace(R_SMALLEST, R_END, _SEARCH_POINTS)
        B = R**2 * (1 - self.potential(R) / energy)
        return R, np.minimum.accumulate(B[::-1])[::-1]

    def orbiting_impact_parameters(self, energy: float) -> Array:
        """Impact parameters at which the turning point jumps, rising, shape (m,) [bohr]; m = 0 above all barriers."""
        R, lowest = self._barrier(energy)
        flat = np.diff(lowest) == 0
        starts = np.flatnonzero(flat & ~np.concatenate(([False], flat[:-1])))
        # A flat piece of the running minimum is a local minimum of B; where it is negative nothing gets that far in.
        return np.array([np.sqrt(lowest[i]) for i in starts if lowest[i] > 0])

    def turning_points(self, energy: float, b: Array) -> Array:
        """Outermost turning points for impact parameters b [bohr], shape of b [bohr].

        Bisection on the outermost bracket, to rounding; a path on the straight potential returns b itself.
        """
        R, lowest = self._barrier(energy)
        inside = np.clip(np.searchsorted(lowest, b**2, side="right"), 1, R.size - 1)
        low, high = R[inside - 1], R[inside]
        for _ in range(_BISECTIONS):
            middle = 0.5 * (low + high)
            outside = middle**2 * (1 - self.potential(middle) / energy) >= b**2
            high = np.where(outside, middle, high)
            low = np.where(outside, low, middle)
        return high

    def time_derivative(self, energy: Array, b: Array, R: Array, y: Array) -> Array:
        """dt/dy = y / (v sqrt(B(R) - b^2)); energy, b broadcast against R, y [atomic units of time per bohr]."""
        clear = R**2 * (1 - self.potential(R) / energy) - b**2
        # Rounding can leave B - b^2 a hair below zero at the turning point of a path that nearly orbits.
        return y / (self.speed(energy) * np.sqrt(np.maximum(clear, 1e-12 * R**2)))
