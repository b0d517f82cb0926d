"""Closed forms against mpmath (independent evaluation), a computed table, and limits.

Sources: constants, table and van der Waals points by independent computations (adaptive integration, two quadratures),
COMPUTED, not published; the definitions are Hindmarsh, Petford and Smith, Proc. R. Soc. A 297, 296 (1967), from memory.
"""

from __future__ import annotations

import math
import runpy
from pathlib import Path

import mpmath
import numpy as np
import pytest

from pertcalc import constants
from pertcalc.collisions import closed_form
from pertcalc.errors import InputError

# Independent computation, mpmath, 15 digits.
FWHM_6, SHIFT_6, RATIO_6 = 8.082779590600965, 2.936241558532680, 0.363271264002680
MOMENT_06, ALPHA_PREFACTOR = 0.977486324149607, 0.539078421360260
B_0, S_0 = 0.301195459295254, -0.437662620840219


def digits12(value: float) -> object:
    return pytest.approx(value, rel=1e-12)


def test_phase_constants():
    """a_3, a_4, a_6, a_12 in closed form; a_8, a_10 to the printed digits (COMPUTED)."""
    exact = {3: 2, 4: math.pi / 2, 6: 3 * math.pi / 8, 12: 63 * math.pi / 256}
    for n, value in exact.items():
        assert closed_form.phase_constant(n) == pytest.approx(value, rel=1e-14)
    assert closed_form.phase_constant(8) == pytest.approx(0.98175, abs=5e-6)
    assert closed_form.phase_constant(10) == pytest.approx(0.85903, abs=5e-6)


@pytest.mark.parametrize("n", [4, 5.5, 6, 9, 12])
def test_phase_constant_is_the_integral_along_a_straight_path(n):
    mpmath.mp.dps = 25
    integral = mpmath.quad(lambda t: (1 + t * t) ** (-mpmath.mpf(n) / 2), [0, 1, 5, mpmath.inf]) * 2
    assert closed_form.phase_constant(n) == pytest.approx(float(integral), rel=1e-13)


def test_lindholm_foley_constants_to_twelve_digits():
    width, shift = closed_form.lindholm_foley_constants(6)
    assert width == digits12(FWHM_6)
    assert shift == digits12(SHIFT_6)
    assert shift / width == digits12(RATIO_6)
    assert closed_form.speed_moment(0.6) == digits12(MOMENT_06)
    with mpmath.workdps(30):
        a6 = 3 * mpmath.pi / 8
        whole = 2 * mpmath.pi * mpmath.gamma(mpmath.mpf(3) / 5) * a6 ** mpmath.mpf("0.4")
        assert width == digits12(float(whole * mpmath.cos(mpmath.pi / 5)))
        assert shift == digits12(float(whole * mpmath.sin(mpmath.pi / 5) / 2))
        assert float(mpmath.tan(mpmath.pi / 5) / 2) == digits12(RATIO_6)
        moment = mpmath.sqrt(mpmath.pi / 4) ** mpmath.mpf("0.6") * mpmath.gamma("1.8") / mpmath.gamma("1.5")
        assert float(moment) == digits12(MOMENT_06)


@pytest.mark.parametrize("n", [5, 6, 8, 12])
def test_lindholm_foley_is_the_impact_integral(n):
    """2 pi Int b db (1 - e^{-i eta}) with eta = b^-(n-1), by mpmath, q = 1/b turned into the lower plane."""
    with mpmath.workdps(25):
        ray = mpmath.exp(-1j * mpmath.pi / (2 * (n - 1)))  # e^{-i q^(n-1)} falls along it
        # 1 - e^{-z} with z = r^(n-1) along the ray; q^-3 dq.
        value = mpmath.quad(
            lambda r: r**-3 * ray**-2 * -mpmath.expm1(-(r ** (n - 1))), [0, 0.5, 1, 2, 4, 16, 256, mpmath.inf]
        )
        sigma = 2 * mpmath.pi * value
    width, shift = closed_form.lindholm_foley_constants(n)
    scale = closed_form.phase_constant(n) ** (2 / (n - 1))
    assert width == pytest.approx(2 * float(sigma.real) * scale, rel=1e-9)
    assert shift == pytest.approx(abs(float(sigma.imag)) * scale, rel=1e-9)


