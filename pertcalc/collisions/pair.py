"""One colliding pair as the dynamics sees it: masses, splitting and fast, smooth tables of its three curves."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from pertcalc import species
from pertcalc.constants import AMU_AU, HARTREE_CM1
from pertcalc.curves.curveset import CurveSet

Array = NDArray[np.float64]
Potential = Callable[[Array], Array]

# The table of the curves: geometric in R [bohr], so dense that its error is below 1e-8 of the curves.
R_SMALLEST = 0.5
R_END = 150.0
_KNOTS = 1800
# Potentials are cut here [hartree], far above any thermal energy, to keep the spline of steep walls finite.
_CEILING = 2.0

PATHS = ("lower", "pi", "upper", "straight")


@dataclass(frozen=True)
class CollisionPair:
    """An alkali atom and a perturber with curves X (ground), A (2Pi), B (2Sigma+), without spin-orbit coupling.

    Parameters
    ----------
    reduced_mass : float
        [electron masses].
    splitting : float
        Fine-structure splitting of the P level [hartree]; 0 is the sudden limit.
    X, A, B : callable
        V(R) [hartree] of R [bohr], zero at infinity.
    isotropic : tuple of 3 floats
        C6, C8, C10 of (B + 2 A)/3 minus those of X [au]: the shift of distant collisions.
    anisotropy : float
        C6 of B minus C6 of A [au].
    """

    reduced_mass: float
    splitting: float
    X: Potential
    A: Potential
    B: Potential
    isotropic: tuple[float, float, float] = (0.0, 0.0, 0.0)
    anisotropy: float = 0.0

    @cached_property
    def _spline(self) -> CubicSpline:
        R = np.geomspace(R_SMALLEST, 2 * R_END, _KNOTS)
        X, A, B = (np.minimum(curve(R), _CEILING) for curve in (self.X, self.A, self.B))
        return CubicSpline(R, np.stack([A - X, B - A, A], axis=-1))

    def table(self, R: Array) -> tuple[Array, Array, Array]:
        """V_Pi - V_X, V_Sigma - V_Pi and V_Pi [hartree], each of the shape of R [bohr]."""
        values = self._spline(R)
        return values[..., 0], values[..., 1], values[..., 2]

    def last_strong_coupling(self, weak: float) -> float:
        """The outermost R [bohr] at which |V_Sigma - V_Pi| is still `weak` [1] of the splitting; 0 if nowhere."""
        R = np.geomspace(2.0, R_END, 600)
        strong = np.flatnonzero(np.abs(self.table(R)[1]) > weak * self.splitting)
        return float(R[strong[-1]]) if strong.size else 0.0

    def path_potential(self, path: str, pi: Array, anisotropy: Array) -> Array:
        """Potential that drives the path, from V_Pi and V_Sigma - V_Pi; zero at infinity, their shape [hartree].

        "lower" and "upper" are the two adiabatic Omega = 1/2 curves (limits P1/2 and P3/2), "pi" is V_Pi, "straight"
        is no potential at all.
        """
        if path == "straight":
            return np.zeros_like(pi)
        if path == "pi":
            return pi
        a = self.splitting / 1.5
        centre = pi + 0.5 * (anisotropy - 0.5 * a)
        half_gap = np.sqrt(0.25 * (anisotropy + 0.5 * a) ** 2 + 0.5 * a * a)
        return centre - half_gap + a if path == "lower" else centre + half_gap - 0.5 * a

    def path_function(self, path: str) -> Potential:
        """The same as a function of R [bohr] alone."""

        def potential(R: Array) -> Array:
            _, anisotropy, pi = self.table(R)
            return self.path_potential(path, pi, anisotropy)

        return potential


def pair_of(curves: CurveSet) -> CollisionPair:
    """What the dynamics needs of a curve set: reduced mass, splitting, curves, dispersion differences.

    Parameters
    ----------
    curves : CurveSet
        Masses [u] and splitting [cm^-1] of the set override the species table.

    Returns
    -------
    CollisionPair
    """
    atom = species.alkali(curves.alkali)
    mass = curves.mass_alkali_u or atom.mass_u.value
    perturber = curves.mass_perturber_u or species.noble_gas(curves.noble_gas).mass_u.value
    splitting = atom.fine_structure_cm1.value if curves.splitting_cm1 is None else curves.splitting_cm1
    X, A, B = curves.X, curves.A, curves.B
    return CollisionPair(
        reduced_mass=mass * perturber / (mass + perturber) * AMU_AU,
        splitting=splitting / HARTREE_CM1,
        X=X,
        A=A,
        B=B,
        isotropic=(
            (B.C6 + 2 * A.C6) / 3 - X.C6,
            (B.C8 + 2 * A.C8) / 3 - X.C8,
            (B.C10 + 2 * A.C10) / 3 - X.C10,
        ),
        anisotropy=B.C6 - A.C6,
    )
