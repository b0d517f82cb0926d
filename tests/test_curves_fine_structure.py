"""Fine-structure curves: limits, eigenvalue identities, derivatives, line differences."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pertcalc.constants import HARTREE_CM1
from pertcalc.curves import fine_structure as fs
from pertcalc.curves.files import default_ids, load_default

energies = st.floats(-0.02, 0.05)


def six_state_matrix(V_sigma: float, V_pi: float, splitting: float) -> np.ndarray:
    """V_P + (V_S - V_P)|n><n| + a l.s in the basis |m_l> x |m_s>, n along z, from the plain operators."""
    root = np.sqrt(0.5)
    lx = root * np.array([[0, 1, 0], [1, 0, 1], [0, 1, 0]], dtype=complex)
    ly = root * np.array([[0, -1j, 0], [1j, 0, -1j], [0, 1j, 0]])
    lz = np.diag([1.0, 0.0, -1.0]).astype(complex)
    sx, sy, sz = (np.array(m, dtype=complex) / 2 for m in ([[0, 1], [1, 0]], [[0, -1j], [1j, 0]], [[1, 0], [0, -1]]))
    spin_orbit = sum(np.kron(a, b) for a, b in ((lx, sx), (ly, sy), (lz, sz)))
    return np.kron(np.diag([V_pi, V_sigma, V_pi]), np.eye(2)) + splitting / 1.5 * spin_orbit


@settings(deadline=None, derandomize=True)
@given(energies, energies, st.floats(0, 0.01))
def test_the_three_curves_are_the_six_state_eigenvalues(S: float, P: float, splitting: float) -> None:
    expected = np.linalg.eigvalsh(six_state_matrix(S, P, splitting))
    three = [fs.lower(S, P, splitting), fs.upper(S, P, splitting), fs.omega32(P, splitting)]
    ours = sorted(2 * [float(value) for value in three])
    assert ours == pytest.approx(expected, abs=1e-15)


@settings(deadline=None, derandomize=True)
@given(energies, energies, st.floats(1e-6, 0.01))
def test_trace_and_determinant(S: float, P: float, splitting: float) -> None:
    a = fs.coupling(splitting)
    low, high = float(fs.lower(S, P, splitting)), float(fs.upper(S, P, splitting))
    assert low + high == pytest.approx(S + P - a / 2, abs=1e-16)
    assert low * high == pytest.approx(S * (P - a / 2) - a * a / 2, abs=1e-17)


def test_limits_at_infinite_separation() -> None:
    s = 554.0 / HARTREE_CM1
    assert float(fs.lower(0, 0, s)) == pytest.approx(-2 * s / 3, rel=1e-15)
    assert float(fs.upper(0, 0, s)) == pytest.approx(s / 3, rel=1e-15)
    assert float(fs.omega32(0, s)) == pytest.approx(s / 3, rel=1e-15)
    assert float(fs.sigma_weight(0, 0, s)) == pytest.approx(1 / 3)


def test_zero_splitting_gives_the_bare_curves() -> None:
    S, P = np.array([0.01, -0.01, 0.0]), np.array([-0.02, 0.03, 0.0])
    assert np.allclose(fs.lower(S, P, 0.0), np.minimum(S, P), atol=1e-18)
    assert np.allclose(fs.upper(S, P, 0.0), np.maximum(S, P), atol=1e-18)
    assert np.all(np.isfinite(fs.lower_derivative(S, P, S, P, 0.0)))


@pytest.mark.parametrize("pair", [("K", "Ar"), ("Cs", "He"), ("Li", "Xe")])
def test_derivatives_of_the_adiabatic_curves(pair: tuple[str, str]) -> None:
    curves = load_default(*pair)
    s = fs.splitting_of(curves)
    R, h = np.linspace(6.05, 24.0, 500), 1e-4
    (S, dS), (P, dP) = curves.B.with_derivative(R), curves.A.with_derivative(R)
    for value, slope in ((fs.lower, fs.lower_derivative), (fs.upper, fs.upper_derivative)):
        centred = value(curves.B(R + h), curves.A(R + h), s) - value(curves.B(R - h), curves.A(R - h), s)
        analytic = slope(S, P, dS, dP, s)
        # The third derivative of a spline jumps at its knots: there the centred difference is good to a few h^2 only.
        assert np.abs(centred / (2 * h) - analytic).max() < 3e-6 * np.abs(analytic).max()


@pytest.mark.parametrize("name", default_ids())
def test_line_differences_start_at_the_line_centre(name: str) -> None:
    alkali, gas = name.removesuffix("_default").title().split("-")
    curves = load_default(alkali, gas)
    s = fs.splitting_of(curves)
    R = np.array([200.0, 9.0])
    found = fs.line_differences(curves.X, curves.A, curves.B, R, s)
    # At 200 bohr the curves are pure C6/R^6; to first order P1/2 feels (S + 2P)/3 and P3/2, Omega = 1/2, (2S + P)/3.
    far = {
        "d1": (curves.B.C6 + 2 * curves.A.C6) / 3 - curves.X.C6,
        "d2_half": (2 * curves.B.C6 + curves.A.C6) / 3 - curves.X.C6,
        "d2_three_half": curves.A.C6 - curves.X.C6,
    }
    for key, C6 in far.items():
        # C8 adds up to 1 %; energies near the splitting (1e-3 hartree) are rounded to 1e-18.
        assert getattr(found, key)[0] == pytest.approx(-C6 / 200.0**6, rel=0.03, abs=3e-18), key
    # Nearby, the sum over the three (their trace) needs no eigenvalue at all.
    total = found.d1[1] + found.d2_half[1] + found.d2_three_half[1]
    assert total == pytest.approx(float(curves.B(9.0) + 2 * curves.A(9.0) - 3 * curves.X(9.0)), rel=1e-9, abs=1e-14)
