"""Diffusion: collision integrals in their limits, classical against quantum, errors, the rule of choice, bad input."""

from __future__ import annotations

import csv
import math
from dataclasses import replace
from importlib.resources import files

import numpy as np
import pytest

from pertcalc import species
from pertcalc.collisions.collision_integrals import (
    chapman_enskog,
    classical_momentum_transfer,
    collision_integral,
    diffusion_grid,
    momentum_transfer,
    second_order,
)
from pertcalc.collisions.pair import CollisionPair, pair_of
from pertcalc.collisions.transport import transport_cross_sections
from pertcalc.constants import AMU_AU, AU_TIME_S, BOHR_CM, KELVIN_HARTREE
from pertcalc.curves.files import load_default
from pertcalc.errors import InputError, OutOfRangeError, UnknownNameError
from pertcalc.vapour.diffusion import (
    EXPONENT_ERROR,
    UNIT,
    WALL_ERROR,
    Diffusion,
    diffusion,
    diffusion_cm2_s,
    measured_diffusion,
)

PAIRS = [(alkali, gas) for alkali in species.ALKALIS for gas in (*species.SPECIES_GASES, "N2")]
ROWS = [row for alkali, gas in PAIRS for row in measured_diffusion(alkali, gas)]
LOSCHMIDT = 2.686780111e19  # CODATA, 273.15 K and 101.325 kPa [cm^-3]


@pytest.fixture(scope="module")
def rb_ne() -> Diffusion:
    return diffusion("Rb", "Ne", 350.0)


# --- collision integrals ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("s", [1, 2, 3])
@pytest.mark.parametrize("mass", [2.5, 60.0])
def test_a_constant_cross_section_is_its_own_collision_integral(s, mass):
    energy = diffusion_grid(np.array([273.0, 700.0]), mass * AMU_AU)
    for T in (273.0, 450.0, 700.0):
        found = collision_integral(energy, np.full(energy.shape, 123.0), T, s)
        assert found.value == pytest.approx(123.0, rel=1e-4 if s == 1 else 2e-3)  # x^5 e^-x reaches further out
        assert found.exponent == pytest.approx(0.0, abs=2e-3 if s == 1 else 2e-2)


def test_the_exponent_is_the_derivative():
    energy = diffusion_grid(np.array([290.0, 310.0]), 20 * AMU_AU)
    sigma = 200 * (energy / energy[0]) ** -0.2 + 30 * (energy / energy[0]) ** -0.7
    low, middle, high = (collision_integral(energy, sigma, T) for T in (299.0, 300.0, 301.0))
    slope = math.log(high.value / low.value) / math.log(301 / 299)
    assert middle.exponent == pytest.approx(slope, abs=1e-4)
    # A power law keeps its power: Omega as T^-p for Q1 as E^-p, value Gamma(3 - p)/2.
    power = collision_integral(energy, (energy / (300 * KELVIN_HARTREE)) ** -0.3, 300.0)
    assert power.value == pytest.approx(math.gamma(2.7) / 2, rel=1e-3)
    assert power.exponent == pytest.approx(-0.3, abs=3e-3)


def test_first_order_for_hard_spheres():
    # Chapman and Cowling: n D = (3/8) sqrt(kT/(2 pi mu))/s^2 for rigid spheres of mean diameter s.
    T, mu, s = 350.0, 15 * AMU_AU, 8.0
    expected = 3 / 8 * math.sqrt(KELVIN_HARTREE * T / (2 * math.pi * mu)) / s**2
    assert chapman_enskog(T, mu, math.pi * s**2) == pytest.approx(expected, rel=1e-12)


def test_second_order_for_hard_spheres():
    # Chapman and Cowling: 13/12 for a light trace in a heavy gas (A* drops out), 59/58 for equal masses (A* = 1).
    assert second_order(1.0, 1.0, 1.0, 1.0) == pytest.approx(1 / 12, rel=1e-12)
    assert second_order(1.0, 1.0, 1.0, 0.5) == pytest.approx(1 / 58, rel=0.03)  # A* = 1.1 in the package
    assert second_order(1.0, 1.0, 1.0, 1e-3) < 1e-6  # a heavy trace: first order is exact


