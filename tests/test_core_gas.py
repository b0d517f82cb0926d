"""Alkali ion and gas: the well it was made from, its limits, bad input."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from pertcalc import constants
from pertcalc.errors import InputError, OutOfRangeError, UnknownNameError
from pertcalc.one_electron.core_gas import (
    WALL_TOP,
    core_dispersion,
    core_gas,
    core_gas_from_well,
    wall_exponent,
)
from pertcalc.one_electron.gas_electron import MODELS, gas_electron
from pertcalc.species import ALKALIS, GASES, noble_gas

PAIRS = [(a, g) for a in ALKALIS for g in GASES]


@pytest.mark.parametrize(("a", "g"), PAIRS)
def test_minimum_is_the_well_for_every_model(a, g):
    for model in MODELS:
        core = core_gas(a, g, gas_electron(g, model))
        Re = core.well.Re.value / constants.BOHR_ANGSTROM
        found = minimize_scalar(lambda R, c=core: float(c(R)), bounds=(0.8 * Re, 1.3 * Re), options={"xatol": 1e-9})
        assert found.x == pytest.approx(Re, rel=1e-5)
        assert -found.fun * constants.HARTREE_EV == pytest.approx(core.well.De.value, rel=1e-9)


@pytest.mark.parametrize(("a", "g"), PAIRS)
def test_shape(a, g):
    """One minimum, a wall that rises to 1 hartree, the charge-induced dipole far away."""
    core = core_gas(a, g)
    V = core(np.linspace(core.r_min, 30.0, 3000))
    slope = np.diff(V)
    assert np.sum(np.diff(np.sign(slope)) != 0) == 1
    assert float(core(core.r_min)) == pytest.approx(WALL_TOP, rel=1e-6)
    assert float(core(300.0)) == pytest.approx(-0.5 * noble_gas(g).polarizability_au.value / 300.0**4, rel=2e-3)


@pytest.mark.parametrize(("a", "g"), PAIRS)
def test_what_is_left_to_C8_is_small(a, g):
    """Polarisation, core dispersion and a wall from ionisation energies explain the remembered well to a third."""
    core = core_gas(a, g)
    Re = core.well.Re.value / constants.BOHR_ANGSTROM
    assert abs(core.C8 / Re**8) < 0.4 * core.well.De.value / constants.HARTREE_EV


def test_wells_follow_the_trend_of_the_charge_induced_dipole():
    """De/(alpha/2Re^4) rises from the light to the heavy ion in every gas: a slip in a remembered digit breaks it."""
    for g in GASES:
        ratios = []
        for a in ALKALIS:
            well = core_gas(a, g).well
            Re = well.Re.value / constants.BOHR_ANGSTROM
            ratios.append(well.De.value / constants.HARTREE_EV / (noble_gas(g).polarizability_au.value / (2 * Re**4)))
        assert ratios == sorted(ratios)
        assert 0.6 < ratios[0] < ratios[-1] < 1.4


def test_errors_and_provenance():
    core = core_gas("Na", "Ar")
    assert core.relative_errors == pytest.approx({"De": 0.05, "Re": 0.02, "C6": 0.15})
    assert "FROM MEMORY" in core.provenance
    assert "0.165 eV" in core.provenance
    assert core.well.grade == "medium"


def test_core_dispersion_of_equal_shells_is_the_homonuclear_one():
    """An ion with the polarisability of its isoelectronic gas would have the C6 of the gas: here scaled back."""
    gas = noble_gas("Ne")
    ratio = 0.995 / gas.polarizability_au.value  # Na+ against Ne: C6 = 3/2 a b sqrt(N)/(sqrt a + sqrt b)
    wanted = gas.C6_homonuclear_au.value * 2 * ratio / (1 + math.sqrt(ratio))
    assert core_dispersion("Na", "Ne").value == pytest.approx(wanted, rel=1e-9)


def test_wall_exponent_of_argon_with_potassium():
    """Harmonic mean of 0.93 * 2 sqrt(2I), I = 31.625 and 15.76 eV."""
    b = [0.93 * 2 * math.sqrt(2 * I / 27.211386) for I in (31.625, 15.76)]
    assert wall_exponent("K", "Ar") == pytest.approx(2 * b[0] * b[1] / sum(b), rel=1e-6)


def test_inside_the_core_is_refused():
    core = core_gas("Cs", "Xe")
    with pytest.raises(OutOfRangeError, match=r"R of Cs\+ Xe = 2 bohr is outside"):
        core(np.array([10.0, 2.0]))
    for bad in (math.nan, math.inf):
        with pytest.raises(OutOfRangeError):
            core(bad)


def test_bad_wells_are_refused():
    core = core_gas("Na", "Ar")
    arguments = ("Na", "Ar", core.well, core.C6, core.b, core.electron)
    assert core_gas_from_well(*arguments).C8 == core.C8
    negative = replace(core.well, De=replace(core.well.De, value=-1.0))
    with pytest.raises(InputError, match="De = -1 eV"):
        core_gas_from_well("Na", "Ar", negative, core.C6, core.b, core.electron)
    millivolts = replace(core.well, De=replace(core.well.De, value=165.0))
    with pytest.raises(InputError, match="Check De, Re and their units"):
        core_gas_from_well("Na", "Ar", millivolts, core.C6, core.b, core.electron)


def test_unknown_names():
    with pytest.raises(UnknownNameError):
        core_gas("Fr", "Ar")
    with pytest.raises(UnknownNameError):
        core_gas("Na", "Rn")
