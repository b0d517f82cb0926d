"""The analytic forms against their printed formulas (mpmath), their limits, and smoothness at every join."""

from __future__ import annotations

import pickle

import mpmath
import numpy as np
import pytest

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.curves.forms import (
    Curve,
    LennardJones,
    MorseVanDerWaals,
    Tail,
    TangToennies,
    VanDerWaals,
    damping,
)
from pertcalc.curves.tabulated import Tabulated
from pertcalc.errors import InputError

# Potassium-argon-like numbers, chosen for the tests: 40 cm^-1 at 10 bohr.
DE, RE = 40 / HARTREE_CM1, 10.0
DISPERSION = (300.0, 2.2e4, 2.1e6)


def sampled(curve: Curve, R: np.ndarray) -> Tabulated:
    return Tabulated(R, curve(R), curve.C6, curve.C8, curve.C10)


TT = TangToennies.from_well(DE, RE, *DISPERSION)
CURVES = {
    "tang-toennies": TT,
    "lennard-jones": LennardJones(DE, RE),
    "van-der-waals": VanDerWaals(300.0, 5.5),
    "morse, computed join": MorseVanDerWaals.from_well(DE, RE, *DISPERSION),
    "morse, given exponent": MorseVanDerWaals.from_well(DE, RE, *DISPERSION, a=0.6),
    "table": sampled(TT, np.arange(5.0, 26.0, 0.5)),
}
JOINS = [
    ("van-der-waals", 5.5),
    ("morse, computed join", CURVES["morse, computed join"].R_join),
    ("morse, given exponent", CURVES["morse, given exponent"].R_join),
    ("table", 5.0),
    ("table", 25.5),
]


@pytest.mark.parametrize("x", [1e-3, 0.05, 0.5, 1.0, 1.9999, 2.0, 2.0001, 3.0, 7.0, 15.0, 40.0, 200.0])
def test_damping_functions_keep_their_digits(x: float) -> None:
    # f_n(x) = P(n + 1, x), the regularised incomplete gamma function, at 40 digits.
    with mpmath.workdps(40):
        expected = [float(mpmath.gammainc(n + 1, 0, x, regularized=True)) for n in (6, 8, 10)]
    assert [float(f[0]) for f in damping([x])] == pytest.approx(expected, rel=3e-11)


@pytest.mark.parametrize("R", [0.1, 1.0, 2.0, 5.0, 10.0, 30.0, 100.0])
def test_tang_toennies_is_the_printed_sum(R: float) -> None:
    with mpmath.workdps(60):
        b, r = mpmath.mpf(TT.b), mpmath.mpf(R)

        def f(n: int) -> mpmath.mpf:
            return 1 - mpmath.exp(-b * r) * sum((b * r) ** k / mpmath.factorial(k) for k in range(n + 1))

        parts = [f(n) * C / r**n for n, C in zip((6, 8, 10), DISPERSION, strict=True)]
        expected = float(TT.A * mpmath.exp(-b * r) - sum(parts))
        scale = float(TT.A * mpmath.exp(-b * r) + sum(parts))
    assert abs(float(TT(R)) - expected) < 1e-12 * scale


@pytest.mark.parametrize(
    "De_cm1, Re_angstrom, dispersion",
    [
        (42.0, 5.4, (301.4, 22086.0, 2.12e6)),
        (394.0, 3.43, (472.5, 10909.0, 7.91e5)),
        (0.85, 7.7, (53.9, 4118.0, 4.51e5)),
        (1020.0, 1.78, (28.3, 307.0, 1.5e4)),
        (212.0, 2.31, (55.1, 752.0, 3.63e4)),
    ],
)
def test_the_solver_returns_the_well_it_was_given(
    De_cm1: float, Re_angstrom: float, dispersion: tuple[float, float, float]
) -> None:
    De, Re = De_cm1 / HARTREE_CM1, Re_angstrom / BOHR_ANGSTROM
    curve = TangToennies.from_well(De, Re, *dispersion)
    assert float(curve(Re)) == pytest.approx(-De, rel=1e-9)
    assert abs(float(curve.derivative(Re))) < 1e-8 * De
    # An independent look at the whole curve: Re is its lowest point, and the wall rises all the way in.
    R = np.linspace(0.5, 40.0, 40000)
    assert abs(R[np.argmin(curve(R))] - Re) < 2e-3
    assert np.all(np.diff(curve(R[R < 0.99 * Re])) < 0)


