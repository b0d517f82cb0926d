"""Angular momentum algebra against sympy's exact symbols, orthogonality sums and explicit traces.

Sources: the independent implementation sympy.physics.wigner; identities of Edmonds, Angular Momentum in Quantum
Mechanics (orthogonality of 3j: eq. 3.7.7-8, of 6j: eq. 6.2.9, of 9j: eq. 6.4.6).
"""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
import sympy
from hypothesis import given, settings
from hypothesis import strategies as st
from sympy.physics import wigner

from pertcalc import angular
from pertcalc.errors import InputError

HALVES = [0, 0.5, 1, 1.5, 2, 2.5]
half_integers = st.integers(0, 9).map(lambda twice: twice / 2)


def exact(value: float) -> sympy.Rational:
    return sympy.Rational(round(2 * value), 2)


@settings(max_examples=150, deadline=None, derandomize=True)
@given(st.data())
def test_three_j_and_clebsch_gordan_agree_with_sympy(data):
    j1, j2 = data.draw(half_integers), data.draw(half_integers)
    j3 = abs(j1 - j2) + data.draw(st.integers(0, int(2 * min(j1, j2))))
    m1 = j1 - data.draw(st.integers(0, int(2 * j1)))
    m2 = j2 - data.draw(st.integers(0, int(2 * j2)))
    m3 = -m1 - m2
    expected = float(wigner.wigner_3j(*map(exact, (j1, j2, j3, m1, m2, m3)))) if abs(m3) <= j3 else 0.0
    assert angular.three_j(j1, j2, j3, m1, m2, m3) == pytest.approx(expected, abs=1e-15, rel=1e-14)
    expected = float(wigner.clebsch_gordan(*map(exact, (j1, j2, j3, m1, m2, -m3)))) if abs(m3) <= j3 else 0.0
    assert angular.clebsch_gordan(j1, m1, j2, m2, j3, -m3) == pytest.approx(expected, abs=1e-15, rel=1e-14)


@settings(max_examples=100, deadline=None, derandomize=True)
@given(st.data())
def test_six_j_agrees_with_sympy(data):
    a, b, d = (data.draw(half_integers) for _ in range(3))
    c = abs(a - b) + data.draw(st.integers(0, int(2 * min(a, b))))
    e = abs(d - c) + data.draw(st.integers(0, int(2 * min(d, c))))
    fs = [f for f in np.arange(abs(a - e), a + e + 1) if abs(d - b) <= f <= d + b and (2 * (d + b - f)) % 2 == 0]
    if not fs:
        return
    f = data.draw(st.sampled_from(fs))
    expected = float(wigner.wigner_6j(*map(exact, (a, b, c, d, e, f))))
    assert angular.six_j(a, b, c, d, e, f) == pytest.approx(expected, abs=1e-15, rel=1e-14)


NINE_J = [
    (1, 0.5, 1.5, 1, 0.5, 1.5, 2, 1, 3),
    (1, 0.5, 0.5, 1, 0.5, 0.5, 2, 1, 1),
    (1, 0.5, 1.5, 1, 0.5, 1.5, 1, 0, 1),
    (1, 0.5, 1.5, 1, 0.5, 0.5, 2, 1, 2),
    (2, 2, 2, 2, 2, 2, 2, 2, 2),
    (3, 2.5, 1.5, 2, 1.5, 2.5, 1, 2, 3),
    (4, 3, 2, 3.5, 2.5, 3, 2.5, 2.5, 3),
]


@pytest.mark.parametrize("arguments", NINE_J)
def test_nine_j_agrees_with_sympy(arguments):
    expected = float(wigner.wigner_9j(*map(exact, arguments), prec=30))
    assert angular.nine_j(*arguments) == pytest.approx(expected, abs=1e-15, rel=1e-13)


@pytest.mark.parametrize("arguments", [(80, 81, 2, 1, 1, -2), (120.5, 120, 1.5, 0.5, -1, 0.5)])
def test_large_three_j_agree_with_sympy(arguments):
    expected = float(wigner.wigner_3j(*map(exact, arguments)))
    assert expected != 0
    assert angular.three_j(*arguments) == pytest.approx(expected, rel=1e-13)


def test_large_six_j_agrees_with_sympy():
    arguments = (1.5, 150.5, 150, 149.5, 1.5, 2)
    expected = float(wigner.wigner_6j(*map(exact, arguments)))
    assert expected != 0
    assert angular.six_j(*arguments) == pytest.approx(expected, rel=1e-13)