def steep_pair(radius: float, softness: float, mass: float) -> CollisionPair:
    """A wall that falls by e in `softness` [bohr] and stands at 300 k kelvin at `radius`."""

    def wall(R: np.ndarray) -> np.ndarray:
        return 300 * KELVIN_HARTREE * np.exp(np.minimum((radius - R) / softness, 60.0))

    return CollisionPair(mass * AMU_AU, 0.0, wall, wall, wall)


@pytest.mark.parametrize("softness, excess", [(0.5, 0.045), (0.25, 0.022)])
def test_hard_spheres_have_pi_s_squared(softness, excess):
    # What a wall of finite softness adds vanishes in proportion to it.
    energy = np.array([300 * KELVIN_HARTREE])
    pair = steep_pair(8.0, softness, 20.0)
    classical = classical_momentum_transfer(pair, energy)[0] / (np.pi * 8.0**2)
    quantum = transport_cross_sections(pair, energy, 4.0).momentum_transfer[0] / (np.pi * 8.0**2)
    assert 1 < quantum < 1 + excess and 1 < classical < 1 + excess
    assert classical == pytest.approx(quantum, rel=4e-3)


def test_classical_diffusion_follows_the_square_root_of_the_mass():
    heavy, light = steep_pair(8.0, 0.5, 4 * 87 / 91), steep_pair(8.0, 0.5, 3 * 87 / 90)
    T = 350.0
    energy = diffusion_grid(np.array([T]), heavy.reduced_mass)
    values = []
    for pair in (heavy, light):
        omega = collision_integral(energy, classical_momentum_transfer(pair, energy), T).value
        values.append(chapman_enskog(T, pair.reduced_mass, omega))
    assert values[1] / values[0] == pytest.approx(math.sqrt(heavy.reduced_mass / light.reduced_mass), rel=1e-9)


@pytest.mark.parametrize("alkali, gas, x", [("Cs", "Xe", 4.0), ("Rb", "Kr", 3.0), ("K", "Ar", 6.0), ("Cs", "He", 5.0)])
def test_classical_and_quantum_cross_sections_agree_well_above_the_well(alkali, gas, x):
    pair = pair_of(load_default(alkali, gas))
    energy = np.array([x * 350 * KELVIN_HARTREE])
    quantum = transport_cross_sections(pair, energy, 4.0).momentum_transfer
    assert classical_momentum_transfer(pair, energy) == pytest.approx(quantum, rel=2e-3)


@pytest.mark.parametrize("alkali, gas", [("Li", "He"), ("Na", "Ar"), ("Rb", "Ne")])
def test_numerical_error_bounds_the_true_error(alkali, gas):
    # Against quantum cross sections throughout, on a grid twice as fine with twice as fine steps.
    T, found = 330.0, diffusion(alkali, gas, 330.0)
    pair = pair_of(load_default(alkali, gas))
    coarse = diffusion_grid(np.array([T]), pair.reduced_mass)
    energy = np.geomspace(coarse[0] / 2, coarse[-1] * 1.2, 2 * coarse.size + 1)
    sigma = transport_cross_sections(pair, energy, 6.0).momentum_transfer
    exact = chapman_enskog(T, pair.reduced_mass, collision_integral(energy, sigma, T).value) / BOHR_CM / AU_TIME_S
    true = abs(found.computed.value / exact - 1)
    assert true <= 3 * found.numerical_error
    assert found.numerical_error < 2e-3


def test_switching_to_classical_paths_is_seamless():
    pair = pair_of(load_default("Cs", "Ar"))
    energy = np.geomspace(1.0, 6.0, 4) * 300 * KELVIN_HARTREE
    quantum = transport_cross_sections(pair, energy, 3.0).momentum_transfer
    found = momentum_transfer(pair, energy)
    assert found == pytest.approx(quantum, rel=2e-3)
    assert found[0] == quantum[0] and found[-1] != quantum[-1]  # both methods took part


# --- computed values -------------------------------------------------------------------------------------------------


def test_exponent_is_the_derivative_at_constant_pressure(rb_ne):
    # So wide apart that the numerical error of either value, 2e-4, counts little.
    hot, cold = (diffusion("Rb", "Ne", T).computed.value for T in (350 * 1.1, 350 / 1.1))
    assert rb_ne.exponent == pytest.approx(1 + math.log(hot / cold) / math.log(1.1**2), abs=4e-3)
    assert 1.5 < rb_ne.exponent < 2.0  # hard spheres have 1.5; attraction adds


