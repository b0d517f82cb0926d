"""Spectator recoupling against superoperators written out in the space m_J m_I, closed forms, limits and sum rules.

Independent of the 9j formula of the package: (1) Liouville-space matrices from spin matrices alone, ranks told apart by
the Casimir operator sum [J_a,[J_a, .]], F projectors by diagonalising F^2; (2) T_k(J) x 1 acting on operators built of
Clebsch-Gordan products. Laws: trace, detailed balance, sum rules, bounds. Closed forms: eigenrates of electron
randomisation (2I+1)^2/2 : 1 (8:1 and 18:1 READ, abstract of osti 7350745), complete randomisation of the electron.
"""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.linalg import eigh, null_space
from scipy.optimize import linear_sum_assignment

from pertcalc.angular import clebsch_gordan, multipole_survival, projections, tensor_operator
from pertcalc.collisions.sudden import sudden_limit
from pertcalc.vapour.hyperfine import f_values, hyperfine_energies
from pertcalc.vapour.recoupling import recoupling, relaxation, relaxation_matrix

SPINS = (1, 1.5, 2.5, 3.5, 4)  # every natural alkali isotope
SYSTEMS = [(J, I) for J in (0.5, 1.5) for I in (0, 0.5, *SPINS)]
GAMMA = {0.5: (0.2, 0.9), 1.5: (0.13, 0.7, 1.0, 0.45)}
BOTH = (0.5, 1.5)


# --- (1) Liouville space from spin matrices alone


def spin_matrices(J: float) -> list[np.ndarray]:
    m = projections(J)
    up = np.diag(np.sqrt(J * (J + 1) - m[1:] * (m[1:] + 1)), 1)
    return [(up + up.T) / 2, (up - up.T) / 2j, np.diag(m)]


def commutator(A: np.ndarray) -> np.ndarray:
    """A rho - rho A as a matrix on rho.ravel()."""
    one = np.eye(len(A))
    return np.kron(A, one) - np.kron(one, A.T)


def electronic_superoperator(J: float, I: float, gamma) -> np.ndarray:
    """sum_k gamma_k P_k, P_k the projector on electronic rank k: eigenspace k(k+1) of sum_a [J_a,[J_a, .]]."""
    casimir = sum(commutator(S) @ commutator(S) for S in spin_matrices(J))
    values, vectors = np.linalg.eigh(casimir)
    k = np.round((np.sqrt(1 + 4 * values) - 1) / 2).astype(int)
    on_electron = (vectors * np.asarray(gamma)[k]) @ vectors.conj().T
    n, N = round(2 * J) + 1, round(2 * I) + 1
    four = on_electron.reshape(n, n, n, n)
    full = np.einsum("abcd,ij,kl->aibkcjdl", four, np.eye(N), np.eye(N))
    return full.reshape((n * N) ** 2, (n * N) ** 2)


def dot_product(J: float, I: float) -> np.ndarray:
    return sum(np.kron(a, b) for a, b in zip(spin_matrices(J), spin_matrices(I), strict=True))


def secular_projector(J: float, I: float) -> np.ndarray:
    """rho -> sum_F P_F rho P_F with P_F the eigenspaces of F^2."""
    IJ = dot_product(J, I)
    values, vectors = np.linalg.eigh(2 * IJ + (J * (J + 1) + I * (I + 1)) * np.eye(len(IJ)))
    F = np.round(np.sqrt(1 + 4 * values) - 1) / 2
    projectors = [vectors[:, f == F] @ vectors[:, f == F].conj().T for f in np.unique(F)]
    return sum(np.kron(P, P.T) for P in projectors)


def all_eigenvalues(J: float, I: float, **options) -> np.ndarray:
    """Eigenvalues of every rank, each 2K+1 times."""
    by_rank = [relaxation({J: GAMMA[J]}, I, K, **options).eigenvalues() for K in range(round(2 * (J + I)) + 1)]
    return np.concatenate([np.repeat(values, 2 * K + 1) for K, values in enumerate(by_rank)])


