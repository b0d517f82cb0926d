"""Limits of quantum close coupling: spectator spin, isotropic curves, van der Waals line broadening at high energy.

Sources: exact recoupling (pertcalc.collisions.sudden, tested on its own; list of the sudden limit); Lindholm-Foley
constants (pertcalc.collisions.lindholm_foley, tested on its own).
"""

from __future__ import annotations

import itertools
import math
from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from pertcalc.angular import clebsch_gordan, projections, six_j, tensor_operator
from pertcalc.collisions.born_tails import shift_tail
from pertcalc.collisions.channels import channels
from pertcalc.collisions.close_coupling import Matrices, ground_matrices, outer_phase, scattering_matrices
from pertcalc.collisions.lindholm_foley import lindholm_foley
from pertcalc.collisions.multipoles import INDEX
from pertcalc.collisions.pair import CollisionPair
from pertcalc.collisions.partial_waves import LEVELS, line_cross_section, multipole_cross_sections
from pertcalc.collisions.quantum import level_cross_sections
from pertcalc.collisions.semiclassical import reach
from pertcalc.collisions.sudden import sudden_limit
from pertcalc.curves.forms import LennardJones
from tests.collision_cases import default_pair, model_k_ar, thermal

J_OF_CHANNEL = (0.5, 1.5, 1.5)
RANKS = {"P1/2": 2, "P3/2": 4}
# Free elements of a random collision up to this orbital total momentum; S = 1 beyond.
L_TOP = 4


# --- a spectator spin, any orbital collision --------------------------------------------------------------------------


def orbital_waves(seed: int) -> dict[int, dict[tuple[int, int], complex]]:
    """Symmetric unitary S of |(1, N) Lt> for both parities, {Lt: {(N', N): S}}, Lt = 0 ... L_TOP."""
    rng = np.random.default_rng(seed)
    waves: dict[int, dict[tuple[int, int], complex]] = {}
    for Lt in range(L_TOP + 1):
        waves[Lt] = {}
        for parity in (0, 1):
            Ns = [N for N in range(abs(Lt - 1), Lt + 2) if N % 2 == parity]
            if Ns:
                U = np.linalg.qr(rng.normal(size=(len(Ns),) * 2) + 1j * rng.normal(size=(len(Ns),) * 2))[0]
                S = U @ U.T
                waves[Lt].update({(a, b): S[i, j] for i, a in enumerate(Ns) for j, b in enumerate(Ns)})
    return waves


def spin_recoupling(Jt: float, j: float, N: int, Lt: int) -> float:
    """<(1 1/2) j, N; Jt | (1 N) Lt, 1/2; Jt> with j = 1 + 1/2 and Lt = 1 + N coupled in these orders."""
    sign = (-1) ** round(j + N + Lt + 0.5)
    return sign * math.sqrt((2 * j + 1) * (2 * Lt + 1)) * six_j(0.5, 1, j, N, Jt, Lt)


def recoupled(waves: dict[int, dict[tuple[int, int], complex]]) -> Matrices:
    """The same collision on |(1 1/2) j, N; Jt>, Jt up to where nothing happens any more."""
    total = np.arange(0.5, L_TOP + 8)
    S, partial = {}, {}
    for parity in ("e", "f"):
        partial[parity] = channels(total, parity).partial
        S[parity] = np.zeros((total.size, 3, 3), dtype=complex)
        for (i, Jt), a, b in itertools.product(enumerate(total), range(3), range(3)):
            Nf, N = (int(partial[parity][c, i]) for c in (a, b))
            if min(N, Nf) < 0:
                continue
            for Lt in (round(Jt - 0.5), round(Jt + 0.5)):
                element = waves[Lt].get((Nf, N), 0) if Lt in waves else float(Nf == N)
                weight = spin_recoupling(Jt, J_OF_CHANNEL[a], Nf, Lt) * spin_recoupling(Jt, J_OF_CHANNEL[b], N, Lt)
                S[parity][i, a, b] += weight * element
    return Matrices(total, S, partial, (1.0, 1.0), 0)


