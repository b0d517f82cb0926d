"""A grid for bound states whose spacing follows the local de Broglie wavelength, and the Hamiltonian on it.

With dx = g(R) dR / pi and u = sqrt(dR/dx) w the radial equation keeps its form, ``-w'' + [J^2 2 mu V + S] w = 2 mu E
J^2 w``, J = dR/dx, S = 3/4 (J'/J)^2 - 1/2 J''/J; particle-in-a-box functions in x then converge exponentially. Source:
mapped Fourier grids (Fattal, Baer and Kosloff, Phys. Rev. E 53, 1217 (1996)) and the sine DVR (Colbert and Miller, J.
Chem. Phys. 96, 1982 (1992)), both FROM MEMORY; the formulas are derived in notes/molecules.md.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.polynomial.legendre import leggauss

from pertcalc.molecules.radial import R_FAR, Array, RadialProblem

# Grid points per half wavelength of the envelope; exponential convergence sets in at 1.
DENSITY = 2.0
# Points beyond that: a well of one level still has a wall, a tail and a limit to be drawn.
EXTRA = 24
# Far out the points are geometric: g = SPREAD/R, enough for any exponential tail on a logarithmic scale.
SPREAD = 5.0
# Outermost point [bohr]; a level bound more weakly than about 1/(2 mu (R_OUT/8)^2) is not resolved.
R_OUT = 1.0e4
_PANELS = 400


@dataclass(frozen=True, slots=True)
class MappedGrid:
    """Points R [bohr] (n,), jacobian J = dR/dx [bohr] (n,), kinetic matrix of N = 0 [hartree] (n, n).

    A wave function is ``u(R_i) = c_i / sqrt(J_i)`` with sum c_i^2 = 1 (the grid step in x is 1).
    """

    R: Array
    jacobian: Array
    kinetic: Array


@dataclass(frozen=True, slots=True)
class Envelope:
    """Wave number ``g(R)^2 = 2 mu C/(R^6 + s^6) + SPREAD^2/R^2`` [1/bohr^2], never below that of the well at E = 0.

    Fields: strength 2 mu C [bohr^4], s6 = s^6 [bohr^6].
    """

    strength: float
    s6: float

    @classmethod
    def around(cls, problem: RadialProblem) -> Envelope:
        """The envelope of a well: twice its depth inside, its r^-6 hull outside."""
        R = np.geomspace(problem.r_in, R_FAR, 4000)
        attraction = np.clip(-problem.potential(R), 0, None)
        top = 2.0 * problem.depth
        C = float(np.max(attraction * R**6 / (1 - attraction / top)))
        return cls(2 * problem.reduced_mass * C, C / top)

    def wave_number(self, R: Array) -> tuple[Array, Array, Array]:
        """g [1/bohr] and its first and second derivative in R, shape of R [bohr]."""
        core = R**6 + self.s6
        q = self.strength / core + (SPREAD / R) ** 2
        slope = -6 * self.strength * R**5 / core**2 - 2 * SPREAD**2 / R**3
        bend = self.strength * (72 * R**10 / core**3 - 30 * R**4 / core**2) + 6 * SPREAD**2 / R**4
        g = np.sqrt(q)
        first = slope / (2 * g)
        return g, first, bend / (2 * g) - slope * slope / (4 * g * q)

    def phase(self, r_in: float, r_out: float) -> tuple[Array, Array]:
        """Knots R [bohr] and the integral of g from r_in to each [1]."""
        edges = np.geomspace(r_in, r_out, _PANELS + 1)
        nodes, weights = leggauss(8)
        half = 0.5 * np.diff(edges)[:, None]
        values = self.wave_number(edges[:-1, None] + half * (1 + nodes))[0]
        return edges, np.concatenate([[0.0], np.cumsum(np.sum(values * weights * half, axis=1))])


def points_needed(problem: RadialProblem, density: float = DENSITY) -> int:
    """Grid points [1] that a well needs at ``density`` points per half wavelength [1]."""
    total = Envelope.around(problem).phase(problem.r_in, R_OUT)[1][-1]
    return int(np.ceil(density * total / np.pi)) + EXTRA


def mapped_grid(problem: RadialProblem, n: int) -> MappedGrid:
    """The grid of ``n`` points between r_in of the problem and R_OUT, with its kinetic matrix.

    Parameters
    ----------
    problem : RadialProblem
        With a well.
    n : int
        Number of points.

    Returns
    -------
    MappedGrid
        Arrays of shape (n,) and (n, n) [bohr, hartree].
    """
    envelope = Envelope.around(problem)
    edges, phase = envelope.phase(problem.r_in, R_OUT)
    step = phase[-1] / (n + 1)
    wanted = step * np.arange(1, n + 1)
    R = _invert(envelope, edges, phase, wanted)
    g, g1, g2 = envelope.wave_number(R)
    J = step / g
    first = -step * g1 / (g * g)  # dJ/dR
    second = step * (2 * g1 * g1 / g - g2) / (g * g)  # d2J/dR2
    S = 0.25 * first * first - 0.5 * J * second
    kinetic = (_sine_kinetic(n) + np.diag(S)) / (2 * problem.reduced_mass * np.outer(J, J))
    return MappedGrid(R, J, kinetic)


def _invert(envelope: Envelope, edges: Array, phase: Array, wanted: Array) -> Array:
    """R [bohr] at which the phase has the wanted values: Newton's method inside the panel that holds each."""
    nodes, weights = leggauss(8)
    panel = np.clip(np.searchsorted(phase, wanted) - 1, 0, _PANELS - 1)
    start = edges[panel]
    R = np.interp(wanted, phase, edges)
    for _ in range(8):
        half = 0.5 * (R - start)
        inside = np.sum(envelope.wave_number(start[:, None] + half[:, None] * (1 + nodes))[0] * weights, axis=1) * half
        R = R - (phase[panel] + inside - wanted) / envelope.wave_number(R)[0]
    return R


def _sine_kinetic(n: int) -> Array:
    """-d2/dx2 in the basis of sine functions that vanish at x = 0 and n + 1; points x = 1..n."""
    i = np.arange(1, n + 1)
    L = n + 1
    minus, plus = i[:, None] - i[None, :], i[:, None] + i[None, :]
    with np.errstate(divide="ignore"):
        matrix = 1 / np.sin(0.5 * np.pi * minus / L) ** 2 - 1 / np.sin(0.5 * np.pi * plus / L) ** 2
    matrix[np.diag_indices(n)] = (2 * L * L + 1) / 3 - 1 / np.sin(np.pi * i / L) ** 2
    signs = np.where(minus % 2 == 0, 1.0, -1.0)
    return signs * matrix * (np.pi**2 / (2 * L * L))
