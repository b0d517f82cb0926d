"""Maxwell averages of tabulated cross sections, and which path family answers for which rate.

k(T) = vbar Int x e^-x sigma(x kT) dx = vbar Int x^2 e^-x sigma d(ln x). In ln E the kernel falls off so fast at both
ends that the plain trapezoid sum over a geometric grid is exact to 1e-11 at the spacing used here; one table therefore
serves every temperature, and the sum over every second energy tells what the structure of sigma(E) costs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from pertcalc.constants import AMU_AU, KELVIN_HARTREE

Array = NDArray[np.float64]

# Energies run from LOWEST kT of the coldest to HIGHEST kT of the hottest temperature, LOG_SPACING apart in ln E.
LOWEST, HIGHEST = 0.03, 14.0
LOG_SPACING = 0.36
# Reduced mass [u] from which that spacing is dense enough.
HEAVY = 20.0


def energy_spacing(reduced_mass: float) -> float:
    """Step of ln E for a pair [1]: LOG_SPACING, closer for light pairs.

    With few partial waves sigma(E) undulates; light pairs are cheap and get more energies.

    Parameters
    ----------
    reduced_mass : float
        [electron masses].
    """
    return LOG_SPACING * min(1.0, float(np.sqrt(reduced_mass / (HEAVY * AMU_AU))))


def energy_grid(temperatures: Array, spacing: float = LOG_SPACING, highest: float = HIGHEST) -> Array:
    """Kinetic energies [hartree] for temperatures [K], geometric, shape (n,), n odd.

    Parameters
    ----------
    temperatures : ndarray, shape (m,)
        [K].
    spacing : float
        Step of ln E [1].
    highest : float
        Last energy in units of kT of the hottest temperature [1].
    """
    low = LOWEST * temperatures.min() * KELVIN_HARTREE
    high = highest * temperatures.max() * KELVIN_HARTREE
    intervals = 2 * int(np.ceil(np.log(high / low) / spacing / 2))
    return np.geomspace(low, high, intervals + 1)


def effort(energy: Array, temperatures: Array, power: float, least: float) -> Array:
    """How much accuracy an energy deserves, from its largest share in any average: shape of energy [1].

    Parameters
    ----------
    energy : ndarray, shape (n,)
        [hartree].
    temperatures : ndarray, shape (m,)
        [K].
    power, least : float
        The share relative to the most important energy is raised to `power` and kept above `least` [1].
    """
    x = energy[:, None] / (KELVIN_HARTREE * temperatures)
    share = (x**2 * np.exp(2 - x) / 4).max(axis=1)
    return np.maximum(share**power, least)


def thermal_speed(kT: Array | float, reduced_mass: Array | float) -> Array:
    """vbar = sqrt(8 kT/(pi mu)) [au] of thermal energies [hartree] and a reduced mass [electron masses]."""
    return np.sqrt(8 * np.asarray(kT) / (np.pi * reduced_mass))


def mean_speed(temperature: Array | float, reduced_mass: float) -> Array:
    """vbar [au] of temperatures [K] and a reduced mass [electron masses]; see `thermal_speed`."""
    return thermal_speed(KELVIN_HARTREE * np.asarray(temperature), reduced_mass)


@dataclass(frozen=True, slots=True)
class Average:
    """Rate coefficient [au] and its exponent d ln|k|/d ln T [1]."""

    rate: float
    exponent: float


def maxwell(energy: Array, sigma: Array, temperature: float, reduced_mass: float) -> Average:
    """Thermal rate of a cross section tabulated on a geometric grid of energies.

    Parameters
    ----------
    energy, sigma : ndarray, shape (n,)
        [hartree], [bohr^2].
    temperature : float
        [K].
    reduced_mass : float
        [electron masses].

    Returns
    -------
    Average
        Rate [bohr^3 per atomic unit of time]; the exponent is 1/2 - 2 + <x> over the integrand.
    """
    x = energy / (KELVIN_HARTREE * temperature)
    step = np.log(energy[1] / energy[0])
    weight = x**2 * np.exp(-x) * step
    # Below the grid sigma counts as constant: the terms left out are a geometric series.
    weight[0] /= 1 - np.exp(-2 * step)
    terms = weight * sigma
    total = terms.sum()
    exponent = float(terms @ x / total - 1.5) if total != 0 else 0.0
    return Average(float(mean_speed(temperature, reduced_mass) * total), exponent)


@dataclass(frozen=True, slots=True)
class Transfer:
    """Rates between the two levels [au], `up` from P1/2 and `down` from P3/2, with their exponents [1]."""

    up: Average
    down: Average


def balanced_transfer(
    energy: Array,
    sigma: Array,
    splitting: float,
    temperature: float,
    reduced_mass: float,
    down_share: float = 0.5,
    ratio: Array | None = None,
) -> Transfer:
    """Transfer rates in exact detailed balance, k_up/k_down = exp(-splitting/kT)/down_share.

    The collision is run at the mean kinetic energy Ebar of the two levels. With sigma the cross section from P1/2 on
    that path, E1 sigma_12(E1) = Ebar sigma(Ebar) and E2 sigma_21(E2) = Ebar sigma(Ebar) down_share (equal angular
    momentum, not equal impact parameter). Both rates are one integral over Ebar > splitting/2.

    Parameters
    ----------
    energy, sigma : ndarray, shape (n,)
        Mean kinetic energy [hartree], rising; cross section from P1/2 [bohr^2], not negative.
    splitting : float
        [hartree].
    temperature : float
        [K].
    reduced_mass : float
        [electron masses].
    down_share : float
        sigma_21/sigma_12 on one path [1]: 1/2 for populations, 1 for the gain of an orthonormal multipole.
    ratio : ndarray, shape (n,), or None
        Factor of sigma [1] that may change sign (multipole gain over population transfer); interpolated linearly in
        ln E while sigma is interpolated logarithmically.

    Returns
    -------
    Transfer

    Source
    ------
    notes/semiclassical.md; microreversibility of the S-matrix.
    """
    kT = KELVIN_HARTREE * temperature
    excess = np.geomspace(1e-3 * kT, 16 * kT, 241)
    mean = excess + 0.5 * splitting
    place = np.log(np.clip(mean, energy[0], energy[-1]))
    value = np.exp(CubicSpline(np.log(energy), np.log(np.maximum(sigma, 1e-300)))(place))
    if ratio is not None:
        value = value * np.interp(place, np.log(energy), ratio)
    terms = np.log(excess[1] / excess[0]) * excess * mean * value * np.exp(-excess / kT) / kT**2
    total = float(terms.sum())
    speed = float(mean_speed(temperature, reduced_mass))
    # d ln k/d ln T: 1/2 from vbar, -2 from 1/kT^2, <excess>/kT from the kernel; the threshold exp(-splitting/kT) up.
    common = float(terms @ (excess / kT) / total - 1.5) if total != 0 else 0.0
    return Transfer(
        Average(speed * total * float(np.exp(-splitting / kT)), common + splitting / kT),
        Average(down_share * speed * total, common),
    )
