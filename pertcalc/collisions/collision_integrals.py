"""Collision integrals of momentum transfer and the Chapman-Enskog diffusion of a trace gas; atomic units.

    Omega(1,s)(T) = 1/(s+1)! Int x^(s+1) e^-x Q1(x kT) dx,   x = E/kT                 [bohr^2]; hard spheres: pi sigma^2
    n D = (3/16) sqrt(2 pi kT/mu) / Omega(1,1)                                         first order

The classical cross section, from deflection angles on the same curve, is the quick one for changes of a curve.

Source: Hirschfelder, Curtiss and Bird, Molecular Theory of Gases and Liquids (1954); Chapman and Cowling, The
Mathematical Theory of Non-uniform Gases, chapter 9 (second order). notes/diffusion.md.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.pair import R_END, R_SMALLEST, CollisionPair
from pertcalc.collisions.transport import transport_cross_sections
from pertcalc.constants import KELVIN_HARTREE
from pertcalc.thermal import energy_spacing

Array = NDArray[np.float64]

# Energies run from LOWEST kT of the coldest to HIGHEST kT of the hottest temperature: x^3 e^-x has died out there.
LOWEST, HIGHEST = 0.08, 15.0
# Omega(2,2) over Omega(1,1), each over its hard-sphere value, is between 1.0 and 1.15 for every realistic potential
# (Hirschfelder, Curtiss and Bird, tables of A*): it enters the second order only.
A_STAR = 1.1
# Classical from here on: waves so short [1/bohr], and energies above all orbiting (0.8 of the depth for Lennard-Jones),
# in units of the well depth. Quantum and classical then agree within 1e-3 (tests/test_diffusion.py).
CLASSICAL_WAVE, CLASSICAL_DEPTHS = 12.0, 2.0
# Points per radian of the shortest local wave of the quantum part: cross sections good to 2e-4.
POINTS = 3.0
# Classical paths: turning points out to here [bohr], how many, and points of the deflection integral.
_R_FARTHEST, _TURNING_POINTS, _ANGLES = 60.0, 1200, 64


@dataclass(frozen=True, slots=True)
class CollisionIntegral:
    """`value` Omega(1,s) [bohr^2]; `exponent` d ln Omega/d ln T [1]."""

    value: float
    exponent: float


def diffusion_grid(temperatures: Array, reduced_mass: float) -> Array:
    """Kinetic energies [hartree] that serve the collision integrals at temperatures [K]: geometric, n odd.

    Parameters
    ----------
    temperatures : ndarray, shape (m,)
        [K].
    reduced_mass : float
        [electron masses].
    """
    low, high = LOWEST * temperatures.min() * KELVIN_HARTREE, HIGHEST * temperatures.max() * KELVIN_HARTREE
    intervals = 2 * math.ceil(math.log(high / low) / energy_spacing(reduced_mass) / 2)
    return np.geomspace(low, high, intervals + 1)


def collision_integral(energy: Array, sigma: Array, temperature: float, s: int = 1) -> CollisionIntegral:
    """Omega(1,s) of a momentum-transfer cross section tabulated on a geometric grid.

    Parameters
    ----------
    energy, sigma : ndarray, shape (n,)
        [hartree], [bohr^2].
    temperature : float
        [K].
    s : int
        1, 2 or 3.

    Returns
    -------
    CollisionIntegral
        The plain sum over ln E: the kernel vanishes at both ends, so it converges like the trapezoid rule of a
        periodic function.
    """
    x = energy / (KELVIN_HARTREE * temperature)
    step = math.log(energy[1] / energy[0])
    weight = x ** (s + 2) * np.exp(-x) * (step / math.factorial(s + 1))
    # Below the grid sigma counts as constant: the terms left out are a geometric series.
    weight[0] /= 1 - math.exp(-(s + 2) * step)
    terms = weight * sigma
    total = float(terms.sum())
    return CollisionIntegral(total, float(terms @ x) / total - (s + 2))


def chapman_enskog(temperature: float, reduced_mass: float, omega11: float) -> float:
    """First-order product of density and diffusion coefficient, ``n D = (3/16) sqrt(2 pi kT/mu)/Omega(1,1)``.

    Parameters
    ----------
    temperature, reduced_mass, omega11 : float
        [K], [electron masses], [bohr^2].

    Returns
    -------
    nD : float
        [1/(bohr atomic unit of time)], independent of the density.
    """
    return 3 / 16 * math.sqrt(2 * math.pi * KELVIN_HARTREE * temperature / reduced_mass) / omega11


def second_order(omega11: float, omega12: float, omega13: float, gas_share: float) -> float:
    """What the second order of Chapman and Enskog adds to the diffusion of a trace in a gas, relative to the first.

    With M the share of the gas in the mass of the pair and m = 1 - M the determinant of the first two Sonine
    polynomials gives Delta/(1 - Delta), Delta = M (5/2 - c2)^2 / (5/4 (6 m^2 + 5 M^2) - 5 M^2 c2 + M^2 c3 + 4 m M A*)
    times M, where c2 = 3 Omega(1,2)/Omega(1,1) and c3 = 12 Omega(1,3)/Omega(1,1).

    Parameters
    ----------
    omega11, omega12, omega13 : float
        [bohr^2].
    gas_share : float
        Mass of the gas atom over that of the pair [1], 0 ... 1.

    Returns
    -------
    addition : float
        (D_2 - D_1)/D_1 [1], >= 0; 1/12 for hard spheres of a very heavy gas.
    """
    M, m = gas_share, 1 - gas_share
    c2, c3 = 3 * omega12 / omega11, 12 * omega13 / omega11
    diagonal = 1.25 * (6 * m * m + 5 * M * M) - 5 * M * M * c2 + M * M * c3 + 4 * m * M * A_STAR
    delta = M * M * (2.5 - c2) ** 2 / diagonal
    return delta / (1 - delta)


def momentum_transfer(pair: CollisionPair, energy: Array) -> Array:
    """Momentum-transfer cross section of the ground curve: quantum, and classical where that is as good.

    Parameters
    ----------
    pair : CollisionPair
    energy : ndarray, shape (n,)
        Kinetic energies [hartree].

    Returns
    -------
    Q1 : ndarray, shape (n,)
        [bohr^2], good to 1e-3.
    """
    depth = -float(_ground(pair, np.geomspace(2.0, R_END, 1000)).min())
    short = np.sqrt(2 * pair.reduced_mass * energy) > CLASSICAL_WAVE
    classical = short & (energy > CLASSICAL_DEPTHS * depth)
    found = np.empty_like(energy)
    found[classical] = classical_momentum_transfer(pair, energy[classical])
    found[~classical] = transport_cross_sections(pair, energy[~classical], POINTS).momentum_transfer
    return found


def classical_momentum_transfer(pair: CollisionPair, energy: Array) -> Array:
    """Classical momentum-transfer cross section of the ground curve, shape (n,) [bohr^2].

    ``Q1 = pi Int (1 - cos chi) d(b^2)``, ``chi = pi - 2 b/R0 Int_0^1 du/sqrt(1 - V(R0/u)/E - (b u/R0)^2)``, with the
    outermost turning point R0 as variable: b^2 = R0^2 (1 - V(R0)/E), the branch behind a centrifugal barrier left out.

    Parameters
    ----------
    pair : CollisionPair
    energy : ndarray, shape (n,)
        Kinetic energies [hartree].

    Returns
    -------
    Q1 : ndarray, shape (n,)
        [bohr^2]. Orbiting costs some per cent at single energies below the well depth; averages at 300 K agree with
        the quantum ones within 0.2 %, walls that fall by e within less than 0.02 R cost more.
    """
    # u = sin theta makes the integrand smooth at the turning point: the midpoint rule is a Gauss rule there.
    theta = (np.arange(_ANGLES) + 0.5) * (0.5 * np.pi / _ANGLES)
    R0 = np.geomspace(R_SMALLEST, _R_FARTHEST, _TURNING_POINTS)
    middle = np.sqrt(R0[1:] * R0[:-1])
    u = np.sin(theta)
    ends, inside, along = (_ground(pair, R) for R in (R0, middle, middle[:, None] / u))
    found = []
    for E in np.atleast_1d(energy):
        # Only what the running minimum from outside leaves is reached from infinity.
        reached = np.minimum.accumulate((R0**2 * (1 - ends / E))[::-1])[::-1]
        share = np.diff(np.maximum(reached, 0.0))
        square = np.maximum(1 - inside / E, 0.0)  # (b/R0)^2
        clear = 1 - along / E - square[:, None] * u**2
        slowness = np.cos(theta) / np.sqrt(np.maximum(clear, 1e-12))
        chi = np.pi - 2 * np.sqrt(square) * slowness.sum(axis=1) * (0.5 * np.pi / _ANGLES)
        found.append(np.pi * np.sum((1 - np.cos(chi)) * share))
    return np.array(found)


def _ground(pair: CollisionPair, R: Array) -> Array:
    line, _, pi = pair.table(np.minimum(R, 2 * R_END))
    return np.where(R < 2 * R_END, pi - line, 0.0)
