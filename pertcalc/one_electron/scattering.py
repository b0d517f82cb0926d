"""A free electron on one gas atom: phase shifts, scattering length, bound states, cross sections; atomic units.

The potential is local W(u) plus separable terms; beyond ``reach`` only the bare tail -alpha_d/(2u^4) - tail_q/(2u^6)
is left of it. Inside, the radial equation is solved once per l in a polynomial basis with the Bloch operator
(R-matrix); outside, the waves of the tail are used, so that nothing is cut off. notes/electron-gas.md: equations.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache
from typing import Protocol

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import ArrayLike, NDArray
from scipy.integrate import solve_ivp
from scipy.linalg import eigh
from scipy.special import gammaln, spherical_jn, spherical_yn

from pertcalc.errors import InputError

Array = NDArray[np.float64]

BASIS = 40  # polynomials inside: phase shifts of every model here are then stable to 1e-8 (tests)
TAIL_PHASE = 1e-8  # the polarisation phase [rad] left outside the radius where free waves begin
HIGHEST_L = 8
FAR = 300.0  # [bohr]; beyond it 1/u^6 is below 1e-5 of 1/u^4 at zero energy


@dataclass(frozen=True, slots=True)
class Separable:
    """A separable term ``strength sum_m |g Y_lm><g Y_lm|`` around the gas, ``g(u) = N u^l exp(-gamma u^2)``.

    ``l`` partial wave, ``strength`` [hartree], ``gamma`` [bohr^-2]; N makes ``int g^2 u^2 du = 1``.
    """

    l: int
    strength: float
    gamma: float

    def g(self, u: ArrayLike) -> Array:
        """Normalised radial function g [bohr^-3/2], shape of u [bohr]."""
        power = self.l + 1.5
        log_norm = 0.5 * (math.log(2.0) + power * math.log(2.0 * self.gamma) - gammaln(power))
        u = np.asarray(u, dtype=np.float64)
        return np.asarray(math.exp(log_norm) * u**self.l * np.exp(-self.gamma * u * u))


class Scatterer(Protocol):
    """A potential: polarisability, 1/u^6 coefficient, radius of its short-range part, W(u), separable terms."""

    @property
    def alpha_d(self) -> float: ...

    @property
    def tail_q(self) -> float: ...

    @property
    def reach(self) -> float: ...

    @property
    def separable(self) -> tuple[Separable, ...]: ...

    def local(self, u: ArrayLike) -> Array: ...


@dataclass(frozen=True, slots=True)
class InnerRegion:
    """R-matrix poles of one partial wave: ``R(E) = phi/phi' at radius = 1/2 sum_i amplitude_i^2/(pole_i - E)``.

    ``radius`` [bohr]; ``poles`` [hartree] and ``amplitudes`` [bohr^-1/2], shape (n,).
    """

    radius: float
    poles: Array
    amplitudes: Array

    def r_matrix(self, energies: ArrayLike) -> Array:
        """R [bohr] at ``energies`` [hartree], same shape."""
        E = np.asarray(energies, dtype=np.float64)
        return np.asarray(0.5 * np.sum(self.amplitudes**2 / (self.poles - E[..., None]), axis=-1))


def inner_region(gas: Scatterer, l: int, core_radius: float = 0.0, n: int = BASIS) -> InnerRegion:
    """Solve the radial problem of partial wave l inside ``gas.reach``.

    ``H = -1/2 d2/du2 + l(l+1)/(2u^2) + W + sum strength |u g><u g|`` plus the Bloch operator, in the basis
    ``(u - core_radius) P_k(x)``; separable terms act exactly.

    Parameters
    ----------
    gas : Scatterer
        Potential [atomic units].
    l : int
        Partial wave, 0 .. 8.
    core_radius : float
        The wave vanishes here [bohr] (hard core); 0 = none.
    n : int
        Number of basis functions.

    Returns
    -------
    InnerRegion
        Its poles [hartree] and amplitudes [bohr^-1/2].

    Raises
    ------
    InputError
        l outside 0 .. 8, or a potential that is not finite.
    """
    if not 0 <= l <= HIGHEST_L:
        raise InputError(f"l = {l} must lie in 0 .. {HIGHEST_L}. Give a partial wave of that range.")
    span = gas.reach - core_radius
    x, w = legendre.leggauss(2 * n + 10)
    u, w = core_radius + 0.5 * span * (x + 1.0), 0.5 * span * w
    P = legendre.legvander(x, n - 1)
    dP = np.stack([legendre.legval(x, legendre.legder(np.eye(n)[k])) for k in range(n)], axis=1) * (2.0 / span)
    basis = (u - core_radius)[:, None] * P
    slope = P + (u - core_radius)[:, None] * dP
    W = np.asarray(gas.local(u)) + 0.5 * l * (l + 1) / u**2
    if not np.all(np.isfinite(W)):
        raise InputError("local(u) is not finite everywhere inside the reach of the potential. Check its parameters.")
    H = 0.5 * slope.T @ (w[:, None] * slope) + basis.T @ ((w * W)[:, None] * basis)
    for term in gas.separable:
        if term.l == l:
            overlap = basis.T @ (w * u * term.g(u))
            H += term.strength * np.outer(overlap, overlap)
    S = basis.T @ (w[:, None] * basis)
    poles, vectors = eigh(H, S)
    return InnerRegion(gas.reach, poles, span * vectors.sum(axis=0))


@lru_cache(maxsize=4096)
def _tail_waves(alpha_d: float, tail_q: float, k: float, l: int, radius: float) -> tuple[float, float, float, float]:
    """f, f', g, g' at ``radius``: waves of the bare tail that become sin and cos of (k u - l pi/2) outside."""
    start = max(radius, 40.0 / k, (alpha_d / (6.0 * k * TAIL_PHASE)) ** (1.0 / 3.0)) if alpha_d else radius
    z = k * start
    j, y = spherical_jn(l, z), spherical_yn(l, z)
    dj, dy = spherical_jn(l, z, derivative=True), spherical_yn(l, z, derivative=True)
    state = [float(x) for x in (z * j, k * (j + z * dj), -z * y, -k * (y + z * dy))]
    if start > radius:
        shift = alpha_d / (6.0 * k * start**3)  # mean phase the tail adds outside start
        c, s = math.cos(shift), math.sin(shift)
        f, df, g, dg = state
        # sin(ku + delta) beyond start is sin(ku + delta - shift) there
        state = [f * c - g * s, df * c - dg * s, g * c + f * s, dg * c + df * s]

        state = _inward(start, radius, state, alpha_d, tail_q, k, l)
    return state[0], state[1], state[2], state[3]


def _inward(
    start: float, radius: float, waves: list[float], alpha_d: float, tail_q: float, k: float, l: int
) -> list[float]:
    """Carry two waves and their slopes from ``start`` in to ``radius`` in the bare tail."""

    def slope(u: float, q: Array) -> list[float]:
        F = l * (l + 1) / u**2 - alpha_d / u**4 - tail_q / u**6 - k * k
        return [q[1], F * q[0], q[3], F * q[2]]

    found = solve_ivp(slope, (start, radius), waves, method="DOP853", rtol=1e-11, atol=1e-13)
    return [float(x) for x in found.y[:, -1]]


def _checked_energies(energies: ArrayLike) -> Array:
    E = np.asarray(energies, dtype=np.float64)
    if not (np.all(np.isfinite(E)) and np.all(E > 0)):
        raise InputError("energies [hartree] must be finite and > 0. The limit E -> 0 is scattering_length().")
    return E


def phase_shifts(gas: Scatterer, energies: ArrayLike, l: int, core_radius: float = 0.0) -> Array:
    """Phase shifts of partial wave l.

    ``tan(delta) = (f - R f')/(R g' - g)`` with the R-matrix inside and the waves f, g of the tail outside.

    Parameters
    ----------
    gas : Scatterer
        Potential [atomic units].
    energies : array_like, any shape
        Kinetic energy k^2/2 [hartree]; > 0.
    l : int
        Partial wave, 0 .. 8.
    core_radius : float
        The wave vanishes here [bohr]; 0 = none.

    Returns
    -------
    delta : ndarray, shape of energies
        Phase shift [rad], modulo pi in (-pi/2, pi/2].

    Raises
    ------
    InputError
        Energies that are not finite and > 0, or l outside 0 .. 8.

    Source
    ------
    R-matrix theory with one channel, any text on scattering; notes/electron-gas.md.
    """
    E = _checked_energies(energies)
    R = np.atleast_1d(inner_region(gas, l, core_radius).r_matrix(E)).ravel()
    k = np.sqrt(2.0 * np.atleast_1d(E)).ravel()
    f, df, g, dg = np.array([_tail_waves(gas.alpha_d, gas.tail_q, float(one), l, gas.reach) for one in k]).T
    return np.arctan((f - R * df) / (R * dg - g)).reshape(E.shape)


@lru_cache(maxsize=1024)
def _zero_energy_tail(alpha_d: float, tail_q: float, l: int, radius: float) -> tuple[float, float, float, float]:
    """(decaying, its slope, growing, its slope) at ``radius`` for E = 0.

    ``u^-l`` and ``u^(l+1)``; with polarisation j_l and y_l of sqrt(alpha_d)/u, carried in from FAR under a 1/u^6 tail.
    """
    if alpha_d == 0:
        return radius**-l, -l * radius ** (-l - 1), radius ** (l + 1), (l + 1) * radius**l
    u = max(radius, FAR) if tail_q else radius
    z = math.sqrt(alpha_d) / u
    dj, dy = spherical_jn(l, z, derivative=True), spherical_yn(l, z, derivative=True)
    waves = [float(spherical_jn(l, z)), float(-dj * z / u), float(spherical_yn(l, z)), float(-dy * z / u)]
    if u > radius:
        waves = _inward(u, radius, waves, alpha_d, tail_q, 0.0, l)
    return waves[0], waves[1], waves[2], waves[3]


def scattering_length(gas: Scatterer, core_radius: float = 0.0) -> float:
    """s-wave scattering length a, ``phi -> u - a`` at zero energy.

    The tail is exact: outside ``phi = c u cos(sqrt(alpha)/u) + s u sin(sqrt(alpha)/u)``, so ``a = -s sqrt(alpha)/c``.

    Parameters: ``gas`` potential [atomic units], ``core_radius`` [bohr]. Returns a [bohr]. Meaningful only beside
    ``bound_states``: the same a belongs to potentials with none, one, two ... of them.
    Source: T. F. O'Malley, L. Spruch and L. Rosenberg, J. Math. Phys. 2, 491 (1961), the 1/u^4 case (FROM MEMORY).
    """
    R = float(inner_region(gas, 0, core_radius).r_matrix(0.0))
    decay, d_decay, grow, d_grow = _zero_energy_tail(gas.alpha_d, gas.tail_q, 0, gas.reach)
    ratio = -(grow - R * d_grow) / (decay - R * d_decay)  # phi = grow + ratio * decay
    # j_0 = sin z/z -> 1 and y_0 = -cos z/z -> -u/sqrt(alpha): phi -> -(u - ratio sqrt(alpha))/sqrt(alpha)
    return ratio * math.sqrt(gas.alpha_d) if gas.alpha_d else -ratio


def bound_states(gas: Scatterer, l: int = 0) -> int:
    """Number of bound states of partial wave l.

    Counts the negative energies inside under the boundary condition of the wave that stays finite outside at E = 0;
    for a local potential this is the number of nodes of the zero-energy wave.

    Parameters: ``gas`` potential [atomic units], ``l``. Returns the count. Raises InputError for l outside 0 .. 8.
    """
    inner = inner_region(gas, l)
    decay, slope, _, _ = _zero_energy_tail(gas.alpha_d, gas.tail_q, l, gas.reach)
    # In the eigenbasis of the Bloch Hamiltonian the boundary condition phi'/phi = L is -1/2 L |a><a|.
    bounded = np.diag(inner.poles) - 0.5 * (slope / decay) * np.outer(inner.amplitudes, inner.amplitudes)
    return int(np.sum(np.linalg.eigvalsh(bounded) < 0.0))


def polarisation_phase(alpha_d: float, k: ArrayLike, l: int) -> Array:
    """First-order phase of the tail alone, ``tan(delta_l) = pi alpha_d k^2/[(2l-1)(2l+1)(2l+3)]``, l >= 1.

    Parameters: ``alpha_d`` [bohr^3], ``k`` [bohr^-1], ``l`` >= 1. Returns delta [rad], shape of k. InputError for l < 1
    (l = 0 is ruled by the scattering length). Source: O'Malley, Spruch & Rosenberg 1961 (FROM MEMORY).
    """
    if l < 1:
        raise InputError(f"l = {l} must be >= 1: at l = 0 the scattering length rules. Use scattering_length().")
    k = np.asarray(k, dtype=np.float64)
    return np.arctan(math.pi * alpha_d * k * k / ((2 * l - 1) * (2 * l + 1) * (2 * l + 3)))


def cross_sections(gas: Scatterer, energies: ArrayLike, solved: int = 4, highest: int = 40) -> tuple[Array, Array]:
    """Elastic and momentum-transfer cross sections.

    ``sigma = 4pi/k^2 sum (2l+1) sin^2 d_l``, ``sigma_mt = 4pi/k^2 sum (l+1) sin^2(d_l - d_{l+1})``; partial waves
    below ``solved`` from the potential, the others up to ``highest`` from the first-order tail.

    Parameters
    ----------
    gas : Scatterer
        Potential [atomic units].
    energies : array_like, shape (n,)
        Kinetic energy [hartree]; > 0.
    solved, highest : int
        Partial waves solved, and summed.

    Returns
    -------
    elastic, momentum_transfer : ndarray, shape (n,)
        Cross sections [bohr^2].

    Raises
    ------
    InputError
        Energies that are not finite and > 0.
    """
    E = np.atleast_1d(_checked_energies(energies))
    k = np.sqrt(2.0 * E)
    delta = [phase_shifts(gas, E, l) for l in range(solved)]
    delta += [polarisation_phase(gas.alpha_d, k, l) for l in range(solved, highest + 1)]
    elastic = sum((2 * l + 1) * np.sin(d) ** 2 for l, d in enumerate(delta))
    transfer = sum((l + 1) * np.sin(a - b) ** 2 for l, (a, b) in enumerate(zip(delta[:-1], delta[1:], strict=True)))
    return 4 * math.pi / k**2 * elastic, 4 * math.pi / k**2 * transfer
