"""Electron-gas potentials: shape, limits, the cross term, sets, and a gas of the user's own."""

from __future__ import annotations

import math

import numpy as np
import pytest

from pertcalc.errors import InputError, UnknownNameError
from pertcalc.one_electron.gas_electron import (
    DEFAULT_MODEL,
    MODELS,
    custom_gas_electron,
    gas_electron,
)
from pertcalc.one_electron.scattering import bound_states, phase_shifts, polarisation_phase, scattering_length
from pertcalc.species import GASES, noble_gas

ALL = [(gas, model) for gas in GASES for model in MODELS]


@pytest.mark.parametrize(("gas", "model"), ALL)
def test_no_bound_state(gas, model):
    found = gas_electron(gas, model)
    assert [bound_states(found, l) for l in range(4)] == [0, 0, 0, 0]


@pytest.mark.parametrize(("gas", "model"), ALL)
def test_scattering_length_is_the_stated_one(gas, model):
    found = gas_electron(gas, model)
    assert scattering_length(found) == pytest.approx(found.scattering_length_bohr, abs=2e-4)
    assert found.scattering_length_bohr == pytest.approx(
        noble_gas(gas).electron_scattering_length_bohr.value, abs=0.02 + 0.03 * abs(found.scattering_length_bohr)
    ), "stays at the value of the species table"


@pytest.mark.parametrize("gas", GASES)
def test_every_s_wave_is_repelled_from_the_core(gas):
    """At 5 eV, where the wave probes the core, the s phase is that of a repulsion, deeper than half the hard sphere's
    of 1 bohr, though the scattering lengths of Ar, Kr, Xe are negative."""
    energy = 5.0 / 27.211386
    delta = float(phase_shifts(gas_electron(gas), energy, 0))
    assert -math.pi / 2 < delta < -0.5 * math.sqrt(2 * energy)


@pytest.mark.parametrize(("gas", "model"), ALL)
def test_provenance(gas, model):
    found = gas_electron(gas, model)
    assert found.alpha_d == noble_gas(gas).polarizability_au.value
    assert found.mark == "COMPUTED"
    assert found.source
    assert found.residuals


@pytest.mark.parametrize("gas", GASES)
def test_tail_and_centre_of_the_local_part(gas):
    found = gas_electron(gas)
    u = np.array([20.0, 40.0])
    bare = -0.5 * found.alpha_d / u**4 - 0.5 * found.tail_q / u**6
    assert found.local(u) == pytest.approx(bare, rel=1e-9)
    assert np.all(np.isfinite(found.local(np.array([0.0, 1e-9, 0.1]))))
    beyond = np.array([found.reach, found.reach + 3])
    assert found.local(beyond) == pytest.approx(-0.5 * found.alpha_d / beyond**4 - 0.5 * found.tail_q / beyond**6)


def test_default_is_the_l_dependent_model_and_helium_3_is_helium():
    assert gas_electron("Ar") is gas_electron("Ar", DEFAULT_MODEL)
    assert gas_electron("3He") is gas_electron("he")


@pytest.mark.parametrize("gas", GASES)
def test_p_wave_obeys_the_polarisation_law(gas):
    """tan(delta_1) -> pi alpha k^2/15, alpha READ: the one part of the p wave that is certain."""
    found, k = gas_electron(gas), 0.004
    assert float(phase_shifts(found, k * k / 2, 1)) == pytest.approx(
        float(polarisation_phase(found.alpha_d, k, 1)), rel=0.03
    )


def test_polarisation_by_two_charges_is_a_square():
    """Core, electron and cross term of the dipole sum to -alpha/2 |E_core + E_electron|^2, damping included."""
    gas = gas_electron("Ar", "soft")
    R, r, theta = 5.0, 4.0, 0.4
    place = np.array([r * math.sin(theta), 0.0, r * math.cos(theta) - R])  # electron seen from the gas
    u = float(np.linalg.norm(place))
    field_core = np.array([0, 0, 1.0]) / R**2 * math.sqrt(gas.damping(R))
    field_electron = place / u**3 * math.sqrt(gas.damping(u))
    wanted = -0.5 * gas.alpha_d * float(np.sum((field_core + field_electron) ** 2))
    pure = gas.polarisation(R, 0.0) + gas.polarisation(u, 0.0)
    assert float(pure + gas.cross(r, R, math.cos(theta))) == pytest.approx(wanted, rel=1e-12)


def test_quadrupole_by_two_charges_is_a_square():
    """The same for -alpha_q/6 sum_ij |grad E_ij|^2: one unit charge gives -alpha_q/(2 R^6)."""
    gas = gas_electron("Ar")
    R, r, theta = 9.0, 5.0, 0.7
    place = np.array([r * math.sin(theta), 0.0, r * math.cos(theta) - R])
    u = float(np.linalg.norm(place))

    def gradient(charge, at):
        d = float(np.linalg.norm(at))
        return charge * (3 * np.outer(at, at) / d**5 - np.eye(3) / d**3) * float(gas.damping(d))

    total = gradient(1, np.array([0, 0, -R])) + gradient(-1, place)
    wanted = -gas.alpha_q / 12 * float(np.sum(total**2))
    pure = gas.polarisation(R, gas.alpha_q) + gas.polarisation(u, gas.alpha_q)
    dipoles = gas.polarisation(R, 0.0) + gas.polarisation(u, 0.0)
    chi = (R - r * math.cos(theta)) / u
    dipole_cross = gas.alpha_d * chi * math.sqrt(gas.damping(u) * gas.damping(R)) / (u * R) ** 2
    found = float(pure - dipoles + gas.cross(r, R, math.cos(theta)) - dipole_cross)
    assert found == pytest.approx(wanted, rel=1e-10)


def test_a_neutral_pair_feels_no_charge_far_away():
    """Core at 0, electron at r << R: core + electron + cross fall as R^-6, the R^-4 and R^-5 terms cancel."""
    gas, r = gas_electron("Ar"), 2.0
    totals = []
    for R in (40.0, 80.0):
        u = np.sqrt(r * r + R * R)  # electron at right angles
        totals.append(float(gas.polarisation(R, gas.alpha_q) + gas.polarisation(u, gas.alpha_q) + gas.cross(r, R, 0.0)))
    assert totals[0] / totals[1] == pytest.approx(2**6, rel=0.03)


def test_custom_gas_meets_its_scattering_length_without_bound_state():
    mine = custom_gas_electron(-2.0, 14.0, 2.0, 0.4)
    assert scattering_length(mine) == pytest.approx(-2.0, abs=1e-8)
    assert [bound_states(mine, l) for l in range(3)] == [0, 0, 0]


def test_custom_gas_refuses_a_length_that_needs_a_bound_state():
    with pytest.raises(InputError, match=r"scattering_length_bohr = 6 bohr.*without bound state stays below"):
        custom_gas_electron(6.0, 14.0, 2.0, 0.4)


def test_custom_gas_names_every_bad_number():
    with pytest.raises(InputError) as problem:
        custom_gas_electron(math.nan, -1.0, 2.0, "soft")  # type: ignore[arg-type]
    assert len(problem.value.problems) == 2
    with pytest.raises(InputError) as problem:
        custom_gas_electron(1.0, -1.0, 0.0, -2.0)
    assert [text.split(" =")[0] for text in problem.value.problems] == ["alpha_d", "cutoff", "beta"]


def test_unknown_names():
    with pytest.raises(UnknownNameError, match="Did you mean Ar"):
        gas_electron("Arr")
    with pytest.raises(UnknownNameError, match="soft"):
        gas_electron("Ar", "sofd")
