"""Cross sections from scattering matrices: 6j symbols, explicit sums over projections, laws.

Independent of the 6j formula: the collision as a superoperator on |j m>|N M> made with Clebsch-Gordan coefficients
(pertcalc.angular, exact), averaged over directions by summing over all N M before and N' M' after. Sources of the
conventions: Omont, Prog. Quantum Electron. 5, 69 (1977); Baranger, Phys. Rev. 112, 855 (1958).
"""

from __future__ import annotations

import itertools
import math
from functools import cache

import numpy as np
import pytest

from pertcalc.angular import clebsch_gordan, projections, six_j, tensor_operator
from pertcalc.collisions.channels import channels
from pertcalc.collisions.close_coupling import Matrices
from pertcalc.collisions.partial_waves import (
    J_OF_LEVEL,
    LEVELS,
    large_six_j,
    line_cross_section,
    multipole_cross_sections,
)

K2 = (1.7, 1.1)  # k^2 of either level [1/bohr^2]
RANKS = [(level, final, K) for level in LEVELS for final in LEVELS for K in range(4)]
RANKS = [(a, b, K) for a, b, K in RANKS if K <= 2 * min(J_OF_LEVEL[a], J_OF_LEVEL[b])]


# --- 6j symbols -----------------------------------------------------------------------------------------------------


def family(Jt_values, j: float, K: int):
    """Every {j Jt N; Jt' j K} the sums use: N = |j - Jt| ... j + Jt, Jt' = Jt - K ... Jt + K."""
    for Jt in Jt_values:
        for N in np.arange(abs(j - Jt), j + Jt + 1):
            for other in np.arange(max(Jt - K, 0.5), Jt + K + 1):
                yield j, Jt, float(N), float(other), j, K


FAMILIES = [(j, K) for j in (0.5, 1.5) for K in range(int(2 * j) + 1)]


@pytest.mark.parametrize(("j", "K"), FAMILIES)
def test_six_j_equals_exact_arithmetic(j, K):
    symbols = list(family([*np.arange(0.5, 12.0), 57.5, 400.5, 900.5], j, K))
    exact = np.array([six_j(*symbol) for symbol in symbols])
    columns = np.array(symbols).T
    # The sums weigh a symbol with 2 Jt + 1: that is the size to compare with (one of two terms may cancel).
    error = np.abs(large_six_j(*columns) - exact) * (2 * columns[1] + 1)
    assert error.max() < 1e-10, symbols[error.argmax()]
    assert np.count_nonzero(exact) > 0.5 * exact.size


@pytest.mark.parametrize(("j", "K"), FAMILIES)
def test_six_j_equals_sympy(j, K):
    from sympy import Rational
    from sympy.physics.wigner import wigner_6j

    for symbol in family([0.5, 1.5, 6.5], j, K):
        try:
            exact = float(wigner_6j(*(Rational(round(2 * x), 2) for x in symbol)))
        except ValueError:  # sympy's word for a broken triangle
            exact = 0.0
        assert float(large_six_j(*symbol)) == pytest.approx(exact, abs=1e-13)


def test_six_j_of_several_hundred_equals_sympy():
    from sympy import Rational
    from sympy.physics.wigner import wigner_6j

    for symbol in [
        (1.5, 300.5, 301.0, 299.5, 1.5, 2),
        (1.5, 640.5, 639.0, 640.5, 1.5, 3),
        (0.5, 812.5, 812, 811.5, 0.5, 1),
    ]:
        exact = float(wigner_6j(*(Rational(round(2 * x), 2) for x in symbol)))
        assert float(large_six_j(*symbol)) == pytest.approx(exact, rel=1e-10)
        assert exact != 0


