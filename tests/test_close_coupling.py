"""Scattering matrices of quantum close coupling: unitarity, symmetry, thresholds, phases, what they are stepped with.

Laws (conservation of flux, time reversal) and an independent integration with scipy's solve_ivp; the pairs are the
default curves and the K-Ar model of collision_cases.
"""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.special import spherical_jn, spherical_yn

from pertcalc.collisions import close_coupling
from pertcalc.collisions.close_coupling import Matrices, ground_matrices, outer_phase, scattering_matrices
from pertcalc.collisions.log_derivative import Blocks, full, propagate
from pertcalc.collisions.pair import CollisionPair
from pertcalc.curves.forms import LennardJones
from pertcalc.errors import PertcalcError
from tests.collision_cases import default_pair, model_k_ar, thermal
from tests.test_channels import projector
from tests.test_log_derivative import even_pieces, resonant_S

# (pair, energy in P1/2 / splitting): below, just below, just above and well above the threshold of P3/2.
CASES = [
    ("model", 0.4),
    ("model", 0.98),
    ("model", 1.05),
    ("model", 5.0),
    ("Rb-He", 0.5),
    ("Rb-He", 1.2),
    ("Cs-Ne", 0.3),
    ("Cs-Ne", 1.01),
    ("Na-Xe", 6.0),
    ("Li-He", 900.0),
]


def pair_named(name: str) -> CollisionPair:
    return model_k_ar() if name == "model" else default_pair(*name.split("-"))


@cache
def matrices(name: str, ratio: float, last: float = 14.0, match: float = 20.0, points: float = 4.0) -> Matrices:
    pair = pair_named(name)
    return scattering_matrices(pair, ratio * pair.splitting, last, match, points)


def both(found: Matrices):
    for parity in ("e", "f"):
        yield found.S[parity], found.partial[parity]


@pytest.mark.parametrize(("name", "ratio"), CASES)
def test_unitary(name, ratio):
    """Of every open channel the flux comes out again: to 1e-8. What is closed or does not exist is zero."""
    found = matrices(name, ratio)
    for S, partial in both(found):
        flux = np.einsum("nij,nkj->nik", S, S.conj())
        is_open = np.abs(np.einsum("nii->ni", flux)) > 0.5
        np.testing.assert_allclose(flux, is_open[:, :, None] * np.eye(3), atol=1e-8)
        np.testing.assert_array_equal(is_open[:, 0], True)
        high = (partial[1:] >= 0).T
        if ratio < 1:
            high = high & False
        elif ratio > 2:
            np.testing.assert_array_equal(is_open[:, 1:], high)
        assert not np.any(is_open[:, 1:] & ~high)
        assert np.all(S[~(is_open[:, :, None] & is_open[:, None, :])] == 0)


@pytest.mark.parametrize(("name", "ratio"), CASES)
def test_symmetric(name, ratio):
    """Time reversal: S = S^T to 1e-8."""
    for S, _ in both(matrices(name, ratio)):
        np.testing.assert_allclose(S, S.transpose(0, 2, 1), atol=1e-8)


def test_far_collisions_change_nothing():
    """The last partial waves pass without exchange; phase and coupling fall with the impact parameter."""
    found = matrices("model", 5.0, 30.0, 40.0)
    for S, _ in both(found):
        away = np.abs(S - np.eye(3)).max(axis=(1, 2))
        assert away[-1] < 0.1
        assert away[-1] < 0.3 * away[round(0.7 * away.size)]


# --- threshold ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["Cs-Ne", "Rb-Ar"])
@pytest.mark.parametrize("above", [1e-6, 1e-3, 0.03, 0.1])
def test_slow_channels_above_their_threshold(name, above):
    """k of P3/2 near zero, many partial waves in P1/2: finite and unitary, without a warning."""
    with np.errstate(over="raise", invalid="raise", divide="raise"):
        found = matrices(name, 1 + above)
    for S, _ in both(found):
        assert np.all(np.isfinite(S))
        np.testing.assert_allclose(np.sum(np.abs(S[:, 0]) ** 2, axis=1), 1.0, atol=1e-8)


def test_elastic_matrix_is_continuous_at_the_threshold():
    """S of P1/2 from below and above the threshold of P3/2, up to a narrow resonance in one or the other wave."""
    below, above = (matrices("model", ratio) for ratio in (1 - 1e-5, 1 + 1e-5))
    change = np.abs(np.concatenate([above.S[p][:, 0, 0] - below.S[p][:, 0, 0] for p in ("e", "f")]))
    assert np.quantile(change, 0.95) < 2e-3, change


