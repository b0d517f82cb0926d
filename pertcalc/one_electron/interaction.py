"""The local interaction of electron, alkali core and gas atom on nodes that are dense where the gas is.

Core at the origin, gas at R on the z axis, electron at r; u its distance from the gas, x the cosine at the core.
notes/model-curves.md has the formulas.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from pertcalc.one_electron.scattering import Separable

Array = NDArray[np.float64]
# W(u) changes over about one bohr; u = S sinh t spreads the nodes as the potential needs them.
STRETCH = 2.0


class RadialStates(Protocol):
    """What is needed of the atom: nodes, weights, energies and reduced functions of each l, core potential, dipole."""

    @property
    def r(self) -> Array: ...
    @property
    def weights(self) -> Array: ...
    @property
    def energies(self) -> tuple[Array, ...]: ...
    @property
    def radial(self) -> tuple[Array, ...]: ...
    @property
    def core(self) -> Callable[[int, Array], Array]: ...
    def dipole_operator(self, r: Array) -> Array: ...


class ElectronGas(Protocol):
    """What is needed of the gas atom: polarisability, local potential, core-electron cross term, separable terms."""

    @property
    def alpha_d(self) -> float: ...
    @property
    def separable(self) -> Sequence[Separable]: ...
    def damping(self, u: Array) -> Array: ...
    def local(self, u: Array) -> Array: ...
    def cross(self, r: Array, R: Array, cos_theta: Array) -> Array: ...


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """Nodes about the core, dense where the gas is: r (nq, 1) [bohr], u [bohr], x [1], weight of dx [1], (nq, nx)."""

    r: Array
    u: Array
    x: Array
    weight: Array


def make_grid(r: Array, R: float, nodes: int) -> Grid:
    """Nodes of Int_{-1}^{1} dx = Int_{|r-R|}^{r+R} u du/(r R) at each r, u = S sinh t, Gauss-Legendre in t.

    Parameters
    ----------
    r : array, shape (nq,)
        Distances of the electron from the core [bohr], > 0.
    R : float
        Distance of the gas from the core [bohr], > 0.
    nodes : int

    Returns
    -------
    Grid
    """
    points, weights = _legendre_rule(nodes)
    low, high = np.arcsinh(np.abs(r - R) / STRETCH), np.arcsinh((r + R) / STRETCH)
    half = 0.5 * (high - low)[:, None]
    t = 0.5 * (high + low)[:, None] + half * points
    u = STRETCH * np.sinh(t)
    product = r[:, None] * R
    x = np.clip(1.0 + ((r[:, None] - R) ** 2 - u * u) / (2.0 * product), -1.0, 1.0)
    return Grid(r[:, None], u, x, weights * half * u * STRETCH * np.cosh(t) / product)


@lru_cache(maxsize=8)
def _legendre_rule(nodes: int) -> tuple[Array, Array]:
    points, weights = np.polynomial.legendre.leggauss(nodes)
    return points, weights


def multipoles(V: Array, grid: Grid, largest: int) -> Array:
    """Legendre components about the core, W_lambda(r) = (2 lambda + 1)/2 Int_{-1}^{1} V(r, x) P_lambda(x) dx.

    Parameters
    ----------
    V : array, shape (nq, nx)
        Potential at the nodes [hartree].
    grid : Grid
    largest : int
        Largest lambda.

    Returns
    -------
    ndarray, shape (largest+1, nq)
        [hartree]
    """
    f, W = V * grid.weight, np.empty((largest + 1, len(V)))
    previous, current = np.zeros_like(V), np.ones_like(V)
    for order in range(largest + 1):
        W[order] = (order + 0.5) * np.einsum("ij,ij->i", f, current)
        previous, current = current, ((2 * order + 1) * grid.x * current - order * previous) / (order + 1)
    return W


def potential(states: RadialStates, electron: ElectronGas, R: float, grid: Grid) -> Array:
    """Everything local between electron and gas: W(u), the gas polarised by core and electron, by the core's dipole.

    Parameters
    ----------
    states : RadialStates
    electron : ElectronGas
    R : float
        [bohr]
    grid : Grid

    Returns
    -------
    ndarray, shape (nq, nx)
        [hartree]
    """
    r = np.broadcast_to(grid.r, grid.u.shape)
    pair = electron.local(grid.u) + electron.cross(r, np.full_like(grid.u, R), grid.x)
    return pair + core_dipole(electron, R, r, grid.u, grid.x, r - states.dipole_operator(r))


def core_dipole(electron: ElectronGas, R: float, r: Array, u: Array, x: Array, dipole: Array) -> Array:
    """What the dipole p that the electron induces in the alkali core adds to the polarisation energy of the gas.

    ``-alpha_d [(E_core + E_electron) . E_p + E_p^2/2]`` with E_p = (3 p_z z - p)/R^3, p towards the electron: far away
    the dipole of the atom becomes that of the dipole operator, r - p. Fields are damped as in the other terms.

    Parameters
    ----------
    electron : ElectronGas
    R : float
        [bohr]
    r, u, x : array, equal shapes
        [bohr], [bohr], [1].
    dipole : array, same shape
        p(r) [bohr].

    Returns
    -------
    ndarray, same shape
        [hartree]
    """
    if not np.any(dipole):
        return np.zeros_like(u)
    at_core = np.sqrt(electron.damping(np.full_like(u, R)))
    with_core = 2.0 * x / R**5 * at_core
    with_electron = -(3.0 * x * (R - r * x) - (R * x - r)) / R**3 * np.sqrt(electron.damping(u)) / u**3
    own = 0.5 * dipole * (1.0 + 3.0 * x * x) / R**6 * at_core
    return -electron.alpha_d * dipole * at_core * (with_core + with_electron + own)
