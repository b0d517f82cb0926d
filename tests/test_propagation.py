"""Batched 3x3 exponentials against scipy.linalg.expm, and the laws they must obey."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import expm

from pertcalc.collisions.propagation import GAUSS_OFFSET, MAGNUS_FAR, MAGNUS_NEAR, apply_exponential

SEED = 20


def applied(matrices: np.ndarray, W: np.ndarray) -> np.ndarray:
    """exp(-i H) W by the package for matrices (n, 3, 3) and complex W (3, 3, n), the summed phase put back."""
    H = tuple(matrices[:, i, j] for i, j in ((0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2)))
    result, phase = apply_exponential(np.stack([W.real, W.imag], axis=1), H, np.zeros(len(matrices)))
    return (result[:, 0] + 1j * result[:, 1]) * np.exp(-1j * phase)


def start(n: int, rng: np.random.Generator) -> np.ndarray:
    return rng.normal(size=(3, 3, n)) + 1j * rng.normal(size=(3, 3, n))


def worst(matrices: np.ndarray) -> float:
    """Largest deviation from expm, relative to the largest element of W."""
    W = start(len(matrices), np.random.default_rng(SEED))
    exact = np.stack([expm(-1j * m) @ W[:, :, k] for k, m in enumerate(matrices)], axis=-1)
    return float(np.abs(applied(matrices, W) - exact).max() / np.abs(W).max())


def with_spectrum(eigenvalues, n: int = 40) -> np.ndarray:
    rng = np.random.default_rng(SEED)
    turns = [np.linalg.qr(rng.normal(size=(3, 3)))[0] for _ in range(n)]
    return np.array([(Q * np.asarray(eigenvalues)) @ Q.T for Q in turns])


@pytest.mark.parametrize("size", [1e-12, 1e-6, 1e-2, 1.0, 10.0, 100.0, 1000.0])
def test_random_symmetric_matrices(size):
    A = np.random.default_rng(SEED).normal(size=(200, 3, 3))
    # expm itself rounds like the norm of the matrix.
    assert worst(size * (A + A.transpose(0, 2, 1)) / 2) < 1e-14 * max(1.0, size)


@pytest.mark.parametrize("size", [1e-3, 1.0, 30.0, 300.0])
@pytest.mark.parametrize("split", [0.0, 1e-12, 1e-8, 1e-4])
def test_two_or_three_equal_eigenvalues(size, split):
    """The trigonometric solution loses half its digits at a degeneracy; the result only loses them squared."""
    near = size * (1 + split)
    pairs = ([size, near, -2 * size], [size, -2 * near, -2 * size], [0, 0, size])
    for spectrum in (*pairs, [size, near, 2 * size - near]):
        assert worst(with_spectrum(spectrum)) < 1e-14 * max(1.0, size) + 5e-15 * size**2


def test_null_diagonal_and_unit_matrices():
    assert worst(np.zeros((1, 3, 3))) == 0.0
    assert worst(7.0 * np.eye(3)[None]) < 1e-14
    assert worst(np.array([np.diag([1.0, -2.0, 5.0]), np.diag([0.0, 0.0, 1e-30])])) < 1e-14


def test_unitary_and_composable():
    rng = np.random.default_rng(SEED)
    A = rng.normal(size=(300, 3, 3)) * np.geomspace(1e-3, 300, 300)[:, None, None]
    A = A + A.transpose(0, 2, 1)
    unit = np.repeat(np.eye(3, dtype=complex)[:, :, None], 300, axis=2)
    U = applied(A, unit)
    products = np.einsum("abn,cbn->nac", U, U.conj())
    np.testing.assert_allclose(products, np.broadcast_to(np.eye(3), products.shape), atol=1e-10)
    # exp(-iH/2) twice is exp(-iH); exp(+iH) undoes it.
    np.testing.assert_allclose(applied(A / 2, applied(A / 2, unit)), U, atol=1e-10)
    np.testing.assert_allclose(applied(-A, U), unit, atol=1e-10)


def test_the_left_out_phase_adds_up():
    W = np.zeros((3, 2, 3, 1))
    W[range(3), 0, range(3)] = 1.0
    H = tuple(np.array([x]) for x in (3.0, 1.0, -2.0, 0.0, 0.0, 0.0))
    _, once = apply_exponential(W, H, np.zeros(1))
    _, twice = apply_exponential(W, H, once)
    assert once[0] == pytest.approx(1.0, abs=1e-14)  # the middle eigenvalue
    assert twice[0] == pytest.approx(2.0, abs=1e-14)


def test_step_weights_are_those_of_the_commutator_free_magnus_integrator():
    """1/4 +- sqrt(3)/6 at Gauss points 1/2 +- sqrt(3)/6: Blanes and Moan, Appl. Numer. Math. 56, 1519 (2006)."""
    assert GAUSS_OFFSET == pytest.approx(np.sqrt(3) / 6, rel=1e-15)
    assert MAGNUS_NEAR + MAGNUS_FAR == pytest.approx(0.5, rel=1e-15)
    # The second exponential minus the first is h^2 H' 2 (near - far) sqrt(3)/6: their commutator is that of the Magnus
    # series, h^3 [H', H]/12, when this factor is 1/3.
    assert (MAGNUS_NEAR - MAGNUS_FAR) * GAUSS_OFFSET == pytest.approx(1 / 6, rel=1e-14)


def order_of(step) -> float:
    """log2 of how the error of a made-up time-dependent Hamiltonian falls when the step is halved."""

    def H(t: float) -> np.ndarray:
        return np.array([[np.cos(t), 0.3 * t, 0.2], [0.3 * t, -1.0, np.sin(2 * t)], [0.2, np.sin(2 * t), 0.5 * t * t]])

    def run(n: int) -> np.ndarray:
        U = np.eye(3, dtype=complex)[:, :, None]
        for k in range(n):
            U = step(H, k * 2.0 / n, 2.0 / n, U)
        return U[:, :, 0]

    exact = np.eye(3, dtype=complex)
    for k in range(20_000):
        exact = expm(-1j * 1e-4 * H((k + 0.5) * 1e-4)) @ exact
    errors = [np.abs(run(n) - exact).max() for n in (8, 16)]
    return float(np.log2(errors[0] / errors[1]))


def test_the_step_is_of_fourth_order():
    def step(H, t, h, U):
        first, second = (h * H(t + (0.5 + sign * GAUSS_OFFSET) * h) for sign in (-1, 1))
        for near, far in ((MAGNUS_NEAR, MAGNUS_FAR), (MAGNUS_FAR, MAGNUS_NEAR)):
            U = applied((near * first + far * second)[None], U)
        return U

    assert order_of(step) == pytest.approx(4.0, abs=0.3)
