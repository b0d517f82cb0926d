"""The sudden limit: explicit list, recoupling formulas, and collision matrices without fine structure, compared.

Sources: exact algebra (method of Grawert, Z. Phys. 225, 283 (1969), from memory); the partial-wave formula of the
transfer of multipoles and the 9j form are written out here, independent of the package's 6j form.
"""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest

from pertcalc.angular import clebsch_gordan, multipole_survival, nine_j, projections, six_j
from pertcalc.collisions.sudden import recoupling_weights, sudden_limit, sudden_transfer
from pertcalc.errors import InputError

LEVELS = {"P1/2": 0.5, "P3/2": 1.5}
CASES = [(b, a, k) for a, b in itertools.product((0.5, 1.5), repeat=2) for k in range(int(2 * min(a, b)) + 1)]


@pytest.mark.parametrize(("J_final", "J", "k"), CASES)
def test_six_j_form_equals_the_nine_j_form(J_final, J, k):
    """(2J+1)(2J'+1) sum_s (2kappa+1)(2s+1) {L S J; L S J; kappa s k}{L S J'; L S J'; kappa s k}."""
    L, S = 1, 0.5
    for kappa, weight in recoupling_weights(J_final, J, k).items():
        nine = sum(
            (2 * s + 1) * nine_j(L, S, J, L, S, J, kappa, s, k) * nine_j(L, S, J_final, L, S, J_final, kappa, s, k)
            for s in (0, 1)
        )
        assert weight == pytest.approx((2 * J + 1) * (2 * J_final + 1) * (2 * kappa + 1) * nine, abs=1e-14)


@pytest.mark.parametrize(("J_final", "J", "k"), CASES)
def test_nothing_happens_without_a_collision(J_final, J, k):
    assert sum(recoupling_weights(J_final, J, k).values()) == pytest.approx(float(J == J_final), abs=1e-14)


def test_explicit_list_equals_the_general_formula():
    rng = np.random.default_rng(3)
    s1, s2 = rng.uniform(10, 500, size=(2, 7))
    limit = sudden_limit(s1, s2)
    losses = {1: s1, 2: s2}
    for level, J in LEVELS.items():
        for k, loss in limit.multipole_loss[level].items():
            np.testing.assert_allclose(loss, sudden_transfer(J, J, k, losses), rtol=1e-12)
        np.testing.assert_allclose(limit.transfer[level], limit.multipole_loss[level][0])
    for k, gain in limit.multipole_transfer.items():
        for J_final, J in ((0.5, 1.5), (1.5, 0.5)):
            np.testing.assert_allclose(gain, sudden_transfer(J_final, J, k, losses), rtol=1e-12, atol=1e-10)


def test_transfer_balances_and_multipoles_of_highest_rank_are_orbital():
    """Levels of equal energy: 2 k(1/2->3/2) = 4 k(3/2->1/2); rank 3 is orbital alignment times spin."""
    limit = sudden_limit(300.0, 280.0)
    assert 2 * limit.transfer["P1/2"] == pytest.approx(4 * limit.transfer["P3/2"])
    assert limit.multipole_loss["P3/2"][3] == pytest.approx(280.0)


def level_basis() -> dict[str, np.ndarray]:
    """Rows |J m> over columns |m_l m_s> of the 2P term, m descending."""
    product = list(itertools.product(projections(1), projections(0.5)))
    return {
        level: np.array([[clebsch_gordan(1, ml, 0.5, ms, J, m) for ml, ms in product] for m in projections(J)])
        for level, J in LEVELS.items()
    }


@pytest.mark.parametrize("seed", range(3))
def test_one_path_with_any_orbital_matrix_obeys_the_list(seed):
    """S = S_orbital x 1_spin, cut into J blocks: losses from explicit traces."""
    rng = np.random.default_rng(seed)
    orbital = np.linalg.qr(rng.normal(size=(3, 3)) + 1j * rng.normal(size=(3, 3)))[0]
    s1, s2 = (1 - multipole_survival(orbital, 1, kappa) for kappa in (1, 2))
    limit, basis = sudden_limit(s1, s2), level_basis()
    whole = np.kron(orbital, np.eye(2))
    for level, J in LEVELS.items():
        block = basis[level] @ whole @ basis[level].T
        for K in range(int(2 * J) + 1):
            assert 1 - multipole_survival(block, J, K) == pytest.approx(limit.multipole_loss[level][K], abs=1e-13)
    across = basis["P3/2"] @ whole @ basis["P1/2"].T
    for K in (0, 1):
        assert multipole_survival(across, 0.5, K, 1.5) == pytest.approx(limit.multipole_transfer[K], abs=1e-13)


def random_partial_waves(rng: np.random.Generator, top: int) -> dict[int, dict[tuple[int, int], complex]]:
    """Symmetric unitary S of |(1,N)Lt> for both parities, Lt <= top, as {Lt: {(N', N): S}}."""
    waves: dict[int, dict[tuple[int, int], complex]] = {}
    for Lt in range(top + 1):
        waves[Lt] = {}
        for parity in (0, 1):
            Ns = [N for N in range(abs(Lt - 1), Lt + 2) if N % 2 == parity]
            if not Ns:
                continue
            U = np.linalg.qr(rng.normal(size=(len(Ns),) * 2) + 1j * rng.normal(size=(len(Ns),) * 2))[0]
            S = U @ U.T
            waves[Lt].update({(a, b): S[i, j] for i, a in enumerate(Ns) for j, b in enumerate(Ns)})
    return waves