def test_a_well_without_a_wall_is_refused() -> None:
    with pytest.raises(InputError, match="no Tang-Toennies wall"):
        TangToennies.from_well(1000 / HARTREE_CM1, 12.0, 300.0)
    with pytest.raises(InputError, match="cannot join"):
        MorseVanDerWaals.from_well(1000 / HARTREE_CM1, 12.0, 300.0)
    with pytest.raises(InputError, match="R_join"):
        MorseVanDerWaals.from_well(DE, RE, *DISPERSION, a=0.6, R_join=9.0)


@pytest.mark.parametrize("name", CURVES)
def test_the_large_R_limit_is_C6(name: str) -> None:
    curve = CURVES[name]
    for R in (1e3, 1e4):
        # C8 and C10 (and the effective terms) still add 1e-4 at 1e3 bohr, 1e-6 at 1e4.
        bound = 1e2 / R**2 + 1e-12
        assert float(-curve(R) * R**6) == pytest.approx(curve.C6, rel=bound)
        assert float(curve.derivative(R) * R**7 / 6) == pytest.approx(curve.C6, rel=2 * bound)


@pytest.mark.parametrize("name", CURVES)
def test_the_derivative_is_the_slope(name: str) -> None:
    curve = CURVES[name]
    R = np.linspace(2.0, 40.0, 3001)
    h = 1e-3
    # At a join, and at the knots of a spline, a higher derivative jumps: those neighbourhoods have their own test.
    places = [join for n, join in JOINS if n == name] + [*CURVES["table"].R] * (name == "table")
    for place in places:
        R = R[np.abs(R - place) > 3 * h]
    # Five-point differences: h^4 V5/30 is 1e-13 V; rounding eps V/h is what the tolerance allows.
    five = (8 * (curve(R + h) - curve(R - h)) - (curve(R + 2 * h) - curve(R - 2 * h))) / (12 * h)
    tolerance = 1e-8 * np.abs(curve.derivative(R)) + 1e-15 * np.abs(curve(R)) / h + 1e-15
    assert np.all(np.abs(five - curve.derivative(R)) < tolerance)


@pytest.mark.parametrize("name, join", JOINS)
def test_value_and_slope_are_continuous_at_the_join(name: str, join: float) -> None:
    curve = CURVES[name]
    h = 1e-4
    inside, outside = join - h * np.arange(4), join + h * np.arange(1, 5)
    left, right = float(curve(np.nextafter(join, 0))), float(curve(np.nextafter(join, 99)))
    assert left == pytest.approx(right, rel=1e-11)
    # One-sided third-order differences from both sides of the join.
    weights = np.array([11, -18, 9, -2]) / (6 * h)
    slope_in = float(weights @ curve(inside))
    slope_out = -float(weights @ curve(outside - h + np.array([h * 1e-9, 0, 0, 0])))
    assert slope_in == pytest.approx(slope_out, rel=1e-5)
    assert slope_in == pytest.approx(float(curve.derivative(join)), rel=1e-5)
    assert float(curve.derivative(np.nextafter(join, 0))) == pytest.approx(
        float(curve.derivative(np.nextafter(join, 99))), rel=1e-10
    )


@pytest.mark.parametrize("name", CURVES)
def test_every_R_gives_a_finite_number(name: str) -> None:
    R = np.concatenate([[0.0, 1e-300, 0.05], np.geomspace(0.1, 1e8, 5000)])
    for values in CURVES[name].with_derivative(R):
        assert np.all(np.isfinite(values))