def test_lindholm_foley_rates_scale_and_turn_sign():
    fwhm, shift = closed_form.lindholm_foley(135.0, np.array([2e-4, 4e-4]))
    assert fwhm[1] / fwhm[0] == pytest.approx(2**0.6)
    assert np.all(shift < 0)  # upper level more attracted: red
    reverse = closed_form.lindholm_foley(-135.0, np.array([2e-4, 4e-4]))
    np.testing.assert_allclose(reverse[0], fwhm)
    np.testing.assert_allclose(reverse[1], -shift)
    assert closed_form.lindholm_foley(0.0, 2e-4)[0] == 0


def test_familiar_gamma6_factor():
    """Unsold's gamma6 = 17 v^(3/5) C6^(2/5) N with C6 in Hz (FROM MEMORY for the 17): 8.0828 (2 pi)^(2/5) = 16.86."""
    assert closed_form.lindholm_foley_constants(6)[0] * (2 * math.pi) ** 0.4 == pytest.approx(16.86, abs=0.005)


def test_thermal_lindholm_foley_is_the_average_over_speeds():
    kT, mu = 300 * constants.KELVIN_HARTREE, 20 * constants.AMU_AU
    x, w = np.polynomial.laguerre.laggauss(180)
    v = np.sqrt(2 * kT * x / mu)
    for n in (6, 8, 12):
        fwhm, shift = closed_form.lindholm_foley_thermal(135.0, kT, mu, n)
        at_v = closed_form.lindholm_foley(135.0, v, n)
        density = 2 / math.sqrt(math.pi) * np.sqrt(x) * w  # Maxwell speeds
        assert fwhm == pytest.approx(density @ at_v[0], rel=2e-4)  # the square root at x = 0 slows Laguerre down
        assert shift == pytest.approx(density @ at_v[1], rel=2e-4)
    cold, hot = (closed_form.lindholm_foley_thermal(135.0, T * kT, mu)[0] for T in (1, 2))
    assert hot / cold == pytest.approx(2**0.3)


def test_power_law_half_width_of_van_der_waals_is_lindholm_foley():
    """sigma(v) = sigma0 (v/v0)^-0.4 with sigma0 = fwhm/(2 v0): half of the full width."""
    kT, mu, v0 = 5000 * constants.KELVIN_HARTREE, 1000.0, 1e6 / constants.AU_VELOCITY_CM_S
    sigma0 = float(closed_form.lindholm_foley(400.0, v0)[0]) / 2 / v0
    half = closed_form.power_law_half_width(sigma0, 0.4, v0, kT, mu)
    assert half == pytest.approx(closed_form.lindholm_foley_thermal(400.0, kT, mu)[0] / 2, rel=1e-13)
    # A constant cross section gives <v> sigma.
    assert closed_form.power_law_half_width(7.0, 0.0, v0, kT, mu) == pytest.approx(7 * closed_form.mean_speed(kT, mu))


# alpha, B, S: two quadratures, COMPUTED, stated good to +-0.001; they agree to 4e-5.
TABLE = """
0 0.301201 -0.437667
0.001 0.299327 -0.440674
0.01 0.288499 -0.431996
0.02 0.279555 -0.449302
0.05 0.331676 -0.49874
0.1 0.257581 -0.548406
0.2 0.206704 -0.443918
0.3 0.199105 -0.366197
0.4 0.201009 -0.312779
0.5 0.205621 -0.273523
0.6 0.211018 -0.243064
0.8 0.221934 -0.197992
1 0.232051 -0.165441
1.5 0.253331 -0.111121
2 0.27028 -0.0758447
3 0.296336 -0.0298815
5 0.332359 0.0231477
7 0.357923 0.0558581
10 0.386612 0.0891341
20 0.447244 0.151156
50 0.538352 0.231182
100 0.616832 0.292706
1000 0.954474 0.524164
"""


