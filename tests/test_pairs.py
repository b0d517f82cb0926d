"""Relaxation by weakly bound pairs: limits of the rate, the two damping forms, reasons for nothing."""

from __future__ import annotations

import math
from functools import cache

import pytest

from pertcalc import species
from pertcalc.molecules.molecule import molecule
from pertcalc.species import Sourced
from pertcalc.units import density_cm3
from pertcalc.vapour.pairs import pair_lifetime_s, pair_loss, pair_rate, sticking
from pertcalc.vapour.spin_destruction import bound_pair

RB87 = next(one for one in species.alkali("Rb").isotopes if one.label == "87Rb")
K = Sourced(1.7e-22, "cm^3", "test", "COMPUTED", 2e-23)
N = Sourced(50.0, "1", "test", "COMPUTED", 5.0)


def at(torr: float, temperature: float = 300.0, gas: str = "Kr"):
    return pair_loss("Rb", gas, RB87, float(density_cm3(torr, temperature)), temperature, K, N)


def test_rate_rises_as_pressure_squared_saturates_and_is_half_at_phi_one():
    """tau = tau1/p, n = n1 p: p^2 for phi >> 1, plateau (2/3) K n1 (gamma N/hbar)^2 tau1 for phi << 1."""
    tau1, n1, coupling = 6.5e-8, 3.2e16, 1e8
    plateau = 2 / 3 * 1.7e-22 * n1 * coupling**2 * tau1

    def rate(p: float) -> float:
        return pair_rate(1.7e-22, n1 * p, tau1 / p, coupling)

    assert rate(2e-4) / rate(1e-4) == pytest.approx(4, rel=1e-6)
    assert rate(1e-4) == pytest.approx(2 / 3 * 1.7e-22 * n1 * 1e-8 / tau1, rel=1e-6)  # every pair randomises, 2/3
    assert rate(1e5) == pytest.approx(plateau, rel=1e-6)
    assert rate(coupling * tau1) == pytest.approx(plateau / 2, rel=1e-12)


def test_published_lifetime_is_that_of_one_torr():
    n = float(density_cm3(2.0, 300.0))
    assert pair_lifetime_s(6.5e-8, 300.0, n, 300.0) == pytest.approx(3.25e-8, rel=1e-12)
    assert pair_lifetime_s(6.5e-8, 300.0, n, 400.0) == pytest.approx(3.25e-8 * math.sqrt(0.75), rel=1e-12)


def test_damping_form_follows_omega_hf_tau():
    """87Rb: omega_hf = 2 pi 6.835 GHz, tau = 6.5e-8 s Torr/p; F-damping turns the atom [I] = 4 times more slowly."""
    slow, fast = at(10.0), at(1e5)
    assert not slow.on_electron and slow.note.startswith("on the whole atom: F-damping")
    assert fast.on_electron and fast.note.startswith("on the electron spin: S-damping")
    tau, coupling = 6.5e-9, 2 * math.pi * 0.63e6 * 50
    expected = pair_rate(1.7e-22, float(density_cm3(10.0, 300.0)), tau, coupling / 4)
    assert slow.rate.value == pytest.approx(expected, rel=1e-9)
    between = at(2800.0)
    assert "lies between" in between.note
    assert between.rate.error / between.rate.value > slow.rate.error / slow.rate.value


def test_both_forms_agree_within_two_in_the_decay_of_orientation():
    """Motional narrowing: F-damping G/[I]^2, S-damping 2 G/[I]^2 (slow eigenrate)."""
    whole, electron = at(500.0).rate.value, at(1e5).rate.value * 2 / 16
    assert electron / whole == pytest.approx(2.0, rel=0.01)


def test_error_is_the_effect_of_its_parts():
    moved = pair_loss("Rb", "Kr", RB87, float(density_cm3(10.0, 300.0)), 300.0, K, Sourced(55.0, "1", "t", "READ", 5.0))
    part = moved.rate.value / at(10.0).rate.value - 1
    assert at(10.0).rate.error / at(10.0).rate.value > part > 0.05


def test_without_computed_constant_the_published_one_is_taken():
    n = float(density_cm3(10.0, 300.0))
    published = pair_loss("Rb", "Kr", RB87, n, 300.0, None, N)
    assert published.rate.value == pytest.approx(at(10.0).rate.value, rel=1e-9)  # K is 1.7e-22 in both
    hot = pair_loss("Rb", "Kr", RB87, n, 400.0, None, N)
    assert hot.rate.error / hot.rate.value > published.rate.error / published.rate.value


def test_unknown_has_a_reason():
    n = float(density_cm3(10.0, 300.0))
    assert "rotation of Rb-Kr is not known" in pair_loss("Rb", "Kr", RB87, n, 300.0, K, None).reason
    assert pair_loss("Rb", "Xe", RB87, n, 300.0, None, None).reason == (
        "no published spin-rotation constant of Rb-Xe pairs in the tables"
    )
    strong = pair_loss("Rb", "Xe", RB87, n, 300.0, K, N)
    assert strong.rate is None and "too little" not in strong.reason and "of the atoms are bound" in strong.reason
    light = pair_loss("Rb", "He", RB87, n, 300.0, Sourced(5e-25, "cm^3", "test", "COMPUTED"), None)
    assert light.rate is None and light.reason.startswith("Rb-He binds too little")
    assert "too little" not in pair_loss("Rb", "He", RB87, n, 300.0, None, None).reason


@cache
def _argon():
    return sticking(molecule("Rb", "Ar", "X", temperature=300.0))


def test_constant_from_levels_agrees_with_the_published_one():
    """94 cubic angstrom at 300 K (READ: Bouchiat, Brossel, Mora & Pottier 1975)."""
    found, published = _argon()[0], bound_pair("Rb", "Ar").equilibrium_cm3
    assert published == pytest.approx(94e-24)
    assert found.value == pytest.approx(published, abs=1.5 * found.error)


def test_rotation_of_the_pairs_is_that_of_the_well():
    """Largest bound N from the classical top, N^2 ~ 2 mu R^2 |V| with centrifugal barrier, is about 40 to 70."""
    rotation = _argon()[1]
    assert 20 < rotation.value < 50 and 0 < rotation.error < rotation.value / 2