def test_closed_channels_matter():
    """Below the threshold the closed P3/2 still turns the phase of P1/2: second-order repulsion of the curves."""
    found = matrices("model", 0.6)
    pair = model_k_ar()
    away = replace(pair, splitting=1e3 * pair.splitting)  # P3/2 out of reach
    alone = scattering_matrices(away, 0.6 * pair.splitting, 14.0, 20.0, 4.0)
    assert np.abs(found.S["e"][:, 0, 0] - alone.S["e"][:, 0, 0]).max() > 0.5


def test_closed_channels_are_matched_to_their_decay():
    """Square well with one open and one closed channel, matched at its edge: the resonance in closed form."""
    gap, depth, D, a = 5.0, 6.0, 1.0, 3.0
    k2 = np.linspace(0.2, 4.6, 60)
    momentum2 = np.stack([k2, k2 - gap, np.full_like(k2, -3.0)])
    axis = np.repeat(np.sqrt([[0.5], [0.5], [0.0]]), k2.size, axis=1)
    blocks = Blocks(momentum2, np.zeros((3, k2.size)), axis)
    y, _ = propagate(blocks, lambda R: (0 * R - depth, 0 * R + D), even_pieces([1e-6, a], 0.01), 1e6)
    S = close_coupling._match(full(y), np.zeros((3, k2.size)), momentum2, a)
    wanted = [resonant_S(float(e), gap, depth, D, a, True) for e in k2]
    np.testing.assert_allclose(S[:, 0, 0], wanted, atol=3e-5)
    assert np.all(S[:, 1:] == 0) and np.all(S[:, :, 1:] == 0)


# --- phases ---------------------------------------------------------------------------------------------------------


def phase_by_scipy(pair: CollisionPair, curve, energy: float, N: int, match: float) -> complex:
    """S of one partial wave of a curve [hartree] with DOP853, matched to free waves."""
    mass = pair.reduced_mass
    k = np.sqrt(2 * mass * energy)

    def strength(R):
        return N * (N + 1) / R**2 + 2 * mass * curve(np.asarray(R)) - k * k

    # 20 e-folds inside the innermost turning point.
    R = np.arange(2.5, match, 0.01)
    turning = int(np.argmax(strength(R) < 0))
    folds = np.cumsum(np.sqrt(strength(R[:turning]))[::-1]) * 0.01
    start = float(R[max(turning - 1 - int(np.searchsorted(folds, 20.0)), 0)])
    u = solve_ivp(
        lambda R, u: [u[1], float(strength(R)) * u[0]],
        (start, match),
        [1e-20, 1e-20 * float(np.sqrt(strength(start)))],
        method="DOP853",
        rtol=1e-9,
        atol=1e-40,
    ).y[:, -1]
    z = k * match
    j, y = spherical_jn(N, z), spherical_yn(N, z)
    dj, dy = spherical_jn(N, z, derivative=True), spherical_yn(N, z, derivative=True)
    slope = u[1] / u[0]
    K = (slope * z * j - k * (j + z * dj)) / (slope * z * y - k * (y + z * dy))
    return (1 + 1j * K) / (1 - 1j * K)


@pytest.mark.parametrize(("name", "x"), [("model", 0.3), ("Rb-He", 1.0)])
def test_ground_phases_equal_an_independent_integration(name, x):
    pair, match = pair_named(name), 20.0
    energy = thermal(373.0, x)
    S, _ = ground_matrices(pair, energy, 60, match, energy, 10.0)
    for N in (0, 17, 60):
        assert S[N] == pytest.approx(phase_by_scipy(pair, pair.X, energy, N, match), abs=2e-4)
    np.testing.assert_allclose(np.abs(S), 1.0, atol=1e-10)


