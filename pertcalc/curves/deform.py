"""A curve changed within its stated uncertainty: depth, position, C_n or wall moved, everything else left as it is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq

from pertcalc.curves.base import Curve, bounded_exp

Array = NDArray[np.float64]

# Parameters that are moved one at a time for the model error of every answer.
PARAMETERS = ("De", "Re", "C6")
# Parameters of a curve file's [states.*.uncertainty] that can be moved.
MOVABLE = ("De", "Re", "C6", "C8", "C10", "wall")
# Inside REACH well positions a curve counts as well and wall, outside as tail; the passage is as smooth as R^-8.
REACH = 1.5
_NO_WELL = 8.0
# The slope of the wall is taken where the curve has risen to this [hartree]: thermal energy at 316 K.
WALL_ENERGY = 1e-3


@dataclass(frozen=True, slots=True)
class Deformed:
    """V(R) of a curve with its depth, position, C_n or wall changed by relative amounts.

    With g(R) = 1/(1 + (R/(1.5 Re))^8), one inside and zero in the tail, and W(R) the curve with its wall steepened,
    V'(R) = (1 + De g) W(R/(1 + Re g)) - (1 - g) sum_n dC_n C_n/R^n;
    W = V exp(wall beta (R0 - R)) inside the zero crossing R0, beta = -d ln V/dR where V = 1e-3 hartree.

    Parameters
    ----------
    base : Curve
        [hartree] of R [bohr].
    De, Re, C6, C8, C10, wall : float
        Relative changes [1]; that of the wall is of its logarithmic slope.
    """

    base: Curve
    De: float = 0.0
    Re: float = 0.0
    C6: float = 0.0
    C8: float = 0.0
    C10: float = 0.0
    wall: float = 0.0

    def __call__(self, R: ArrayLike) -> Array:
        """V'(R) [hartree], shape of R [bohr]."""
        r = np.asarray(R, dtype=float)
        well = self.base.well()
        inside = 1 / (1 + (r / (REACH * (well.position if well else _NO_WELL))) ** 8)
        terms = ((6, self.C6 * self.base.C6), (8, self.C8 * self.base.C8), (10, self.C10 * self.base.C10))
        tail = (1 - inside) * sum(extra / r**n for n, extra in terms if extra)
        return (1 + self.De * inside) * self._walled(r / (1 + self.Re * inside)) - tail

    def _walled(self, R: Array) -> Array:
        """The base curve with its wall steepened [hartree], shape of R [bohr]."""
        V = self.base(R)
        if not self.wall:
            return V
        crossing, slope = wall_of(self.base)
        return V * bounded_exp(self.wall * slope * np.maximum(crossing - R, 0.0))

    @property
    def new_c6(self) -> float:
        """C6 of the deformed tail [au]."""
        return self.dispersion[0]

    @property
    def dispersion(self) -> tuple[float, float, float]:
        """C6, C8, C10 of the deformed tail [au]."""
        base = self.base
        return (1 + self.C6) * base.C6, (1 + self.C8) * base.C8, (1 + self.C10) * base.C10


def wall_of(curve: Curve) -> tuple[float, float]:
    """Where a curve crosses zero, R0 [bohr], and the slope of its wall, beta = -d ln V/dR [1/bohr] at WALL_ENERGY.

    A curve without a well is pivoted where it has risen to WALL_ENERGY. Both are 0 where there is no such wall.
    """
    well = curve.well()
    R = np.geomspace(0.3, well.position if well else 60.0, 400)
    V = np.asarray(curve(R))

    def outermost(level: float) -> float:
        above = np.flatnonzero(V > level)
        if not above.size or above[-1] == R.size - 1:
            return 0.0
        i = above[-1]
        return float(brentq(lambda r: float(curve(r)) - level, R[i], R[i + 1]))

    risen = outermost(WALL_ENERGY)
    if not risen:
        return 0.0, 0.0
    return outermost(0.0) or risen, -float(curve.derivative(risen)) / WALL_ENERGY