def recouple(orbital: dict[int, dict[tuple[int, int], complex]], top: int) -> dict[float, dict[tuple, complex]]:
    """S^Jt over (j', N', j, N) of |(1 1/2)j N; Jt> from S^Lt over (N', N), spin a spectator."""
    coupled: dict[float, dict[tuple, complex]] = {}
    for Jt in np.arange(0.5, top, 1.0):
        entries: dict[tuple, complex] = {}
        for Lt in (int(Jt - 0.5), int(Jt + 0.5)):
            for (N1, N0), S in orbital[Lt].items():
                for j1, j0 in itertools.product((0.5, 1.5), repeat=2):
                    both = 1.0
                    for j, N in ((j1, N1), (j0, N0)):
                        both *= (-1) ** round(j + N + Lt + 0.5) * six_j(0.5, 1, j, N, Jt, Lt)
                    both *= math.sqrt((2 * j1 + 1) * (2 * j0 + 1)) * (2 * Lt + 1)
                    entries[j1, N1, j0, N0] = entries.get((j1, N1, j0, N0), 0) + both * S
        coupled[Jt] = entries
    return coupled


def partial_wave_sum(S: dict, j_final: float, j: float, K: int, N_in: range) -> float:
    """sum (2Jt+1)(2Jt'+1)(-1)^(j'-j+N'-N) {j' Jt N'; Jt' j' K}{j Jt N; Jt' j K} S S'* over entrance waves N_in."""
    total = 0.0
    for Jt, row in S.items():
        for Jp, other in S.items():
            if abs(Jt - Jp) > K:
                continue
            for (j1, N1, j0, N0), value in row.items():
                if j1 == j_final and j0 == j and N0 in N_in and (j1, N1, j0, N0) in other:
                    weight = six_j(j1, Jt, N1, Jp, j1, K) * six_j(j0, Jt, N0, Jp, j0, K)
                    weight *= (2 * Jt + 1) * (2 * Jp + 1) * (-1) ** round(j1 - j0 + N1 - N0)
                    total += (weight * value * np.conj(other[j1, N1, j0, N0])).real
    return total


def test_random_partial_waves_recoupled_obey_the_list():
    """Any symmetric unitary S on |(1,N)Lt>, recoupled to |(1 1/2)j N;Jt>, with the quantum partial-wave formula."""
    top = 9
    orbital = random_partial_waves(np.random.default_rng(11), top)
    S_spin = recouple(orbital, top)
    S_orbital = {float(Lt): {(1, a, 1, b): S for (a, b), S in row.items()} for Lt, row in orbital.items()}
    one = {Jt: {key: float(key[0] == key[2] and key[1] == key[3]) for key in row} for Jt, row in S_spin.items()}
    one_orbital = {Lt: {key: float(key[1] == key[3]) for key in row} for Lt, row in S_orbital.items()}
    waves = range(0, top - 2)  # entrance waves all of whose total momenta are in the list

    def orbital_loss(k: int) -> float:
        return partial_wave_sum(one_orbital, 1, 1, k, waves) - partial_wave_sum(S_orbital, 1, 1, k, waves)

    limit = sudden_limit(orbital_loss(1), orbital_loss(2))
    scale = sum(2 * N + 1 for N in waves)
    assert orbital_loss(1) > 0.1 * scale and orbital_loss(2) > 0.1 * scale
    for level, j in LEVELS.items():
        for K in range(int(2 * j) + 1):
            loss = partial_wave_sum(one, j, j, K, waves) - partial_wave_sum(S_spin, j, j, K, waves)
            assert loss == pytest.approx(limit.multipole_loss[level][K], rel=1e-12)
    for K in (0, 1):
        gain = partial_wave_sum(S_spin, 1.5, 0.5, K, waves)
        assert gain == pytest.approx(limit.multipole_transfer[K], rel=1e-12)


def test_born_level_ratio():
    """Weak van der Waals anisotropy gives s1 : s2 = 5 : 3 (independent calculation); loss_K then follows c_K.

    Elastic and inelastic parts together: c_K + 1/6 for P3/2 and c_K + 1/3 for P1/2, in the same unit (1/2, 3/10).
    """
    limit = sudden_limit(1 / 2, 3 / 10)
    assert limit.multipole_loss["P1/2"][0] == pytest.approx(1 / 3)
    assert limit.multipole_loss["P1/2"][1] == pytest.approx(1 / 3)
    assert limit.multipole_loss["P3/2"][0] == pytest.approx(1 / 6)
    for K, elastic in {1: 2 / 15, 2: 4 / 15, 3: 2 / 15}.items():
        assert limit.multipole_loss["P3/2"][K] == pytest.approx(elastic + 1 / 6)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: recoupling_weights(0.5, 1.5, 2), "k = 2"),
        (lambda: recoupling_weights(2.5, 1.5, 1), "must both lie between"),
        (lambda: recoupling_weights(1.0, 1.0, 1), "must both lie between"),
        (lambda: sudden_transfer(0.5, 1.5, 1, {1: 3.0}), "kappa = 2"),
        (lambda: sudden_limit(float("nan"), 1.0), "finite"),
    ],
)
def test_bad_arguments_are_named(call, message):
    with pytest.raises(InputError, match=message):
        call()
