"""The slow, obvious version of the dynamics, for tests and benchmarks: six states, fixed axes, the whole path.

Nothing of pertcalc's dynamics is used: the path solves Newton's equations on the adiabatic curve, the amplitudes solve
the time-dependent Schroedinger equation in the basis |m_l, m_s> along the normal of the collision plane,

    <+1|V|+1> = <-1|V|-1> = (V_S + V_P)/2,   <+1|V|-1> = -(V_S - V_P)/2 exp(-2 i phi),   <0|V|0> = V_P,   plus a l.s,

from far inside the incoming half to the end of the outgoing one, with scipy's solve_ivp. Atomic units.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import cos, sin, sqrt

import numpy as np
from scipy.integrate import solve_ivp
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq

# Basis of block A, (m_l, spin): (+1 up), (-1 up), (0 down); of block B its mirror (-1 down), (+1 down), (0 up).
L_DOT_S = np.array([[0.5, 0, 0], [0, -0.5, sqrt(0.5)], [0, sqrt(0.5), 0]])
# Clebsch-Gordan coefficients, columns |3/2, 3/2>, |3/2, -1/2>, |1/2, -1/2> (A) and the same with m -> -m (B): written
# out, because the sign of |1/2, m> changes with the mirror and matters for what is carried between the levels.
TO_J = {
    "A": np.array([[1, 0, 0], [0, sqrt(1 / 3), -sqrt(2 / 3)], [0, sqrt(2 / 3), sqrt(1 / 3)]]),
    "B": np.array([[1, 0, 0], [0, sqrt(1 / 3), sqrt(2 / 3)], [0, sqrt(2 / 3), -sqrt(1 / 3)]]),
}
# Positions of those states in (P3/2: m = 3/2, 1/2, -1/2, -3/2; P1/2: m = 1/2, -1/2).
PLACES = {"A": [0, 2, 5], "B": [3, 1, 4]}


@dataclass(frozen=True)
class SlowPair:
    """Curves with derivatives (pertcalc.curves), splitting [hartree], reduced mass [electron masses]."""

    X: object
    A: object
    B: object
    splitting: float
    reduced_mass: float

    def driving(self, path: str, R: float) -> tuple[float, float]:
        """Potential of the path [hartree] and its slope, by Hellmann and Feynman."""
        V_P, slope_P = (float(x) for x in self.A.with_derivative(R))
        if path == "pi":
            return V_P, slope_P
        V_S, slope_S = (float(x) for x in self.B.with_derivative(R))
        a = self.splitting / 1.5
        levels, vectors = np.linalg.eigh([[V_S, a * sqrt(0.5)], [a * sqrt(0.5), V_P - 0.5 * a]])
        i, limit = (0, -a) if path == "lower" else (1, 0.5 * a)
        c, s = vectors[:, i]
        return float(levels[i]) - limit, float(c * c * slope_S + s * s * slope_P)


@dataclass(frozen=True)
class SlowPath:
    """One classical path from the solution of Newton's equations.

    ``met`` maps |t| since the apse to (V_S, V_P, V_X, phi): a cubic spline through 20 points per step of the solution
    (good to 1e-9 hartree), because calling curves one point at a time is most of the cost.
    """

    duration: float
    turning_point: float
    met: CubicSpline


def turning_point(pair: SlowPair, path: str, energy: float, b: float) -> float:
    """Outermost R [bohr] at which the radial kinetic energy vanishes."""
    if path == "straight":
        return b

    def radial(R: float) -> float:
        return energy * (1 - (b / R) ** 2) - pair.driving(path, R)[0]

    grid = np.geomspace(80.0, 1.5, 2000)
    values = np.array([radial(R) for R in grid])
    i = int(np.flatnonzero(values <= 0)[0])
    return float(brentq(radial, grid[i], grid[i - 1], xtol=1e-14, rtol=1e-15))


def newton_path(pair: SlowPair, path: str, energy: float, b: float, R_end: float, rtol: float = 1e-11) -> SlowPath:
    """The outgoing half from the apse (phi = 0) to R_end [bohr]; the incoming half is its mirror image."""
    mu = pair.reduced_mass
    momentum = mu * sqrt(2 * energy / mu) * b  # angular

    def motion(t, y):
        R, p, _ = y
        slope = 0.0 if path == "straight" else pair.driving(path, R)[1]
        return [p / mu, momentum**2 / (mu * R**3) - slope, momentum / (mu * R * R)]

    def far(t, y):
        return y[0] - R_end

    far.terminal = True
    R0 = turning_point(pair, path, energy, b)
    out = solve_ivp(motion, (0, 1e9), [R0, 0.0, 0.0], "DOP853", events=far, rtol=rtol, atol=1e-12, dense_output=True)
    t = np.unique(np.concatenate([np.linspace(*step, 20) for step in zip(out.t[:-1], out.t[1:], strict=True)]))
    R, _, phi = out.sol(t)
    table = np.stack([np.asarray(pair.B(R)), np.asarray(pair.A(R)), np.asarray(pair.X(R)), phi], axis=-1)
    return SlowPath(float(out.t[-1]), R0, CubicSpline(t, table))


def hamiltonian(splitting: float, V_S: float, V_P: float, phi: float) -> np.ndarray:
    """Block A [hartree] where the curves are V_S, V_P and the axis stands at phi; block B with -phi."""
    H = splitting / 1.5 * L_DOT_S.astype(complex)
    mean, half = 0.5 * (V_S + V_P), 0.5 * (V_S - V_P)
    H[0, 0] += mean
    H[1, 1] += mean
    H[2, 2] += V_P
    turn = complex(cos(2 * phi), -sin(2 * phi))
    H[0, 1] -= half * turn
    H[1, 0] -= half * turn.conjugate()
    return H


def propagate(pair: SlowPair, path: SlowPath, psi: np.ndarray, sign: int, rtol: float, atol: float) -> np.ndarray:
    """Amplitudes (3, k) carried over the whole path; last row of the result is the phase of V_X [radian]."""
    columns = psi.shape[1]

    def equation(t, y):
        V_S, V_P, V_X, phi = path.met(abs(t))
        turned = sign * phi if t > 0 else -sign * phi
        change = -1j * (hamiltonian(pair.splitting, V_S, V_P, turned) @ y[:-1].reshape(3, columns))
        return np.append(change.ravel(), V_X)

    span = (-path.duration, path.duration)
    out = solve_ivp(equation, span, np.append(psi.astype(complex).ravel(), 0), "DOP853", rtol=rtol, atol=atol)
    return out.y[:, -1]


def s_matrix(pair: SlowPair, path: SlowPath, rtol: float = 1e-9) -> np.ndarray:
    """S of the six states times exp(+i Int V_X dt), interaction picture, shape (6, 6), in the order of PLACES."""
    S = np.zeros((6, 6), dtype=complex)
    levels = pair.splitting * np.array([1 / 3, 1 / 3, -2 / 3])
    free = np.exp(1j * levels * path.duration)
    for block, sign in (("A", 1), ("B", -1)):
        end = propagate(pair, path, np.eye(3), sign, rtol, 1e-3 * rtol)
        U = TO_J[block].T @ end[:-1].reshape(3, 3) @ TO_J[block]
        S[np.ix_(PLACES[block], PLACES[block])] = free[:, None] * U * free * np.exp(1j * end[-1].real)
    return S