def orbital_losses(waves: dict[int, dict[tuple[int, int], complex]]) -> tuple[float, float]:
    """s1, s2 of the orbital: pi (2K+1)^-1 sum_Q Tr[T^+ T - T^+ S T S^+] over |1 m>|N M>, N up to L_TOP + 1."""
    axis = [(N, M) for N in range(L_TOP + 2) for M in range(-N, N + 1)]
    place = {wave: i for i, wave in enumerate(axis)}
    whole = np.eye(3 * len(axis), dtype=complex).reshape(3, len(axis), 3, len(axis))

    def state(Lt: int, N: int, M: int) -> np.ndarray:
        vector = np.zeros((3, len(axis)))
        for a, m in enumerate(projections(1)):
            if abs(M - m) <= N:
                vector[a, place[N, round(M - m)]] = clebsch_gordan(1, m, N, M - m, Lt, M)
        return vector

    for Lt, elements in waves.items():
        for (Nf, N), S in elements.items():
            for M in range(-Lt, Lt + 1):
                whole += (S - (Nf == N)) * np.multiply.outer(state(Lt, Nf, M), state(Lt, N, M))
    losses = []
    for K in (1, 2):
        lost = 0.0
        for Q in range(-K, K + 1):
            T = tensor_operator(1, K, Q)
            survived = np.einsum("ba,bxcy,cd,axdy->", T, whole, T, whole.conj(), optimize=True)
            lost += len(axis) - survived.real
        losses.append(np.pi * lost / (2 * K + 1))
    return losses[0], losses[1]


@pytest.mark.parametrize("seed", range(3))
def test_any_spectator_spin_obeys_the_sudden_limit(seed):
    """Random symmetric unitary S on |(1,N)Lt>, recoupled: every loss and gain of the list to 1e-12."""
    waves = orbital_waves(seed)
    matrices = recoupled(waves)
    for S in matrices.S.values():
        np.testing.assert_allclose(S, S.transpose(0, 2, 1), atol=1e-13)
    s1, s2 = orbital_losses(waves)
    assert min(s1, s2) > 10
    limit = sudden_limit(s1, s2)
    for level, ranks in RANKS.items():
        for K in range(ranks):
            loss = multipole_cross_sections(matrices, level, level, K)[1]
            assert loss == pytest.approx(float(limit.multipole_loss[level][K]), rel=1e-12)
    for (level, final), K in itertools.product((LEVELS, LEVELS[::-1]), (0, 1)):
        gain = multipole_cross_sections(matrices, level, final, K)[0]
        assert gain == pytest.approx(float(limit.multipole_transfer[K]), rel=1e-12, abs=1e-12)


def test_the_lists_numbers():
    """The list written out: 2/3 s1; 2/9 s1 + 20/27 s2; s1/3; 5/9 s1 + 2/27 s2; 2/3 s1 + 1/3 s2; s2; gains."""
    waves = orbital_waves(7)
    matrices, (s1, s2) = recoupled(waves), orbital_losses(waves)

    def loss(level: str, K: int) -> float:
        return multipole_cross_sections(matrices, level, level, K)[1]

    wanted = [2 / 3 * s1, 2 / 9 * s1 + 20 / 27 * s2, s1 / 3, 5 / 9 * s1 + 2 / 27 * s2, 2 / 3 * s1 + s2 / 3, s2]
    found = [loss("P1/2", 0), loss("P1/2", 1), *(loss("P3/2", K) for K in range(4))]
    np.testing.assert_allclose(found, wanted, rtol=1e-12)
    gains = [multipole_cross_sections(matrices, "P1/2", "P3/2", K)[0] for K in (0, 1)]
    np.testing.assert_allclose(gains, [math.sqrt(2) / 3 * s1, -math.sqrt(10) * (s1 / 9 - 2 * s2 / 27)], rtol=1e-12)


# --- real curves without splitting ------------------------------------------------------------------------------------


@cache
def without_splitting(name: str, x: float = 1.0) -> tuple[CollisionPair, float, Matrices]:
    pair = replace(model_k_ar() if name == "model" else default_pair(*name.split("-")), splitting=0.0)
    energy = thermal(373.0, x)
    last = 34.0 if name == "model" else 24.0
    return pair, energy, scattering_matrices(pair, energy, last, 1.3 * last, 5.0)


CURVES = [("model", 0.5), ("Rb-He", 1.0), ("Na-Ne", 1.0)]


