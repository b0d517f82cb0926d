"""Maxwell averages and detailed balance against closed forms (gamma functions, constant collision strength)."""

from __future__ import annotations

from math import exp, gamma, log

import numpy as np
import pytest
from scipy.integrate import quad

from pertcalc.constants import AMU_AU, KELVIN_HARTREE
from pertcalc.thermal import balanced_transfer, effort, energy_grid, maxwell, mean_speed

MASS = 20.0 * AMU_AU
T = 350.0
KT = T * KELVIN_HARTREE
# Wide enough for the kernel to vanish at both ends: what is tested here is the rule, not where a table ends.
WIDE = np.geomspace(1e-7 * KT, 40 * KT, 81)


def test_constant_cross_section_gives_the_mean_speed():
    average = maxwell(WIDE, np.full(WIDE.size, 300.0), T, MASS)
    assert average.rate == pytest.approx(300.0 * float(mean_speed(T, MASS)), rel=1e-9)
    assert average.exponent == pytest.approx(0.5, abs=1e-8)
    # hard sphere: mean speed of a pair from its definition
    assert mean_speed(T, MASS) == pytest.approx(np.sqrt(8 * KT / (np.pi * MASS)), rel=1e-14)


@pytest.mark.parametrize("p", [-0.7, -0.2, 0.3, 1.0, 2.0])
def test_power_law_gives_gamma_functions_and_its_exponent(p):
    """sigma = E^p: k = vbar (kT)^p Gamma(2 + p), d ln k/d ln T = 1/2 + p; van der Waals width is p = -1/5, T^0.3."""
    average = maxwell(WIDE, WIDE**p, T, MASS)
    assert average.rate == pytest.approx(float(mean_speed(T, MASS)) * KT**p * gamma(2 + p), rel=1e-7)
    assert average.exponent == pytest.approx(0.5 + p, abs=1e-6)


@pytest.mark.parametrize("temperatures", [[T], [300.0, 500.0]])
@pytest.mark.parametrize("p", [-0.2, 0.0, 1.0, 2.0])
def test_table_of_ordinary_use_loses_little_at_its_ends(temperatures, p):
    """Energies from 0.03 kT to 14 kT: 0.1 per cent for a cross section that does not vanish at low energy."""
    energy = energy_grid(np.array(temperatures))
    for T_i in temperatures:
        average = maxwell(energy, energy**p, T_i, MASS)
        exact = float(mean_speed(T_i, MASS)) * (KELVIN_HARTREE * T_i) ** p * gamma(2 + p)
        assert average.rate == pytest.approx(exact, rel=1.5e-3)
        assert average.exponent == pytest.approx(0.5 + p, abs=4e-3)


def test_oscillating_cross_section():
    """1 + cos(6 ln x)/3, two periods per energy decade and more, against scipy's quadrature."""

    def sigma(x):
        return 1 + np.cos(6 * np.log(x)) / 3

    energy = energy_grid(np.array([T]), 0.18)
    exact = quad(lambda u: np.exp(2 * u - np.exp(u)) * sigma(np.exp(u)), -16, 4, epsabs=1e-12, limit=400)[0]
    average = maxwell(energy, sigma(energy / KT), T, MASS)
    assert average.rate == pytest.approx(float(mean_speed(T, MASS)) * exact, rel=1e-3)


def test_exponent_is_the_slope_of_the_rate():
    """d ln k/d ln T against a centred difference: a cross section with a threshold, one that changes sign."""
    for sigma in (np.exp(-KT / WIDE), 1 - WIDE / (1.2 * KT)):
        h = 1e-4
        up, down = (maxwell(WIDE, sigma, T * (1 + s * h), MASS).rate for s in (1, -1))
        slope = (log(abs(up)) - log(abs(down))) / (log(1 + h) - log(1 - h))
        assert maxwell(WIDE, sigma, T, MASS).exponent == pytest.approx(slope, rel=1e-6)


def test_rates_are_linear_and_nothing_gives_nothing():
    assert maxwell(WIDE, 0 * WIDE, T, MASS) == pytest.approx(maxwell(WIDE, 0 * WIDE, T, MASS))
    assert maxwell(WIDE, 0 * WIDE, T, MASS).rate == 0.0
    a, b = WIDE**0.3, np.exp(-WIDE / KT)
    together = maxwell(WIDE, 2 * a - 3 * b, T, MASS).rate
    assert together == pytest.approx(2 * maxwell(WIDE, a, T, MASS).rate - 3 * maxwell(WIDE, b, T, MASS).rate, rel=1e-13)