LIOUVILLE = [(0.5, 1), (0.5, 1.5), (0.5, 2.5), (1.5, 1), (1.5, 1.5), (0.5, 4)]


@pytest.mark.parametrize(("J", "I"), LIOUVILLE)
def test_secular_eigenvalues_equal_those_of_the_liouville_space(J, I):
    R, P = electronic_superoperator(J, I, GAMMA[J]), secular_projector(J, I)
    # Coherences are thrown out of the spectrum by a rate far above all others.
    direct = np.sort(np.linalg.eigvalsh(P @ R @ P + 100 * (np.eye(len(P)) - P)))
    ours = np.sort(all_eigenvalues(J, I, secular=True).real)
    np.testing.assert_allclose(ours, direct[: len(ours)], atol=1e-12)
    np.testing.assert_allclose(direct[len(ours) :], 100, rtol=1e-12)


@pytest.mark.parametrize(("J", "I", "B"), [(0.5, 1, 0), (0.5, 1.5, 0), (1.5, 1, -0.03), (1.5, 1.5, 0.02)])
@pytest.mark.parametrize("A", [0.01, 0.08, 3.0])
def test_full_spectrum_with_hyperfine_frequencies_equals_the_liouville_space(J, I, B, A):
    """A in units of the rates / (2 pi 10^6): structure below, near and above the relaxation."""
    IJ = dot_product(J, I)
    H = A * IJ.astype(complex)
    if B:
        quadrupole = 3 * IJ @ IJ + 1.5 * IJ - I * (I + 1) * J * (J + 1) * np.eye(len(IJ))
        H += B * quadrupole / (2 * I * (2 * I - 1) * J * (2 * J - 1))
    direct = np.linalg.eigvals(electronic_superoperator(J, I, GAMMA[J]) + 2j * np.pi * commutator(H))
    energies = {J: hyperfine_energies(J, I, A * 1e-6, B * 1e-6)}
    ours = all_eigenvalues(J, I, energies_MHz=energies)
    distance = np.abs(ours[:, None] - direct[None, :])
    assert np.max(distance[linear_sum_assignment(distance)]) < 1e-6  # square root of rounding near exceptional points


# --- (2) operators from Clebsch-Gordan products


@lru_cache
def coupled_states(J: float, I: float, F: float) -> np.ndarray:
    """Columns |F M>, M descending, in the product basis m_J m_I (descending)."""
    return np.array(
        [
            [clebsch_gordan(J, mJ, I, mI, F, M) if mJ + mI == M else 0.0 for M in projections(F)]
            for mJ in projections(J)
            for mI in projections(I)
        ]
    )


def pair_operator(J: float, I: float, F1: float, F2: float, K: int, Q: int) -> np.ndarray:
    """T_KQ(F1,F2) = sum (-1)^(F2-M2) <F1 M1 F2 -M2|K Q> |F1 M1><F2 M2| in the product basis."""
    inner = np.array(
        [
            [
                (-1) ** round(F2 - M2) * clebsch_gordan(F1, M1, F2, -M2, K, Q) if M1 - M2 == Q else 0.0
                for M2 in projections(F2)
            ]
            for M1 in projections(F1)
        ]
    )
    return coupled_states(J, I, F1) @ inner @ coupled_states(J, I, F2).T


def electron_map(rho: np.ndarray, J: float, J_to: float, I: float, rates) -> np.ndarray:
    """sum_kq rates_k [T_kq(J') x 1] Tr_J{[T_kq(J) x 1]^+ rho}: electronic multipoles go over, the nucleus stays."""
    n, N = round(2 * J) + 1, round(2 * I) + 1
    four = rho.reshape(n, N, n, N)
    total = 0.0
    for k, rate in enumerate(rates):
        for q in range(-k, k + 1):
            nuclear = np.einsum("ab,aibj->ij", tensor_operator(J, k, q), four)
            total = total + rate * np.kron(tensor_operator(J_to, k, q), nuclear)
    return total


