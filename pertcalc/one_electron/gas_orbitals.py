"""Gaussian orbitals around the gas atom, seen from the alkali core: partial waves, values, integrals among themselves.

``chi(u) = N u^l exp(-gamma u^2) Y_lm`` around the gas at R on the z axis. They are the form factors of the separable
terms, and they complete the atomic basis where the gas atom bends the wave function: partial waves about the core
alone converge slowly there. notes/model-curves.md has the formulas.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln, ive

from pertcalc.one_electron.atom import angular_factor

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class GasOrbital:
    """Normalised Gaussian around the gas: ``l``, exponent ``gamma`` [bohr^-2]."""

    l: int
    gamma: float

    @property
    def norm(self) -> float:
        """N of ``Int (N u^l exp(-gamma u^2))^2 u^2 du = 1`` [bohr^-(l+3/2)]."""
        power = self.l + 1.5
        return math.exp(0.5 * (math.log(2.0) + power * math.log(2.0 * self.gamma) - float(gammaln(power))))


@lru_cache(maxsize=8192)
def legendre_element(l: int, order: int, k: int, m: int) -> float:
    """<l m|P_order(cos theta)|k m> [1], remembered."""
    return angular_factor(l, m, order, 0, k, m)


def partial_waves(orbital: GasOrbital, r: Array, R: float, m: int, l_max: int) -> Array:
    """Reduced partial waves ``w_l(r) = r <Y_lm|chi>`` of an orbital about the core.

    ``exp(-gamma u^2) = e^{-gamma (r-R)^2} sum (2j+1) [e^-z i_j(z)] P_j(x)``, z = 2 gamma r R, times the solid harmonic
    of u = r - R moved to the core, ``sum_k sqrt(C(l+m,k+m) C(l-m,k-m)) (-R)^(l-k) r^k`` with its harmonics C_km.

    Parameters
    ----------
    orbital : GasOrbital
    r : array, shape (nq,)
        Distance from the core [bohr], > 0.
    R : float
        [bohr]
    m : int
        0 <= m <= l of the orbital.
    l_max : int

    Returns
    -------
    ndarray, shape (l_max-m+1, nq)
        l from m [bohr^-1/2].

    Source
    ------
    Translation of regular solid harmonics along z and the expansion of exp(z x) in modified spherical Bessel
    functions; any text on angular momentum. Tests compare with sums over space.
    """
    p, z = orbital.l, 2.0 * orbital.gamma * r * R
    bessel = np.sqrt(np.pi / (2.0 * z)) * ive(np.arange(l_max + p + 1)[:, None] + 0.5, z)
    waves = np.zeros((l_max - m + 1, len(r)))
    for k in range(m, p + 1):
        shift = math.sqrt(math.comb(p + m, k + m) * math.comb(p - m, k - m)) * (-R) ** (p - k)
        solid = shift * math.sqrt(4.0 * math.pi / (2 * k + 1)) * r**k
        for l in range(m, l_max + 1):
            for j in range(abs(l - k), l + k + 1, 2):
                waves[l - m] += (2 * j + 1) * legendre_element(l, j, k, m) * solid * bessel[j]
    amplitude = orbital.norm * math.sqrt((2 * p + 1) / (4.0 * math.pi))
    return amplitude * r * np.exp(-orbital.gamma * (r - R) ** 2) * waves


def harmonics(x: Array, m: int, largest: int) -> Array:
    """Spherical harmonics Y_lm at azimuth 0, Condon-Shortley phase.

    Parameters
    ----------
    x : array, any shape
        cos(theta) [1].
    m : int
        0 or 1.
    largest : int
        Largest l.

    Returns
    -------
    ndarray, shape (largest-m+1, *x.shape)
        [1]
    """
    found = np.empty((largest - m + 1, *x.shape))
    previous = np.zeros_like(x)
    current = np.ones_like(x) if m == 0 else -np.sqrt(np.maximum(1.0 - x * x, 0.0))
    for l in range(m, largest + 1):
        found[l - m] = math.sqrt((2 * l + 1) / (4.0 * math.pi) / ((l * (l + 1)) ** m)) * current
        previous, current = current, ((2 * l + 1) * x * current - (l + m) * previous) / (l - m + 1)
    return found


def values(orbitals: Sequence[GasOrbital], r: Array, R: float, u: Array, x: Array, m: int) -> Array:
    """Orbitals at points (r, x) about the core, azimuth 0.

    Parameters
    ----------
    orbitals : sequence of GasOrbital
    r, u, x : array, equal shapes
        Distance from the core and from the gas [bohr], cosine of the angle at the core [1].
    R : float
        [bohr]
    m : int

    Returns
    -------
    ndarray, shape (len(orbitals), *x.shape)
        [bohr^-3/2]
    """
    cosine = np.clip((r * x - R) / np.maximum(u, 1e-12), -1.0, 1.0)
    Y = harmonics(cosine, m, max([orbital.l for orbital in orbitals], default=m))
    shapes = [o.norm * u**o.l * np.exp(-o.gamma * u * u) * Y[o.l - m] for o in orbitals]
    return np.array(shapes).reshape(len(orbitals), *x.shape)


def own_integrals(orbitals: Sequence[GasOrbital]) -> tuple[Array, Array]:
    """Overlap and kinetic energy among Gaussians on one centre.

    ``S = (2 sqrt(g g')/(g + g'))^(l+3/2)``, ``T = (2l+3) g g'/(g + g') S`` for equal l, else 0.

    Parameters
    ----------
    orbitals : sequence of GasOrbital

    Returns
    -------
    tuple of ndarray, shape (K, K)
        S [1], T [hartree].
    """
    l = np.array([orbital.l for orbital in orbitals], dtype=float)
    g = np.array([orbital.gamma for orbital in orbitals], dtype=float)
    total = g[:, None] + g
    product = g[:, None] * g
    S = np.where(l[:, None] == l, (2.0 * np.sqrt(product) / total) ** (l + 1.5), 0.0)
    return S, (2.0 * l + 3.0) * product / total * S


def even_tempered(exponents: dict[int, tuple[float, float, int]]) -> tuple[GasOrbital, ...]:
    """Orbitals with exponents in geometric series; for each l: lowest, highest [bohr^-2], number."""
    return tuple(GasOrbital(l, float(g)) for l, series in exponents.items() for g in np.geomspace(*series))
