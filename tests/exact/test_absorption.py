"""Absorption against closed forms: area, two-level resonance, Doppler and Lorentz limits, dispersion, transmission."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import mpmath
import numpy as np
import pytest
from scipy.integrate import quad, trapezoid
from scipy.special import ive

from pertcalc.species import ALKALIS, alkali
from pertcalc.vapour.absorption import AREA_CM2_GHZ, GHZ_RAD_S, absorption_line, hyperfine_strengths
from pertcalc.vapour.trapping import escape_probability

LINES = [(symbol, line) for symbol in ALKALIS for line in ("D1", "D2")]


def single(symbol: str, line: str, doppler_GHz: float, lorentz_GHz: float | None = None):
    """The line with one component at zero: no hyperfine structure, chosen Doppler sigma and Lorentz width."""
    made = absorption_line(alkali(symbol), line, 300.0)
    one = replace(made.components[0], weight=1.0, offset_GHz=0.0, doppler_GHz=doppler_GHz)
    natural = made.natural_fwhm_GHz if lorentz_GHz is None else lorentz_GHz
    return replace(made, components=(one,), natural_fwhm_GHz=natural)


@pytest.mark.parametrize(("symbol", "line"), LINES)
@pytest.mark.parametrize("width_GHz", [0.0, 3.0, 300.0])
def test_the_area_is_pi_re_c_f_at_every_width(symbol, line, width_GHz):
    made = absorption_line(alkali(symbol), line, 350.0, width_GHz * GHZ_RAD_S, -0.3 * width_GHz * GHZ_RAD_S)
    # nu = c tan(t) maps the whole axis.
    half = 0.5 * made.component_fwhm_GHz()
    t = np.linspace(-math.pi / 2, math.pi / 2, 40_003)[1:-1]
    nu = made.shift_GHz + half * np.tan(t)
    area = trapezoid(made.cross_section(nu) * half / np.cos(t) ** 2, t)
    f = alkali(symbol).oscillator_strength[line].value
    assert area == pytest.approx(math.pi * 2.8179403262e-13 * 29.9792458 * f, rel=2e-5)  # r_e [cm], c [cm GHz], CODATA


def test_the_area_of_unit_oscillator_strength_is_the_textbook_number():
    # pi e^2/(4 pi eps0 m c) = 2.654e-6 m^2 Hz, any text on atomic spectra.
    assert AREA_CM2_GHZ * 1e-4 * 1e9 == pytest.approx(2.654e-6, rel=1e-4)


@pytest.mark.parametrize("spin", [0.0, 0.5, 1.0, 1.5, 2.5, 3.5, 4.0])
@pytest.mark.parametrize("j_upper", [0.5, 1.5])
def test_hyperfine_strengths_obey_their_sum_rules(spin, j_upper):
    strengths = hyperfine_strengths(spin, j_upper)
    assert sum(strengths.values()) == pytest.approx(1.0, rel=1e-12)
    for F in {F for F, _ in strengths}:  # from one F: its population
        share = sum(value for (lower, _), value in strengths.items() if lower == F)
        assert share == pytest.approx((2 * F + 1) / (2 * (2 * spin + 1)), rel=1e-12)
    for upper in {upper for _, upper in strengths}:  # into one F': its statistical weight
        share = sum(value for (_, above), value in strengths.items() if above == upper)
        assert share == pytest.approx((2 * upper + 1) / ((2 * spin + 1) * (2 * j_upper + 1)), rel=1e-12)


@pytest.mark.parametrize(("symbol", "line"), LINES)
def test_hyperfine_structure_moves_no_centre_of_gravity(symbol, line):
    # The hyperfine interaction is traceless and offsets count from the mean of the isotopes; the sum over all
    # components weights each level with 2F+1.
    made = absorption_line(alkali(symbol), line, 350.0)
    assert sum(one.weight * one.offset_GHz for one in made.components) == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize(("line", "ratio"), [("D1", 1.0), ("D2", 2.0)])
@pytest.mark.parametrize("symbol", ALKALIS)
def test_resonance_of_a_closed_two_level_line(symbol, line, ratio):
    # sigma_0 = lambda^2/(2 pi) (2J'+1)/(2J+1) for a line whose upper level decays in this line only.
    made = single(symbol, line, doppler_GHz=1e-9)
    wavelength = alkali(symbol).line_wavelength_nm(line) * 1e-7
    assert made.cross_section(0.0) == pytest.approx(ratio * wavelength**2 / (2 * math.pi), rel=1e-6)


def test_doppler_limit():
    made = single("Rb", "D1", doppler_GHz=0.2, lorentz_GHz=1e-9)
    nu = np.array([0.0, 0.1, 0.4])
    closed = made.area_cm2_GHz / (0.2 * math.sqrt(2 * math.pi)) * np.exp(-(nu**2) / (2 * 0.2**2))
    assert made.cross_section(nu) == pytest.approx(closed, rel=1e-6)
    assert made.peak()[1] == pytest.approx(closed[0], rel=1e-6)
    assert made.fwhm_GHz() == pytest.approx(2 * math.sqrt(2 * math.log(2)) * 0.2, rel=1e-6)


def test_lorentz_limit_with_shift():
    made = replace(single("Rb", "D2", 1e-7, 0.0), fwhm_rad_s=5 * GHZ_RAD_S, shift_rad_s=-1.5 * GHZ_RAD_S)
    nu = np.array([-1.5, 0.0, 40.0])
    away = nu + 1.5
    assert made.cross_section(nu) == pytest.approx(made.area_cm2_GHz * 2.5 / (math.pi * (away**2 + 2.5**2)), rel=1e-9)
    assert made.dispersion(nu) == pytest.approx(made.area_cm2_GHz * away / (math.pi * (away**2 + 2.5**2)), rel=1e-9)
    assert made.peak()[0] == pytest.approx(-1.5, abs=1e-4)
    assert made.fwhm_GHz() == pytest.approx(5.0, rel=1e-6)


@pytest.mark.parametrize(("width_GHz", "nu"), [(0.0, -1.0), (0.0, 2.3), (2.0, 0.7), (2.0, -6.0)])
def test_dispersion_is_the_hilbert_transform_of_absorption(width_GHz, nu):
    # Kramers and Kronig: L(nu) = (1/pi) P Int V(x)/(nu - x) dx, by a quadrature that knows of no Faddeeva function.
    made = absorption_line(alkali("Rb"), "D1", 330.0, width_GHz * GHZ_RAD_S)

    def absorption(x):
        return float(made.profile(x).real)

    inner = quad(absorption, nu - 0.5, nu + 0.5, weight="cauchy", wvar=nu, limit=400)[0]
    kinks = [one.offset_GHz for one in made.components]
    outer = 0.0
    for low, high in ((nu - 4000, nu - 0.5), (nu + 0.5, nu + 4000)):
        points = sorted({p for p in kinks if low < p < high} | {max(low, -60), min(high, 60)})
        edges = [low, *[p for p in points if low < p < high], high]
        outer += sum(quad(lambda x: absorption(x) / (x - nu), a, b, limit=400)[0] for a, b in pairwise(edges))
    assert -(inner + outer) / math.pi == pytest.approx(float(made.profile(nu).imag), rel=1e-4)


@pytest.mark.parametrize("spectrum_GHz", [0.3, 4.0])
def test_a_wide_light_spectrum_averages_the_cross_section(spectrum_GHz):
    made = absorption_line(alkali("Cs"), "D2", 320.0)
    s = spectrum_GHz / (2 * math.sqrt(2 * math.log(2)))
    x = np.linspace(-9 * s, 9 * s, 40_001)
    mean = trapezoid(made.cross_section(1.1 + x) * np.exp(-(x**2) / (2 * s**2)), x) / (s * math.sqrt(2 * math.pi))
    assert made.cross_section(1.1, spectrum_GHz) == pytest.approx(mean, rel=1e-7)


@pytest.mark.parametrize("depth", [1e-3, 0.3, 3.0, 30.0, 1e3, 1e6])
def test_escape_of_a_lorentz_line(depth):
    # (1/pi) Int dx/(1+x^2) exp(-t/(1+x^2)) = exp(-t/2) I0(t/2): x = tan(theta) makes it Bessel's integral.
    made = single("Rb", "D1", 1e-8, 2.0)
    assert escape_probability(made, depth / made.peak()[1], 1.0) == pytest.approx(ive(0, depth / 2), rel=1e-4)


@pytest.mark.parametrize("depth", [0.1, 1.0, 10.0, 30.0])
def test_escape_of_a_doppler_line(depth):
    # Int exp(-x^2)/sqrt(pi) exp(-t exp(-x^2)) dx = sum (-t)^k/(k! sqrt(k+1)), term by term.
    made = single("Rb", "D1", 0.2, 1e-9)
    with mpmath.workdps(40):
        series = mpmath.nsum(lambda k: (-depth) ** k / (mpmath.factorial(k) * mpmath.sqrt(k + 1)), [0, mpmath.inf])
    assert escape_probability(made, depth / made.peak()[1], 1.0) == pytest.approx(float(series), rel=1e-4)
