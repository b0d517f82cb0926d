"""Phase shifts of an electron on one atom against closed forms, limits and an independent integration."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pytest
from scipy.integrate import quad, solve_ivp
from scipy.linalg import eigvalsh_tridiagonal
from scipy.special import dawsn, spherical_jn, spherical_yn

from pertcalc.errors import InputError
from pertcalc.one_electron.scattering import (
    BASIS,
    Separable,
    bound_states,
    cross_sections,
    inner_region,
    phase_shifts,
    polarisation_phase,
    scattering_length,
)


@dataclass(frozen=True)
class Potential:
    """Any W(u) with a polarisation tail beyond ``reach``."""

    W: Callable
    reach: float
    alpha_d: float = 0.0
    separable: tuple[Separable, ...] = ()
    tail_q: float = 0.0

    def local(self, u):
        return self.W(np.asarray(u, dtype=float))


def nothing(u):
    return np.zeros_like(u)


def damped(alpha_d, d, tail_q=0.0):
    def W(u):
        D = -np.expm1(-((u / d) ** 6))
        return -0.5 * alpha_d * D / u**4 - 0.5 * tail_q * (D / u**3) ** 2

    return W


def modulo_pi(x):
    return np.mod(np.asarray(x) + 0.5 * math.pi, math.pi) - 0.5 * math.pi


ENERGIES = np.array([1e-3, 0.02, 0.1, 0.5])
K = np.sqrt(2 * ENERGIES)


@pytest.mark.parametrize("l", [0, 1, 2])
def test_hard_sphere(l):
    """tan(delta_l) = j_l(ka)/y_l(ka); a = radius (any text on scattering)."""
    sphere = Potential(nothing, 4.0)
    wanted = np.arctan(spherical_jn(l, 2.0 * K) / spherical_yn(l, 2.0 * K))
    found = phase_shifts(sphere, ENERGIES, l, core_radius=2.0)
    assert modulo_pi(found - wanted) == pytest.approx(0, abs=1e-8)
    assert scattering_length(sphere, core_radius=2.0) == pytest.approx(2.0, abs=1e-9)


@pytest.mark.parametrize("depth", [0.1, 0.4, -0.6])
def test_square_well(depth):
    """delta_0 = arctan(k/q tan(qa)) - ka, a_s = a (1 - tan(qa)/(qa)); one bound state more at qa = (n + 1/2) pi."""
    a = 2.0
    well = Potential(lambda u: np.full_like(u, -depth), a)
    q = np.sqrt(2 * (ENERGIES + depth) + 0j)
    wanted = np.arctan((K / q * np.tan(q * a)).real) - K * a
    assert modulo_pi(phase_shifts(well, ENERGIES, 0) - wanted) == pytest.approx(0, abs=1e-9)
    q0 = np.sqrt(2 * depth + 0j)
    assert scattering_length(well) == pytest.approx((a * (1 - np.tan(q0 * a) / (q0 * a))).real, rel=1e-9)
    assert bound_states(well) == (round(math.sqrt(2 * depth) * a / math.pi) if depth > 0 else 0)


def test_separable_gaussian_closed_form():
    """One s term alone: tan(delta) = -(2/k) S f^2/(1 - S P), f = int sin(kr) r g dr, P by Dawson's function."""
    strength, gamma = 0.8, 0.4
    alone = Potential(nothing, 12.0, separable=(Separable(0, strength, gamma),))
    norm2 = 4.0 * (2 * gamma) ** 1.5 / math.sqrt(math.pi)
    C, a = norm2 * math.pi / (16 * gamma**3), 1 / (2 * gamma)
    P = 4 / math.pi * C * (K * math.sqrt(math.pi) * dawsn(math.sqrt(a) * K) - 0.5 * math.sqrt(math.pi / a))
    wanted = np.arctan(-2 / K * strength * C * K**2 * np.exp(-a * K**2) / (1 - strength * P))
    assert modulo_pi(phase_shifts(alone, ENERGIES, 0) - wanted) == pytest.approx(0, abs=1e-8)
    wanted_a = 2 * strength * C / (1 + strength * 2 / math.pi * C * math.sqrt(math.pi / a))
    assert scattering_length(alone) == pytest.approx(wanted_a, rel=1e-8)
    assert phase_shifts(alone, ENERGIES, 1) == pytest.approx(0, abs=1e-9), "an s term acts in the s wave only"


