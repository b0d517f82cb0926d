"""Integration rules against integrals known exactly (gamma functions, polynomials); no fitted numbers."""

from __future__ import annotations

import math

import numpy as np
import pytest

from pertcalc import quadrature
from pertcalc.errors import InputError


@pytest.mark.parametrize("order", [1, 2, 5, 16])
def test_panels_integrate_polynomials_exactly(order):
    x, w = quadrature.gauss_legendre_panels([-1.0, 0.25, 0.5, 3.0], order)
    for degree in range(2 * order):
        exact = (3.0 ** (degree + 1) - (-1.0) ** (degree + 1)) / (degree + 1)
        assert w @ x**degree == pytest.approx(exact, rel=1e-12, abs=1e-12)


def test_panels_take_a_batch_of_edges():
    edges = np.array([[0.0, 1.0, 2.0], [1.0, 4.0, 9.0]])
    x, w = quadrature.gauss_legendre_panels(edges, 4)
    assert x.shape == w.shape == (2, 8)
    np.testing.assert_allclose((w * x**2).sum(-1), [8 / 3, (729 - 1) / 3], rtol=1e-14)
    assert np.all(np.diff(x, axis=-1) > 0)


def test_panels_converge_at_their_order():
    """Halving the panels of a rule of order 3 gains 2^6 on a smooth function."""
    errors = []
    for panels in (4, 8, 16):
        x, w = quadrature.gauss_legendre_panels(np.linspace(0, 3, panels + 1), 3)
        errors.append(abs(w @ np.exp(-x) - (1 - math.exp(-3))))
    assert errors[0] / errors[1] == pytest.approx(64, rel=0.1)
    assert errors[1] / errors[2] == pytest.approx(64, rel=0.1)


def test_log_panels_integrate_powers_over_many_decades():
    x, w = quadrature.log_panels(1e-6, 1e4, 20, 12)
    for power in (-2.5, -1.0, -0.4, 0.0, 0.6):
        exact = math.log(1e10) if power == -1 else (1e4 ** (power + 1) - 1e-6 ** (power + 1)) / (power + 1)
        assert w @ x**power == pytest.approx(exact, rel=1e-12)


@pytest.mark.parametrize("order", [1, 4, 16, 64])
def test_laguerre_rule_gives_the_moments_of_the_flux_weighted_energy(order):
    """<x^n> = Gamma(n+2)."""
    x, w = quadrature.maxwell_laguerre(order)
    for power in range(min(2 * order, 20)):
        assert quadrature.maxwell_average(x**power, w) == pytest.approx(math.gamma(power + 2), rel=1e-11)


@pytest.mark.parametrize("power", [-1.0, -0.5, -0.2, 0.0, 0.3, 1.0, 4.0])
def test_panel_rule_gives_gamma_functions_for_any_power(power):
    """<x^s> = Gamma(s+2); x^-1/5 is the van der Waals cross section."""
    x, w = quadrature.maxwell_panels()
    rel = 3e-8 if power == -1 else 3e-12  # at s = -1 the cut at x = 1e-8 is the error, and is 1e-8
    assert quadrature.maxwell_average(x**power, w) == pytest.approx(math.gamma(power + 2), rel=rel)


def test_panel_rule_averages_a_threshold():
    """<theta(x - a)> = (1 + a) e^-a with a panel edge at a: an Arrhenius-like cross section."""
    a = 3.0
    x, w = quadrature.log_panels(a, 60.0, 8, 12)
    assert w @ (x * np.exp(-x)) == pytest.approx((1 + a) * math.exp(-a), rel=1e-12)


def test_average_runs_over_the_last_axis():
    x, w = quadrature.maxwell_laguerre(8)
    np.testing.assert_allclose(quadrature.maxwell_average(np.stack([x, 2 * x, x * 0 + 1]), w), [2, 4, 1], rtol=1e-13)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: quadrature.gauss_legendre_panels([1.0]), "at least two"),
        (lambda: quadrature.gauss_legendre_panels([0.0, 0.0]), "strictly rising"),
        (lambda: quadrature.gauss_legendre_panels([0.0, float("nan")]), "finite"),
        (lambda: quadrature.gauss_legendre_panels([0.0, 1.0], 0), "order = 0"),
        (lambda: quadrature.gauss_legendre_panels([0.0, 1.0], 2.5), "order = 2.5"),
        (lambda: quadrature.log_panels(0.0, 1.0, 3), "low = 0"),
        (lambda: quadrature.log_panels(1.0, 2.0, 0), "panels = 0"),
        (lambda: quadrature.maxwell_laguerre(1000), "order = 1000"),
        (lambda: quadrature.maxwell_average([1.0, 2.0], [1.0]), "equal length"),
    ],
)
def test_bad_arguments_are_named(call, message):
    with pytest.raises(InputError, match=message):
        call()