@pytest.mark.parametrize("row", TABLE.split("\n")[1:-1])
def test_lennard_jones_functions_agree_with_the_table(row):
    alpha, B, S = map(float, row.split())
    ours = closed_form.lennard_jones_functions(alpha)
    assert ours[0] == pytest.approx(B, abs=1e-4)
    assert ours[1] == pytest.approx(S, abs=1e-4)


def series(alpha: float) -> tuple[float, float]:
    """B and S from the entire power series in e^{-i q^5}: gamma functions only, no integration, many digits.

    2B - iS = -(i/2) sum_k (-i)^k/k! [alpha Gamma(s) (i/alpha)^s - (5/11) Gamma(t) (i/alpha)^t],
    s = (9+5k)/11, t = (3+5k)/11.
    """
    kappa = (2.2 * abs(alpha)) ** (-5 / 6)
    with mpmath.workdps(int(40 + kappa)):  # terms grow like e^kappa before they fall
        a, i = mpmath.mpf(alpha), mpmath.mpc(0, 1)
        base = i / a if alpha > 0 else -i / abs(a)
        total, factor, k = mpmath.mpc(0), mpmath.mpc(1), 0
        while True:
            s, t = mpmath.mpf(9 + 5 * k) / 11, mpmath.mpf(3 + 5 * k) / 11
            term = factor * (a * mpmath.gamma(s) * base**s - mpmath.mpf(5) / 11 * mpmath.gamma(t) * base**t)
            total += term
            if k > 2 * kappa + 20 and abs(term) < mpmath.mpf(10) ** -30:
                break
            k += 1
            factor *= -i / k
        whole = -i / 2 * total
        return float(whole.real) / 2, -float(whole.imag)


ALPHAS = [5e-4, 1e-3, 1.2e-3, 2e-3, 4e-3, 0.0117, 0.05, 0.1, 0.31, 0.77, 1.0, 3.0, 4.1, 12.0, 100.0, 2e3, 1e4]
ALPHAS += [-2e-3, -0.02, -0.5, -1.0, -30.0, -1e4]


@pytest.mark.parametrize("alpha", ALPHAS)
def test_lennard_jones_functions_agree_with_the_power_series(alpha):
    expected = series(alpha)
    ours = closed_form.lennard_jones_functions(alpha)
    assert ours[0] == pytest.approx(expected[0], rel=1e-11, abs=1e-12)
    assert ours[1] == pytest.approx(expected[1], rel=1e-11, abs=1e-12)


def test_lennard_jones_functions_agree_with_the_plain_definition():
    """The integral as defined, brute force on the real axis; its oscillating core x < 0.55 holds less than x^2/2."""
    core = 0.55
    x = np.concatenate([np.linspace(core, 1.0, 400_001)[:-1], np.geomspace(1.0, 1e3, 400_001)])
    eta = 4.0 * x**-11 - x**-5
    B = np.trapezoid(x * np.sin(eta / 2) ** 2, x) + 1e3**-8 / 32
    S = np.trapezoid(x * np.sin(eta), x) - 1e3**-3 / 3
    ours = closed_form.lennard_jones_functions(4.0)
    # Core: sin^2 averages to 1/2, sin to 0; what the first uncounted oscillation can hold is x/(d eta/dx).
    slope = abs(-44 * core**-12 + 5 * core**-6)
    assert ours[0] == pytest.approx(B + core**2 / 4, abs=2 * core / slope)
    assert ours[1] == pytest.approx(S, abs=2 * core / slope)


def test_lennard_jones_limits():
    B, S = closed_form.lennard_jones_functions(0.0)
    assert B == digits12(B_0)
    assert S == digits12(S_0)
    assert digits12(B_0) == math.gamma(0.6) * math.cos(math.pi / 5) / 4
    # alpha -> 0 is continuous, from either side.
    small = closed_form.lennard_jones_functions(np.array([1e-12, -1e-12, 1e-30, 1e-41]))
    np.testing.assert_allclose(small[0], B_0, rtol=1e-8)
    np.testing.assert_allclose(small[1], S_0, rtol=1e-8)
    # alpha -> infinity is pure C12: 2B - iS -> (1/2) alpha^(2/11) Gamma(9/11) [cos(pi/11) - i sin(pi/11)].
    B, S = closed_form.lennard_jones_functions(1e30)
    assert B == pytest.approx(1e30 ** (2 / 11) * math.gamma(9 / 11) * math.cos(math.pi / 11) / 4, rel=1e-6)
    assert S == pytest.approx(1e30 ** (2 / 11) * math.gamma(9 / 11) * math.sin(math.pi / 11) / 2, rel=1e-6)