@pytest.mark.parametrize("l", [0, 1, 2, 3])
def test_born_limit(l):
    """tan(delta) -> -(2/k) <kr j_l|V|kr j_l> for a weak local and a weak separable potential."""
    weak, term = 1e-5, Separable(l, 1e-5, 0.3)
    potential = Potential(lambda u: weak * np.exp(-0.5 * u * u), 12.0, separable=(term,))
    for E, k in zip(ENERGIES, K, strict=True):
        local = quad(lambda r, k=k: weak * math.exp(-0.5 * r * r) * (k * r * spherical_jn(l, k * r)) ** 2, 0, 12)[0]
        overlap = quad(lambda r, k=k: k * r * spherical_jn(l, k * r) * r * float(term.g(r)), 0, 14)[0]
        wanted = -2 / k * (local + term.strength * overlap**2)
        assert float(phase_shifts(potential, E, l)) == pytest.approx(wanted, rel=1e-3, abs=1e-12)


@pytest.mark.parametrize("l", [0, 1, 2])
def test_form_factor_is_normalised(l):
    assert quad(lambda u: float(Separable(l, 1.0, 0.37).g(u)) ** 2 * u * u, 0, 20)[0] == pytest.approx(1, rel=1e-9)


@pytest.mark.parametrize("l", [1, 2, 3])
def test_polarisation_law_at_low_energy(l):
    """tan(delta_l) -> pi alpha k^2/[(2l-1)(2l+1)(2l+3)] whatever happens inside (pi alpha k^2/15 for p)."""
    potential = Potential(damped(11.1, 2.0), 14.0, 11.1)
    k = np.array([0.01, 0.005])
    ratio = phase_shifts(potential, k**2 / 2, l) / polarisation_phase(11.1, k, l)
    assert abs(ratio[0] - 1) < 0.05
    assert abs(ratio[1] - 1) < abs(ratio[0] - 1) * 0.7 + 5e-5  # l = 3: 1e-10 rad of rounding in a phase of 2e-6 rad


def test_s_wave_follows_modified_effective_range_theory():
    """tan(delta_0) = -ak[1 + (4 alpha/3) k^2 ln k] - pi alpha k^2/3 + O(k^3): the rest falls as k^3."""
    alpha = 11.1
    potential = Potential(damped(alpha, 2.0), 14.0, alpha, (Separable(0, 3.4, 0.47),))
    a = scattering_length(potential)
    k = np.array([0.02, 0.01, 0.005])
    law = -a * k * (1 + 4 * alpha / 3 * k**2 * np.log(k)) - math.pi * alpha * k**2 / 3
    rest = np.tan(phase_shifts(potential, k**2 / 2, 0)) - law
    orders = np.log(rest[:-1] / rest[1:]) / math.log(2)
    assert orders == pytest.approx(3.0, abs=0.35)
    assert abs(rest[-1]) < 0.01 * abs(law[-1])


