"""The r^-6 law of levels near the limit: |E|^(1/3) falls linearly with v.

``d(-E)^(1/3)/dv = -K_6/3``, K_n = hbar sqrt(2 pi/mu) n Gamma(1 + 1/n)/[Gamma(1/2 + 1/n) C_n^(1/n)], from WKB with a
pure -C_n/R^n tail. Source: R. J. LeRoy and R. B. Bernstein, J. Chem. Phys. 52, 3869 (1970), FROM MEMORY.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import gamma, pi, sqrt

import numpy as np

from pertcalc.molecules.levels import Levels
from pertcalc.molecules.radial import Array, RadialProblem

# The law is WKB with half-integer phases, v_D = Phi/pi - 1/2; at the limit itself the r^-6 tail makes 5/8 of that 1/2
# (see `counting`), so the number of levels is floor(v_D - THRESHOLD_SHIFT) + 1.
THRESHOLD_SHIFT = 0.125


@dataclass(frozen=True, slots=True)
class NearDissociation:
    """The law beside the last levels of N = 0.

    ``slope`` K_6/3 [hartree^(1/3)]; ``observed`` -d(-E)^(1/3)/dv between neighbours of the last levels, lowest first
    [hartree^(1/3)], shape (n,); ``v_D`` the (non-integer) v at the limit, extrapolated with the law's slope from the
    last level bound by more than its numerical error [1]; ``count`` levels of N = 0 by that extrapolation.
    """

    slope: float
    observed: Array
    v_D: float
    count: int

    @property
    def ratios(self) -> Array:
        """Observed over law [1]; to 1 where the outer turning point is in the r^-6 tail and WKB holds."""
        return self.observed / self.slope


def law_slope(reduced_mass: float, C6: float) -> float:
    """K_6/3 [hartree^(1/3)] for a reduced mass [electron masses] and C6 [hartree bohr^6], > 0."""
    return 2 * sqrt(2 * pi / reduced_mass) * gamma(7 / 6) / (gamma(2 / 3) * C6 ** (1 / 6))


def near_dissociation(problem: RadialProblem, levels: Levels, last: int = 4) -> NearDissociation | None:
    """Set the last levels of N = 0 beside the law.

    Parameters
    ----------
    problem : RadialProblem
    levels : Levels
        Of the same problem.
    last : int
        How many of the last levels are looked at.

    Returns
    -------
    NearDissociation or None
        None without C6 or without a level.
    """
    energies = -levels.energy[levels.N == 0]
    if problem.C6 <= 0 or not energies.size:
        return None
    slope = law_slope(problem.reduced_mass, problem.C6)
    roots = np.cbrt(energies)
    observed = -np.diff(roots[-last:])
    sure = np.flatnonzero(energies > 10 * levels.numerical_error)
    v = int(sure[-1]) if sure.size else len(energies) - 1
    v_D = v + roots[v] / slope
    return NearDissociation(slope, observed, float(v_D), int(np.floor(v_D - THRESHOLD_SHIFT)) + 1)
