"""Levels and counts against closed forms, limits and integrations that share nothing with the package's methods."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad, solve_ivp
from scipy.special import gamma, gammainc

from pertcalc.constants import HARTREE_CM1, KELVIN_HARTREE
from pertcalc.curves.files import load_default
from pertcalc.curves.forms import LennardJones, VanDerWaals
from pertcalc.molecules import grid as grid_module
from pertcalc.molecules.counting import count_levels, node_counts, wkb_counts
from pertcalc.molecules.equilibrium import (
    classical_bound,
    classical_metastable,
    equilibrium,
    phase_space_count,
    state_sum,
    thermal_volume,
)
from pertcalc.molecules.grid import mapped_grid, points_needed
from pertcalc.molecules.levels import bound_levels
from pertcalc.molecules.near_dissociation import near_dissociation
from pertcalc.molecules.quasibound import quasibound_levels
from pertcalc.molecules.radial import radial_problem, state_problem
from tests.well_cases import through_well

DEPTH = 100 / HARTREE_CM1


def morse(De: float, Re: float, a: float):
    return lambda R: De * np.exp(-a * (R - Re)) * (np.exp(-a * (R - Re)) - 2)


def morse_levels(De: float, a: float, mu: float) -> np.ndarray:
    """E_v = -(sqrt(De) - a (v + 1/2)/sqrt(2 mu))^2, v + 1/2 < sqrt(2 mu De)/a: any text on molecular spectra."""
    v = np.arange(int(np.sqrt(2 * mu * De) / a + 0.5))
    return -((np.sqrt(De) - a * (v + 0.5) / np.sqrt(2 * mu)) ** 2)


@pytest.fixture(scope="module")
def rb_ar():
    problem = state_problem(load_default("Rb", "Ar"), "X")
    levels = bound_levels(problem)
    return problem, levels, quasibound_levels(problem, levels)


@pytest.mark.parametrize(("a", "mu"), [(0.6, 50_000.0), (0.4, 8_000.0), (0.8, 200_000.0), (0.5, 1_500.0)])
def test_morse_levels_and_count(a, mu):
    exact = morse_levels(DEPTH, a, mu)
    problem = radial_problem(morse(DEPTH, 12.0, a), mu, 0.0)
    levels = bound_levels(problem)
    energy = levels.energy[levels.N == 0]
    assert len(energy) == len(exact)
    assert np.abs(energy - exact).max() < 1e-8 * DEPTH
    counts = count_levels(problem, levels)
    assert counts.spectral[0] == counts.nodes[0] == counts.wkb[0] == len(exact)


def test_harmonic_limit():
    # Low levels of a parabola 24 quanta deep, cut off where their wave functions are below exp(-20).
    mu, Re, omega = 2_000.0, 14.0, 60 / HARTREE_CM1
    D = 24 * omega

    def parabola(R):
        V = 0.5 * mu * omega**2 * (R - Re) ** 2 - D
        return np.where(R > Re, np.minimum(V, 0.0), np.minimum(V, 3 * D))

    levels = bound_levels(radial_problem(parabola, mu, 0.0), points=260)
    exact = -D + omega * (np.arange(4) + 0.5)
    assert np.abs(levels.energy[levels.N == 0][:4] / exact - 1).max() < 1e-8


def test_rotational_constant_is_the_slope_in_n_times_n_plus_one(rb_ar):
    # Hellmann and Feynman: dE/d[N(N+1)] = <1/(2 mu R^2)>; from N = 0, 1, 2 by Richardson.
    _, levels, _ = rb_ar
    E = [levels.energy[(levels.N == N) & (levels.v < 6)] for N in (0, 1, 2)]
    one, two = (E[1] - E[0]) / 2, (E[2] - E[0]) / 6
    slope = one + (one - two) * 2 / 4  # linear in N(N+1) = 0, 2, 6
    B = levels.rotation[(levels.N == 0) & (levels.v < 6)]
    assert np.abs(slope / B - 1).max() < 1e-4


def plain_node_count(potential, mu: float, N: int, start: float, end: float, n: int) -> int:
    """Textbook Numerov integration of u at E = 0 on a uniform grid, counting sign changes."""
    R = np.linspace(start, end, n)
    h = R[1] - R[0]
    w = h * h / 12 * (2 * mu * potential(R) + N * (N + 1) / R**2)
    before, here, nodes = 0.0, 1e-30, 0
    for i in range(1, n - 1):
        after = ((2 + 10 * w[i]) * here - (1 - w[i - 1]) * before) / (1 - w[i + 1])
        nodes += (after < 0) != (here < 0)
        scale = 1e-30 / abs(after) if abs(after) > 1e30 else 1.0
        before, here = here * scale, after * scale
    return nodes


@pytest.mark.parametrize("strength", [30.0, 250.0, 2500.0])
def test_lennard_jones_counts_against_plain_numerov(strength):
    De, Rm = 40 / HARTREE_CM1, 10.0
    sigma = Rm / 2 ** (1 / 6)
    curve = LennardJones(De, Rm)
    mu = strength / (2 * De * sigma**2)
    problem = radial_problem(curve, mu, curve.C6)
    levels = bound_levels(problem)
    counts = count_levels(problem, levels)
    highest = len(counts.nodes) - 1
    assert np.array_equal(counts.spectral, counts.nodes)
    for N in sorted({0, 1, highest // 2, highest, highest + 1}):
        expected = plain_node_count(curve, mu, N, 0.62 * Rm, 300.0, 30_000)
        assert (counts.nodes[N] if N <= highest else 0) == expected, N


def test_lennard_jones_critical_strength():
    # 2 mu eps sigma^2/hbar^2 = 5.590142 for the first bound state (literature value as given in reference/check_values;
    # FROM MEMORY of the literature on quantum clusters). The scattering length has its pole there.
    De, Rm = 20 / HARTREE_CM1, 10.0
    sigma = Rm / 2 ** (1 / 6)
    curve = LennardJones(De, Rm)

    def found(strength: float):
        nodes, length = node_counts(radial_problem(curve, strength / (2 * De * sigma**2), curve.C6), 2.0)
        return nodes[0], length

    below, above = found(5.590142 * (1 - 3e-6)), found(5.590142 * (1 + 3e-6))
    assert below[0] == 0 and above[0] == 1
    assert below[1] < -1e5 and above[1] > 1e5


def test_three_counts_agree_where_wkb_should(rb_ar):
    problem, levels, _ = rb_ar
    counts = count_levels(problem, levels)
    assert counts.agree and counts.remarks == ()
    assert counts.nodes.sum() == len(levels.v)


def test_langer_term_is_the_r6_correction_at_n_zero():
    # Int sqrt(b^2/R^4 - 1/4) dR/R falls short of Int b/R^3 dR by exactly pi/8 (module text of counting): so both
    # forms of the WKB number agree for a pure r^-6 tail of many levels.
    curve = VanDerWaals(338.0, 8.0)
    problem = radial_problem(curve, 4e5, curve.C6)
    with_r6 = wkb_counts(problem, np.array([0.0])).real[0]
    R = np.geomspace(problem.r_in, 8000.0, 400_000)
    kinetic = np.clip(-2 * 4e5 * R * R * curve(R) - 0.25, 0, None)
    langer = np.trapezoid(np.sqrt(kinetic), np.log(R)) / np.pi + 0.5
    assert with_r6 == pytest.approx(langer, abs=2e-3)


def test_remark_names_the_rotation_where_ways_differ():
    problem = state_problem(through_well("K", "Ar"), "X")
    counts = count_levels(problem, bound_levels(problem))
    assert np.array_equal(counts.spectral, counts.nodes)
    wrong = np.flatnonzero(counts.wkb != counts.nodes)
    assert wrong.size and not counts.agree
    assert all(str(N) in counts.remarks[0] for N in wrong)


def test_r6_law_slope():
    # LeRoy and Bernstein (1970): within 1 % for all but the very last level, which feels the limit itself.
    curve = VanDerWaals(338.0, 8.0)
    problem = radial_problem(curve, 2e5, curve.C6)
    levels = bound_levels(problem)
    law = near_dissociation(problem, levels, last=6)
    assert law is not None
    assert np.abs(law.ratios[:-1] - 1).max() < 0.01
    assert law.count == np.count_nonzero(levels.N == 0)
    # v at the limit by the law and by the WKB action are the same number.
    assert law.v_D == pytest.approx(wkb_counts(problem, np.array([0.0])).real[0] - 0.875, abs=0.05)


@pytest.mark.parametrize("pair", [("Rb", "Kr"), ("Cs", "He")])
def test_scattering_length_against_an_ordinary_integration(pair):
    curves = load_default(*pair)
    problem = state_problem(curves, "X")
    mu, end = problem.reduced_mass, 2000.0

    def equation(R, y):
        return [y[1], 2 * mu * float(problem.potential(np.array(R))) * y[0]]

    # From deep inside the wall: the solution grows by e^36 on the way out and the start is forgotten.
    start = problem.r_in
    kappa = np.sqrt(2 * mu * float(problem.potential(np.array(start))))
    path = solve_ivp(equation, (start, end), [1e-8, 1e-8 * kappa], method="DOP853", rtol=1e-10, atol=1e-30)
    u, slope = path.y[:, -1]
    a = end - u / slope
    # First-order effect of the tail beyond the end, as any text on effective-range theory derives it.
    a -= 2 * mu * curves.X.C6 * quad(lambda R: (R - a) ** 2 / R**6, end, np.inf)[0]
    _, length = node_counts(problem, 2.0)
    assert length == pytest.approx(a, abs=max(2e-3 * abs(a), 0.02))


def test_wave_functions_are_orthonormal_on_a_finer_grid(rb_ar):
    # The sine functions of the grid are summed at five times as many points; overlaps there are integrals over R.
    problem, levels, _ = rb_ar
    n = levels.points
    grid = mapped_grid(problem, n)
    c = np.linalg.eigh(grid.kinetic + np.diag(problem.potential(grid.R)))[1][:, :10]
    modes = np.arange(1, n + 1)
    sines = np.sin(np.pi * np.outer(np.arange(1, n + 1), modes) / (n + 1))
    amplitudes = 2 / (n + 1) * sines.T @ (c / grid.jacobian[:, None])
    fine = mapped_grid(problem, 5 * (n + 1) - 1)
    w = np.sin(np.pi * np.outer(np.arange(1, 5 * (n + 1)) / 5, modes) / (n + 1)) @ amplitudes
    J = 5 * fine.jacobian[:, None]
    overlaps = (w * J).T @ (w * J) / 5
    assert np.abs(overlaps - np.eye(10)).max() < 1e-6


def test_basis_and_range_doubling_stay_inside_the_stated_error(rb_ar, monkeypatch):
    problem, levels, _ = rb_ar
    dense = bound_levels(problem, points=2 * levels.points)
    assert np.array_equal(dense.N, levels.N)
    assert np.abs(dense.energy - levels.energy).max() <= 3 * levels.numerical_error + 1e-15
    monkeypatch.setattr(grid_module, "R_OUT", 2 * grid_module.R_OUT)
    wide = bound_levels(problem)
    assert np.abs(wide.energy - levels.energy).max() <= 3 * levels.numerical_error + 1e-14


@pytest.mark.parametrize("fraction", [0.72, 0.85])
def test_error_estimate_bounds_the_true_error(fraction):
    a, mu = 0.6, 50_000.0
    problem = radial_problem(morse(DEPTH, 10.0, a), mu, 0.0)
    levels = bound_levels(problem, points=int(fraction * points_needed(problem)))
    true = np.abs(levels.energy[levels.N == 0] - morse_levels(DEPTH, a, mu)).max()
    assert 0 < true <= 3 * levels.numerical_error


@pytest.mark.parametrize("state", ["X", "A3/2", "X table"])
def test_levels_of_rotation_against_a_uniform_grid(state):
    # Colbert and Miller's sinc DVR on a uniform grid in R: nothing in common but the potential.
    curves = through_well("K", "Kr") if state == "X" else load_default("K", "Kr")
    problem = state_problem(curves, state.split()[0])
    levels = bound_levels(problem)
    # The knots of a table's spline limit the convergence: there the stated error counts.
    tolerance = 3 * levels.numerical_error if state == "X table" else 1e-7 * problem.depth
    assert tolerance < 1e-6 * problem.depth
    n = 500
    R = np.linspace(0.9 * problem.r_in, 30.0, n)
    i = np.subtract.outer(np.arange(n), np.arange(n))
    with np.errstate(divide="ignore"):
        T = np.where(i == 0, np.pi**2 / 3, 2.0 / i**2 * (-1.0) ** i) / (2 * problem.reduced_mass * (R[1] - R[0]) ** 2)
    for N in (0, 20, 40):
        E = np.linalg.eigvalsh(T + np.diag(problem.effective(R, float(N))))
        ours = levels.energy[levels.N == N]
        deep = ours < -0.05 * problem.depth  # the uniform box ends at 30 bohr
        assert deep.sum() >= 2
        assert np.abs(E[: deep.sum()] - ours[deep]).max() < tolerance


def plain_phase_shift(problem, N: int, E: np.ndarray, end: float) -> np.ndarray:
    """Phase shifts from a Numerov integration in ln R and Riccati-Bessel functions at the end [rad, modulo pi]."""
    from scipy.special import spherical_jn, spherical_yn

    h, mu = 6e-4, problem.reduced_mass
    R = np.exp(np.arange(np.log(problem.r_in), np.log(end), h))
    Q = (2 * mu * R * R * problem.potential(R) + (N + 0.5) ** 2)[:, None] - 2 * mu * np.outer(R * R, E)
    T = 1 - h * h / 12 * Q
    ratio = 12 / T[0] - 10
    for n in range(1, len(R) - 1):
        ratio = 12 / T[n] - 10 - 1 / ratio
    ratio = ratio * T[-2] / T[-1] * np.sqrt(R[-1] / R[-2])
    k = np.sqrt(2 * mu * E)

    def riccati(x):
        return x * spherical_jn(N, x), -x * spherical_yn(N, x)

    (s1, c1), (s2, c2) = riccati(k * R[-2]), riccati(k * R[-1])
    return np.unwrap(2 * np.arctan2(-(s2 - ratio * s1), c2 - ratio * c1)) / 2


@pytest.mark.parametrize(("N", "v"), [(18, 7), (23, 6), (33, 4), (38, 3)])
def test_quasibound_energy_and_width_against_the_phase_shift(rb_ar, N, v):
    # A resonance raises the phase by pi; d(delta)/dE has its peak at the level and its half maximum Gamma apart.
    problem, _, quasi = rb_ar
    (i,) = np.flatnonzero((quasi.N == N) & (quasi.v == v))
    width, energy = quasi.width[i], quasi.energy[i]
    E = energy + width * np.linspace(-2, 2, 161)
    rate = np.gradient(plain_phase_shift(problem, N, E, 300.0), E)
    inside = E[rate > 0.5 * rate.max()]
    assert E[rate.argmax()] == pytest.approx(energy, abs=0.1 * width)
    assert inside[-1] - inside[0] == pytest.approx(width, rel=0.08)


def test_ways_to_a_width_agree_where_both_hold(rb_ar):
    _, _, quasi = rb_ar
    both = np.isfinite(quasi.width_delay) & ~quasi.by_delay
    assert both.sum() >= 8
    assert np.abs(quasi.width_delay[both] / quasi.width_flux[both] - 1).max() < 0.05
    # WKB within 25 % over sixty orders of magnitude; in the last per cent below the top of the barrier, where its two
    # turning points meet, within a factor two.
    ratio = np.abs(np.log(quasi.width_wkb / quasi.width_flux))
    top = quasi.energy > 0.99 * quasi.barrier
    assert 0 < top.sum() < 0.1 * len(top)
    assert ratio[~top].max() < 0.25 and ratio.max() < np.log(2)
    assert quasi.width_flux.min() * HARTREE_CM1 < 1e-60


def test_quasibound_levels_lie_under_their_barrier_and_go_on_where_the_bound_end(rb_ar):
    _, levels, quasi = rb_ar
    assert np.all((quasi.energy > 0) & (quasi.energy < quasi.barrier) & (quasi.inner < quasi.outer))
    for N in np.unique(quasi.N):
        v = np.concatenate([levels.v[levels.N == N], quasi.v[quasi.N == N]])
        assert np.array_equal(v, np.arange(len(v)))


def test_quasibound_energies_stay_inside_the_stated_error(rb_ar, monkeypatch):
    from pertcalc.molecules import numerov

    problem, levels, quasi = rb_ar
    monkeypatch.setattr(numerov, "STEP", numerov.STEP / 3)
    finer = quasibound_levels(problem, levels, delays=False)
    flux = ~quasi.by_delay
    assert np.array_equal(finer.N, quasi.N)
    assert np.abs(finer.energy - quasi.energy)[flux].max() <= 1.5 * quasi.numerical_error


def test_square_well_constant():
    # e P(3/2, 1) = 1.162319 for D = kT (check_values: closed form).
    T, R0 = 300.0, 12.0
    kT = T * KELVIN_HARTREE
    K = classical_bound(lambda R: np.where(R < R0, -kT, 0.0), 1e-3, T)
    assert K / (4 * np.pi * R0**3 / 3) == pytest.approx(1.162319, rel=2e-3)
    assert np.e * gammainc(1.5, 1.0) == pytest.approx(1.162319, abs=1e-6)


def test_constant_is_the_integral_of_the_partition_function():
    # One level: K = lambda^3 e^{-E/kT}, lambda the thermal de Broglie wavelength h/sqrt(2 pi mu kT).
    mu, T, E = 5000.0, 250.0, -3e-4
    kT = T * KELVIN_HARTREE
    wavelength = 2 * np.pi / np.sqrt(2 * np.pi * mu * kT)
    assert thermal_volume(mu, T) == pytest.approx(wavelength**3, rel=1e-12)
    assert state_sum(np.array([2]), np.array([E]), T) == pytest.approx(5 * np.exp(-E / kT), rel=1e-12)


@pytest.mark.parametrize("pair", [("Rb", "Kr"), ("Cs", "Xe"), ("K", "Xe")])
def test_quantum_and_classical_constants_agree_for_heavy_pairs(pair):
    problem = state_problem(load_default(*pair), "X")
    levels = bound_levels(problem)
    found = equilibrium(problem, levels, quasibound_levels(problem, levels, delays=False), 300.0)
    assert found.bound == pytest.approx(found.classical, rel=0.03)
    assert found.metastable == pytest.approx(found.classical_metastable, rel=0.03)


@pytest.mark.parametrize(("pair", "tolerance"), [(("Rb", "Ar"), 0.02), (("Rb", "Kr"), 0.01), (("Cs", "Xe"), 0.01)])
def test_sum_over_levels_is_the_phase_space_count(pair, tolerance):
    problem = state_problem(load_default(*pair), "X")
    levels = bound_levels(problem)
    assert np.sum(2 * levels.N + 1) == pytest.approx(phase_space_count(problem), rel=tolerance)


def test_classical_metastable_constant_against_random_points_in_phase_space(rb_ar):
    problem, _, _ = rb_ar
    T, mu, size, n = 300.0, problem.reduced_mass, 50.0, 400_000
    kT = T * KELVIN_HARTREE
    draw = np.random.default_rng(5)
    # Held pairs are slow: momenta are drawn from a narrower Gaussian and distances evenly, the weight makes up for it.
    narrow = 0.35
    R = size * draw.random(n)
    p = draw.normal(scale=narrow * np.sqrt(mu * kT), size=(3, n))  # radial, and two across
    L = R * np.hypot(p[1], p[2])
    E = np.sum(p * p, axis=0) / (2 * mu) + problem.potential(R)
    grid = np.geomspace(problem.position * 0.7, 400.0, 3000)
    table = np.linspace(0, 200, 801)
    tops = np.zeros((2, len(table)))
    for i, l in enumerate(table):
        V = problem.potential(grid) + l * l / (2 * mu * grid**2)
        peaks = np.flatnonzero((V[1:-1] > V[:-2]) & (V[1:-1] > V[2:])) + 1
        tops[:, i] = (V[peaks[-1]], grid[peaks[-1]]) if peaks.size else (-1.0, 0.0)
    held = (E > 0) & (E < np.interp(L, table, tops[0])) & (R < np.interp(L, table, tops[1]))
    held &= R > problem.position / 2
    R = np.where(held, R, problem.position)
    thermal = narrow**3 * np.exp(-np.sum(p * p, axis=0) / (2 * mu * kT) * (1 - 1 / narrow**2))
    weight = np.where(held, 4 * np.pi * R**2 * size * thermal * np.exp(-problem.potential(R) / kT), 0.0)
    found, error = weight.mean(), weight.std() / np.sqrt(n)
    assert error < 0.04 * found
    assert classical_metastable(problem, T) == pytest.approx(found, abs=4 * error)


def test_pure_r6_scattering_length_in_closed_form():
    # Zero-energy solution of -C6/R^6: sqrt(R) J_{+-1/4}(b^2/2R^2); from the node nearest the core outwards the length
    # is (b/2) Gamma(3/4)/Gamma(5/4) J_{-1/4}(x)/J_{1/4}(x) with x at that node (any text on r^-6 scattering).
    from scipy.optimize import brentq
    from scipy.special import jv

    curve = VanDerWaals(338.0, 8.0)
    mu = 2e5
    problem = radial_problem(curve, mu, curve.C6)
    b2 = np.sqrt(2 * mu * 338.0)
    _, length = node_counts(problem, 2.0)
    mixing = length / (np.sqrt(b2) / 2 * gamma(0.75) / gamma(1.25))

    def u(R: float) -> float:
        x = b2 / (2 * R * R)
        return jv(-0.25, x) - mixing * jv(0.25, x)

    # The same solution by an ordinary integration has its outermost node where the closed form has it.
    def equation(R, y):
        return [y[1], 2 * mu * float(curve(np.array(R))) * y[0]]

    path = solve_ivp(
        equation, (7.7, 40.0), [1e-8, 1e-6], method="DOP853", rtol=1e-10, atol=1e-30, dense_output=True, max_step=0.02
    )
    R = np.linspace(20.0, 40.0, 4000)
    values = path.sol(R)[0]
    flips = np.flatnonzero(np.diff(np.sign(values)))
    assert flips.size
    node = brentq(lambda r: path.sol(r)[0], R[flips[-1]], R[flips[-1] + 1])
    assert u(node * 0.999) * u(node * 1.001) < 0