@pytest.mark.parametrize(("J", "I"), SYSTEMS)
def test_every_element_equals_the_direct_trace(J, I):
    for K in {0, 1, 2, round(2 * (J + I))} & set(range(round(2 * (J + I)) + 1)):
        found = relaxation({J: GAMMA[J]}, I, K)
        operators = [pair_operator(J, I, p.F1, p.F2, K, min(K, 1)) for p in found.pairs]
        relaxed = [electron_map(T, J, J, I, GAMMA[J]) for T in operators]
        direct = [[np.sum(row * column) for column in relaxed] for row in operators]
        np.testing.assert_allclose(found.matrix, direct, atol=1e-13)
        F, M = relaxation_matrix(J, I, GAMMA[J], K)
        secular = [i for i, p in enumerate(found.pairs) if p.F1 == p.F2]
        np.testing.assert_allclose(M, np.array(direct)[np.ix_(secular, secular)], atol=1e-13)
        assert list(F) == [found.pairs[i].F1 for i in secular]


@pytest.mark.parametrize(("J", "I"), [(0.5, 1), (1.5, 1.5), (1.5, 4)])
def test_sign_of_the_frequencies(J, I):
    """d rho/dt = -i [H, rho]: the multipole of |F1><F2| turns with exp(-i (E1-E2) t); spectra cannot tell the sign."""
    A = 2.5e-6
    H = 2 * np.pi * 1e6 * A * dot_product(J, I)
    found = relaxation({J: [0.0] * round(2 * J + 1)}, I, 1, energies_MHz={J: hyperfine_energies(J, I, A)})
    for pair, value in zip(found.pairs, np.diag(found.matrix), strict=True):
        T = pair_operator(J, I, pair.F1, pair.F2, 1, 1)
        np.testing.assert_allclose(1j * (H @ T - T @ H), value * T, atol=1e-12)


@pytest.mark.parametrize("I", [0, 1, 1.5, 4])
@pytest.mark.parametrize("secular", [True, False])
def test_gains_equal_the_direct_trace(I, secular):
    gain = {(0.5, 1.5): (0.08, -0.05), (1.5, 0.5): (0.11, 0.03)}
    for K in (0, 1, 2):
        if K > 1 and I == 0:
            continue
        found = relaxation(GAMMA, I, K, gain=gain, secular=secular)
        for row, to in enumerate(found.pairs):
            wanted = pair_operator(to.J, I, to.F1, to.F2, K, 0)
            for column, origin in enumerate(found.pairs):
                T = pair_operator(origin.J, I, origin.F1, origin.F2, K, 0)
                rates = GAMMA[to.J] if to.J == origin.J else -np.array(gain[origin.J, to.J])
                direct = np.sum(wanted * electron_map(T, origin.J, to.J, I, rates))
                assert found.matrix[row, column] == pytest.approx(direct, abs=1e-13)


@pytest.mark.parametrize("I", [0.5, 1, 1.5, 4])
def test_coupled_levels_in_the_sudden_limit(I):
    """Electron spin and nucleus both spectators: relax orbital multipoles in m_L m_s m_I, read off those of F and J.

    Electronic input: the exact recoupling of L = 1 (collisions/sudden.py); the sign of the orientation transfer counts.
    """
    s1, s2 = 0.7, 1.3
    limit = sudden_limit(s1, s2)
    levels = {"P1/2": 0.5, "P3/2": 1.5}
    loss = {J: {k: float(v) for k, v in limit.multipole_loss[name].items()} for name, J in levels.items()}
    both = {k: float(v) for k, v in limit.multipole_transfer.items()}
    fine = {J: np.kron(coupled_states(1, 0.5, J), np.eye(round(2 * I) + 1)) for J in BOTH}
    for K in (0, 1, 2):
        found = relaxation(loss, I, K, gain={(0.5, 1.5): both, (1.5, 0.5): both})
        operators = [fine[p.J] @ pair_operator(p.J, I, p.F1, p.F2, K, 0) @ fine[p.J].T for p in found.pairs]
        # The spectator of the orbital is (s, I) with 2(2I+1) states: its "nuclear spin" for electron_map.
        relaxed = [electron_map(T, 1, 1, 2 * I + 0.5, (0, s1, s2)) for T in operators]
        direct = [[np.sum(row * column) for column in relaxed] for row in operators]
        np.testing.assert_allclose(found.matrix, direct, atol=1e-13)


