"""Ground-level spin: eigenrates without spin exchange, slowing-down factors with it, and how the two meet.

Sources: q = [4I(I+1)+3]/3 and 2I+1 (Anderson, Pipkin and Baird 1959; Appelt et al. 1998), eigenrates G, 2G/(2I+1)^2
(Bouchiat; Happer 1972), all FROM MEMORY and rederived here by direct sums over sublevels; 8:1 and 18:1 READ (abstract
of osti 7350745).
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pertcalc.angular import clebsch_gordan, projections
from pertcalc.errors import InputError
from pertcalc.vapour.ground_spin import exchange_broadening, ground_relaxation, observable_rates, slowing_down
from tests.vapour_cases import spin_matrices

SPINS = (1, 1.5, 2.5, 3.5, 4)


@pytest.mark.parametrize(("I", "ratio"), [(1, 4.5), (1.5, 8), (2.5, 18), (3.5, 32), (4, 40.5)])
def test_two_observable_rates(I, ratio):
    fast, slow = observable_rates(I, 250.0)
    assert fast == pytest.approx(250.0, rel=1e-12)
    assert fast / slow == pytest.approx(ratio, rel=1e-12)


def test_one_rate_where_only_one_level_is_oriented():
    assert observable_rates(0, 3.0) == pytest.approx((3.0, 3.0))
    assert observable_rates(0.5, 3.0) == pytest.approx((1.5, 1.5))  # F = 1: half of F_z is electronic


@pytest.mark.parametrize("I", SPINS)
def test_populations_of_the_two_levels_equalise_with_the_full_rate(I):
    np.testing.assert_allclose(ground_relaxation(I, 7.0, 0).eigenvalues().real, [0, 7], atol=1e-12)


@pytest.mark.parametrize(("I", "low", "high"), [(1.5, 6, 4), (2.5, 38 / 3, 6), (3.5, 22, 8), (1, 11 / 3, 3), (0, 1, 1)])
def test_limits_of_the_slowing_down_factor(I, low, high):
    assert slowing_down(I) == pytest.approx(low, rel=1e-14)
    assert slowing_down(I, 1.0) == pytest.approx(high, rel=1e-14)
    assert slowing_down(I, -1.0) == pytest.approx(high, rel=1e-14)


def sublevel_sums(I: float, P: float) -> tuple[float, float]:
    """<F_z>, <S_z> of rho ~ exp(beta F_z): populations of |F M>, S_z of each by its Clebsch-Gordan coefficients."""
    beta = 2 * math.atanh(P)
    norm = total = electronic = 0.0
    for F in (I - 0.5, I + 0.5) if I else (0.5,):
        for M in projections(F):
            weight = math.exp(beta * M)
            share = {m: clebsch_gordan(0.5, m, I, M - m, F, M) ** 2 if abs(M - m) <= I else 0.0 for m in (0.5, -0.5)}
            norm += weight
            total += weight * M
            electronic += weight * (share[0.5] - share[-0.5]) / 2
    return total / norm, electronic / norm


@pytest.mark.parametrize("I", [0, 0.5, *SPINS])
@pytest.mark.parametrize("P", [1e-3, 0.1, 0.5, 0.9, 0.999, -0.3])
def test_slowing_down_against_sums_over_all_sublevels(I, P):
    F_z, S_z = sublevel_sums(I, P)
    assert 2 * S_z == pytest.approx(P, rel=1e-10)  # P is the electron polarisation
    assert slowing_down(I, P) == pytest.approx(F_z / S_z, rel=1e-9)


@pytest.mark.parametrize(("I", "formula"), [(0.5, lambda P: 2 + 0 * P), (1.5, lambda P: (6 + 2 * P**2) / (1 + P**2))])
def test_slowing_down_closed_form(I, formula):
    """I = 1/2: electron and nucleus equally polarised, q = 2. I = 3/2: (6+2P^2)/(1+P^2), Appelt et al., FROM MEMORY."""
    P = np.linspace(-1, 1, 21)
    np.testing.assert_allclose(slowing_down(I, P), formula(P), rtol=1e-12)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(I=st.sampled_from(SPINS), P=st.floats(-1, 1))
def test_slowing_down_is_even_and_between_its_limits(I, P):
    q = slowing_down(I, P)
    assert q == slowing_down(I, -P)
    assert (2 * I + 1) * (1 - 1e-12) <= q <= (4 * I * (I + 1) + 3) / 3 * (1 + 1e-12)


@pytest.mark.parametrize("I", SPINS)
def test_spin_temperature_starts_with_rate_over_q_and_ends_with_the_slow_eigenrate(I):
    """rho ~ F_z (spin temperature, low P) loses <F_z> at G/q at first; without spin exchange the slow mode remains.

    rho^1(F) and the coefficients of <F_z> are both sqrt(F(F+1)(2F+1)/3): the Rayleigh quotient of the matrix.
    """
    found = ground_relaxation(I, 1.0)
    F = np.array([pair.F1 for pair in found.pairs])
    vector = np.sqrt(F * (F + 1) * (2 * F + 1) / 3)
    initial = vector @ found.matrix @ vector / (vector @ vector)
    assert initial == pytest.approx(1 / slowing_down(I), rel=1e-12)
    assert initial > observable_rates(I, 1.0)[1]


def test_shape_follows_the_polarisation():
    assert slowing_down(1.5).shape == ()
    assert slowing_down(1.5, [[0.0, 0.5, 1.0]]).shape == (1, 3)
    assert slowing_down(0, [0.1, 0.2]).shape == (2,)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: slowing_down(1.5, 1.2), r"P = 1\.2 must lie between -1 and 1"),
        (lambda: slowing_down(1.5, [0.1, math.nan]), r"P = .* must lie between"),
        (lambda: slowing_down(1.4), r"I = 1\.4 must be a whole or half number"),
        (lambda: observable_rates(1.5, -1.0), r"G = -1\.0 must be a finite rate >= 0"),
        (lambda: ground_relaxation(1.5, 1.0, 9), r"K = 9 must be an integer from 0 to"),
    ],
)
def test_bad_input_is_one_clear_error(call, message):
    with pytest.raises(InputError, match=message):
        call()


@pytest.mark.parametrize("I", [0.5, 1.0, 1.5, 2.5, 3.5, 4.0])
def test_exchange_damps_the_precession_of_one_hyperfine_level(I: float) -> None:
    """2I(2I-1)/[3(2I+1)^2]: 1/8 at I = 3/2, 7/32 at I = 7/2 (Happer and Tam 1977, FROM MEMORY)."""
    assert exchange_broadening(I) == pytest.approx(2 * I * (2 * I - 1) / (3 * (2 * I + 1) ** 2), abs=1e-13)


@pytest.mark.parametrize("I", [1.0, 1.5, 3.5])
def test_exchange_damping_by_direct_sums_over_sublevels(I: float) -> None:
    """Independent: apply R[phi (1 + 4<S>.S) - rho], linear in the polarisation, to F_x of the upper level alone."""
    S = [np.kron(s, np.eye(round(2 * I + 1))) for s in spin_matrices(0.5)]
    N = [np.kron(np.eye(2), n) for n in spin_matrices(I)]
    F = [s + n for s, n in zip(S, N, strict=True)]
    square = sum(f @ f for f in F)
    upper = (square - (I - 0.5) * (I + 0.5) * np.eye(len(square))) / (2 * I + 1)  # projector on F = I + 1/2
    rho = upper @ F[0] @ upper
    phi = rho / 4 + sum(s @ rho @ s for s in S)
    mean_S = [np.trace(rho @ s) for s in S]
    returned = 4 / len(square) * sum(m * s for m, s in zip(mean_S, S, strict=True))
    change = upper @ (phi + returned - rho) @ upper
    decay = -np.trace(change @ rho) / np.trace(rho @ rho)
    assert exchange_broadening(I) == pytest.approx(float(decay.real), rel=1e-12)