def test_lennard_jones_landmarks():
    """S changes sign near alpha = 4.1; B has a minimum of about 0.199 near 0.3 (independent, interpolated)."""
    alpha = np.linspace(0.2, 6, 581)
    B, S = closed_form.lennard_jones_functions(alpha)
    assert alpha[np.argmin(B)] == pytest.approx(0.3, abs=0.05)
    assert B.min() == pytest.approx(0.199, abs=1e-3)
    assert alpha[np.argmax(S > 0)] == pytest.approx(4.1, abs=0.15)
    assert closed_form.lennard_jones_functions(alpha.reshape(7, 83))[0].shape == (7, 83)


def test_alpha_prefactor_to_twelve_digits():
    assert closed_form.lennard_jones_alpha(1.0, 1.0, 1.0) == digits12(ALPHA_PREFACTOR)
    with mpmath.workdps(30):
        exact = 63 * mpmath.pi / 256 * (3 * mpmath.pi / 8) ** (-mpmath.mpf(11) / 5)
    assert float(exact) == digits12(ALPHA_PREFACTOR)
    assert closed_form.lennard_jones_alpha(-2.0, 3.0, 1.0) < 0


def test_lennard_jones_line_meets_its_two_power_laws():
    v = np.array([1e-4, 3e-4])
    for ours, limit in (
        (closed_form.lennard_jones_line(135.0, 1e-4, v), closed_form.lindholm_foley(135.0, v)),
        (closed_form.lennard_jones_line(1e-12, 1e8, v), closed_form.lindholm_foley(-1e8, v, 12)),
        (closed_form.lennard_jones_line(0.0, 1e8, v), closed_form.lindholm_foley(-1e8, v, 12)),
        (closed_form.lennard_jones_line(135.0, 0.0, v), closed_form.lindholm_foley(135.0, v)),
    ):
        np.testing.assert_allclose(ours[0], limit[0], rtol=1e-6)
        np.testing.assert_allclose(ours[1], limit[1], rtol=1e-6)


def test_lennard_jones_line_of_reversed_potential():
    """dV -> -dV is complex conjugation: same width, opposite shift."""
    v = np.array([1e-4, 3e-4])
    for C12 in (3e7, -3e7):
        fwhm, shift = closed_form.lennard_jones_line(135.0, C12, v)
        reverse = closed_form.lennard_jones_line(-135.0, -C12, v)
        np.testing.assert_allclose(reverse[0], fwhm, rtol=1e-13)
        np.testing.assert_allclose(reverse[1], -shift, rtol=1e-13)


def test_lennard_jones_line_is_the_integral_over_impact_parameters():
    """2 n v 2 pi Int b db (1 - cos eta) with the phase of the real potential: prefactors too."""
    C6, C12, v, core = 135.0, 6e7, 2.5e-4, 5.0
    b = np.concatenate([np.linspace(core, 30.0, 900_001)[:-1], np.geomspace(30.0, 1e4, 200_001)])
    eta = (3 * math.pi / 8 * C6 / b**5 - 63 * math.pi / 256 * C12 / b**11) / v  # - Int dV dt
    width = 2 * v * 2 * math.pi * np.trapezoid(b * (1 - np.cos(eta)), b) + 2 * v * math.pi * core**2
    shift = -v * 2 * math.pi * np.trapezoid(b * np.sin(eta), b)
    ours = closed_form.lennard_jones_line(C6, C12, v)
    # Core: cos averages to 0; the first oscillation not counted holds less than 4 pi v b/(d eta/db).
    slack = 8 * math.pi * v * core / abs(11 * 63 * math.pi / 256 * C12 / core**12 / v)
    assert ours[0] == pytest.approx(width, abs=slack + 1e-6 * width)
    assert ours[1] == pytest.approx(shift, abs=slack + 1e-6 * width)