@pytest.mark.parametrize(("name", "x"), CURVES)
def test_scattering_without_splitting_does_not_see_the_spin(name, x):
    """On |(1,N)Lt, 1/2; Jt> the matrices are diagonal in Lt and the same for Jt = Lt - 1/2 and Lt + 1/2."""
    _, _, matrices = without_splitting(name, x)
    blocks: dict[tuple[int, int, int], list[complex]] = {}
    for parity, i in itertools.product(("e", "f"), range(2, 60, 3)):
        for Jt in (matrices.total[i], matrices.total[i] + 1):
            k = round(Jt - 0.5)
            N = matrices.partial[parity][:, k].astype(int)
            Lts = (round(Jt - 0.5), round(Jt + 0.5))
            states = [(Lt, n) for Lt in Lts for n in sorted(set(N)) if abs(Lt - n) <= 1]
            assert len(states) == 3
            U = np.array(
                [[spin_recoupling(Jt, J_OF_CHANNEL[c], n, Lt) * (n == N[c]) for c in range(3)] for Lt, n in states]
            )
            np.testing.assert_allclose(U @ U.T, np.eye(3), atol=1e-10)
            orbital = U @ matrices.S[parity][k] @ U.T
            for (a, (Lt, n)), (b, (Lt2, n2)) in itertools.product(enumerate(states), repeat=2):
                if Lt != Lt2:
                    assert abs(orbital[a, b]) < 1e-8
                else:
                    blocks.setdefault((Lt, n, n2), []).append(orbital[a, b])
    twice = [values for values in blocks.values() if len(values) == 2]
    assert len(twice) > 30
    for first, second in twice:
        assert first == pytest.approx(second, abs=1e-4)  # other steps when Jt lies in another group


@pytest.mark.parametrize(("name", "x"), CURVES)
def test_cross_sections_without_splitting_are_the_sudden_limit(name, x):
    """s1, s2 from two observables of P3/2 predict the other six and both gains."""
    _, _, matrices = without_splitting(name, x)
    s1 = 3 * multipole_cross_sections(matrices, "P3/2", "P3/2", 0)[1]
    s2 = multipole_cross_sections(matrices, "P3/2", "P3/2", 3)[1]
    limit = sudden_limit(s1, s2)
    for level, K in (("P1/2", 0), ("P1/2", 1), ("P3/2", 1), ("P3/2", 2)):
        loss = multipole_cross_sections(matrices, level, level, K)[1]
        assert loss == pytest.approx(float(limit.multipole_loss[level][K]), rel=1e-3)
    for K, (level, final) in itertools.product((0, 1), (LEVELS, LEVELS[::-1])):
        gain = multipole_cross_sections(matrices, level, final, K)[0]
        assert gain == pytest.approx(float(limit.multipole_transfer[K]), rel=2e-3)


@pytest.mark.parametrize(("name", "x"), CURVES)
def test_lines_without_splitting_are_one(name, x):
    """D1 = D2: the optical cross section of a spectator spin is that of the orbital."""
    pair, energy, matrices = without_splitting(name, x)
    highest = int(matrices.total[-1] + 2)
    ground, _ = ground_matrices(pair, energy, highest, 44.0 if name == "model" else 31.0, energy, 5.0)
    lines = [line_cross_section(matrices, level, ground) for level in LEVELS]
    assert lines[0].real == pytest.approx(lines[1].real, rel=1e-3)
    assert lines[0].imag == pytest.approx(lines[1].imag, rel=5e-3, abs=1.0)


# --- isotropic curves -------------------------------------------------------------------------------------------------


@cache
def isotropic_row(level: str) -> np.ndarray:
    pair = replace(model_k_ar(), B=model_k_ar().A, anisotropy=0.0)
    A, X = pair.A, pair.X
    pair = replace(pair, isotropic=(A.C6 - X.C6, A.C8 - X.C8, A.C10 - X.C10))
    return level_cross_sections(pair, level, np.array([thermal(373.0)]), np.array([8.0])).sigma[0]


@pytest.mark.parametrize(("level", "name"), [(n.split(".")[0], n) for n in INDEX if "loss" in n or "outflow" in n])
def test_isotropic_curves_relax_nothing(level, name):
    """A = B: the p orbital is a spectator. What is left comes from where the partial waves end."""
    assert isotropic_row(level)[INDEX[name]] == pytest.approx(
        0, abs=1e-5 * isotropic_row(level)[INDEX[f"{level}.width"]]
    )


