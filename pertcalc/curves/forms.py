"""Analytic pair potentials V(R) and dV/dR in atomic units: smooth, vectorised, finite for every R.

Every curve is a frozen dataclass that is called with R [bohr] and answers V [hartree]; ``derivative`` answers
dV/dR [hartree/bohr] and ``with_derivative`` both for the price of one. notes/curves.md explains the joins.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import brentq

from pertcalc.curves.base import Array, Curve, Shape, SurveyedCurve, Tail, Well, bounded_exp, floored, survey
from pertcalc.curves.tang_toennies import TangToennies, damping, solve_born_mayer
from pertcalc.errors import InputError

__all__ = [
    "Array",
    "Curve",
    "LennardJones",
    "MorseVanDerWaals",
    "Tail",
    "TangToennies",
    "VanDerWaals",
    "Well",
    "damping",
    "solve_born_mayer",
]

# Hardness of the van der Waals core in units of the depth at the core radius, see VanDerWaals.
CORE_HARDNESS = 100.0


@dataclass(frozen=True, slots=True)
class LennardJones(SurveyedCurve):
    """Lennard-Jones 12-6 potential ``V = De [(Rm/R)^12 - 2 (Rm/R)^6]``; C6 = 2 De Rm^6, C8 = C10 = 0.

    Fields: De [hartree] the well depth, R_min [bohr] the position of the minimum.
    """

    De: float
    R_min: float
    _shape: Shape = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "_shape", survey(self))

    @property
    def C6(self) -> float:
        """[hartree bohr^6]"""
        return 2.0 * self.De * self.R_min**6

    @property
    def C8(self) -> float:
        return 0.0

    @property
    def C10(self) -> float:
        return 0.0

    def with_derivative(self, R: ArrayLike) -> tuple[Array, Array]:
        """V [hartree] and dV/dR [hartree/bohr], shape of R [bohr]."""
        r = floored(R)
        ratio2 = np.square(self.R_min / r)
        x = ratio2 * ratio2 * ratio2
        return self.De * x * (x - 2.0), -12.0 * self.De * x * (x - 1.0) / r


@dataclass(frozen=True, slots=True)
class VanDerWaals(SurveyedCurve):
    """Pure ``V = -C6/R^6`` outside a hard core of radius R_core.

    Inside, with x = (R_core/R)^6 and D = C6/R_core^6, ``V = -D x + 100 D (x - 1)^2``. The added term has zero value and
    zero slope at R_core, so V is C1 there; it turns V positive within 1.7 % of R_core. Fields: C6 [hartree bohr^6],
    R_core [bohr].
    """

    C6: float
    R_core: float
    _shape: Shape = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "_shape", survey(self))

    @property
    def C8(self) -> float:
        return 0.0

    @property
    def C10(self) -> float:
        return 0.0

    def with_derivative(self, R: ArrayLike) -> tuple[Array, Array]:
        """V [hartree] and dV/dR [hartree/bohr], shape of R [bohr]."""
        r = floored(R)
        D = self.C6 / self.R_core**6
        ratio2 = np.square(self.R_core / r)
        x = ratio2 * ratio2 * ratio2
        overlap = np.maximum(x - 1.0, 0.0)
        V = D * (CORE_HARDNESS * overlap * overlap - x)
        return V, -6.0 * D * x * (2.0 * CORE_HARDNESS * overlap - 1.0) / r


@dataclass(frozen=True, slots=True)
class MorseVanDerWaals(SurveyedCurve):
    """Morse potential ``De [(1 - e^{-a(R - Re)})^2 - 1]`` inside R_join, a C_n tail outside, C1 at the join.

    Fields: De [hartree], Re [bohr], a [1/bohr], R_join [bohr], tail (its C12 and C14 close the join; both are zero
    when ``from_well`` was free to choose a and R_join).
    """

    De: float
    Re: float
    a: float
    R_join: float
    tail: Tail
    _shape: Shape = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "_shape", survey(self))

    @classmethod
    def from_well(
        cls,
        De: float,
        Re: float,
        C6: float,
        C8: float = 0.0,
        C10: float = 0.0,
        a: float | None = None,
        R_join: float | None = None,
    ) -> MorseVanDerWaals:
        """Make the curve from its well and its tail.

        Parameters
        ----------
        De, Re : float
            Depth [hartree], position [bohr].
        C6, C8, C10 : float
            [hartree bohr^n].
        a : float, optional
            Morse exponent [1/bohr]. None: a and R_join are those at which Morse meets the pure C_n tail in value and
            slope.
        R_join : float, optional
            [bohr], only with a; default Re + ln(8)/a, where Morse has come back to 23 % of its depth.

        Returns
        -------
        MorseVanDerWaals

        Raises
        ------
        InputError
            R_join not outside Re, or no smooth join exists.
        """
        pure = Tail(C6, C8, C10)
        if a is None:
            a, R_join = _solve_morse_join(De, Re, pure)
        elif R_join is None:
            R_join = Re + math.log(8.0) / a
        if not R_join > Re:
            raise InputError(f"R_join = {R_join:g} bohr must be larger than Re = {Re:g} bohr.")
        V, slope = _morse(R_join, De, Re, a)
        return cls(De, Re, a, R_join, Tail.matched(R_join, float(V), float(slope), C6, C8, C10))

    @property
    def C6(self) -> float:
        """[hartree bohr^6]"""
        return self.tail.C6

    @property
    def C8(self) -> float:
        return self.tail.C8

    @property
    def C10(self) -> float:
        return self.tail.C10

    def with_derivative(self, R: ArrayLike) -> tuple[Array, Array]:
        """V [hartree] and dV/dR [hartree/bohr], shape of R [bohr]."""
        r = floored(R)
        inner, inner_slope = _morse(r, self.De, self.Re, self.a)
        outer, outer_slope = self.tail.with_derivative(np.maximum(r, self.R_join))
        inside = r < self.R_join
        return np.where(inside, inner, outer), np.where(inside, inner_slope, outer_slope)


def _morse(R: ArrayLike, De: float, Re: float, a: float) -> tuple[Array, Array]:
    e = bounded_exp(-a * (np.asarray(R) - Re))
    return De * e * (e - 2.0), -2.0 * a * De * e * (e - 1.0)


def _solve_morse_join(De: float, Re: float, tail: Tail) -> tuple[float, float]:
    """(a, R_join) at which Morse meets the tail with equal value and slope; InputError when there is none."""

    def exponent(R: float) -> float:
        depth = -float(tail.with_derivative(R)[0]) / De
        return -math.log1p(-math.sqrt(max(1.0 - depth, 0.0))) / (R - Re)

    def mismatch(R: float) -> float:
        return float(_morse(R, De, Re, exponent(R))[1]) - float(tail.with_derivative(R)[1])

    def height(R: float) -> float:
        return float(tail.with_derivative(R)[0]) + De

    if height(Re) < 0:
        start = float(brentq(height, Re, 100.0 * Re)) * (1 + 1e-9)
        grid = start * np.geomspace(1.0, 4.0, 200)
        for low, high in zip(grid[:-1], grid[1:], strict=True):
            if mismatch(low) < 0 <= mismatch(high):
                R_join = float(brentq(mismatch, low, high, xtol=1e-13))
                return exponent(R_join), R_join
    raise InputError(
        f"De = {De:.6g} hartree at Re = {Re:.6g} bohr with C6 = {tail.C6:g} au: a Morse well cannot join this tail "
        "smoothly. Check the units, or give a_per_bohr."
    )