def test_thermal_lennard_jones_line_and_its_error():
    kT, mu = np.array([100.0, 400.0]) * constants.KELVIN_HARTREE, 20 * constants.AMU_AU
    for C12 in (1e5, 1e7, -1e7):
        fwhm, shift, error = closed_form.lennard_jones_line_thermal(135.0, C12, kT, mu)
        x = np.linspace(-9, math.log(45), 2_001)  # ln(E/kT), plain trapezoid as the slow obvious version
        v = np.sqrt(2 * kT[:, None] * np.exp(x) / mu)
        weight = 2 / math.sqrt(math.pi) * np.exp(1.5 * x - np.exp(x))
        at_v = closed_form.lennard_jones_line(135.0, C12, v)
        for ours, rate in zip((fwhm, shift), at_v, strict=True):
            exact = np.trapezoid(weight * rate, x)
            assert np.all(np.abs(ours - exact) <= 3 * error + 3e-7 * fwhm)  # the trapezoid is cut at x = e^-9
        # alpha < 1e-3 (C12 = 1e5 here) oscillates faster than the largest rule resolves; the error says so.
        assert np.all(error < (3e-4 if C12 == 1e5 else 1e-7) * fwhm)


SCRIPT = runpy.run_path(str(Path(__file__).parents[2] / "notes/scripts/van_der_waals_lambda.py"))

# Pi_K at beta = dC6/(hbar v b^5): full-path integration, rtol 1e-9 (independent, COMPUTED).
POINTS = {
    1.0: {0.5: (0.06584, 0.04007), 3: (0.957357, 0.960516), 20: (1.070867, 1.051046), 200: (1.279540, 0.787696)},
    1.5: {
        0.5: (0.017855, 0.035597, 0.017909),
        3: (0.490962, 0.871271, 0.544479),
        20: (0.827241, 1.377269, 0.786956),
        200: (1.165597, 0.813234, 1.194169),
    },
}


@pytest.mark.parametrize("J", [1.0, 1.5])
def test_script_behind_the_depolarisation_constants(J):
    betas = np.array([1e-3, *POINTS[J]])
    ours = SCRIPT["depolarisation"](betas, J, 1000)
    for K, losses in ours.items():
        born = {1.0: {1: 7 / 256, 2: 21 / 1280}, 1.5: {1: 7 / 960, 2: 7 / 480, 3: 7 / 960}}[J][K]
        assert losses[0] == pytest.approx(born * math.pi**2 * 1e-6, rel=1e-3)
        for loss, expected in zip(losses[1:], POINTS[J].values(), strict=True):
            assert loss == pytest.approx(expected[K - 1], abs=1e-5)


@pytest.mark.parametrize(("J", "level"), [(1.0, "P1"), (1.5, "P3/2")])
def test_depolarisation_constants(J, level):
    """Stored constants: reproduced by a shorter run of the script, and within +-0.01 of the independent values."""
    independent = {"P1": {1: 2.80, 2: 2.54}, "P3/2": {1: 2.10, 2: 2.575, 3: 2.31}}[level]
    stored = closed_form.DEPOLARISATION_CONSTANTS[level]
    assert set(stored) == set(independent)
    short = SCRIPT["lambdas"](J, 1000.0, 140, 8, 1200)
    for K, value in stored.items():
        assert value == pytest.approx(independent[K], abs=0.01)
        assert value == pytest.approx(short[K], abs=0.006)