def test_isotropic_curves_carry_nothing_over():
    assert isotropic_row("P3/2")[INDEX["gain1"]] == pytest.approx(0, abs=1e-8)


def test_isotropic_curves_have_one_line():
    """Same curve, same kinetic energy, whatever the splitting: D1 = D2."""
    for kind, tolerance in (("width", 3e-4), ("shift", 2e-3)):
        low, high = (isotropic_row(level)[INDEX[f"{level}.{kind}"]] for level in LEVELS)
        assert low == pytest.approx(high, rel=tolerance)


# --- van der Waals ----------------------------------------------------------------------------------------------------


def van_der_waals_pair(C6_ground: float, C6_upper: float, core: float, mass: float) -> CollisionPair:
    """Lennard-Jones curves with one and the same R^-12 wall: the difference is -dC6/R^6 exactly."""

    def curve(C6: float) -> LennardJones:
        C12 = 0.5 * (C6_ground + C6_upper) * core**6
        return LennardJones(C6**2 / (4 * C12), (2 * C12 / C6) ** (1 / 6))

    X, A = curve(C6_ground), curve(C6_upper)
    return CollisionPair(mass, 0.0, X, A, A, (A.C6 - X.C6, 0.0, 0.0), 0.0)


def line_of_phases(pair: CollisionPair, energy: float) -> complex:
    """(pi/k^2) sum (2N+1)(1 - S S_g*) with the phases of both curves and the tail of the shift [bohr^2]."""
    k, v = math.sqrt(2 * pair.reduced_mass * energy), math.sqrt(2 * energy / pair.reduced_mass)
    radius = reach(pair, v)
    last, match = int(2.0 * radius * k), 2.4 * radius
    upper = replace(pair, X=pair.A)
    S_g, S = (ground_matrices(p, energy, last, match, energy, 4.0)[0] for p in (pair, upper))
    N = np.arange(last + 1.0)
    product = S * (S_g * np.exp(2j * outer_phase(pair, energy, N, match))).conj()
    return complex(
        np.pi / k**2 * np.sum((2 * N + 1) * (1 - product)) + 1j * shift_tail(v, (last + 1) / k, *pair.isotropic)
    )


def deviations(ground: float, upper: float, times_depth: float) -> np.ndarray:
    """Half width and shift over Lindholm-Foley, minus 1, at five energies around a multiple of the well depth."""
    pair = van_der_waals_pair(ground, upper, 6.5, 1e5)
    depth = max(pair.X.De, pair.A.De)
    rows = []
    for energy in times_depth * depth * np.geomspace(0.7, 1.4, 5):
        v = math.sqrt(2 * energy / pair.reduced_mass)
        fwhm, shift = lindholm_foley(upper - ground, v)
        line = line_of_phases(pair, float(energy))
        rows.append([line.real * 2 * v / float(fwhm) - 1, line.imag * v / float(shift) - 1])
    return np.array(rows)


@pytest.mark.parametrize(
    ("ground", "upper"), [(50.0, 650.0), pytest.param(650.0, 50.0, marks=pytest.mark.slow)], ids=["red", "blue"]
)
def test_line_tends_to_lindholm_foley_as_energy_rises(ground, upper):
    """Pure C6 difference: oscillations of the core die out (rms of five energies), the mean is right to 2 %."""
    found = [deviations(ground, upper, times) for times in (1.0, 4.0)]
    for rows in found:
        assert np.all(np.abs(rows.mean(axis=0)) < 0.02), rows.mean(axis=0)
    rms = [np.sqrt(np.mean(rows**2)) for rows in found]
    assert 0.02 < rms[0] < 0.08 and rms[1] < 0.8 * rms[0], rms


@pytest.mark.slow
def test_line_tends_to_lindholm_foley_at_high_energy():
    rms = [np.sqrt(np.mean(deviations(50.0, 650.0, times) ** 2)) for times in (1.0, 4.0, 16.0, 64.0)]
    assert np.all(np.diff(rms) < 0) and rms[-1] < 0.025, rms
