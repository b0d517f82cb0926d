"""Classical paths against potentials whose paths are known in closed form, and against an ordinary root finder.

Sources: elementary mechanics (C/R^2, straight lines); orbiting in a Lennard-Jones potential stops at 0.8 of the well
depth (classical scattering, e.g. Hirschfelder, Curtiss and Bird, Molecular Theory of Gases and Liquids, 1954, section
8.4, from memory; derived again below).
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import brentq, minimize_scalar

from pertcalc.collisions.pair import R_END, CollisionPair
from pertcalc.collisions.paths import PATH_SCALE, PathFamily
from pertcalc.curves.forms import LennardJones
from tests.collision_cases import default_pair, model_k_ar, thermal

MASS = 36_000.0
ENERGY = 1.2e-3


def family(potential, path: str = "pi") -> PathFamily:
    """Paths on one potential: all curves alike, no fine structure."""
    return PathFamily(CollisionPair(MASS, 0.0, potential, potential, potential), path)


def along(paths: PathFamily, energy: float, b: float, integrand) -> float:
    """Int integrand(R) dt over the outgoing half, in the coordinate s of the package."""
    R0 = float(paths.turning_points(energy, np.array([b]))[0])
    potential = paths.pair.path_function(paths.path)

    def at(s: float) -> float:
        y = PATH_SCALE * np.sinh(s)
        R = np.sqrt(R0**2 + y**2)
        rate = paths.rate_of_time(np.array(energy), np.array(b), R, y, potential(np.array(R)))
        return float(rate) * integrand(R)

    # Start off the turning point: at y = 0 exactly the rate is 0/0.
    last = float(paths.last_coordinate(np.array(R0)))
    return quad(at, 1e-7, last, epsabs=0, epsrel=1e-10, limit=400)[0]


@pytest.mark.parametrize("b", [1.0, 5.0, 20.0])
def test_straight_path_takes_the_time_of_a_straight_line(b):
    paths = family(lambda R: 0 * R, "straight")
    v = float(paths.speed(np.array(ENERGY)))
    assert paths.turning_points(ENERGY, np.array([b]))[0] == b
    assert paths.orbiting_impact_parameters(ENERGY) == []
    # 1e-6: the quadrature starts at s = 1e-7.
    assert along(paths, ENERGY, b, lambda R: 1.0) == pytest.approx(np.sqrt(R_END**2 - b**2) / v, rel=1e-6)
    turned = along(paths, ENERGY, b, lambda R: b * v / R**2)
    assert turned == pytest.approx(np.arccos(b / R_END), abs=1e-6)


@pytest.mark.parametrize("b", [0.0, 0.3, 4.0, 15.0])
@pytest.mark.parametrize("strength", [0.02, 0.3])
def test_inverse_square_repulsion(b, strength):
    """U = C/R^2: R0^2 = b^2 + C/E, R^2 = R0^2 + v^2 t^2, angle b/R0 times that of the straight line at R0."""
    paths = family(lambda R: strength / R**2)
    v = float(paths.speed(np.array(ENERGY)))
    R0 = np.sqrt(b**2 + strength / ENERGY)
    assert paths.turning_points(ENERGY, np.array([b]))[0] == pytest.approx(R0, rel=1e-8)
    assert along(paths, ENERGY, b, lambda R: 1.0) == pytest.approx(np.sqrt(R_END**2 - R0**2) / v, rel=3e-6)
    assert along(paths, ENERGY, b, lambda R: b * v / R**2) == pytest.approx(b / R0 * np.arccos(R0 / R_END), abs=3e-6)


def test_hard_sphere():
    """A wall as steep as R^-100: R0 is the radius for b inside it and b outside; exact root beside it."""
    radius, power = 7.0, 100
    paths = family(lambda R: ENERGY * (radius / np.maximum(R, 0.5)) ** power)
    b = np.array([0.0, 2.0, 5.0, 6.5, 8.0, 20.0])
    found = paths.turning_points(ENERGY, b)
    np.testing.assert_allclose(found, np.maximum(b, radius), rtol=0.03)
    exact = [brentq(lambda R, bi=bi: 1 - (radius / R) ** power - (bi / R) ** 2, 5.0, 40.0, xtol=1e-13) for bi in b]
    np.testing.assert_allclose(found, exact, rtol=1e-6)  # what the table of the wall costs


@pytest.mark.parametrize("x", [0.1, 0.5, 0.79, 0.81, 1.0, 5.0])
def test_lennard_jones_turning_points(x):
    well = LennardJones(5e-4, 8.0)
    paths = family(well)
    energy = x * well.De
    b = np.linspace(0.2, 30.0, 60)

    def radial(R, bi):
        return 1 - (bi / R) ** 2 - well(R) / energy

    R = np.geomspace(40.0, 3.0, 4000)
    for bi, found in zip(b, paths.turning_points(energy, b), strict=True):
        inner = int(np.flatnonzero(radial(R, bi) <= 0)[0])
        exact = brentq(radial, R[inner], R[inner - 1], args=(bi,), xtol=1e-14)
        assert found == pytest.approx(exact, rel=1e-7)


@pytest.mark.parametrize(("x", "orbits"), [(0.05, True), (0.4, True), (0.79, True), (0.81, False), (2.0, False)])
def test_lennard_jones_orbits_below_four_fifths_of_the_well(x, orbits):
    well = LennardJones(5e-4, 8.0)
    found = family(well).orbiting_impact_parameters(x * well.De)
    assert len(found) == int(orbits)
    if orbits:
        # Outermost barrier of the effective potential: the least b^2 at which it is as high as E.
        barrier = minimize_scalar(
            lambda R: R**2 * (1 - well(R) / (x * well.De)),
            bounds=(8.0 * 1.05, 30.0),
            method="bounded",
            options={"xatol": 1e-9},
        )
        assert found[0] == pytest.approx(np.sqrt(barrier.fun), rel=1e-5)


def test_turning_points_jump_only_where_paths_orbit():
    paths = PathFamily(model_k_ar(), "lower")
    energy = thermal(373.0, 0.2)
    (orbiting,) = paths.orbiting_impact_parameters(energy)
    inside, outside = paths.turning_points(energy, np.array([orbiting * (1 - 1e-4), orbiting * (1 + 1e-4)]))
    assert outside > 1.3 * inside
    b = np.linspace(0.1, orbiting * 0.999, 300)
    R0 = paths.turning_points(energy, b)
    assert np.all(np.diff(R0) > 0)
    assert np.all(np.diff(R0) < 0.2)


def test_driving_potentials_are_the_adiabatic_curves():
    """Eigenvalues of [[V_S, a/sqrt2], [a/sqrt2, V_P - a/2]] by numpy, their limits taken off; V_Pi itself."""
    pair = default_pair("Rb", "Ar")
    a = pair.splitting / 1.5
    R = np.array([5.0, 6.5, 8.0, 12.0, 20.0, 60.0])
    V_S, V_P = pair.B(R), pair.A(R)
    matrices = np.array([[[s, a / np.sqrt(2)], [a / np.sqrt(2), p - a / 2]] for s, p in zip(V_S, V_P, strict=True)])
    exact = np.linalg.eigvalsh(matrices)
    np.testing.assert_allclose(pair.path_function("lower")(R), exact[:, 0] + a, rtol=2e-6, atol=1e-9)
    np.testing.assert_allclose(pair.path_function("upper")(R), exact[:, 1] - a / 2, rtol=2e-6, atol=1e-9)
    np.testing.assert_allclose(pair.path_function("pi")(R), V_P, rtol=2e-6, atol=1e-9)
    for path in ("lower", "upper", "pi", "straight"):
        assert abs(pair.path_function(path)(np.array([140.0]))[0]) < 1e-9