def test_energy_grid():
    energy = energy_grid(np.array([300.0, 450.0]))
    assert energy.size % 2 == 1  # every second one spans the same range
    assert energy[0] == pytest.approx(0.03 * 300.0 * KELVIN_HARTREE)
    assert energy[-1] == pytest.approx(14.0 * 450.0 * KELVIN_HARTREE)
    assert np.ptp(np.diff(np.log(energy))) < 1e-12
    assert energy_grid(np.array([300.0]), 0.1).size > 2 * energy_grid(np.array([300.0]), 0.3).size


def test_effort_is_largest_where_the_average_weighs_most():
    energy = energy_grid(np.array([T]))
    share = effort(energy, np.array([T]), 0.35, 0.3)
    assert abs(log(energy[np.argmax(share)] / (2 * KT))) < 0.36  # x^2 e^-x peaks at x = 2
    assert share.max() == pytest.approx(1.0, abs=0.02)
    assert share.min() == 0.3
    assert np.all(effort(energy, np.array([T, 2 * T]), 0.35, 0.3) >= share - 1e-12)


# --- detailed balance -----------------------------------------------------------------------------------------------

ENERGY = energy_grid(np.array([T]), 0.2)
STRUCTURED = 20 + 15 * np.sin(3 * np.log(ENERGY / KT)) + 5 * ENERGY / KT


@pytest.mark.parametrize("splitting", [0.0, 1.5e-6, 2.6e-4, 2.5e-3])
@pytest.mark.parametrize("temperature", [250.0, T, 400.0])
def test_up_and_down_are_in_exact_detailed_balance(splitting, temperature):
    """k(1/2 -> 3/2)/k(3/2 -> 1/2) = 2 exp(-splitting/kT); orthonormal multipoles exp(-splitting/kT)."""
    boltzmann = exp(-splitting / (temperature * KELVIN_HARTREE))
    transfer = balanced_transfer(ENERGY, STRUCTURED, splitting, temperature, MASS)
    assert transfer.up.rate / transfer.down.rate == pytest.approx(2 * boltzmann, rel=1e-12)
    gain = balanced_transfer(ENERGY, STRUCTURED, splitting, temperature, MASS, 1.0, np.cos(ENERGY / KT))
    assert gain.up.rate / gain.down.rate == pytest.approx(boltzmann, rel=1e-12)
    # d ln(up/down)/d ln T of the ratio itself
    assert transfer.up.exponent - transfer.down.exponent == pytest.approx(splitting / (temperature * KELVIN_HARTREE))


@pytest.mark.parametrize("p", [0.0, 1.0, 2.0])
@pytest.mark.parametrize("splitting", [1e-6, 2.6e-4])
def test_power_law_transfer(p, splitting):
    """Ebar sigma(Ebar) = (Ebar - splitting/2)^p: k_down = vbar/2 (kT)^(p-1) Gamma(1 + p), exponent p - 1/2."""
    mean = np.geomspace(0.5 * splitting * (1 + 1e-4), 40 * KT, 1500)
    sigma = (mean - 0.5 * splitting) ** p / mean
    found = balanced_transfer(mean, sigma, splitting, T, MASS)
    exact = 0.5 * float(mean_speed(T, MASS)) * KT ** (p - 1) * gamma(1 + p)
    assert found.down.rate == pytest.approx(exact, rel=2e-3)
    assert found.down.exponent == pytest.approx(p - 0.5, abs=5e-3)


def test_transfer_without_splitting_is_the_ordinary_average():
    plain = maxwell(ENERGY, STRUCTURED, T, MASS)
    found = balanced_transfer(ENERGY, STRUCTURED, 0.0, T, MASS)
    assert found.up.rate == pytest.approx(plain.rate, rel=2e-3)
    assert found.down.rate == pytest.approx(plain.rate / 2, rel=2e-3)


def test_gain_follows_its_ratio():
    """A constant ratio goes through as it is, of either sign, and without the factor 1/2 downwards."""
    plain = balanced_transfer(ENERGY, STRUCTURED, 2.6e-4, T, MASS)
    gain = balanced_transfer(ENERGY, STRUCTURED, 2.6e-4, T, MASS, 1.0, np.full(ENERGY.size, -0.3))
    assert gain.up.rate == pytest.approx(-0.3 * plain.up.rate, rel=1e-12)
    assert gain.down.rate == pytest.approx(-0.6 * plain.down.rate, rel=1e-12)
