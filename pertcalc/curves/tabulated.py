"""Tabulated pair potentials: cubic spline inside, exponential wall, C_n tail, C1 at both joins."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicSpline

from pertcalc.curves.base import WALL_CAP, Array, Shape, SurveyedCurve, Tail, bounded_exp, floored, survey
from pertcalc.errors import InputError

MIN_POINTS = 5


@dataclass(frozen=True, slots=True, eq=False)
class Tabulated(SurveyedCurve):
    """Curve through points (R_i, V_i): spline inside, ``V_0 exp(-b (R - R_0))`` below R_0, C_n tail beyond R_last.

    * Wall: b = ln(V_0/V_1)/(R_1 - R_0), the exponential through the first two points; the spline is clamped to its
      slope at R_0, so V is C1 there and the wall always rises inwards.
    * Tail: C6, C8, C10 stay as given, an effective C12 takes up the difference at R_last (``Tail.through``), so
      -R^6 V -> C6 exactly. The spline is clamped to the slope of the tail at R_last, so V is C1 there too.
      notes/curves.md compares this with the free end slope that needs two effective terms.

    Fields: R [bohr], V [hartree], shape (n,), n >= 5; C6, C8, C10 [hartree bohr^n].
    """

    R: Array
    V: Array
    C6: float
    C8: float = 0.0
    C10: float = 0.0
    decay: float = field(init=False)
    tail: Tail = field(init=False)
    _spline: CubicSpline = field(init=False, repr=False)
    _shape: Shape = field(init=False, repr=False)

    def __post_init__(self) -> None:
        R = np.array(self.R, dtype=np.float64)
        V = np.array(self.V, dtype=np.float64)
        problems = table_problems(R, V)
        if problems:
            raise InputError(problems)
        for values in (R, V):
            values.flags.writeable = False
        decay = math.log(V[0] / V[1]) / (R[1] - R[0])
        tail = Tail.through(float(R[-1]), float(V[-1]), self.C6, self.C8, self.C10)
        slopes = np.array([-decay * V[0], tail.with_derivative(R[-1])[1]])
        spline = CubicSpline(R, V, bc_type=((1, np.array(slopes[0])), (1, np.array(slopes[1]))))
        for name, value in (("R", R), ("V", V), ("decay", decay), ("_spline", spline), ("tail", tail)):
            object.__setattr__(self, name, value)
        found = survey(self)
        # The wall beyond the first point is a continuation: it is supported up to the first point only.
        object.__setattr__(self, "_shape", Shape(found.well, float(R[0]), min(float(V[0]), WALL_CAP)))

    def with_derivative(self, R: ArrayLike) -> tuple[Array, Array]:
        """V [hartree] and dV/dR [hartree/bohr], shape of R [bohr]."""
        shape = np.shape(R)
        r = np.atleast_1d(floored(R))
        first, last = self.R[0], self.R[-1]
        inside = np.clip(r, first, last)
        V, slope = self._spline(inside), self._spline(inside, 1)
        wall, far = r < first, r > last
        if np.any(wall):
            V[wall] = self.V[0] * bounded_exp(self.decay * (first - r[wall]))
            slope[wall] = -self.decay * V[wall]
        if np.any(far):
            V[far], slope[far] = self.tail.with_derivative(r[far])
        return V.reshape(shape), slope.reshape(shape)


def table_problems(R: Array, V: Array) -> list[str]:
    """Every rule a table breaks, each with the next step; empty for a good one.

    Parameters
    ----------
    R, V : ndarray, shape (n,)
        Points [bohr], [any unit of energy].

    Returns
    -------
    list of str
    """
    if len(R) < MIN_POINTS:
        return [f"{len(R)} points: a spline with two joins needs at least {MIN_POINTS}; add points"]
    problems = []
    bad = np.flatnonzero(~(np.isfinite(R) & np.isfinite(V)))
    if bad.size:
        problems.append(f"point {bad[0] + 1} is not finite ({bad.size} such points); remove or correct it")
    low = np.flatnonzero(R <= 0)
    if low.size:
        problems.append(f"point {low[0] + 1} has R = {R[low[0]]:g} bohr: R must be > 0; remove it")
    falling = np.flatnonzero(np.diff(R) <= 0)
    if falling.size:
        k = falling[0]
        problems.append(
            f"point {k + 2} has R = {R[k + 1]:g} bohr after {R[k]:g}: R must rise strictly; sort, drop repeats"
        )
    if not problems and not V[0] > V[1] > 0:
        problems.append(
            f"the first two values are {V[0]:g} and {V[1]:g}: the table must begin on the repulsive wall, positive and "
            "falling, to be continued inwards; add points at smaller R or drop the ones inside the wall's top"
        )
    return problems