def test_helium_3_is_faster_by_the_square_root_of_the_reduced_masses():
    masses = [pair_of(load_default("Rb", gas)).reduced_mass for gas in ("He", "3He")]
    four, three = (diffusion("Rb", gas, 350.0) for gas in ("He", "3He"))
    # The curve is the same; what is left is the quantum part of the cross section.
    assert three.computed.value / four.computed.value == pytest.approx(math.sqrt(masses[0] / masses[1]), rel=3e-3)
    assert three.measured == () and three.chosen == three.computed


def test_density_and_pressure():
    nD = 5e18
    assert diffusion_cm2_s(nD, 1e19) == 2 * diffusion_cm2_s(nD, 2e19) == 0.5
    with pytest.raises(InputError, match="density"):
        diffusion_cm2_s(nD, 0.0)


def test_model_error_holds_the_stated_errors(rb_ne):
    assert rb_ne.computed.error == pytest.approx(
        rb_ne.computed.value * math.hypot(rb_ne.model_error, rb_ne.numerical_error)
    )
    # Re of 2 % and De of 15 % move a cross section by some 6 %; neon is so light that the second order adds nothing.
    assert 0.04 < rb_ne.model_error < 0.09
    assert (rb_ne.computed.unit, rb_ne.computed.mark) == (UNIT, "COMPUTED") and "rb-ne_default" in rb_ne.computed.source


def test_stated_errors_of_a_curve_hardly_move_the_exponent():
    # The claim beside EXPONENT_ERROR, at the pair with the largest stated errors and the deepest well.
    from pertcalc.model_error import deformed_pair

    curves = load_default("Cs", "Xe")
    energy = diffusion_grid(np.array([300.0]), pair_of(curves).reduced_mass)

    def exponent(pair: CollisionPair) -> float:
        return collision_integral(energy, classical_momentum_transfer(pair, energy), 300.0).exponent

    plain = exponent(pair_of(curves))
    for parameter, change in (("De", 0.2), ("Re", 0.04), ("C6", 0.03)):
        moved = abs(exponent(deformed_pair(curves, "X", parameter, change)) - plain)
        assert moved < 0.5 * EXPONENT_ERROR


def test_a_users_curves():
    curves = load_default("Li", "He")
    no_error = replace(curves, id="mine", states=curves.states | {"X": replace(curves.states["X"], uncertainty={})})
    found = diffusion("Li", "He", 600.0, no_error)
    assert found.model_error is None and found.computed.error is None and "mine" in found.computed.source
    analytic = replace(curves, states=curves.states | {"X": replace(curves.states["X"], form="tang-toennies")})
    given = diffusion("Li", "He", 600.0, analytic)
    # A table states its own wall, an analytic form extrapolates it.
    assert diffusion("Li", "He", 600.0).model_error < 0.1 < WALL_ERROR < given.model_error
    with pytest.raises(InputError, match="Li-He, not"):
        diffusion("Na", "He", 400.0, curves)


# --- measured values and the choice ----------------------------------------------------------------------------------


def test_every_row_is_complete():
    text = (files("pertcalc") / "data" / "vapour" / "diffusion.csv").read_text(encoding="utf-8").splitlines()
    assert "notes/scripts/make_vapour.py" in text[1]
    assert len(list(csv.DictReader(line for line in text if not line.startswith("#")))) == len(ROWS) == 43
    for row in ROWS:
        assert row.own.mark in ("READ", "FROM MEMORY") and (row.own.mark != "READ" or "http" in row.own.source)
        assert row.standing in ("usable", "superseded", "assumed") and row.grade in ("high", "medium", "low")
        assert row.own.unit == UNIT and 200 < row.temperature_K < 500 and 1900 < row.year < 2100
        assert row.own.error is None or 0 < row.own.error < row.own.value
        assert row.published.strip() and row.scaled is None
        # Whatever its units were: between the heaviest and the lightest pair at these temperatures.
        assert 1e18 < row.own.value < 3e19


