"""Scattering polarisability: electronic factors, mixtures, limits of the gas, propagated errors, refused input.

Sources: textbook values of the electronic factor; limits and laws otherwise.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import ALKALIS, alkali
from pertcalc.vapour.level_rates import free_rates
from pertcalc.vapour.scattering import (
    degree_linear,
    degree_unpolarised,
    electronic_polarisability,
    mixture,
    polarisability_error,
    scaled_rates,
    scattering_polarisability,
)
from tests.vapour_cases import DECAY, dipole_operator, made_isotope, made_rates

GAS = made_rates(1.1e7, (3.1e7, 4.3e7, 2.9e7), (2.2e7, 1.4e7), (-0.9e7, -0.6e7))


@pytest.mark.parametrize(
    "J, lower, W2", [(1, 0, 1.0), (1.5, 0.5, 0.5), (0.5, 0.5, 0.0), (0.5, 1.5, 0.0), (0, 1, 0.0), (1, 1, 0.25)]
)
def test_electronic_factor(J, lower, W2):
    """Textbook values of resonance fluorescence."""
    assert electronic_polarisability(J, lower) == pytest.approx(W2, rel=1e-14)


@pytest.mark.parametrize("J", [0.5, 1.5])
def test_electronic_factor_from_dipole_matrix_elements(J):
    """I(e -> e') from Clebsch-Gordan coefficients: (I_par - I_perp)/(I_par + I_perp) = 3 W2/(2 + W2)."""
    y, z, x = np.eye(3)[[1, 2, 0]]
    parallel, perpendicular = (np.trace(dipole_operator(J, y) @ dipole_operator(J, e)).real for e in (y, x))
    contrast = (parallel - perpendicular) / (parallel + perpendicular)
    assert contrast == pytest.approx(degree_linear(electronic_polarisability(J)), abs=1e-14)
    # Unpolarised beam along x, seen along z: the mean of the intensities of y and z excitation.
    I_y, I_x = (sum(np.trace(dipole_operator(J, e) @ dipole_operator(J, seen)).real for e in (y, z)) for seen in (y, x))
    expected = degree_unpolarised(electronic_polarisability(J))
    assert (I_y - I_x) / (I_y + I_x) == pytest.approx(expected, abs=1e-14)


def test_a_line_that_no_dipole_makes_is_refused():
    with pytest.raises(InputError, match="no dipole line"):
        electronic_polarisability(2.5, 0.5)


@pytest.mark.parametrize("symbol", ALKALIS)
def test_natural_mixture_is_the_mean_by_abundance(symbol):
    """Populations are equal (the rates are electronic), so the weights are the abundances, normalised."""
    element = alkali(symbol)
    found = scattering_polarisability(element, "D2", GAS)
    abundances = np.array([one.abundance.value for one in element.isotopes])
    assert list(found.weights.values()) == pytest.approx(abundances / abundances.sum(), rel=1e-12)
    alone = [scattering_polarisability(element, "D2", GAS, one.label).W2.value for one in element.isotopes]
    assert found.W2.value == pytest.approx(np.average(alone, weights=abundances), rel=1e-12)
    assert found.work["solves"] == len(element.isotopes)


@pytest.mark.parametrize("symbol", ALKALIS)
def test_collisions_without_hyperfine_structure_multiply_by_gamma_over_gamma_plus_loss(symbol):
    element = replace(alkali(symbol), isotopes=(made_isotope(1.5, symbol=symbol),))
    rates = made_rates(ranks=(0.0, 5.7e7, 0.0))
    found = scattering_polarisability(element, "D2", rates)
    assert found.W2.value == pytest.approx(0.5 * DECAY["P3/2"] / (DECAY["P3/2"] + 5.7e7), rel=1e-12)


@pytest.mark.parametrize("symbol", ALKALIS)
def test_more_gas_never_polarises(symbol):
    """W2 falls as every collision rate grows by the same factor, from its free value to zero."""
    element = alkali(symbol)

    def dense(n: float):
        return scaled_rates(GAS, n, n)

    W2 = [scattering_polarisability(element, "D2", dense(n)).W2.value for n in (0.0, 0.1, 1.0, 10.0, 1e5)]
    free = replace(free_rates(element), decay=DECAY)
    assert W2[0] == pytest.approx(scattering_polarisability(element, "D2", free).W2.value, rel=1e-12)
    assert all(a > b for a, b in zip(W2, W2[1:], strict=False))
    assert 0 < W2[-1] < 1e-4


def test_scaled_rates_keep_the_trace_and_the_outflow_in_every_rank():
    changed = scaled_rates(GAS, depolarisation=0.3, transfer=1.7)
    for level in ("P1/2", "P3/2"):
        assert changed.loss[level][0] == pytest.approx(1.7 * GAS.loss[level][0])
        for K in (0, 1):
            assert changed.gain[level][K] == pytest.approx(1.7 * GAS.gain[level][K])
    assert changed.loss["P3/2"][2] == pytest.approx(1.7 * 1.4e7 + 0.3 * 4.3e7)


def test_error_of_W2_is_the_derivative_for_small_errors():
    """Without hyperfine structure and transfer d ln W2 = -loss/(Gamma + loss) d ln loss."""
    element = replace(alkali("K"), isotopes=(made_isotope(0.0, symbol="K"),))
    rates = made_rates(ranks=(0.0, 5.7e7, 0.0))
    found = scattering_polarisability(element, "D2", rates, loss_error=0.02)
    expected = 0.02 * 5.7e7 / (DECAY["P3/2"] + 5.7e7)
    assert found.W2.error / found.W2.value == pytest.approx(expected, rel=1e-3)


def test_error_of_W2_bounds_the_change_it_stands_for():
    """The true change for rates off by their error, either way, is the error within a third (curvature)."""
    element = alkali("Rb")
    W2 = scattering_polarisability(element, "D2", GAS).W2.value
    for index, name in enumerate(("loss", "transfer")):
        given = [0.0, 0.0]
        given[index] = 0.2
        error = polarisability_error(element, "D2", GAS, *given)
        for sign in (-1, 1):
            factors = [1.0, 1.0]
            factors[index] += 0.2 * sign
            change = scattering_polarisability(element, "D2", scaled_rates(GAS, *factors)).W2.value - W2
            assert abs(change) == pytest.approx(error, rel=0.35), name
    both = polarisability_error(element, "D2", GAS, 0.2, 0.2)
    parts = (polarisability_error(element, "D2", GAS, 0.2, 0.0), polarisability_error(element, "D2", GAS, 0.0, 0.2))
    assert both == pytest.approx(np.hypot(*parts), rel=1e-12)


def test_error_is_unknown_rather_than_zero():
    element = alkali("Rb")
    assert scattering_polarisability(element, "D2", GAS).W2.error is None
    assert scattering_polarisability(element, "D2", free_rates(element), loss_error=0.1).W2.error is None


def test_bad_input_is_refused():
    element = alkali("Rb")
    with pytest.raises(UnknownNameError, match="isotope of Rb '133Cs'"):
        mixture(element, "D2", GAS, [0.0], "133Cs")
    with pytest.raises(UnknownNameError, match="line 'D7'"):
        scattering_polarisability(element, "D7", GAS)
    with pytest.raises(InputError) as caught:
        polarisability_error(element, "D2", GAS, -0.1, float("nan"))
    assert len(caught.value.problems) == 2