def test_depolarisation_rates():
    kT, mu = np.array([200.0, 400.0]) * constants.KELVIN_HARTREE, 20 * constants.AMU_AU
    rates = closed_form.van_der_waals_depolarisation(220.0, kT, mu)
    assert rates[2][1] / rates[2][0] == pytest.approx(2**0.3)
    np.testing.assert_allclose(rates[1] / rates[2], 0.816, atol=0.002)  # ratio, independent computation
    vbar = closed_form.mean_speed(kT, mu)
    np.testing.assert_allclose(rates[2], 2.577 * 220**0.4 * MOMENT_06 * vbar**0.6, rtol=1e-12)
    opposite = closed_form.van_der_waals_depolarisation(-220.0, kT, mu)
    np.testing.assert_allclose(opposite[3], rates[3])
    np.testing.assert_allclose(closed_form.van_der_waals_depolarisation(0.0, kT, mu)[1], 0)


def test_rates_of_a_pair():
    kT, mu = np.array([300.0, 400.0]) * constants.KELVIN_HARTREE, 20 * constants.AMU_AU
    plain = closed_form.closed_form_rates(kT, mu, {"D1": 135.0, "D2": 135.0}, 220.0)
    np.testing.assert_allclose(plain.fwhm["D1"], closed_form.lindholm_foley_thermal(135.0, kT, mu)[0])
    np.testing.assert_allclose(-plain.shift["D1"] / plain.fwhm["D1"], RATIO_6, rtol=1e-12)
    assert plain.multipole_loss["P1/2"] == {1: None}
    assert plain.transfer == {"P1/2": None, "P3/2": None}
    assert set(plain.multipole_loss["P3/2"]) == {1, 2, 3}
    assert plain.reasons["transfer"] and plain.reasons["P1/2 K=1"]
    assert plain.numerical_error_relative["P3/2 K=2"] == pytest.approx(0.002 / 2.577)
    hard = closed_form.closed_form_rates(kT, mu, {"D1": 135.0, "D2": 135.0}, 220.0, {"D1": 1e9, "D2": 0.0})
    np.testing.assert_allclose(hard.fwhm["D1"], closed_form.lennard_jones_line_thermal(135.0, 1e9, kT, mu)[0])
    np.testing.assert_allclose(hard.fwhm["D2"], plain.fwhm["D2"])
    assert np.all(hard.shift["D1"] > plain.shift["D1"])  # repulsion pushes to the blue


def test_size_of_a_real_case():
    """Order of magnitude with units: dC6 = 135 au, mu = 19.7 u, 368 K is about 2e-9 rad/s cm^3 (common practice)."""
    rate = closed_form.lindholm_foley_thermal(135.0, 368 * constants.KELVIN_HARTREE, 19.7 * constants.AMU_AU)[0]
    assert 1e-9 < float(rate) * constants.AU_RATE_CM3_S < 5e-9


NAN = float("nan")


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: closed_form.phase_constant(1), "n = 1"),
        (lambda: closed_form.lindholm_foley_constants(3), "n = 3 must be above 3"),
        (lambda: closed_form.lindholm_foley(NAN, 1e-4), "C = nan"),
        (lambda: closed_form.lindholm_foley(1.0, -1e-4), "v must be positive"),
        (lambda: closed_form.lindholm_foley_thermal(1.0, 0.0, 1.0), "kT must be positive"),
        (lambda: closed_form.lindholm_foley_thermal(1.0, 1e-3, -1.0), "reduced_mass must be positive"),
        (lambda: closed_form.speed_moment(-3), "s = -3"),
        (lambda: closed_form.lennard_jones_functions(NAN), "alpha must be finite"),
        (lambda: closed_form.lennard_jones_functions([1.0, np.inf]), "alpha must be finite"),
        (lambda: closed_form.lennard_jones_alpha(0.0, 1.0, 1e-4), "C6 = 0"),
        (lambda: closed_form.lennard_jones_line(NAN, NAN, 1e-4), "C12 = nan"),
        (lambda: closed_form.van_der_waals_depolarisation(1.0, 1e-3, 1.0, "P1/2"), "level 'P1/2' is not covered"),
        (lambda: closed_form.power_law_half_width(1.0, 4.0, 1e-3, 1e-3, 1.0), "exponent = 4"),
        (lambda: closed_form.closed_form_rates(1e-3, 1.0, {"D1": 1.0}, 1.0, {}), "no entry for line D1"),
    ],
)
def test_bad_arguments_are_named(call, message):
    with pytest.raises(InputError, match=message):
        call()
