"""B-spline basis of the radial equation and its eigenstates: -u''/2 + [l(l+1)/(2 r^2) + V(r)] u = E u, u(0) = 0.

The splines vanish at 0 and at the wall r_max of a spherical box. Every integral is a Gauss-Legendre sum over the knot
intervals, exact for products of splines; the eigenstates live on the same nodes. notes/one-electron-atom.md shows the
convergence.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import BSpline
from scipy.linalg import eigh

from pertcalc.errors import InputError

Array = NDArray[np.float64]

SIZE, R_MAX, DEGREE = 50, 80.0, 8
# Knots are even in ln(1 + r/NEAR) + r/FAR: they crowd at the core and end up equidistant.
NEAR, FAR = 2.0, 50.0
SMALLEST_SIZE = 12


@dataclass(frozen=True, slots=True, eq=False)
class RadialBasis:
    """Basis functions of r on quadrature nodes, zero at the origin and at the wall.

    ``r``, ``weights`` nodes and weights of ``Int_0^r_max f dr``, shape (nq,) [bohr]; ``values`` the functions, shape
    (n, nq) [1]; ``slopes`` their derivatives, shape (n, nq) [bohr^-1].
    """

    r: Array
    weights: Array
    values: Array
    slopes: Array

    def integral(self, function: Array) -> Array:
        """Matrix ``Int B_i f B_j dr`` of a function of r at the nodes.

        Parameters
        ----------
        function : ndarray, shape (nq,)
            f at the nodes [any unit].

        Returns
        -------
        matrix : ndarray, shape (n, n)
            The integrals [that unit times bohr].
        """
        return (self.values * (self.weights * function)) @ self.values.T

    @property
    def overlap(self) -> Array:
        """Matrix ``Int B_i B_j dr`` [bohr]."""
        return self.integral(np.ones_like(self.r))

    def hamiltonian(self, l: int, potential: Array) -> Array:
        """Matrix of ``-d^2/2dr^2 + l(l+1)/(2 r^2) + V``, with V given at the nodes.

        Parameters
        ----------
        l : int
            Orbital angular momentum.
        potential : ndarray, shape (nq,)
            V at the nodes [hartree].

        Returns
        -------
        matrix : ndarray, shape (n, n)
            The Hamiltonian [hartree bohr]; the kinetic part is ``Int B_i' B_j' dr / 2``.
        """
        kinetic = (self.slopes * self.weights) @ self.slopes.T / 2
        return kinetic + self.integral(l * (l + 1) / (2 * self.r**2) + potential)


@cache
def bspline_basis(size: int = SIZE, r_max: float = R_MAX, degree: int = DEGREE) -> RadialBasis:
    """B-splines of a degree on knots that crowd at the origin and end equidistant.

    Parameters
    ----------
    size : int
        Number of basis functions, at least 12.
    r_max : float
        Radius of the box [bohr]; > 0. States that reach it are states of the box.
    degree : int
        Degree of the splines, 3 .. 12; each function lives on degree + 1 intervals.

    Returns
    -------
    basis : RadialBasis
        The functions on degree + 2 Gauss points per interval [bohr].

    Raises
    ------
    InputError
        Names every argument outside these ranges.
    """
    rules = [
        (size >= SMALLEST_SIZE, f"size = {size}: a basis needs at least {SMALLEST_SIZE} functions"),
        (0 < r_max < np.inf, f"r_max = {r_max}: must be finite and > 0 [bohr]"),
        (3 <= degree <= 12, f"degree = {degree}: must be 3 .. 12"),
    ]
    if problems := [message for kept, message in rules if not kept]:
        raise InputError(problems)
    intervals = size + 2 - degree  # the first and the last spline are left out: u = 0 at both ends
    if intervals < 2:
        raise InputError(f"size = {size}: degree {degree} needs at least {degree} functions")
    breaks = _breakpoints(intervals, r_max)
    nodes, node_weights = np.polynomial.legendre.leggauss(degree + 2)
    half = np.diff(breaks)[:, None] / 2
    r = (breaks[:-1, None] + half * (nodes + 1)).ravel()
    weights = (half * node_weights).ravel()
    knots = np.concatenate([[0.0] * degree, breaks, [r_max] * degree])
    splines = BSpline(knots, np.eye(size + 2)[:, 1:-1], degree)
    return RadialBasis(r, weights, splines(r).T.copy(), splines.derivative()(r).T.copy())


def eigenstates(basis: RadialBasis, l: int, potential: Array) -> tuple[Array, Array]:
    """All eigenstates of the radial equation in a basis, lowest first.

    Parameters
    ----------
    basis : RadialBasis
        Functions and nodes [bohr].
    l : int
        Orbital angular momentum.
    potential : ndarray, shape (nq,)
        V at the nodes [hartree].

    Returns
    -------
    energies : ndarray, shape (n,)
        Eigenvalues [hartree]; those above 0 stand for the continuum.
    radial : ndarray, shape (n, nq)
        u = r R at the nodes [bohr^-1/2]; ``Int u_a u_b dr`` = delta_ab under the weights, u > 0 near the origin.
    """
    energies, vectors = eigh(basis.hamiltonian(l, potential), basis.overlap)
    radial = vectors.T @ basis.values
    first = np.argmax(np.abs(radial) > 1e-2 * np.abs(radial).max(axis=1, keepdims=True), axis=1)
    signs = np.sign(radial[np.arange(len(radial)), first])
    return energies, radial * signs[:, None]


def _breakpoints(intervals: int, r_max: float) -> Array:
    """Knot positions from 0 to r_max, even in ln(1 + r/NEAR) + r/FAR."""
    fine = np.concatenate([[0.0], np.geomspace(1e-4, r_max, 2000)])
    even = np.log1p(fine / NEAR) + fine / FAR
    return np.interp(np.linspace(0, even[-1], intervals + 1), even, fine)