@pytest.mark.parametrize(("J", "I"), SYSTEMS)
def test_recoupling_is_orthogonal(J, I):
    for K in range(round(2 * (J + I)) + 1):
        U = recoupling(J, I, K)[2]
        np.testing.assert_allclose(U @ U.T, np.eye(len(U)), atol=1e-13)


# --- closed forms


@pytest.mark.parametrize(("I", "ratio"), [(1, 4.5), (1.5, 8), (2.5, 18), (3.5, 32), (4, 40.5)])
def test_electron_randomisation_has_two_orientation_rates(I, ratio):
    """1 and 2/(2I+1)^2; 8:1 and 18:1 READ (abstract of osti 7350745), the law FROM MEMORY (Bouchiat; Happer 1972)."""
    fast_slow = np.linalg.eigvalsh(relaxation_matrix(0.5, I, (0, 1), 1)[1])
    np.testing.assert_allclose(fast_slow, [2 / (2 * I + 1) ** 2, 1], rtol=1e-12)
    assert fast_slow[1] / fast_slow[0] == pytest.approx(ratio, rel=1e-12)


RATIONALS = [
    (0, (0, 1, 1, 1), (0, 1, 1, 1), (15 / 16, 13 / 16, 11 / 16, 9 / 16)),
    (1, (0, 1, 1, 1), (0.5, 1, 1), (0.975, 0.875, 0.65)),
    (2, (0, 1, 1, 1), (0.73, 1, 1), None),
    (2, (0, 0.5, 1, 0.5), (0.5, 0.5, 0.76), None),
]


@pytest.mark.parametrize(("K", "gamma", "eigenvalues", "diagonal"), RATIONALS)
def test_rational_values_of_three_halves_with_three_halves(K, gamma, eigenvalues, diagonal):
    """J = I = 3/2: rationals of an independent calculation (9j sums and a direct superoperator); not published."""
    M = relaxation_matrix(1.5, 1.5, gamma, K)[1]
    np.testing.assert_allclose(np.linalg.eigvalsh(M), eigenvalues, atol=1e-13)
    if diagonal:
        np.testing.assert_allclose(np.diag(M), diagonal, rtol=1e-13)


@pytest.mark.parametrize(("J", "I"), SYSTEMS)
def test_complete_randomisation_of_the_electron_redistributes_by_weight(J, I):
    """gamma_k = 1 for k > 0 turns rho into 1/(2J+1) x Tr_J rho.

    Tr_J of an unpolarised F' is an unpolarised nucleus, so F is refilled by its weight (2F+1)/((2J+1)(2I+1)).
    """
    W = relaxation({J: [0.0] + [1.0] * round(2 * J)}, I, 0).population_matrix()
    weights = (2 * f_values(J, I) + 1) / ((2 * J + 1) * (2 * I + 1))
    np.testing.assert_allclose(W, np.eye(len(weights)) - weights[:, None], atol=1e-12)


# --- limits and laws


@pytest.mark.parametrize("J", BOTH)
def test_without_nuclear_spin_the_electronic_rate_is_left(J):
    for K, gamma in enumerate(GAMMA[J]):
        F, M = relaxation_matrix(J, 0, GAMMA[J], K)
        assert list(F) == [J] and M == pytest.approx(np.array([[gamma]]))


