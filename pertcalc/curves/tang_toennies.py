"""The Tang-Toennies potential: damping functions without cancellation, and its parameters from a well."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import brentq

from pertcalc.curves.base import Array, Shape, SurveyedCurve, floored, survey
from pertcalc.errors import InputError

# The damping functions switch here from 1 - e^-x sum x^k/k! to their power series; at 2 the former has lost 5 digits
# of f_10 but the term it multiplies is then 1e-10 of the exchange wall.
SERIES_BELOW = 2.0
SERIES_TERMS = 18


def damping(x: ArrayLike) -> tuple[Array, Array, Array]:
    """Tang-Toennies damping functions f_6, f_8, f_10, ``f_n(x) = 1 - exp(-x) sum_{k=0..n} x^k/k!``.

    f_10 is the power series ``exp(-x) sum_{k>10} x^k/k!`` below SERIES_BELOW, where the definition cancels; f_8 and
    f_6 add positive terms to it, so all three keep their digits at small x.

    Parameters
    ----------
    x : array_like, any shape
        b R, dimensionless [1]; >= 0.

    Returns
    -------
    f6, f8, f10 : ndarray, shape of x
        Dimensionless [1], between 0 and 1.

    Source
    ------
    K. T. Tang and J. P. Toennies, J. Chem. Phys. 80, 3726 (1984), eq. for f_2n (FROM MEMORY; the formula itself is
    checked against the incomplete gamma function, f_n(x) = P(n + 1, x)).
    """
    x = np.asarray(x, dtype=np.float64)
    decay = np.exp(-x)
    partial = np.ones_like(x)
    for k in range(10, 0, -1):
        partial = 1.0 + partial * (x / k)
    f10 = 1.0 - decay * partial
    small = x < SERIES_BELOW
    if np.any(small):
        y = x[small]
        rest = np.ones_like(y)
        for k in range(11 + SERIES_TERMS, 11, -1):
            rest = 1.0 + rest * (y / k)
        f10[small] = decay[small] * rest * y**11 / math.factorial(11)
    x2 = x * x
    x7 = x2 * x2 * x2 * x * decay
    f8 = f10 + x7 * x2 * (1.0 / math.factorial(9) + x / math.factorial(10))
    f6 = f8 + x7 * (1.0 / math.factorial(7) + x / math.factorial(8))
    return f6, f8, f10


@dataclass(frozen=True, slots=True)
class TangToennies(SurveyedCurve):
    """Tang-Toennies potential ``V = A exp(-b R) - sum_{n=6,8,10} f_n(b R) C_n / R^n``.

    Fields: A [hartree], b [1/bohr], C6, C8, C10 [hartree bohr^n]. Source as for ``damping``.
    """

    A: float
    b: float
    C6: float
    C8: float = 0.0
    C10: float = 0.0
    _shape: Shape = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "_shape", survey(self))

    @classmethod
    def from_well(cls, De: float, Re: float, C6: float, C8: float = 0.0, C10: float = 0.0) -> TangToennies:
        """The (A, b) with ``V(Re) = -De`` and ``V'(Re) = 0``.

        Parameters
        ----------
        De, Re : float
            Well depth [hartree] and position [bohr]; > 0.
        C6, C8, C10 : float
            Dispersion coefficients [hartree bohr^n].

        Returns
        -------
        TangToennies
            Its well is (De, Re) to rounding.

        Raises
        ------
        InputError
            No repulsive wall exists for these numbers: the undamped dispersion at Re is too weak for De.
        """
        A, b = solve_born_mayer(De, Re, (C6, C8, C10))
        return cls(A, b, C6, C8, C10)

    def with_derivative(self, R: ArrayLike) -> tuple[Array, Array]:
        """V [hartree] and dV/dR [hartree/bohr], shape of R [bohr]; d f_n/dx = exp(-x) x^n/n!."""
        r = np.atleast_1d(floored(R))
        x = self.b * r
        wall = np.exp(-x)
        inverse2 = 1.0 / (r * r)
        inverse6 = inverse2 * inverse2 * inverse2
        f6, f8, f10 = damping(x)
        v6 = f6 * (self.C6 * inverse6)
        v8 = f8 * (self.C8 * inverse6 * inverse2)
        v10 = f10 * (self.C10 * inverse6 * inverse2 * inverse2)
        V = self.A * wall - v6 - v8 - v10
        slope = (6.0 * v6 + 8.0 * v8 + 10.0 * v10) / r - self._wall_slope() * wall
        shape = np.shape(R)
        return V.reshape(shape), slope.reshape(shape)

    def _wall_slope(self) -> float:
        coefficients = ((6, self.C6), (8, self.C8), (10, self.C10))
        return self.b * self.A + sum(C * self.b ** (n + 1) / math.factorial(n) for n, C in coefficients)


def solve_born_mayer(De: float, Re: float, dispersion: tuple[float, float, float]) -> tuple[float, float]:
    """Born-Mayer parameters of the Tang-Toennies curve whose minimum is -De at Re.

    With D(b) = sum f_n C_n/Re^n the first condition gives ``A = (D - De) exp(b Re)``; the second then is one
    equation in b. The softest wall that solves it is taken (the physical one: b Re of order 10).

    Parameters
    ----------
    De, Re : float
        Well depth [hartree] and position [bohr].
    dispersion : tuple of 3 floats
        C6, C8, C10 [hartree bohr^n].

    Returns
    -------
    A, b : float
        [hartree], [1/bohr].

    Raises
    ------
    InputError
        When no b between 0.5/Re and 60/Re meets both conditions.
    """
    orders = (6, 8, 10)

    def terms(b: float) -> tuple[float, float]:
        x = b * Re
        values = [float(f[0]) * C / Re**n for f, C, n in zip(damping([x]), dispersion, orders, strict=True)]
        pull = sum(n * v for n, v in zip(orders, values, strict=True)) / Re
        pairs = zip(orders, dispersion, strict=True)
        growth = math.exp(-x) * sum(C * b ** (n + 1) / math.factorial(n) for n, C in pairs)
        return sum(values), pull - growth

    def condition(b: float) -> float:
        total, slope = terms(b)
        return slope - b * (total - De)

    grid = np.linspace(0.5, 60.0, 1200) / Re
    values = [condition(b) for b in grid]
    for low, high, f_low, f_high in zip(grid[:-1], grid[1:], values[:-1], values[1:], strict=True):
        if f_low > 0 >= f_high:
            b = float(brentq(condition, low, high, xtol=1e-15, rtol=1e-14))
            A = (terms(b)[0] - De) * math.exp(b * Re)
            if A > 0:
                return A, b
    raise InputError(
        f"De = {De:.6g} hartree at Re = {Re:.6g} bohr with C6 = {dispersion[0]:g} au: no Tang-Toennies wall has this "
        "minimum. Check the units of De, Re and C_n, or give A_hartree and b_per_bohr."
    )