@pytest.mark.parametrize("name", CURVES)
@pytest.mark.parametrize("shape", [(), (0,), (1,), (7,), (2, 3), (2, 1, 4)])
def test_the_shape_of_the_answer_is_the_shape_of_R(name: str, shape: tuple[int, ...]) -> None:
    curve = CURVES[name]
    R = np.full(shape, 9.0)
    assert curve(R).shape == curve.derivative(R).shape == shape
    assert np.all(curve(R) == curve(9.0))
    assert isinstance(curve, Curve)


@pytest.mark.parametrize("name", CURVES)
def test_curves_survive_the_trip_to_another_process(name: str) -> None:
    again = pickle.loads(pickle.dumps(CURVES[name]))
    R = np.linspace(3, 30, 50)
    assert np.array_equal(again(R), CURVES[name](R))


@pytest.mark.parametrize("name", ["tang-toennies", "lennard-jones", "morse, computed join", "morse, given exponent"])
def test_the_well_comes_back(name: str) -> None:
    well = CURVES[name].well()
    assert well is not None
    assert (well.depth, well.position) == pytest.approx((DE, RE), rel=1e-9)


def test_lennard_jones_identities() -> None:
    curve = LennardJones(DE, RE)
    sigma = RE * 2 ** (-1 / 6)
    assert abs(float(curve(sigma))) < 1e-14 * DE * 1e2
    assert curve.C6 == pytest.approx(4 * DE * sigma**6)
    # Curvature at the minimum is 72 De/Re^2.
    h = 1e-3
    curvature = float(curve.derivative(RE + h) - curve.derivative(RE - h)) / (2 * h)
    assert curvature == pytest.approx(72 * DE / RE**2, rel=1e-6)


def test_the_van_der_waals_core_is_hard() -> None:
    curve = VanDerWaals(300.0, 5.5)
    outside = np.linspace(5.5, 50, 100)
    assert curve(outside) == pytest.approx(-300.0 / outside**6, rel=1e-14)
    assert float(curve(5.5 * 0.983)) > 0
    assert curve.wall_top > 0.1


def test_a_table_follows_the_curve_it_was_sampled_from() -> None:
    table = CURVES["table"]
    R = np.linspace(6.5, 25.5, 2000)
    # Spline error h^4 b^4 V/384 is 1.6e-4 V on the wall (h = 0.5 bohr, b about 1/bohr); twice that, plus 1e-3 De.
    assert np.all(np.abs(table(R) - TT(R)) < 1e-3 * DE + 3e-4 * np.abs(TT(R)))
    # The damped curve is shallower than its C_n sum at the last point; the effective C12 takes that up to 2 %.
    far = np.linspace(26, 60, 200)
    assert np.abs(table(far) / TT(far) - 1).max() < 0.02
    assert table.well().depth == pytest.approx(DE, rel=1e-3)
    assert table.r_min == 5.0
    assert table.wall_top == pytest.approx(float(TT(5.0)))


def test_matched_tail_meets_value_and_slope() -> None:
    tail = Tail.matched(12.0, -1e-4, 4e-5, *DISPERSION)
    V, slope = tail.with_derivative(12.0)
    assert (float(V), float(slope)) == pytest.approx((-1e-4, 4e-5), rel=1e-12)
    assert (tail.C6, tail.C8, tail.C10) == DISPERSION


@pytest.mark.parametrize(
    "R, V, words",
    [
        ([5, 6, 7, 8], [4, 3, 2, 1], "at least 5"),
        ([5, 6, 6, 8, 9], [4, 3, 2, 1, -1], "rise strictly"),
        ([5, 6, 5.5, 8, 9], [4, 3, 2, 1, -1], "rise strictly"),
        ([0, 6, 7, 8, 9], [4, 3, 2, 1, -1], "must be > 0"),
        ([5, 6, 7, 8, 9], [4, 3, np.nan, 1, -1], "not finite"),
        ([5, 6, 7, 8, 9], [3, 4, 2, 1, -1], "repulsive wall"),
        ([5, 6, 7, 8, 9], [-3, -4, -2, -1, -1], "repulsive wall"),
    ],
)
def test_bad_tables_are_refused(R: list[float], V: list[float], words: str) -> None:
    with pytest.raises(InputError, match=words):
        Tabulated(np.array(R), np.array(V) * 1e-3, 300.0)
