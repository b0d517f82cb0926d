"""Collision integrals of the Lennard-Jones potential and measured diffusion coefficients."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from pertcalc import species
from pertcalc.collisions.collision_integrals import classical_momentum_transfer, collision_integral, diffusion_grid
from pertcalc.collisions.pair import CollisionPair
from pertcalc.collisions.transport import transport_cross_sections
from pertcalc.constants import AMU_AU, KELVIN_HARTREE
from pertcalc.curves.files import load_default
from pertcalc.curves.forms import LennardJones, TangToennies
from pertcalc.vapour.diffusion import WALL_ERROR, Diffusion, MeasuredDiffusion, diffusion, measured_diffusion

# Source: Monchick and Mason, J. Chem. Phys. 35, 1676 (1961), Omega(1,1)* of the 12-6 potential, four digits; READ in a
# table at sambuz.com/doc/coefficients-in-binary-systems-pdf-document-1071138.
TABLE = ((0.3, 2.649), (0.5, 2.066), (1, 1.440), (2, 1.075), (5, 0.8428), (10, 0.7422), (50, 0.5763), (100, 0.5180))
SIGMA, DEPTH_K = 7.0, 100.0  # bohr, kelvin; the table is in units of them


def neufeld(T: float) -> float:
    """Omega(1,1)* by Neufeld, Janzen and Aziz, J. Chem. Phys. 57, 1100 (1972); coefficients READ."""
    powers = ((0.19300, 0.47635), (1.03587, 1.52996), (1.76474, 3.89411))
    return 1.06036 * T**-0.15610 + sum(a * math.exp(-b * T) for a, b in powers)


def lennard_jones(mass_u: float) -> CollisionPair:
    curve = LennardJones(DEPTH_K * KELVIN_HARTREE, SIGMA * 2 ** (1 / 6))
    return CollisionPair(mass_u * AMU_AU, 0.0, curve, curve, curve)


def reduced(pair: CollisionPair, T_star: float, cross_section, closer: int = 1) -> float:
    grid = diffusion_grid(np.array([T_star * DEPTH_K]), pair.reduced_mass)
    energy = np.geomspace(grid[0], grid[-1], closer * (grid.size - 1) + 1)
    return collision_integral(energy, cross_section(pair, energy), T_star * DEPTH_K).value / (math.pi * SIGMA**2)


@pytest.mark.parametrize("T_star, omega", TABLE)
def test_classical_paths_reproduce_the_table(T_star, omega):
    # The table is classical. 0.5 % covers its digits, and orbiting on a grid of energies at the lowest T*.
    assert reduced(lennard_jones(20.0), T_star, classical_momentum_transfer, 3) == pytest.approx(omega, rel=5e-3)


@pytest.mark.parametrize("T_star, omega", TABLE[:5])
def test_quantum_cross_sections_reproduce_the_table(T_star, omega):
    # Mass 20 u: quantum effects and resonances of a few partial waves at the lowest T*.
    def quantum(pair, energy):
        return transport_cross_sections(pair, energy, 3.0).momentum_transfer

    assert reduced(lennard_jones(20.0), T_star, quantum) == pytest.approx(omega, rel=5e-3)


@pytest.mark.parametrize("T_star", [0.3, 0.7, 1.5, 4.0, 20.0, 80.0])
def test_classical_paths_agree_with_the_fit(T_star):
    # The fit is good to a few 1e-3 (its distance from the table above is 0.3-0.6 %).
    assert reduced(lennard_jones(20.0), T_star, classical_momentum_transfer, 3) == pytest.approx(
        neufeld(T_star), rel=6e-3
    )


# Source: Chapman and Cowling, Mathematical Theory of Non-uniform Gases, table of A1(nu) for forces K r^-nu: Q1 =
# 2 pi A1(nu) (K/(mu v^2))^(2/(nu-1)); 5 is Maxwell's case, the limit nu -> infinity (1/2) that of hard spheres. FROM
# MEMORY.
@pytest.mark.parametrize("nu, A1", [(5, 0.422), (7, 0.385), (9, 0.382), (11, 0.383), (15, 0.393), (21, 0.407)])
def test_inverse_power_walls(nu, A1):
    energy, radius = np.array([0.7, 1.0, 1.5]) * 300 * KELVIN_HARTREE, 8.0
    force = (nu - 1) * energy[1] * radius ** (nu - 1)

    def wall(R: np.ndarray) -> np.ndarray:
        return force / (nu - 1) / R ** (nu - 1)

    pair = CollisionPair(20 * AMU_AU, 0.0, wall, wall, wall)
    expected = 2 * np.pi * A1 * (force / (2 * energy)) ** (2 / (nu - 1))
    assert classical_momentum_transfer(pair, energy) == pytest.approx(expected, rel=4e-3)


MEASURED_PAIRS = [("Na", gas) for gas in ("He", "Ne", "Ar")] + [("Rb", gas) for gas in species.GASES] + [("Cs", "Ar")]


@pytest.fixture(scope="module")
def found() -> dict[tuple[str, str], Diffusion]:
    return {pair: diffusion(*pair, 300.0) for pair in MEASURED_PAIRS}


def usable(one: Diffusion) -> list[MeasuredDiffusion]:
    return [r for r in one.measured if r.own.mark == "READ" and r.standing == "usable" and r.own.error is not None]


def misfit(found: dict[tuple[str, str], Diffusion]) -> float:
    """Rms of ln(computed/measured) over every READ row with a stated error; sources in data/vapour/diffusion.csv."""
    ratios = [math.log(one.computed.value / row.scaled.value) for one in found.values() for row in usable(one)]
    assert len(ratios) == 13
    return float(np.sqrt(np.mean(np.square(ratios))))


def test_tabulated_walls_meet_the_measurements(found):
    # None of these numbers went into the curves: electron-gas scattering and ion-gas wells did (notes/electron-gas.md).
    assert misfit(found) < 0.08


def test_wall_error_is_the_misfit_of_analytic_forms(found):
    # Tang-Toennies forms through the same wells make diffusion too slow throughout: their walls stand too far out.
    analytic = {}
    for pair in MEASURED_PAIRS:
        curves = load_default(*pair)
        X = curves.states["X"]
        well = X.curve.well()
        form = TangToennies.from_well(well.depth, well.position, X.curve.C6, X.curve.C8, X.curve.C10)
        moved = replace(X, curve=form, form="tang-toennies")
        analytic[pair] = diffusion(*pair, 300.0, replace(curves, id="analytic", states=curves.states | {"X": moved}))
    assert misfit(analytic) == pytest.approx(WALL_ERROR, abs=0.02)


@pytest.mark.parametrize("pair", MEASURED_PAIRS, ids="-".join)
def test_computed_and_measured_agree_within_their_errors(found, pair):
    for row in usable(found[pair]):
        error = math.hypot(found[pair].computed.error, row.scaled.error)
        assert abs(found[pair].computed.value - row.scaled.value) < 1.5 * error


def test_temperature_law_of_sodium_in_helium():
    # Source: Ager and Howard, flow tube, p D = 385 (T/300)^1.72(18) between 211 and 424 K; READ.
    row = next(row for row in measured_diffusion("Na", "He") if row.exponent is not None)
    for T in (211.0, 300.0, 424.0):
        assert diffusion("Na", "He", T).exponent == pytest.approx(row.exponent, abs=row.exponent_error)
    assert (row.exponent, row.exponent_error) == (1.72, 0.18)