def test_six_j_orthogonality():
    """sum_K (2K+1)(2N+1) {j Jt N; Jt' j K}^2 = 1 and different N are orthogonal (Edmonds 6.2.9)."""
    Jt = np.arange(2.5, 900.0, 7.0)
    for d, first, second in itertools.product((-1, 0, 1), (-1.5, -0.5, 0.5, 1.5), (-1.5, -0.5, 0.5, 1.5)):
        other, total = Jt + d, np.zeros_like(Jt)
        for K in range(4):
            pair = large_six_j(1.5, Jt, Jt + first, other, 1.5, K) * large_six_j(1.5, Jt, Jt + second, other, 1.5, K)
            total += (2 * K + 1) * (2 * (Jt + first) + 1) * pair
        there = abs(first - d) <= 1.5 and first == second
        np.testing.assert_allclose(total, float(there), atol=1e-10)


def test_six_j_outside_a_triangle_is_zero():
    assert large_six_j(0.5, 3.5, 5.0, 3.5, 0.5, 1) == 0
    assert large_six_j(0.5, 3.5, 4.0, 3.5, 0.5, 2) == 0
    assert large_six_j(0.5, 0.5, -1.0, 0.5, 0.5, 0) == 0


# --- explicit sums over projections ---------------------------------------------------------------------------------


def random_matrices(seed: int, top: float, exchange: bool = True) -> Matrices:
    """Random symmetric unitary S of every (Jt, parity), Jt = 1/2 ... top, on the channels that exist."""
    rng = np.random.default_rng(seed)
    total = np.arange(0.5, top + 0.6)
    S, partial = {}, {}
    for parity in ("e", "f"):
        partial[parity] = channels(total, parity).partial
        S[parity] = np.zeros((total.size, 3, 3), dtype=complex)
        for i in range(total.size):
            there = np.flatnonzero(partial[parity][:, i] >= 0)
            for block in (there,) if exchange else (there[:1], there[1:]):
                shape = (len(block), len(block))
                U = np.linalg.qr(rng.normal(size=shape) + 1j * rng.normal(size=shape))[0]
                S[parity][i][np.ix_(block, block)] = U @ U.T
    return Matrices(total, S, partial, K2, 0)


@cache
def product_basis(j: float, top: int) -> dict[tuple[float, int, float], np.ndarray]:
    """|(j N) Jt Mt> over |j m>|N M>, N = 0 ... top, as {(Jt, N, 0): columns over Mt}, shape (size, 2Jt+1)."""
    waves = [(N, M) for N in range(top + 1) for M in range(-N, N + 1)]
    place = {wave: i for i, wave in enumerate(waves)}
    states = {}
    for N in range(top + 1):
        for Jt in np.arange(abs(j - N), j + N + 1):
            columns = np.zeros((round(2 * j + 1), len(waves), round(2 * Jt + 1)))
            for (a, m), M, (c, Mt) in itertools.product(
                enumerate(projections(j)), range(-N, N + 1), enumerate(projections(Jt))
            ):
                if m + M == Mt:
                    columns[a, place[N, M], c] = clebsch_gordan(j, m, N, M, Jt, Mt)
            states[float(Jt), N] = columns.reshape(-1, columns.shape[-1])
    return states


def operator(matrices: Matrices, level: str, final: str, top: int, unit: bool = False) -> np.ndarray:
    """S (or 1 on the same total momenta) from `level` to `final` over |j m>|N M>, shape (2j'+1, waves, 2j+1, waves)."""
    j, jf = J_OF_LEVEL[level], J_OF_LEVEL[final]
    before, after = product_basis(j, top), product_basis(jf, top)
    waves = (top + 1) ** 2
    whole = np.zeros((round((2 * jf + 1) * waves), round((2 * j + 1) * waves)), dtype=complex)
    levels = (LEVELS[0], LEVELS[1], LEVELS[1])
    for parity, (i, Jt) in itertools.product(("e", "f"), enumerate(matrices.total)):
        for a, b in itertools.product(range(3), repeat=2):
            Nf, N = (int(matrices.partial[parity][c, i]) for c in (a, b))
            if (levels[b], levels[a]) == (level, final) and min(N, Nf) >= 0:
                element = float(a == b) if unit else matrices.S[parity][i, a, b]
                whole += element * after[float(Jt), Nf] @ before[float(Jt), N].T
    return whole.reshape(round(2 * jf + 1), waves, round(2 * j + 1), waves)


