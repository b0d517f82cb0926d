"""Born tails against independent numbers, against exact sums over impact parameters, and against each other.

Sources: closed forms and numbers of an independent calculation (COMPUTED): K-Ar size coefficients, and a full-path
integration (DOP853) of the six-state collision at b = 22. The paths here are integrated by this file itself.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import quad

from pertcalc import constants
from pertcalc.collisions import born_tails as born
from pertcalc.collisions.closed_form import lindholm_foley_constants
from pertcalc.errors import InputError

V, D, DC = 2.56304e-4, 220.0, 135.33
FAR = 1.0  # hartree: a splitting so large that nothing flows out


def test_shift_tail_numbers():
    """b0 = 45: -14.297 (C6), -0.470 (C8) bohr^2; C6 rate -2.245e-11 rad/s cm^3. Independent numbers, dC8 of K-Ar."""
    c6 = born.shift_tail(V, 45.0, DC)
    assert c6 == pytest.approx(-14.297, abs=6e-4)
    assert c6 * V * constants.AU_RATE_CM3_S == pytest.approx(-2.245e-11, abs=6e-15)
    dC8 = (90_000 + 2 * 15_000) / 3 - 22_000  # C8 of B, A, X of those K-Ar curves
    c8 = born.shift_tail(V, 45.0, 0.0, dC8=dC8)
    assert c8 == pytest.approx(-0.470, abs=6e-4)
    assert c8 / c6 == pytest.approx(dC8 / (2 * DC * 45**2), rel=1e-12)


def test_shift_rate_does_not_depend_on_temperature():
    v = np.array([1e-4, 2e-4, 5e-4])
    rate = v * born.shift_tail(v, 45.0, DC, 2e4, 1e6)
    np.testing.assert_allclose(rate, rate[0], rtol=1e-14)


@pytest.mark.parametrize(("n", "name"), [(6, "dC6"), (8, "dC8"), (10, "dC10")])
def test_shift_tail_is_the_sum_of_phases(n, name):
    coefficients = {"dC6": 0.0, "dC8": 0.0, "dC10": 0.0, name: 100.0}
    b0 = 7.0
    summed = -quad(lambda b: 2 * math.pi * b * float(born.phase(V, b, **coefficients)), b0, np.inf, epsrel=1e-12)[0]
    assert born.shift_tail(V, b0, **coefficients) == pytest.approx(summed, rel=1e-10)
    along = quad(lambda z: 100.0 / (b0 * b0 + z * z) ** (n / 2), -np.inf, np.inf, epsrel=1e-12)[0] / V
    assert born.phase(V, b0, **coefficients) == pytest.approx(along, rel=1e-10)


@pytest.mark.parametrize("R_max", [20.0, 26.0, 80.0])
def test_shift_tail_beyond_a_largest_distance(R_max):
    """(1/v) Int dV d^3R over b > b0 or R > R_max, from cylinders: each b < b0 misses the path beyond R_max."""
    b0 = 20.0
    coefficients = {"dC6": 135.0, "dC8": 2e4, "dC10": 2e6}

    def missed(b: float) -> float:
        z0 = math.sqrt(max(R_max**2 - b * b, 0.0))

        def minus_dV(z: float) -> float:
            r2 = b * b + z * z
            return 135.0 / r2**3 + 2e4 / r2**4 + 2e6 / r2**5

        return 2 * quad(minus_dV, z0, np.inf, epsabs=0)[0]

    extra = -quad(lambda b: 2 * math.pi * b * missed(b), 0, b0, epsrel=1e-9)[0] / V
    whole, plain = born.shift_tail(V, b0, **coefficients, R_max=R_max), born.shift_tail(V, b0, **coefficients)
    assert whole - plain == pytest.approx(extra, rel=1e-7)


@pytest.mark.parametrize(
    ("b0", "elastic", "half_width", "extra"), [(20.0, 3.253, 5.936, 1.017), (30.0, 0.127, 0.232, 0.040)]
)
def test_tail_numbers(b0, elastic, half_width, extra):
    """Independent numbers, three decimals: loss_2(3/2) elastic, half width of P1/2, what P3/2 adds."""
    assert born.multipole_loss_tail(V, b0, D, FAR, "P3/2", 2) == pytest.approx(elastic, abs=6e-4)
    half = born.half_width_tail(V, b0, DC, D, FAR, "P1/2")
    assert half == pytest.approx(half_width, abs=6e-4)
    assert born.half_width_tail(V, b0, DC, D, FAR, "P3/2") - half == pytest.approx(extra, abs=6e-4)


@pytest.mark.parametrize(("x0", "h"), [(0.1, 0.999991), (0.3, 0.999351), (1, 0.951643), (2, 0.675353), (4, 0.135074)])
def test_adiabatic_tail_factor_numbers(x0, h):
    assert born.adiabatic_tail_factor(x0) == pytest.approx(h, abs=6e-7)


def test_adiabatic_tail_factor_is_its_integral():
    f0 = float(born.adiabatic_factor(0.0))
    for x0 in (0.05, 0.7, 3.0, 12.0):
        integral = quad(lambda t: t**-9 * float(born.adiabatic_factor(t)) / f0, x0, np.inf, epsabs=0, epsrel=1e-11)[0]
        assert born.adiabatic_tail_factor(x0) == pytest.approx(8 * x0**8 * integral, rel=1e-9)
    assert born.adiabatic_tail_factor(0.0) == pytest.approx(1)
    assert born.adiabatic_factor(0.0) == pytest.approx(7 * math.pi**2 / 128)
    assert born.adiabatic_tail_factor(1e4) == 0


def test_adiabatic_factor_is_first_order_perturbation_theory():
    """c F(x) from the coupling <J' m'|V|J m> integrated along the straight path: 2P levels, Clebsch-Gordan sums.

    V = -D/R^6 |n><n| on the orbital; first-order amplitude -i Int <f|V|i> e^{i omega t} dt, averaged over m.
    """
    from pertcalc.angular import clebsch_gordan, projections

    def state(J, m):
        return np.array([clebsch_gordan(1, ml, 0.5, ms, J, m) for ml in (1, 0, -1) for ms in (0.5, -0.5)])

    tan = np.tan(np.linspace(-math.pi / 2, math.pi / 2, 4003)[1:-1])
    step = math.pi / 4002
    weight = (1 + tan**2) ** -2  # dt/R^6 = (b^-5/v) cos^4(phi) dphi, with t = b tan(phi)/v
    for x in (0.0, 0.6, 1.3, 3.0):
        phase = np.exp(1j * x * tan)
        cos, sin = 1 / np.sqrt(1 + tan**2), tan / np.sqrt(1 + tan**2)
        # Axis n = (cos, sin, 0) in the plane z = 0, as the spherical components m = 1, 0, -1 of the p orbital.
        n = np.array([-(cos - 1j * sin), 0 * cos, cos + 1j * sin]) / math.sqrt(2)
        orbital = np.einsum("at,bt,t->ab", n, n.conj(), weight * phase) * step
        V = np.kron(orbital, np.eye(2))
        for level, other, J, J_other in (("P1/2", "P3/2", 0.5, 1.5), ("P3/2", "P1/2", 1.5, 0.5)):
            total = sum(
                abs(state(J_other, b) @ V @ state(J, a)) ** 2 for a in projections(J) for b in projections(J_other)
            ) / (2 * J + 1)
            # D/(v b^5) = 1 and splitting b/v = x
            ours = born.outflow_probability(1.0, 1.0, 1.0, x, level)
            assert ours == pytest.approx(total, rel=2e-6), (other, x)


def test_verified_at_one_impact_parameter():
    """b = 22, C6 560, 340, 278, v = 2.5629e-4: the Born column to its digits, the exact (DOP853) column to 1 %.

    The exact column differs by second order only: strength^2 is 0.028.
    """
    v, b, d, dc = 2.5629e-4, 22.0, 220.0, (560 + 2 * 340) / 3 - 278
    wide = 2.6295e-4
    assert wide * b / v == pytest.approx(22.6, abs=0.05)
    middle = 1.5e-5  # x = 1.288, printed as 1.29
    loss = [born.multipole_loss_probability(v, b, d, wide, "P3/2", K) for K in (1, 2, 3)]
    born_column = [(loss[0], 1.9966e-3), (loss[1], 3.9931e-3), (loss[2], 1.9966e-3)]
    born_column += [
        (born.outflow_probability(v, b, d, middle, "P1/2"), 4.658e-3),
        (born.multipole_loss_probability(v, b, d, middle, "P3/2", 2), 6.322e-3),
        (born.outflow_probability(v, b, d, 0.0, "P1/2"), 4.991e-3),
        (-born.phase(v, b, dc), -0.12071),
        (born.half_width_probability(v, b, dc, d, wide, "P1/2"), 7.285e-3),
    ]
    for ours, expected in born_column:
        assert ours == pytest.approx(expected, rel=2e-4)
    assert born.multipole_loss_probability(v, b, d, wide, "P1/2", 1) < 1e-9  # exact: 2.3e-10, second order only
    exact_column = [1.9875e-3, 3.9735e-3, 1.9881e-3, 4.689e-3, 6.265e-3, 4.978e-3, -0.12063, 7.302e-3]
    for (ours, _), exact in zip(born_column, exact_column, strict=True):
        assert ours == pytest.approx(exact, rel=0.011)


@pytest.mark.parametrize("level", ["P1/2", "P3/2"])
@pytest.mark.parametrize("splitting", [0.0, 5e-6, 3e-5])
def test_tails_are_the_integrals_of_their_probabilities(level, splitting):
    b0 = 18.0

    def summed(function) -> float:
        return quad(lambda b: 2 * math.pi * b * float(function(b)), b0, np.inf, epsrel=1e-11)[0]

    pairs = [
        (
            born.outflow_tail(V, b0, D, splitting, level),
            lambda b: born.outflow_probability(V, b, D, splitting, level),
        ),
        (
            born.half_width_tail(V, b0, DC, D, splitting, level),
            lambda b: born.half_width_probability(V, b, DC, D, splitting, level),
        ),
    ]
    for K in born.ELASTIC_SHARE[level]:
        pairs.append(
            (
                born.multipole_loss_tail(V, b0, D, splitting, level, K),
                lambda b, K=K: born.multipole_loss_probability(V, b, D, splitting, level, K),
            )
        )
    for tail, probability in pairs:
        assert tail == pytest.approx(summed(probability), rel=1e-9)


def test_closed_form_tail_expressions():
    """The printed formulas: (7 pi^3/512) c_K, (9 pi^3/512), (7 pi^3/6144), c h(x0)."""
    unit = D**2 / (V**2 * 25.0**8)
    for K, c in {1: 2 / 15, 2: 4 / 15, 3: 2 / 15}.items():
        tail = born.multipole_loss_tail(V, 25.0, D, FAR, "P3/2", K)
        assert tail == pytest.approx(c * 7 * math.pi**3 / 512 * unit, rel=1e-12)
    half = born.half_width_tail(V, 25.0, DC, D, FAR, "P1/2")
    assert half == pytest.approx(9 * math.pi**3 / 512 * unit * (DC / D) ** 2, rel=1e-12)
    extra = born.half_width_tail(V, 25.0, DC, D, FAR, "P3/2") - half
    assert extra == pytest.approx(7 * math.pi**3 / 6144 * unit, rel=1e-12)
    splitting = 2 * V / 25.0
    assert born.outflow_tail(V, 25.0, D, splitting, "P1/2") == pytest.approx(
        7 * math.pi**3 / 1536 * unit * 0.675353, rel=2e-6
    )


def test_shift_tail_completes_the_lindholm_foley_shift():
    """Numerical 2 pi Int b sin(eta) db up to b0 plus the Born tail is the exact van der Waals shift."""
    b0 = 40.0
    a, C = 3 * math.pi / 8, DC / V
    q = np.linspace(1 / b0, 1 / 3.0, 2_000_001)
    inner = -2 * math.pi * np.trapezoid(np.sin(a * C * q**5) / q**3, q)
    exact = -lindholm_foley_constants(6)[1] * C**0.4
    assert inner + born.shift_tail(V, b0, DC) == pytest.approx(exact, rel=1e-4)
    assert abs(born.shift_tail(V, b0, DC) / exact) > 0.02  # and the tail is what closes the gap


def test_arrays_broadcast():
    v = np.linspace(1e-4, 5e-4, 6)[:, None]
    b = np.array([20.0, 30.0, 40.0])
    for result in (
        born.phase(v, b, DC),
        born.shift_tail(v, b, DC, R_max=60.0),
        born.outflow_tail(v, b, D, 2e-4, "P1/2"),
        born.half_width_tail(v, b, DC, D, 2e-4, "P3/2"),
        born.multipole_loss_tail(v, b, D, 2e-4, "P3/2", 3),
        born.multipole_loss_tail(v, b, D, 2e-4, "P1/2", 1),
    ):
        assert result.shape == (6, 3)
        assert np.all(np.isfinite(result))


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: born.shift_tail(-1.0, 0.0, DC), "v must be positive and finite\nb0 must be positive"),
        (lambda: born.shift_tail(V, 45.0, DC, R_max=10.0), "R_max = 10 bohr"),
        (lambda: born.outflow_tail(V, 45.0, D, 1e-4, "S1/2"), "level 'S1/2'"),
        (lambda: born.multipole_loss_tail(V, 45.0, D, 1e-4, "P1/2", 2), "level 'P1/2' with K = 2"),
        (lambda: born.outflow_tail(V, 45.0, D, float("nan"), "P1/2"), "splitting = nan"),
        (lambda: born.adiabatic_factor(-1.0), "x must be"),
        (lambda: born.adiabatic_tail_factor(float("inf")), "x0 must be"),
    ],
)
def test_bad_arguments_are_named(call, message):
    with pytest.raises(InputError, match=message):
        call()
