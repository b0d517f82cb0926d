"""Matrix elements of one electron between an alkali core and a gas atom against closed forms and plain 3-D sums."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
import pytest
from scipy.special import ive, sph_harm_y

from pertcalc.errors import InputError
from pertcalc.one_electron import interaction, pair
from pertcalc.one_electron.atom import solve_atom
from pertcalc.one_electron.core import HYDROGEN as PROTON
from pertcalc.one_electron.gas_orbitals import (
    GasOrbital,
    even_tempered,
    harmonics,
    legendre_element,
    partial_waves,
    values,
)
from pertcalc.one_electron.radial_basis import bspline_basis

# The exact reduced hydrogen functions u_nl(r); textbook formulas.
HYDROGEN = {
    (1, 0): lambda r: 2 * r * np.exp(-r),
    (2, 0): lambda r: r * (1 - r / 2) * np.exp(-r / 2) / math.sqrt(2),
    (2, 1): lambda r: r**2 * np.exp(-r / 2) / math.sqrt(24),
    (3, 1): lambda r: 8 / 27 / math.sqrt(6) * r**2 * (1 - r / 6) * np.exp(-r / 3),
    (3, 2): lambda r: 4 / 81 / math.sqrt(30) * r**3 * np.exp(-r / 3),
}


@dataclass(frozen=True)
class Term:
    l: int
    strength: float
    gamma: float


@dataclass(frozen=True)
class Gas:
    """A gas atom of tests: Gaussian, screened polarisation of the electron, cross term, separable terms."""

    height: float = 0.0
    beta: float = 0.5
    alpha: float = 0.0
    d: float = 1.5
    crossed: bool = False
    separable: tuple[Term, ...] = field(default=())

    @property
    def alpha_d(self):
        return self.alpha

    def damping(self, u):
        return -np.expm1(-((u / self.d) ** 6))

    def local(self, u):
        return self.height * np.exp(-self.beta * u**2) - self.alpha / (2 * u**4) * self.damping(u)

    def cross(self, r, R, cos_theta):
        if not self.crossed:
            return np.zeros_like(r * cos_theta)
        u2 = r**2 + R**2 - 2 * r * R * cos_theta
        return self.alpha * (R - r * cos_theta) / (R**2 * u2**1.5) * np.sqrt(self.damping(np.sqrt(u2)))


@dataclass(frozen=True)
class Atom:
    r: np.ndarray
    weights: np.ndarray
    energies: tuple
    radial: tuple
    core = PROTON

    def dipole_operator(self, r):
        return r


def bound_hydrogen() -> Atom:
    """1s 2s, 2p 3p, 3d on a fine grid."""
    grid = bspline_basis(60, 60.0)
    shells = [[(1, 0), (2, 0)], [(2, 1), (3, 1)], [(3, 2)]]
    return Atom(
        grid.r,
        grid.weights,
        tuple(np.array([-0.5 / n**2 for n, _ in shell]) for shell in shells),
        tuple(np.array([HYDROGEN[key](grid.r) for key in shell]) for shell in shells),
    )


def hydrogen(l_max: int, size: int = 40, r_max: float = 40.0):
    """Hydrogen in a box: complete enough for sums over states."""
    return solve_atom(PROTON, l_max, bspline_basis(size, r_max))


def expanded(V, R: float, largest: int, nodes: int) -> np.ndarray:
    """Multipoles of V(u, x) on R_GRID."""
    grid = interaction.make_grid(R_GRID, R, nodes)
    return interaction.multipoles(V(grid.u, grid.x), grid, largest)


R_GRID = np.array([0.01, 0.4, 2.0, 5.0, 5.9, 6.0, 6.3, 9.0, 30.0])


@pytest.mark.parametrize("R", [0.5, 6.0, 14.0])
def test_multipoles_of_a_gaussian(R):
    # exp(-b u^2) = e^{-b(r^2+R^2)} exp(2 b r R x); the plane-wave-like expansion has (2l+1) i_l(2 b r R).
    b, orders = 0.6, np.arange(17)
    z = 2 * b * R_GRID * R
    bessel = np.sqrt(np.pi / (2 * z)) * ive(orders[:, None] + 0.5, z)
    exact = (2 * orders[:, None] + 1) * np.exp(-b * (R_GRID - R) ** 2) * bessel
    found = expanded(lambda u, x: np.exp(-b * u**2), R, 16, 64)
    np.testing.assert_allclose(found, exact, atol=2e-9)


@pytest.mark.parametrize("R", [0.5, 6.0, 14.0])
def test_multipoles_of_the_coulomb_potential(R):
    # 1/u = sum r_<^l / r_>^{l+1} P_l(x): Laplace's expansion.
    orders = np.arange(9)[:, None]
    exact = np.minimum(R_GRID, R) ** orders / np.maximum(R_GRID, R) ** (orders + 1)
    found = expanded(lambda u, x: 1 / u, R, 8, 96)
    np.testing.assert_allclose(found, exact, atol=1e-8 * exact.max())


def test_multipoles_of_a_polynomial_in_the_cosine():
    # x^2 = 1/3 P_0 + 2/3 P_2.
    found = expanded(lambda u, x: x**2, 6.0, 4, 32)
    np.testing.assert_allclose(found, np.outer([1 / 3, 0, 2 / 3, 0, 0], np.ones_like(R_GRID)), atol=1e-10)


@pytest.mark.parametrize("l, order, k, m", [(0, 1, 1, 0), (1, 2, 1, 1), (2, 3, 3, 1), (4, 6, 6, 0), (5, 2, 3, 1)])
def test_angular_factors_are_the_integrals_of_three_harmonics(l, order, k, m):
    x, w = np.polynomial.legendre.leggauss(40)
    theta = np.arccos(x)
    legendre = np.polynomial.legendre.Legendre.basis(order)(x)
    exact = 2 * np.pi * np.sum(w * (sph_harm_y(l, m, theta, 0) * sph_harm_y(k, m, theta, 0)).real * legendre)
    assert legendre_element(l, order, k, m) == pytest.approx(exact, abs=1e-13)


def test_terms_of_the_polarised_gas_are_the_square_of_the_summed_field():
    # -alpha/2 |E_core + E_electron + E_p|^2 with Cartesian vectors; p is the dipole of the core, towards the electron;
    # fields of core and p damped at R, that of the electron at u.
    gas, R, p = Gas(alpha=3.0, d=2.5, crossed=True), 4.0, 0.7
    r, x = np.array([0.5, 2.0, 3.7, 6.0]), np.array([-0.9, 0.3, 0.95, 0.1])
    n = np.stack([np.sqrt(1 - x**2), 0 * x, x], axis=1)
    offset = np.array([0, 0, R]) - r[:, None] * n  # from the electron to the gas
    u = np.linalg.norm(offset, axis=1)
    core = np.array([0, 0, 1 / R**2]) * math.sqrt(gas.damping(R))
    electron = -offset / u[:, None] ** 3 * np.sqrt(gas.damping(u))[:, None]
    dipole = p * (3 * n[:, 2:] * np.array([0, 0, 1]) - n) / R**3 * math.sqrt(gas.damping(R))
    square = np.sum((core + electron + dipole) ** 2, axis=1)
    mixed = gas.cross(r, R, x) * math.sqrt(gas.damping(R))
    found = gas.local(u) - gas.alpha / (2 * R**4) * gas.damping(R) + mixed
    found += interaction.core_dipole(gas, R, r, u, x, np.full_like(x, p))
    np.testing.assert_allclose(found, -gas.alpha / 2 * square, rtol=1e-12)


# --- against plain three-dimensional sums ----------------------------------------------------------------------------

GAS = Gas(height=0.3, beta=0.4, alpha=2.0, d=2.0, crossed=True, separable=(Term(0, 0.7, 0.35), Term(1, -0.4, 0.5)))
R_PAIR, SMALL = 5.0, pair.Basis(2, 1, 96, ())


def sphere(atom: Atom, nx: int = 64, nphi: int = 48):
    """Nodes of space about the core: r, directions, weights (r part without r^2: the functions are reduced)."""
    x, w = np.polynomial.legendre.leggauss(nx)
    phi = 2 * np.pi * np.arange(nphi) / nphi
    sin = np.sqrt(1 - x**2)[:, None]
    n = np.stack([sin * np.cos(phi), sin * np.sin(phi), x[:, None] * np.ones_like(phi)], axis=-1).reshape(-1, 3)
    return n, np.repeat(w * 2 * np.pi / nphi, nphi)


def cartesian_hamiltonian(atom: Atom, gas: Gas, where: np.ndarray) -> np.ndarray:
    """H of s and p orbitals in real harmonics, the gas anywhere, summed over space: independent of pair.py."""
    n, weight = sphere(atom)
    harmonics = np.vstack([np.full(len(n), (4 * np.pi) ** -0.5), math.sqrt(3 / (4 * np.pi)) * n.T])
    orbitals = [(l, k, u) for l, parts in ((0, [0]), (1, [1, 2, 3])) for u in atom.radial[l] for k in parts]
    E = [e for l, parts in ((0, [0]), (1, [1, 2, 3])) for e in atom.energies[l] for _ in parts]
    H = np.diag(E).astype(float)
    R = np.linalg.norm(where)
    keep = atom.r < 45
    for r, w, column in zip(
        atom.r[keep], atom.weights[keep], np.stack([u for _, _, u in orbitals], 1)[keep], strict=True
    ):
        offset = r * n - where
        u = np.linalg.norm(offset, axis=1)
        V = (gas.local(u) + gas.cross(np.full_like(u, r), np.full_like(u, R), n @ where / R)) * weight
        psi = column[:, None] * harmonics[[k for _, k, _ in orbitals]]
        H += w * (psi * V) @ psi.T
    for term in gas.separable:
        H += term.strength * separable_sum(atom, orbitals, harmonics, n, weight, term, where)
    return H


def separable_sum(atom, orbitals, harmonics, n, weight, term, where):
    """sum_m |<orbital|g Y_m>|^2 of a separable term, the form factor normalised by its own quadrature."""
    s, ws = np.polynomial.legendre.leggauss(200)
    s, ws = 6 * (s + 1), 6 * ws
    norm = np.sum(ws * (s ** (term.l + 1) * np.exp(-term.gamma * s**2)) ** 2) ** -0.5
    offset = atom.r[:, None, None] * n - where
    bell = norm * np.exp(-term.gamma * np.sum(offset**2, axis=-1))
    parts = [bell * (4 * np.pi) ** -0.5] if term.l == 0 else [
        bell * math.sqrt(3 / (4 * np.pi)) * offset[..., axis] for axis in range(3)
    ]  # fmt: skip
    total = np.zeros((len(orbitals), len(orbitals)))
    for g in parts:
        overlap = [np.sum(u * atom.r * atom.weights * (g @ (weight * harmonics[k]))) for _, k, u in orbitals]
        total += np.outer(overlap, overlap)
    return total


@pytest.fixture(scope="module")
def bound() -> Atom:
    atom = bound_hydrogen()
    return Atom(atom.r, atom.weights, atom.energies[:2], atom.radial[:2])


def spectrum(atom: Atom, gas: Gas, R: float, basis: pair.Basis) -> np.ndarray:
    """Sigma levels once, Pi levels twice."""
    sigma, pi = (found.H for found in pair.hamiltonians(atom, gas, R, basis))
    return np.sort(np.concatenate([np.linalg.eigvalsh(sigma), np.repeat(np.linalg.eigvalsh(pi), 2)]))


@pytest.mark.parametrize("direction", [(0, 0, 1), (0, 0, -1), (1, 0, 0), (0.36, -0.48, 0.8)])
def test_spectrum_is_that_of_a_sum_over_space_wherever_the_gas_is(bound, direction):
    levels = np.linalg.eigvalsh(cartesian_hamiltonian(bound, GAS, R_PAIR * np.array(direction)))
    # 64 x 48 directions resolve the gas atom at 5 bohr to this accuracy.
    np.testing.assert_allclose(spectrum(bound, GAS, R_PAIR, SMALL), levels, atol=2e-7)


def test_elements_of_sigma_one_by_one(bound):
    H = cartesian_hamiltonian(bound, GAS, np.array([0, 0, R_PAIR]))
    sigma, pi = (found.H for found in pair.hamiltonians(bound, GAS, R_PAIR, SMALL))
    places = [0, 1, 4, 7]  # 1s, 2s, then z of 2p and 3p among (x, y, z) each
    np.testing.assert_allclose(sigma, H[np.ix_(places, places)], atol=2e-7)
    np.testing.assert_allclose(pi, H[np.ix_([2, 5], [2, 5])], atol=2e-7)


def test_an_s_term_leaves_pi_alone(bound):
    pi = pair.hamiltonians(bound, Gas(separable=(Term(0, 0.7, 0.35),)), R_PAIR, SMALL)[1]
    np.testing.assert_allclose(pi.H, np.diag(bound.energies[1]), atol=1e-15)


# --- Gaussians around the gas ----------------------------------------------------------------------------------------


@pytest.mark.parametrize("l, m", [(0, 0), (1, 0), (1, 1), (2, 0), (2, 1), (3, 1)])
def test_partial_waves_and_values_of_a_gas_orbital_agree_with_sums_over_the_sphere(l, m):
    orbital, R, r = GasOrbital(l, 0.3), 4.0, np.array([0.3, 2.0, 3.9, 7.0])
    x, w = np.polynomial.legendre.leggauss(120)
    # chi by its definition in Cartesian u = r - R z, at azimuth 0; Y from scipy.
    rx, rs = r[:, None] * x - R, r[:, None] * np.sqrt(1 - x**2)
    u = np.hypot(rx, rs)
    chi = orbital.norm * u**l * np.exp(-0.3 * u**2) * sph_harm_y(l, m, np.arctan2(rs, rx), 0).real
    np.testing.assert_allclose(
        values([orbital], np.broadcast_to(r[:, None], u.shape), R, u, x + 0 * u, m)[0], chi, atol=1e-13
    )
    waves = partial_waves(orbital, r, R, m, 6)
    for k in range(m, 7):
        Y = sph_harm_y(k, m, np.arccos(x), 0).real
        np.testing.assert_allclose(harmonics(x, m, 6)[k - m], Y, atol=1e-13)
        np.testing.assert_allclose(waves[k - m], 2 * np.pi * r * np.sum(w * Y * chi, axis=1), atol=1e-12)


def test_atomic_states_resolve_a_gas_orbital_completely():
    # sum over all l of Int w_l^2 dr = <chi|chi> = 1 (Parseval).
    grid = bspline_basis(60, 30.0)
    for orbital in (GasOrbital(0, 0.4), GasOrbital(1, 0.4), GasOrbital(2, 0.3)):
        waves = partial_waves(orbital, grid.r, 3.0, 0, 30)
        assert np.sum(waves**2 * grid.weights) == pytest.approx(1.0, abs=1e-8)


def test_energies_of_the_hydrogen_molecule_ion():
    # H2+ at 2 bohr, electronic energies 1s sigma, 2p sigma, 2p pi: exact in spheroidal coordinates, D. R. Bates,
    # K. Ledsham and A. L. Stewart, Phil. Trans. R. Soc. A 246, 215 (1953), digits FROM MEMORY. The second proton is
    # nothing but Gaussians here, whose cusp error is a few 1e-6: every term (kinetic, core, both attractions) counts.
    class SecondProton(Gas):
        def local(self, u):
            return -1 / u

    basis = pair.Basis(30, 6, 96, even_tempered({0: (0.05, 300.0, 12), 1: (0.1, 10.0, 6)}))
    sigma, pi = pair.hamiltonians(hydrogen(6, 44, 30.0), SecondProton(), 2.0, basis)
    np.testing.assert_allclose(sigma.lowest(2)[0], [-1.1026342, -0.6675344], atol=2e-5)
    np.testing.assert_allclose(pi.lowest(1)[0], [-0.4287718], atol=2e-5)


def test_gas_orbitals_do_what_many_partial_waves_do():
    # A strong repulsion and attraction far from the core: l = 14 without Gaussians against l = 5 with them.
    gas, R = Gas(height=0.5, beta=0.4, alpha=4.0, d=2.0, crossed=True), np.array([5.0, 8.0])
    many = pair.energies(hydrogen(11, 40), gas, R, pair.Basis(30, 11, 64, ()))
    few = pair.energies(hydrogen(5, 40), gas, R, pair.Basis(24, 5, 64))
    none = pair.energies(hydrogen(5, 40), gas, R, pair.Basis(24, 5, 64, ()))
    errors = {"with": 0.0, "without": 0.0}
    for name in "XAB":
        with_, without, wide = (getattr(one, name) for one in (few, none, many))
        assert np.all(with_ < without + 1e-8)  # Rayleigh-Ritz
        # What is left between the two, 0.1 cm^-1, is what partial waves beyond l = 11 would add.
        np.testing.assert_allclose(with_, wide, atol=6e-7)
        errors["with"] += np.sum(np.abs(with_ - wide))
        errors["without"] += np.sum(np.abs(without - wide))
    assert errors["without"] > 10 * errors["with"]


# --- laws ------------------------------------------------------------------------------------------------------------


def test_first_order_far_away_is_the_mean_square_field():
    # Core and electron polarise the gas: -alpha/2 <|F|^2>, F the dipole field of the atom: |F|^2 = (r^2 + 3 z^2)/R^6.
    # The core's own -alpha/(2 R^4) is added by hand. The next order is <r^4>/(<r^2> R^2) times a number of order one:
    # 0.6 % times that number for 2p at R = 100.
    R, alpha = 100.0, 1.0
    atom = bound_hydrogen()
    sigma, pi = (
        found.H for found in pair.hamiltonians(atom, Gas(alpha=alpha, crossed=True), R, pair.Basis(2, 2, 200, ()))
    )
    core = -alpha / (2 * R**4)
    r2 = [np.sum(atom.weights * atom.radial[l][0] ** 2 * atom.r**2) for l in (0, 1)]
    assert sigma[0, 0] + 0.5 + core == pytest.approx(-alpha * r2[0] / R**6, rel=0.01)
    # <z^2> = 3/5 <r^2> for p sigma, 1/5 for p pi.
    assert sigma[2, 2] + 0.125 + core == pytest.approx(-alpha / 2 * r2[1] * (1 + 9 / 5) / R**6, rel=0.04)
    assert pi[0, 0] + 0.125 + core == pytest.approx(-alpha / 2 * r2[1] * (1 + 3 / 5) / R**6, rel=0.04)


def test_weak_perturbation_is_the_sum_over_states():
    atom, basis, scale = hydrogen(4), pair.Basis(20, 4, 64, ()), 1e-3
    gas = Gas(height=scale, beta=0.4)
    sigma = pair.hamiltonians(atom, gas, 4.0, basis)[0].H
    E0 = np.concatenate([atom.energies[l][:20] for l in range(5)])
    V = sigma - np.diag(E0)
    second = V[0, 0] - np.sum(V[0, 1:] ** 2 / (E0[1:] - E0[0]))
    found = pair.energies(atom, gas, np.array([4.0]), basis)
    # Third order is smaller than second by about V/gap = 1e-3 * density / 0.4.
    assert found.X[0] == pytest.approx(second, rel=1e-6)
    assert abs(found.X[0] - V[0, 0]) > 1e-6 * abs(found.X[0])


def test_a_distant_charge_induces_the_exact_polarisability_of_hydrogen():
    # Charge q at R: E = -q <1/|r-R|> - alpha_1 q^2/(2 R^4) - alpha_2 q^2/(2 R^6), alpha_1 = 9/2, alpha_2 = 15 (exact,
    # textbook); third order in the field, -(1/2) B q^3.../R^7, is what 1 % leaves room for.
    q, R = 0.05, 14.0

    class Charge(Gas):
        def local(self, u):
            return -q / np.sqrt(u**2 + 0.01)

    found = pair.energies(hydrogen(3, 60), Charge(), np.array([R]), pair.Basis(40, 3, 128, ()))
    softening = q * 0.005 / R**3  # 1/sqrt(R^2 + 0.01) against 1/R
    assert found.X[0] + q / R - softening == pytest.approx(-(q**2) / 2 * (4.5 / R**4 + 15 / R**6), rel=0.01)


@pytest.mark.parametrize("gaussians", [(), pair.Basis().gas_orbitals], ids=["atomic", "with Gaussians"])
def test_larger_bases_lower_the_energies_and_the_estimate_bounds_the_change(gaussians):
    atom, gas, R = hydrogen(8, 44), Gas(height=1.5, beta=0.6, alpha=1.4, d=1.0), np.array([2.5, 4.0, 6.0])
    small = pair.energies(atom, gas, R, pair.Basis(28, 6, 64, gaussians))
    large = pair.energies(atom, gas, R, pair.Basis(40, 8, 96, gaussians))
    for name in "XAB":
        change = getattr(small, name) - getattr(large, name)
        estimate = small.error[name]
        assert np.all(change > -1e-9)  # Rayleigh-Ritz: min-max
        assert np.all(estimate > 0)
        assert np.all(change < 3 * estimate + 1e-9), name


def test_basis_rules_are_reported_together():
    with pytest.raises(InputError) as caught:
        pair.Basis(n_states=1, l_max=99, nodes=3)
    assert [text.split(" ")[0] for text in caught.value.problems] == ["n_states", "l_max", "nodes"]
    with pytest.raises(InputError, match="l_max = 5: the atom has partial waves up to l = 2"):
        pair.energies(bound_hydrogen(), Gas(), np.array([5.0]), pair.Basis(2, 5, 64, ()))