def explicit(matrices: Matrices, level: str, final: str, K: int, unit: bool = False) -> float:
    """(pi/k^2)(2K+1)^-1 sum_Q Tr[T_KQ(j')^+ S T_KQ(j) S^+], trace over the projections of atom and axis."""
    top = round(matrices.total[-1] + 1.5)
    S = operator(matrices, level, final, top, unit)
    value = 0j
    for Q in range(-K, K + 1):
        T, Tf = tensor_operator(J_OF_LEVEL[level], K, Q), tensor_operator(J_OF_LEVEL[final], K, Q)
        value += np.einsum("ba,bxcy,cd,axdy->", Tf.conj(), S, T, S.conj(), optimize=True)
    assert abs(value.imag) < 1e-9 * max(abs(value), 1)
    return np.pi / matrices.momentum2[LEVELS.index(level)] * value.real / (2 * K + 1)


@pytest.mark.parametrize(("level", "final", "K"), RANKS)
@pytest.mark.parametrize("seed", [1, 2])
def test_multipoles_equal_explicit_sums_over_projections(level, final, K, seed):
    matrices = random_matrices(seed, 4.5)
    gain, loss = multipole_cross_sections(matrices, level, final, K)
    assert gain == pytest.approx(explicit(matrices, level, final, K), rel=1e-10, abs=1e-9)
    if level == final:
        whole = explicit(matrices, level, final, K, unit=True)
        assert loss == pytest.approx(whole - explicit(matrices, level, final, K), rel=1e-10, abs=1e-9)


def test_spin_flips_of_p12():
    """sigma(1/2 -> -1/2) as a sum of multipoles equals its plain sum of squares."""
    matrices = random_matrices(3, 3.5)
    S = operator(matrices, "P1/2", "P1/2", 5)
    explicit_flip = np.pi / K2[0] * np.sum(np.abs(S[0, :, 1, :]) ** 2)
    gains = [multipole_cross_sections(matrices, "P1/2", "P1/2", K)[0] for K in (0, 1)]
    # rho = |1/2><1/2| = (T00 + T10)/sqrt 2; probability to arrive in -1/2.
    assert (gains[0] - gains[1]) / 2 == pytest.approx(explicit_flip, rel=1e-10)


# --- laws -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", range(3))
def test_loss_of_population_is_the_plain_inelastic_sum(seed):
    """loss_0 = (pi/k^2) sum (2Jt+1)/(2j+1) |S_{j'N',jN}|^2; sigma_0 of transfer is that times sqrt((2j+1)/(2j'+1))."""
    matrices = random_matrices(seed, 20.5)
    for level, final in (("P1/2", "P3/2"), ("P3/2", "P1/2")):
        column, row = ([0], [1, 2]) if level == "P1/2" else ([1, 2], [0])
        plain = sum(
            np.sum((2 * matrices.total + 1)[:, None, None] * np.abs(S[:, row][:, :, column]) ** 2)
            for S in matrices.S.values()
        )
        j, jf = J_OF_LEVEL[level], J_OF_LEVEL[final]
        plain *= np.pi / matrices.momentum2[LEVELS.index(level)] / (2 * j + 1)
        assert multipole_cross_sections(matrices, level, level, 0)[1] == pytest.approx(plain, rel=1e-11)
        gain = multipole_cross_sections(matrices, level, final, 0)[0]
        assert gain == pytest.approx(math.sqrt((2 * j + 1) / (2 * jf + 1)) * plain, rel=1e-11)


@pytest.mark.parametrize("K", [0, 1])
def test_microreversibility(K):
    """k1^2 sigma_K(1/2 -> 3/2) = k2^2 sigma_K(3/2 -> 1/2) for any symmetric S (orthonormal tensors)."""
    matrices = random_matrices(4, 20.5)
    up = multipole_cross_sections(matrices, "P1/2", "P3/2", K)[0] * K2[0]
    down = multipole_cross_sections(matrices, "P3/2", "P1/2", K)[0] * K2[1]
    assert up == pytest.approx(down, rel=1e-11) and abs(up) > 1e-3