@pytest.mark.parametrize(("j1", "j2"), list(itertools.combinations_with_replacement(HALVES, 2)))
def test_clebsch_gordan_matrix_is_orthogonal(j1, j2):
    pairs = list(itertools.product(angular.projections(j1), angular.projections(j2)))
    coupled = [(J, M) for J in np.arange(abs(j1 - j2), j1 + j2 + 1) for M in angular.projections(J)]
    matrix = np.array([[angular.clebsch_gordan(j1, m1, j2, m2, J, M) for m1, m2 in pairs] for J, M in coupled])
    assert matrix.shape[0] == matrix.shape[1]
    np.testing.assert_allclose(matrix @ matrix.T, np.eye(len(pairs)), atol=1e-14)


@pytest.mark.parametrize(("a", "b", "c", "d"), [(1, 0.5, 1.5, 2), (2, 1.5, 1, 2.5), (3, 3, 3, 3), (2.5, 2, 1.5, 1)])
def test_six_j_orthogonality(a, b, c, d):
    xs = np.arange(max(abs(a - b), abs(c - d)), min(a + b, c + d) + 1)
    rows = np.arange(max(abs(c - b), abs(a - d)), min(c + b, a + d) + 1)
    matrix = np.array(
        [[math.sqrt((2 * x + 1) * (2 * e + 1)) * angular.six_j(a, b, x, c, d, e) for x in xs] for e in rows]
    )
    assert len(rows) > 1
    np.testing.assert_allclose(matrix @ matrix.T, np.eye(len(rows)), atol=1e-14)


def test_nine_j_recoupling_is_orthogonal():
    """|(L s)J (L s)J'; k> against |(L L)kappa (s s)sigma; k> of two p electrons: an orthogonal matrix."""
    L, s, k = 1, 0.5, 2
    jj = [(J, P) for J in (0.5, 1.5) for P in (0.5, 1.5) if abs(J - P) <= k <= J + P]
    ls = [(kappa, sigma) for kappa in (0, 1, 2) for sigma in (0, 1) if abs(kappa - sigma) <= k <= kappa + sigma]
    matrix = np.array(
        [
            [
                math.sqrt((2 * J + 1) * (2 * P + 1) * (2 * kappa + 1) * (2 * sigma + 1))
                * angular.nine_j(L, s, J, L, s, P, kappa, sigma, k)
                for kappa, sigma in ls
            ]
            for J, P in jj
        ]
    )
    assert matrix.shape == (3, 3)
    np.testing.assert_allclose(matrix @ matrix.T, np.eye(3), atol=1e-14)


def test_selection_rules_give_zero():
    assert angular.three_j(1, 1, 3, 0, 0, 0) == 0  # triangle
    assert angular.three_j(1, 1, 1, 0, 0, 0) == 0  # odd sum, all m zero
    assert angular.three_j(1, 1, 2, 1, 1, -1) == 0  # m sum
    assert angular.three_j(1, 1, 1, 2, -1, -1) == 0  # |m| > j
    assert angular.six_j(1, 1, 3, 1, 1, 1) == 0
    assert angular.six_j(0.5, 1, 1, 1, 1, 1) == 0  # half-integer sum of a triad
    assert angular.nine_j(1, 1, 3, 1, 1, 1, 1, 1, 1) == 0


@pytest.mark.parametrize("J", [0.5, 1, 1.5, 2, 2.5])
def test_tensor_operators_are_orthonormal_and_complete(J):
    size = int(2 * J) + 1
    labels = [(K, Q) for K in range(size) for Q in range(-K, K + 1)]
    stack = np.array([angular.tensor_operator(J, K, Q).ravel() for K, Q in labels])
    np.testing.assert_allclose(stack @ stack.T, np.eye(size**2), atol=1e-14)


def spin_matrices(J):
    """J_z and J_+ over descending m, from the ladder formula, not from coupling coefficients."""
    m = angular.projections(J)
    return np.diag(m), np.diag(np.sqrt(J * (J + 1) - m[1:] * (m[1:] + 1)), 1)


