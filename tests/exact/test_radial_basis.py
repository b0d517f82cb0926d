"""B-spline basis against the hydrogen atom in closed form, and its convergence."""

from __future__ import annotations

import numpy as np
import pytest

from pertcalc.errors import InputError
from pertcalc.one_electron.atom import solve_atom
from pertcalc.one_electron.core import HYDROGEN
from pertcalc.one_electron.radial_basis import bspline_basis, eigenstates

HYDROGEN_ATOM = solve_atom(HYDROGEN, 5)


@pytest.mark.parametrize("l", range(4))
def test_coulomb_energies(l):
    basis = bspline_basis(64, 120.0)
    energies, _ = eigenstates(basis, l, -1 / basis.r)
    n = np.arange(l + 1, 6)
    np.testing.assert_allclose(energies[: len(n)], -1 / (2 * n**2), rtol=1e-8)


@pytest.mark.parametrize(("n", "l"), [(1, 0), (2, 0), (2, 1), (3, 0), (3, 1), (3, 2)])
def test_coulomb_moments(n, l):
    # <r> = [3 n^2 - l(l+1)]/2, <r^2> = n^2 [5 n^2 + 1 - 3 l(l+1)]/2: any text on the hydrogen atom.
    atom = HYDROGEN_ATOM
    density = atom.weights * atom.radial[l][atom.index(n, l)] ** 2
    assert density @ atom.r == pytest.approx((3 * n**2 - l * (l + 1)) / 2, rel=1e-8)
    assert density @ atom.r**2 == pytest.approx(n**2 * (5 * n**2 + 1 - 3 * l * (l + 1)) / 2, rel=1e-8)


def test_coulomb_oscillator_strengths():
    # 1s-np: f = 2^8 n^5 (n-1)^(2n-4) / (3 (n+1)^(2n+4)); 2p-3d 0.695785 (Bethe and Salpeter).
    for n in (2, 3, 4):
        f = 2**8 * n**5 * (n - 1) ** (2 * n - 4) / (3 * (n + 1) ** (2 * n + 4))
        assert HYDROGEN_ATOM.oscillator_strength(1, 0, n, 1) == pytest.approx(f, rel=1e-6)
    assert HYDROGEN_ATOM.oscillator_strength(2, 1, 3, 2) == pytest.approx(0.695785, rel=1e-5)
    assert HYDROGEN_ATOM.oscillator_strength(2, 1, 1, 0) == pytest.approx(-(2**13) / 3**9 / 3, rel=1e-8)


def test_sum_rule_of_one_electron():
    total = sum(HYDROGEN_ATOM.oscillator_strength(1, 0, n, 1) for n in range(2, 2 + len(HYDROGEN_ATOM.energies[1])))
    assert total == pytest.approx(1, abs=1e-5)


@pytest.mark.parametrize(("rank", "alpha"), [(1, 4.5), (2, 15.0), (3, 131.25)])
def test_coulomb_polarizabilities(rank, alpha):
    assert HYDROGEN_ATOM.polarizability(1, 0, 0, rank) == pytest.approx(alpha, rel=1e-9)


def test_states_are_orthonormal_and_start_positive():
    for radial in HYDROGEN_ATOM.radial:
        overlap = (radial * HYDROGEN_ATOM.weights) @ radial.T
        np.testing.assert_allclose(overlap, np.eye(len(radial)), atol=1e-10)
    assert (HYDROGEN_ATOM.radial[0][:5, 0] > 0).all()


def test_energies_fall_to_the_limit_as_the_basis_grows():
    # Variational: every basis is above the limit, and more functions on the same box come closer.
    errors = []
    for size in (14, 20, 26):
        basis = bspline_basis(size, 40.0)
        errors.append(eigenstates(basis, 0, -1 / basis.r)[0][0] + 0.5)
    assert errors[0] > errors[1] > errors[2] > 0
    assert errors[2] < 1e-4 * errors[0]


def test_quadrature_integrates_products_of_splines():
    basis = bspline_basis(30, 20.0)
    assert basis.weights.sum() == pytest.approx(20.0, rel=1e-13)
    assert basis.weights @ basis.r**16 == pytest.approx(20.0**17 / 17, rel=1e-12)  # the product of two of degree 8


def test_bad_arguments_are_all_named():
    with pytest.raises(InputError) as caught:
        bspline_basis(3, -1.0, 20)
    assert [problem.split(" = ")[0] for problem in caught.value.problems] == ["size", "r_max", "degree"]
    with pytest.raises(InputError, match="r_max"):
        bspline_basis(50, float("nan"))
