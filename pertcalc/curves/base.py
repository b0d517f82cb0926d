"""What every pair potential is: the protocol, its numerical facts, and the C_n tail shared by two forms.

Every curve is a frozen dataclass that is called with R [bohr] and answers V [hartree]; ``derivative`` answers
dV/dR [hartree/bohr] and ``with_derivative`` both for the price of one. notes/curves.md explains the joins.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol, runtime_checkable

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq

Array = NDArray[np.float64]

# Nothing is evaluated closer than this [bohr]; a smaller R gets the value here, so that no input gives inf or nan.
R_FLOOR = 0.1
# Exponents are cut here: exp(200) = 7e86 is beyond any energy and its square is still a finite float64.
EXPONENT_CAP = 200.0
# A wall is called supported up to here at most [hartree] (100,000 cm^-1): no thermal collision needs more.
WALL_CAP = 0.455


@dataclass(frozen=True, slots=True)
class Well:
    """Depth [hartree, > 0] and position [bohr] of the minimum of a curve."""

    depth: float
    position: float


@runtime_checkable
class Curve(Protocol):
    """What the rest of the package needs of a pair potential; all in atomic units, zero at infinite separation."""

    @property
    def C6(self) -> float: ...

    @property
    def C8(self) -> float: ...

    @property
    def C10(self) -> float: ...

    @property
    def r_min(self) -> float: ...

    @property
    def wall_top(self) -> float: ...

    def __call__(self, R: ArrayLike) -> Array: ...

    def derivative(self, R: ArrayLike) -> Array: ...

    def with_derivative(self, R: ArrayLike) -> tuple[Array, Array]: ...

    def well(self) -> Well | None: ...


@dataclass(frozen=True, slots=True)
class Shape:
    """Numerical facts about a curve, found once when it is made."""

    well: Well | None
    r_min: float
    wall_top: float


def floored(R: ArrayLike) -> Array:
    """R as float64, never below R_FLOOR [bohr], same shape."""
    return np.maximum(np.asarray(R, dtype=np.float64), R_FLOOR)


def bounded_exp(exponent: ArrayLike) -> Array:
    """exp that stays finite: the exponent is cut at EXPONENT_CAP, same shape."""
    return np.exp(np.minimum(exponent, EXPONENT_CAP))


def survey(curve: Curve, r_far: float = 200.0) -> Shape:
    """Find the deepest minimum of a curve and how high its wall rises inside it.

    Parameters
    ----------
    curve : Curve
        Any potential [hartree] of R [bohr].
    r_far : float
        Outermost R looked at [bohr].

    Returns
    -------
    Shape
        ``well`` is None where the curve is nowhere negative; ``wall_top`` [hartree] is the highest V inside the well,
        at most WALL_CAP; ``r_min`` [bohr] is where the wall, seen from the well, first reaches it.
    """
    R = np.geomspace(R_FLOOR, r_far, 1500)
    V, slope = curve.with_derivative(R)
    k = int(np.argmin(V))
    well = None
    if V[k] < 0 and 0 < k < len(R) - 1 and slope[k - 1] < 0 < slope[k + 1]:
        position = float(brentq(lambda r: float(curve.derivative(r)), R[k - 1], R[k + 1], xtol=1e-12))
        well = Well(-float(curve(position)), position)
    inside = V[: k + 1]
    wall_top = min(float(inside.max()), WALL_CAP)
    at = int(np.flatnonzero(inside >= wall_top)[-1])
    return Shape(well, float(R[at]), wall_top)


class SurveyedCurve:
    """Shared part of the forms: ``__call__`` and ``derivative`` from ``with_derivative``, facts from ``survey``."""

    __slots__ = ()
    _shape: Shape

    def with_derivative(self, R: ArrayLike) -> tuple[Array, Array]:
        """V(R) [hartree] and dV/dR [hartree/bohr], shape of R [bohr]; every form has its own."""
        raise NotImplementedError

    def __call__(self, R: ArrayLike) -> Array:
        """V(R) [hartree], shape of R [bohr]."""
        return self.with_derivative(R)[0]

    def derivative(self, R: ArrayLike) -> Array:
        """dV/dR [hartree/bohr], shape of R [bohr]."""
        return self.with_derivative(R)[1]

    @property
    def r_min(self) -> float:
        """Below this R [bohr] the form is only a continuation: finite and smooth, not to be trusted."""
        return self._shape.r_min

    @property
    def wall_top(self) -> float:
        """Energy [hartree] up to which the repulsive wall is there."""
        return self._shape.wall_top

    def well(self) -> Well | None:
        """The deepest minimum, or None for a curve that is nowhere attractive."""
        return self._shape.well


@dataclass(frozen=True, slots=True)
class Tail:
    """Long-range part ``V = -sum_{n=6,8,10,12,14} C_n/R^n``; C12 and C14 are effective, fitted at a join.

    Fields: C_n [hartree bohr^n]. The limit of -R^6 V for R -> infinity is exactly C6.
    """

    C6: float
    C8: float
    C10: float
    C12: float = 0.0
    C14: float = 0.0

    def with_derivative(self, R: ArrayLike) -> tuple[Array, Array]:
        """V [hartree] and dV/dR [hartree/bohr], shape of R [bohr]."""
        r = floored(R)
        u = 1.0 / (r * r)
        u3 = u * u * u
        V = self.C6 + u * (self.C8 + u * (self.C10 + u * (self.C12 + u * self.C14)))
        slope = 6.0 * self.C6 + u * (
            8.0 * self.C8 + u * (10.0 * self.C10 + u * (12.0 * self.C12 + u * (14.0 * self.C14)))
        )
        return -u3 * V, u3 * slope / r

    @classmethod
    def through(cls, R: float, V: float, C6: float, C8: float, C10: float) -> Tail:
        """The tail with the given C6, C8, C10 that passes through V at R by an effective C12 alone.

        Parameters
        ----------
        R, V : float
            Join [bohr] and value there [hartree].
        C6, C8, C10 : float
            [hartree bohr^n], kept as they are.

        Returns
        -------
        Tail
        """
        missing = V - float(cls(C6, C8, C10).with_derivative(R)[0])
        return cls(C6, C8, C10, -missing * R**12)

    @classmethod
    def matched(cls, R: float, V: float, slope: float, C6: float, C8: float, C10: float) -> Tail:
        """The tail with the given C6, C8, C10 whose C12 and C14 give value V and slope dV/dR at R.

        Parameters
        ----------
        R, V, slope : float
            Join [bohr], value [hartree], derivative [hartree/bohr] there.
        C6, C8, C10 : float
            [hartree bohr^n], kept as they are.

        Returns
        -------
        Tail
            C1 with the inner piece; the two fitted terms fall off four and more powers faster than C8.
        """
        pure, pure_slope = cls(C6, C8, C10).with_derivative(R)
        missing, missing_slope = V - float(pure), slope - float(pure_slope)
        # missing = -(p + q), missing_slope = (12 p + 14 q)/R with p = C12/R^12, q = C14/R^14.
        q = (R * missing_slope + 12.0 * missing) / 2.0
        return cls(C6, C8, C10, (-missing - q) * R**12, q * R**14)