@pytest.mark.parametrize(("l", "tail_q"), [(0, 0.0), (1, 0.0), (0, 40.0), (2, 40.0)])
def test_against_direct_integration(l, tail_q):
    """One outward integration to 3000 bohr and free waves there: a method that shares nothing with ours."""
    alpha, E = 16.8, 0.01
    W = damped(alpha, 2.2, tail_q)
    repulsion = 2.0
    potential = Potential(lambda u: W(u) + repulsion * np.exp(-0.3 * u * u), 14.0, alpha, tail_q=tail_q)

    def slope(r, y):
        return [y[1], 2 * (W(r) + repulsion * math.exp(-0.3 * r * r) - E + l * (l + 1) / (2 * r * r)) * y[0]]

    far, k = 3000.0, math.sqrt(2 * E)
    y = solve_ivp(slope, (1e-3, far), [1e-3 ** (l + 1), (l + 1) * 1e-3**l], rtol=1e-10, atol=1e-14, method="DOP853").y
    L, z = y[1, -1] / y[0, -1], k * far
    s, c = z * spherical_jn(l, z), -z * spherical_yn(l, z)
    ds = k * (spherical_jn(l, z) + z * spherical_jn(l, z, derivative=True))
    dc = -k * (spherical_yn(l, z) + z * spherical_yn(l, z, derivative=True))
    wanted = math.atan((s * L - ds) / (dc - c * L))
    assert modulo_pi(float(phase_shifts(potential, E, l)) - wanted) == pytest.approx(0, abs=2e-7)


def test_nothing_depends_on_where_the_tail_begins():
    near = Potential(damped(27.3, 2.0), 10.0, 27.3, (Separable(0, 3.0, 0.6),))
    far = Potential(near.W, 16.0, 27.3, near.separable)
    assert phase_shifts(near, ENERGIES, 0) == pytest.approx(phase_shifts(far, ENERGIES, 0), abs=1e-6)
    assert scattering_length(near) == pytest.approx(scattering_length(far), rel=1e-5)  # nearly bound: sensitive


def test_basis_is_converged():
    potential = Potential(damped(11.1, 1.9), 12.0, 11.1, (Separable(1, 2.0, 0.4),))
    more = inner_region(potential, 1, n=BASIS + 25).r_matrix(ENERGIES)
    assert inner_region(potential, 1).r_matrix(ENERGIES) == pytest.approx(more, rel=1e-5)


@pytest.mark.parametrize("l", [0, 1])
def test_bound_states_against_a_grid(l):
    """Count against eigenvalues < 0 of the second-difference matrix in a box of 150 bohr (short-range well)."""
    r = np.arange(1, 6000) * 0.025
    for depth in (0.5, 2.0, 6.0):
        diagonal = 1 / 0.025**2 - depth * np.exp(-0.3 * r * r) + l * (l + 1) / (2 * r * r)
        off = np.full(len(r) - 1, -0.5 / 0.025**2)
        grid = eigvalsh_tridiagonal(diagonal, off, select="v", select_range=(-depth, 0.0))
        found = bound_states(Potential(lambda u, d=depth: -d * np.exp(-0.3 * u * u), 12.0), l)
        assert found == len(grid)


def test_scattering_length_changes_sign_through_infinity_where_a_state_is_bound():
    """From below the threshold a -> -infinity, above +infinity (Levinson's theorem counts the state)."""
    lengths = {}
    for depth in (0.30, 0.317):  # sqrt(2 V) a = pi/2 at V = 0.3084, a = 2
        well = Potential(lambda u, d=depth: np.full_like(u, -d), 2.0)
        lengths[bound_states(well)] = scattering_length(well)
    assert lengths[0] < -20
    assert lengths[1] > 20


def test_cross_sections_of_a_hard_sphere_at_zero_energy():
    """Both tend to 4 pi a^2; here the scattering length of a repulsive Gaussian."""
    soft = Potential(lambda u: 5 * np.exp(-u * u), 7.0)
    elastic, transfer = cross_sections(soft, np.array([1e-8]))
    assert elastic[0] == pytest.approx(4 * math.pi * scattering_length(soft) ** 2, rel=1e-4)
    assert transfer[0] == pytest.approx(elastic[0], rel=1e-3)


@pytest.mark.parametrize("energy", [0.0, -1.0, math.nan])
def test_energy_must_be_positive(energy):
    with pytest.raises(InputError, match="finite and > 0"):
        phase_shifts(Potential(nothing, 4.0), energy, 0)


def test_partial_wave_must_exist():
    with pytest.raises(InputError, match="l = 9"):
        phase_shifts(Potential(nothing, 4.0), 0.1, 9)
    with pytest.raises(InputError, match="l = 0"):
        polarisation_phase(1.0, 0.1, 0)