@pytest.mark.parametrize(("J", "I"), SYSTEMS)
def test_the_stretched_rank_belongs_to_the_highest_electronic_rank(J, I):
    F, M = relaxation_matrix(J, I, GAMMA[J], round(2 * (J + I)))
    assert list(F) == [J + I] and M == pytest.approx(np.array([[GAMMA[J][-1]]]))


@pytest.mark.parametrize(("J", "I"), SYSTEMS)
def test_sum_rule_of_the_traces(J, I):
    """sum_K (2K+1) tr M_K = (2I+1)^2 sum_k (2k+1) gamma_k: the trace of the superoperator."""
    traces = [(2 * K + 1) * np.trace(relaxation({J: GAMMA[J]}, I, K).matrix) for K in range(round(2 * (J + I)) + 1)]
    electronic = sum((2 * k + 1) * rate for k, rate in enumerate(GAMMA[J]))
    assert sum(traces) == pytest.approx((2 * I + 1) ** 2 * electronic, rel=1e-12)


@pytest.mark.parametrize("I", [0, 0.5, *SPINS])
def test_unresolved_structure_gives_pure_electronic_rates(I):
    for K in range(4):
        for mode in relaxation({1.5: GAMMA[1.5]}, I, K).eigenrates() if K <= 3 + 2 * I else ():
            k = mode.rank[1]
            assert mode.electronic[1.5, k] == pytest.approx(1, abs=1e-9)
            assert mode.rate == pytest.approx(GAMMA[1.5][k], rel=1e-12)
            assert mode.multiplicity == min(2 * I, k + K) - abs(k - K) + 1  # number of nuclear ranks kappa


@pytest.mark.parametrize(("J", "I"), [(0.5, 1.5), (1.5, 1), (1.5, 3.5)])
def test_wide_structure_tends_to_the_secular_matrix(J, I):
    """The next order is rate^2/omega: ten times the splitting, at most a tenth of the difference."""
    K, difference = 1, []
    secular = np.linalg.eigvalsh(relaxation_matrix(J, I, GAMMA[J], K)[1])
    for A in (3e-6, 30e-6):
        modes = relaxation({J: GAMMA[J]}, I, K, energies_MHz={J: hyperfine_energies(J, I, A)}).eigenvalues()
        slow = np.sort(modes[np.abs(modes.imag) < 1].real)
        assert slow.size == secular.size
        difference.append(np.max(np.abs(slow - secular)))
    assert 0 < difference[0] < 0.05
    assert difference[1] < 0.12 * difference[0]


def physical_rates(seed: int) -> tuple[dict, dict]:
    """Losses and gains of both levels behind a random unitary collision matrix of the six electronic states."""
    rng = np.random.default_rng(seed)
    H = rng.normal(size=(6, 6)) + 1j * rng.normal(size=(6, 6))
    values, vectors = eigh(H + H.conj().T)
    S = (vectors * np.exp(1j * rng.uniform(0.1, 1) * values)) @ vectors.conj().T
    part = {0.5: slice(0, 2), 1.5: slice(2, 6)}
    loss = {
        J: [1 - float(multipole_survival(S[part[J], part[J]], J, k)) for k in range(round(2 * J) + 1)] for J in BOTH
    }
    gain = {
        (a, b): [float(multipole_survival(S[part[b], part[a]], a, k, b)) for k in (0, 1)] for a, b in (BOTH, BOTH[::-1])
    }
    return loss, gain


@pytest.mark.parametrize("I", [0, *SPINS])
@pytest.mark.parametrize("secular", [True, False])
def test_total_trace_is_conserved_with_transfer_and_lost_with_decay(I, secular):
    loss, gain = physical_rates(1)
    found = relaxation(loss, I, 0, gain=gain, secular=secular)
    np.testing.assert_allclose(found.population_matrix().sum(axis=0), 0, atol=1e-13)
    decayed = relaxation(loss, I, 0, gain=gain, secular=secular, decay={0.5: 0.3, 1.5: 0.3})
    np.testing.assert_allclose(decayed.population_matrix().sum(axis=0), 0.3, rtol=1e-12)