def test_conversions():
    newest = measured_diffusion("Rb", "Ne")[0]  # D = 0.214 cm^2/s at 24 C and 760 Torr
    assert newest.own.value == pytest.approx(0.214 * LOSCHMIDT * 273.15 / 297.15, rel=1e-6)
    assert newest.own.error / newest.own.value == pytest.approx(0.014 / 0.214)
    flow = measured_diffusion("na", "n2")[0]  # p D = 129 cm^2 Torr/s at 281 K
    assert flow.own.value == pytest.approx(129 * 9.6565e18 / 281, rel=1e-5)
    section = next(row for row in measured_diffusion("K", "Ar") if "cross section" in row.published)
    kT, mu = 1.380649e-23 * 400, 39.0983 * 39.948 / 79.0463 * 1.66053907e-27  # SI
    assert section.own.value == pytest.approx(3 / 16 * math.sqrt(2 * math.pi * kT / mu) * 100 / 61e-16, rel=1e-4)
    assert section.standing == "assumed" and section.own.error / section.own.value > 0.15


def test_a_range_and_two_reductions_carry_half_their_distance():
    ranged = measured_diffusion("Cs", "N2")[0]  # .073-.10 within 20 %
    assert ranged.own.value == pytest.approx(0.0865 * LOSCHMIDT * 273.15 / 273, rel=1e-5)
    assert ranged.own.error / ranged.own.value == pytest.approx(math.hypot(0.2, 0.0135 / 0.0865), rel=1e-3)
    two = next(row for row in measured_diffusion("Rb", "Kr") if row.standing == "superseded")
    assert two.own.error / two.own.value == pytest.approx(math.hypot(0.0016, 0.00215) / 0.09815, rel=2e-3)


def test_scaling(rb_ne):
    for row in rb_ne.measured:
        assert row.scaled is not None
        # nD goes as T^(exponent - 1); the exponent changes little on the way.
        factor = (350.0 / row.temperature_K) ** (rb_ne.exponent - 1)
        assert row.scaled.value / row.own.value == pytest.approx(factor, rel=5e-3)
        if row.own.error is None:
            assert row.scaled.error is None
        else:
            way = EXPONENT_ERROR * math.log(350 / row.temperature_K)
            relative = row.scaled.error / row.scaled.value
            assert relative == pytest.approx(math.hypot(row.own.error / row.own.value, way))
    home = diffusion("Rb", "Ne", 297.15).measured[0]
    assert home.scaled == home.own


def test_choice_of_a_measurement(rb_ne):
    # 2026 (READ, 7 %) beats 2014 (READ); the older reduction of the 2026 data states 1.5 % and must not win.
    first = rb_ne.measured[0]
    assert first.year == 2026 and first.standing == "usable"
    assert rb_ne.chosen.value == first.scaled.value and rb_ne.chosen.mark == "READ"
    read = [row.scaled.value for row in rb_ne.measured if row.standing == "usable"]
    spread = (max(read) - min(read)) / 2
    assert len(read) == 4 and rb_ne.chosen.error == pytest.approx(math.hypot(first.scaled.error, spread))
    assert "range of the 4" in rb_ne.reason


@pytest.mark.parametrize(
    "alkali, gas, mark",
    [("K", "He", "COMPUTED"), ("Cs", "Ne", "COMPUTED"), ("Cs", "Ar", "READ"), ("Na", "He", "READ")],
)
def test_assumed_conditions_and_memory_never_win(alkali, gas, mark):
    found = diffusion(alkali, gas, 380.0)
    assert found.chosen.mark == mark and found.chosen.error > 0
    if mark == "COMPUTED":
        assert found.chosen == found.computed and "computed" in found.reason
        assert not [row for row in found.measured if row.own.mark == "READ" and row.standing == "usable"]


# --- bad input -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("bad", [math.nan, math.inf, None, "300"])
def test_temperatures_that_are_no_numbers(bad):
    with pytest.raises(InputError, match="temperature"):
        diffusion("Rb", "He", bad)


@pytest.mark.parametrize("T", [0.0, -5.0, 99.0, 2001.0])
def test_temperatures_out_of_range(T):
    with pytest.raises(OutOfRangeError, match=r"100 \.\. 2000 K.*[Cc]hoose"):
        diffusion("Rb", "He", T)


def test_unknown_names():
    with pytest.raises(UnknownNameError):
        diffusion("Rb", "N2", 350.0)
    with pytest.raises(UnknownNameError, match="N2"):
        measured_diffusion("Rb", "CO2")
    with pytest.raises(UnknownNameError):
        measured_diffusion("Fr", "He")
    assert len(measured_diffusion("Rb", "N2")) == 4
    assert measured_diffusion("Li", "He") == ()