def coupled_by_scipy(pair: CollisionPair, energy: float, N: np.ndarray, coupling: np.ndarray, match: float):
    """S of three coupled open channels: all columns of psi'' = -Q psi with DOP853, the coupling from 3j and 6j."""
    mass, levels = pair.reduced_mass, np.array([0.0, 1.0, 1.0])
    k2 = 2 * mass * (energy - levels * pair.splitting)

    def minus_Q(R: float) -> np.ndarray:
        pi, sigma = (2 * mass * float(curve(np.array(R))) for curve in (pair.A, pair.B))
        return np.diag(N * (N + 1) / R**2 + pi - k2) + (sigma - pi) * coupling

    R = np.arange(2.5, match, 0.02)
    lowest = np.array([np.linalg.eigvalsh(minus_Q(r))[0] for r in R])
    turning = int(np.argmax(lowest < 0))
    folds = np.cumsum(np.sqrt(lowest[:turning])[::-1]) * 0.02
    start = float(R[turning - 1 - int(np.searchsorted(folds, 9.0))])

    def slope(r: float, u: np.ndarray) -> np.ndarray:
        psi, dpsi = u.reshape(2, 3, 3)
        return np.concatenate([dpsi, minus_Q(r) @ psi]).ravel()

    # Start afresh from (1, psi' psi^-1) every 0.2 bohr: the columns must not grow alike in the forbidden region.
    Y = np.sqrt(lowest[np.searchsorted(R, start)]) * np.eye(3)
    edges = np.append(np.arange(start, match - 0.1, 0.2), match)
    for left, right in zip(edges[:-1], edges[1:], strict=True):
        first = np.concatenate([np.eye(3), Y]).ravel()
        psi, dpsi = solve_ivp(slope, (left, right), first, method="DOP853", rtol=1e-8).y[:, -1].reshape(2, 3, 3)
        Y = dpsi @ np.linalg.inv(psi)
    k = np.sqrt(k2)
    z, n = k * match, N.astype(int)
    j, y = spherical_jn(n, z), spherical_yn(n, z)
    dj, dy = spherical_jn(n, z, derivative=True), spherical_yn(n, z, derivative=True)
    J, Z = (np.diag(z * f / np.sqrt(k)) for f in (j, y))
    dJ, dZ = (np.diag((f + z * df) * np.sqrt(k)) for f, df in ((j, dj), (y, dy)))
    K = np.linalg.solve(Y @ Z - dZ, Y @ J - dJ)
    return np.linalg.solve(np.eye(3) - 1j * K, np.eye(3) + 1j * K)


@pytest.mark.parametrize("parity", ["e", "f"])
@pytest.mark.parametrize(("name", "x", "Jt"), [("Na-He", 1.0, 2.5), ("Na-He", 1.0, 11.5), ("Rb-He", 0.5, 8.5)])
def test_coupled_channels_equal_an_independent_integration(name, x, Jt, parity, monkeypatch):
    """Three coupled channels with scipy: amplitudes and relative phases of every element."""
    # The integration matches to bare levels; so must we here.
    monkeypatch.setattr(close_coupling, "ADIABATIC", np.inf)
    pair, match = pair_named(name), 16.0
    energy = thermal(350.0, x) + pair.splitting
    found = scattering_matrices(pair, energy, 8.0, match, 10.0)
    i = round(Jt - 0.5)
    N = found.partial[parity][:, i]
    wanted = coupled_by_scipy(pair, energy, N, projector(Jt, N), match)
    # The sign of a channel is free: fixed by the axis vector, which is a column of the coupling up to its sign.
    signs = np.sign(projector(Jt, N)[0]) * np.sign(close_coupling.channels(found.total, parity).axis[:, i])
    np.testing.assert_allclose(found.S[parity][i], signs[:, None] * wanted * signs, atol=1e-3)
    assert np.abs(wanted[0, 1:]).max() > 0.01 or name == "Rb-He"


def test_levels_without_anisotropy_follow_their_curve():
    """A = B: every channel has the phase of that curve at its own kinetic energy and N, and nothing is exchanged."""
    pair = replace(model_k_ar(), B=model_k_ar().A)
    energy, match = 4 * pair.splitting, 20.0
    found = scattering_matrices(pair, energy, 8.0, match, 10.0)
    alone = replace(pair, X=pair.A)
    for level, kinetic in enumerate((energy, energy - pair.splitting)):
        phases, _ = ground_matrices(alone, kinetic, 400, match, energy, 10.0)
        for S, partial in both(found):
            for channel in (0,) if level == 0 else (1, 2):
                there = np.flatnonzero(partial[channel] >= 0)
                wanted = phases[partial[channel][there].astype(int)]
                np.testing.assert_allclose(S[there, channel, channel], wanted, atol=2e-5)
                off = S.copy()
                off[:, range(3), range(3)] = 0
                assert np.abs(off).max() < 1e-10


def test_phase_beyond_the_matching():
    """Matched further out, the product S S_g* gains exactly the phase that outer_phase promised (straight path)."""
    X, A = LennardJones(2e-5, 11.0), LennardJones(6e-5, 11.0)
    pair = CollisionPair(36_000.0, 0.0, X, A, A, (A.C6 - X.C6, 0.0, 0.0), 0.0)
    energy = thermal(373.0)
    alone = replace(pair, X=A)
    products = []
    for match in (24.0, 48.0):
        ground, upper = (ground_matrices(p, energy, 260, match, energy, 8.0)[0] for p in (pair, alone))
        N = np.arange(ground.size, dtype=float)
        products.append(upper * ground.conj() * np.exp(-2j * outer_phase(pair, energy, N, match)))
    k = np.sqrt(2 * pair.reduced_mass * energy)
    inside = np.arange(261) < 0.8 * 24.0 * k
    assert inside.sum() > 100
    np.testing.assert_allclose(products[0][inside], products[1][inside], atol=3e-3)
    # Without it they differ by far more.
    bare = [
        p * np.exp(2j * outer_phase(pair, energy, np.arange(261.0), m)) for p, m in zip(products, (24, 48), strict=True)
    ]
    assert np.abs(bare[0] - bare[1])[inside].max() > 0.03