@pytest.mark.parametrize("I", [0, *SPINS])
def test_detailed_balance_of_all_hyperfine_populations(I):
    """k(1/2->3/2)/k(3/2->1/2) = 2 exp(-D/kT) makes N_F ~ (2F+1) exp(-E_J/kT) stationary, each pair F, F' balanced."""
    boltzmann, down = math.exp(-1.7), 0.4
    up = 2 * boltzmann * down
    loss = {0.5: (up, up + 0.3), 1.5: (down, down + 0.1, down + 0.5, down + 0.2)}
    gain = {(0.5, 1.5): (up / math.sqrt(2), -0.02), (1.5, 0.5): (down * math.sqrt(2), -0.02 / boltzmann)}
    found = relaxation(loss, I, 0, gain=gain)
    W = found.population_matrix()
    expected = np.array([(2 * p.F1 + 1) * (boltzmann if p.J == 1.5 else 1) for p in found.pairs])
    stationary = null_space(W)[:, 0]
    np.testing.assert_allclose(stationary / stationary.sum(), expected / expected.sum(), rtol=1e-10)
    flow = W * expected
    np.testing.assert_allclose(flow, flow.T, atol=1e-12)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(
    I=st.sampled_from([0, 0.5, *SPINS]),
    J=st.sampled_from(BOTH),
    rates=st.lists(st.floats(0, 1e9), min_size=4, max_size=4),
    A=st.floats(-500, 500),
    data=st.data(),
)
def test_rates_lie_between_the_electronic_ones(I, J, rates, A, data):
    """min gamma <= Re(eigenvalue) <= max gamma: the Hermitian part is a compression of diag(gamma)."""
    gamma = rates[: round(2 * J) + 1]
    K = data.draw(st.integers(0, round(2 * (J + I))))
    for options in ({"secular": True}, {"energies_MHz": {J: hyperfine_energies(J, I, A)}}):
        values = relaxation({J: gamma}, I, K, **options).eigenvalues().real
        slack = 1e-9 * max(*gamma, abs(A) * 1e8, 1e-300)
        assert min(gamma) - slack <= values.min() and values.max() <= max(gamma) + slack


@settings(max_examples=40, deadline=None, derandomize=True)
@given(seed=st.integers(0, 10**6), I=st.sampled_from([0, *SPINS]), secular=st.booleans(), data=st.data())
def test_coupled_levels_never_grow(seed, I, secular, data):
    """A unitary collision never makes a multipole grow: Re(eigenvalue) >= 0, 0 only for the total population.

    |1 - eigenvalue| <= 1 because the map is completely positive and unital.
    """
    K = data.draw(st.integers(0, round(2 * (1.5 + I))))
    loss, gain = physical_rates(seed)
    values = relaxation(loss, I, K, gain=gain, secular=secular).eigenvalues()
    assert np.all(np.abs(1 - values) <= 1 + 1e-9)
    assert np.all(values.real > -1e-9)


@pytest.mark.parametrize(("J", "I"), [(1.5, 1), (1.5, 1.5), (0.5, 4)])
def test_shares_explain_the_rate(J, I):
    """Without gains rate = sum over k of share times gamma_k, exactly, whatever the frequencies."""
    for options in ({"secular": True}, {"energies_MHz": {J: hyperfine_energies(J, I, 0.08e-6)}}, {}):
        modes = relaxation({J: GAMMA[J]}, I, 2, **options).eigenrates()
        for mode in modes:
            assert sum(mode.electronic.values()) == pytest.approx(1) == sum(mode.hyperfine.values())
            explained = sum(share * GAMMA[J][k] for (_, k), share in mode.electronic.items())
            assert mode.rate == pytest.approx(explained, rel=1e-10)
        assert sum(mode.multiplicity for mode in modes) == len(next(iter(modes)).hyperfine)
