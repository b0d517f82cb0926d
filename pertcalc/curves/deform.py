"""A curve changed within its stated uncertainty: depth, position or C6 moved, everything else left as it is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pertcalc.curves.base import Curve

Array = NDArray[np.float64]

# Parameters of a curve file's [states.*.uncertainty] that can be moved.
PARAMETERS = ("De", "Re", "C6")
# Inside REACH well positions a curve counts as well and wall, outside as tail; the passage is as smooth as R^-8.
REACH = 1.5
_NO_WELL = 8.0


@dataclass(frozen=True, slots=True)
class Deformed:
    """V(R) of a curve with its depth, position or C6 changed by relative amounts.

    With g(R) = 1/(1 + (R/(1.5 Re))^8), one inside and zero in the tail:
    V'(R) = (1 + De g) V(R/(1 + Re g)) - C6 (1 - g) C6_0/R^6.

    Parameters
    ----------
    base : Curve
        [hartree] of R [bohr].
    De, Re, C6 : float
        Relative changes [1].
    """

    base: Curve
    De: float = 0.0
    Re: float = 0.0
    C6: float = 0.0

    def __call__(self, R: ArrayLike) -> Array:
        """V'(R) [hartree], shape of R [bohr]."""
        r = np.asarray(R, dtype=float)
        well = self.base.well()
        inside = 1 / (1 + (r / (REACH * (well.position if well else _NO_WELL))) ** 8)
        tail = self.C6 * (1 - inside) * self.base.C6 / r**6
        return (1 + self.De * inside) * self.base(r / (1 + self.Re * inside)) - tail

    @property
    def new_c6(self) -> float:
        """C6 of the deformed tail [au]."""
        return (1 + self.C6) * self.base.C6