@pytest.mark.parametrize("J", [0.5, 1, 1.5, 2.5])
def test_tensor_operators_obey_the_commutators_that_define_them(J):
    """[J_z, T_KQ] = Q T_KQ and [J_+, T_KQ] = sqrt(K(K+1) - Q(Q+1)) T_KQ+1 (Edmonds, eq. 5.2.1)."""
    Jz, Jp = spin_matrices(J)
    for K in range(int(2 * J) + 1):
        for Q in range(-K, K + 1):
            T = angular.tensor_operator(J, K, Q)
            np.testing.assert_allclose(Jz @ T - T @ Jz, Q * T, atol=1e-13)
            up = angular.tensor_operator(J, K, Q + 1) * math.sqrt(K * (K + 1) - Q * (Q + 1)) if Q < K else 0 * T
            np.testing.assert_allclose(Jp @ T - T @ Jp, up, atol=1e-13)
    np.testing.assert_allclose(
        angular.tensor_operator(J, 1, 0), Jz / np.linalg.norm(Jz), atol=1e-14, err_msg="orientation along +z"
    )


@pytest.mark.parametrize(
    ("J", "J_final", "K"),
    [(0.5, 0.5, 0), (0.5, 0.5, 1), (1.5, 1.5, 2), (1.5, 1.5, 3), (0.5, 1.5, 1), (1.5, 0.5, 0), (1, 1, 2)],
)
def test_weights_reproduce_the_trace_they_stand_for(J, J_final, K):
    rng = np.random.default_rng(5)
    shape = (4, int(2 * J_final) + 1, int(2 * J) + 1)
    S = rng.normal(size=shape) + 1j * rng.normal(size=shape)
    traces = np.zeros(4, complex)
    for Q in range(-K, K + 1):
        T, final = angular.tensor_operator(J, K, Q), angular.tensor_operator(J_final, K, Q)
        traces += [np.trace(final.conj().T @ s @ T @ s.conj().T) / (2 * K + 1) for s in S]
    M = angular.tensor_weights(J, K, J_final)
    np.testing.assert_allclose(np.einsum("abcd,nac,nbd->n", M, S, S.conj()), traces, rtol=1e-13, atol=1e-13)
    np.testing.assert_allclose(angular.multipole_survival(S, J, K, J_final), traces.real, rtol=1e-13, atol=1e-13)
    np.testing.assert_allclose(traces.imag, 0, atol=1e-13)


def test_identity_keeps_every_multipole_and_unitary_keeps_population():
    rng = np.random.default_rng(6)
    unitary = np.linalg.qr(rng.normal(size=(4, 4)) + 1j * rng.normal(size=(4, 4)))[0]
    for K in range(4):
        assert angular.multipole_survival(np.eye(4), 1.5, K) == pytest.approx(1, abs=1e-14)
    assert angular.multipole_survival(unitary, 1.5, 0) == pytest.approx(1, abs=1e-14)
    assert angular.multipole_survival(unitary, 1.5, 2) < 1


BAD = [
    (lambda: angular.three_j(0.3, 1, 1, 0, 0, 0), "j1 = 0.3"),
    (lambda: angular.three_j(-1, 1, 1, 0, 0, 0), "j1 = -1"),
    (lambda: angular.three_j(1, 1, 1, 0.5, 0, 0), "m1 = 0.5"),
    (lambda: angular.three_j(1, 1, 1, 0.25, 0, 0), "m1 = 0.25"),
    (lambda: angular.six_j(1, 1, float("nan"), 1, 1, 1), "j3 = nan"),
    (lambda: angular.six_j(1, 1, float("inf"), 1, 1, 1), "j3 = inf"),
    (lambda: angular.six_j(1, 1, 1e12, 1, 1, 1), "j3 = 1e\\+12"),
    (lambda: angular.nine_j(1, 1, 1, 1, 1, 1, 1, 1, "x"), "j9 = 'x'"),
    (lambda: angular.clebsch_gordan(1, 0, 1, 0.5, 2, 0), "m2 = 0.5"),
    (lambda: angular.projections(0.75), "J = 0.75"),
    (lambda: angular.tensor_operator(0.5, 2, 0), "K = 2 must be an integer from 0 to 2J = 1"),
    (lambda: angular.tensor_operator(1.5, 1, 2), "Q = 2"),
    (lambda: angular.tensor_operator(1.5, 0.5, 0), "K = 0.5"),
    (lambda: angular.tensor_weights(1.5, 3, 0.5), "K = 3"),
    (lambda: angular.multipole_survival(np.eye(3), 1.5, 1), r"S has shape \(3, 3\)"),
]


@pytest.mark.parametrize(("call", "message"), BAD)
def test_bad_arguments_are_named(call, message):
    with pytest.raises(InputError, match=message):
        call()


def test_all_bad_arguments_are_reported_at_once():
    with pytest.raises(InputError) as caught:
        angular.six_j(-1, 0.3, 1, 1, 1, -2)
    assert len(caught.value.problems) == 3