def test_no_exchange_no_outflow():
    matrices = random_matrices(5, 10.5, exchange=False)
    for level in LEVELS:
        assert multipole_cross_sections(matrices, level, level, 0)[1] == pytest.approx(0, abs=1e-9)
        assert multipole_cross_sections(matrices, level, level, 1)[1] > 1
    assert multipole_cross_sections(matrices, "P1/2", "P3/2", 0)[0] == 0


def diagonal_matrices(phase, top: float) -> Matrices:
    """S = exp(2 i phase(N)) in every channel: a spinless, isotropic collision."""
    total = np.arange(0.5, top + 0.6)
    made = {parity: channels(total, parity) for parity in ("e", "f")}
    S = {}
    for parity, found in made.items():
        S[parity] = np.zeros((total.size, 3, 3), dtype=complex)
        for c in range(3):
            N = found.partial[c]
            S[parity][:, c, c] = np.where(N >= 0, np.exp(2j * phase(np.maximum(N, 0))), 0)
    return Matrices(total, S, {parity: found.partial for parity, found in made.items()}, K2, 0)


def phase(N):
    return 9.0 / (1 + N**2 / 20)


@pytest.mark.parametrize("level", LEVELS)
def test_isotropic_collisions_relax_nothing(level):
    """Angular momentum of the atom is a spectator: every loss is 0 but for the last partial waves."""
    matrices = diagonal_matrices(lambda N: np.where(N < 30, phase(N), 0.0), 40.5)
    for K in range(int(2 * J_OF_LEVEL[level]) + 1):
        assert multipole_cross_sections(matrices, level, level, K)[1] == pytest.approx(0, abs=1e-8)


@pytest.mark.parametrize("level", LEVELS)
def test_line_of_isotropic_collisions_is_the_sum_over_partial_waves(level):
    """(pi/k^2) sum (2N+1) [1 - S(N) S_g(N)*], both levels."""
    N = np.arange(43)
    upper = np.where(N < 30, phase(N), 0.0)
    ground = np.exp(2j * np.where(N < 30, 0.4 * phase(N), 0.0))
    matrices = diagonal_matrices(lambda n: upper[n.astype(int)], 40.5)
    wanted = np.pi / K2[LEVELS.index(level)] * np.sum((2 * N + 1) * (1 - np.exp(2j * upper) * ground.conj()))
    assert line_cross_section(matrices, level, ground) == pytest.approx(wanted, rel=1e-11)


@pytest.mark.parametrize("level", LEVELS)
def test_line_equals_explicit_trace(level):
    """(pi/k^2)(2j+1)^-1 Tr[1 - S S_g^+] over |j m>|N M>; the weight of every element of S counts."""
    matrices = random_matrices(6, 4.5)
    top = 6
    ground = np.exp(2j * phase(np.arange(top + 1)))
    of_wave = np.repeat(ground, 2 * np.arange(top + 1) + 1)
    S, unit = (operator(matrices, level, level, top, flag) for flag in (False, True))
    trace = np.einsum("axax,x->", unit, np.ones(of_wave.size)) - np.einsum("axax,x->", S, of_wave.conj())
    wanted = np.pi / K2[LEVELS.index(level)] * trace / (2 * J_OF_LEVEL[level] + 1)
    assert line_cross_section(matrices, level, ground) == pytest.approx(wanted, rel=1e-11)


@pytest.mark.parametrize("level", LEVELS)
def test_line_of_full_absorption(level):
    """S = 0: the half width counts every channel, (pi/k^2) sum (2Jt+1)/(2j+1), and there is no shift."""
    matrices = random_matrices(7, 9.5)
    dark = Matrices(matrices.total, {p: 0 * S for p, S in matrices.S.items()}, matrices.partial, K2, 0)
    j = J_OF_LEVEL[level]
    wanted = 0.0
    for Jt in matrices.total:
        wanted += (2 * Jt + 1) / (2 * j + 1) * len(np.arange(abs(Jt - j), Jt + j + 1))
    found = line_cross_section(dark, level, np.ones(20, dtype=complex))
    assert found == pytest.approx(np.pi / K2[LEVELS.index(level)] * wanted, rel=1e-12)