def test_outer_phase_of_a_central_collision():
    """N = 0: -dC6/(5 v R^5) of a pure C6 difference."""
    X, A = LennardJones(2e-5, 11.0), LennardJones(6e-5, 11.0)
    pair = CollisionPair(36_000.0, 0.0, X, A, A, (A.C6 - X.C6, 0.0, 0.0), 0.0)
    energy = thermal(300.0)
    v = np.sqrt(2 * energy / pair.reduced_mass)
    found = outer_phase(pair, energy, np.array([0.0]), 30.0)[0]
    core = (A.De * 11.0**12 - X.De * 11.0**12) / (11 * v * 30.0**11)
    assert found == pytest.approx(-(A.C6 - X.C6) / (5 * v * 30.0**5) + core, rel=1e-3)


# --- what the computation is made of --------------------------------------------------------------------------------


def test_grouping_and_starting_point_do_not_matter(monkeypatch):
    """Other starts, other batches: S changes by the phase error of the step only."""
    pair = default_pair("Rb", "He")
    energy = thermal(350.0, 2.0) + pair.splitting
    wanted = scattering_matrices(pair, energy, 14.0, 20.0, 12.0)
    monkeypatch.setattr(close_coupling, "GROUP", 20)
    monkeypatch.setattr(close_coupling, "FORBIDDEN", 20.0)
    other = scattering_matrices(pair, energy, 14.0, 20.0, 12.0)
    for parity in ("e", "f"):
        np.testing.assert_allclose(other.S[parity], wanted.S[parity], atol=2e-5)


def test_step():
    """Doubling the points moves S by little, by 16 times less the next time (fourth order)."""
    pair = default_pair("Rb", "He")
    energy = thermal(350.0) + pair.splitting
    coarse, fine, finest = (scattering_matrices(pair, energy, 12.0, 18.0, points) for points in (4.0, 8.0, 16.0))
    first, second = (
        max(np.abs(a.S[p] - b.S[p]).max() for p in ("e", "f")) for a, b in ((coarse, fine), (fine, finest))
    )
    assert first < 0.02 and 10 < first / second < 25
    assert coarse.inversions < fine.inversions < 2.1 * coarse.inversions


def test_matching_further_out_changes_no_exchange():
    """|S|^2 from one level to the other is made inside 30 bohr, where the coupling is 1e-3 of the splitting."""
    near, far = (matrices("model", 5.0, 12.0, match, 8.0) for match in (30.0, 45.0))
    for parity in ("e", "f"):
        exchange = [np.abs(found.S[parity][:, 0, 1:]) ** 2 for found in (near, far)]
        assert exchange[0].max() > 0.1
        np.testing.assert_allclose(*exchange, atol=2e-3)


def test_reach():
    """Impact parameter of the last partial wave: that asked for, counted in P1/2; larger in the slower level."""
    found = matrices("model", 5.0)
    assert found.last_impact(0) == pytest.approx(14.0, rel=0.02)
    assert found.last_impact(1) == pytest.approx(found.last_impact(0) / np.sqrt(1 - 1 / 5), rel=1e-12)
    np.testing.assert_array_equal(np.diff(found.total), 1.0)
    assert found.total[0] == 0.5


def test_momenta_and_work():
    pair = model_k_ar()
    found = matrices("model", 5.0)
    k2 = 2 * pair.reduced_mass * 5 * pair.splitting
    assert found.momentum2[0] == pytest.approx(k2)
    assert found.momentum2[1] == pytest.approx(k2 * 0.8)
    assert matrices("model", 0.4).momentum2[1] < 0
    assert found.inversions % (2 * found.total.size) == 0 or found.total.size > close_coupling.GROUP
    assert found.inversions > 2 * found.total.size * 1.5 * np.sqrt(k2) * 14.0


# --- bad input --------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("energy", [-1e-4, 0.0])
def test_energy_without_an_open_channel_is_refused(energy):
    with pytest.raises(PertcalcError, match="energy"):
        scattering_matrices(model_k_ar(), energy, 14.0, 20.0, 4.0)


def test_curve_without_a_repulsive_wall_is_refused():
    """Allowed down to the smallest R: what comes out would hang on where the propagation starts."""
    pair = replace(model_k_ar(), B=lambda R: -560 / (R**6 + 500.0))
    with pytest.raises(PertcalcError, match="wall"):
        scattering_matrices(pair, 2e-3, 14.0, 20.0, 4.0)
