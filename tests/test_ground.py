"""The relaxation processes of the ground level put together: who is there, on what it acts, errors and reasons."""

from __future__ import annotations

import dataclasses
import math

import pytest

from pertcalc import species
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import Sourced
from pertcalc.vapour.cell import parse_cell, transit_rate, wall_rate
from pertcalc.vapour.ground import (
    TRANSIT,
    WALL,
    Surroundings,
    exchange_is_fast,
    ground_processes,
    observable,
    orientation_decay,
)
from pertcalc.vapour.pairs import PAIRS
from pertcalc.vapour.spin_destruction import BY_ALKALI, BY_GAS, EXCHANGE

RB = species.alkali("Rb")
RB87 = next(one for one in RB.isotopes if one.label == "87Rb")
FULL = Surroundings(
    temperature_K=333.0,
    cell=parse_cell("sphere 25 mm"),
    wall="bare",
    gas="Ar",
    gas_density_cm3=6e17,
    alkali_density_cm3=Sourced(3e11, "cm^-3", "test", "COMPUTED", 3e10),
    diffusion_nD=Sourced(3e18, "cm^-1 s^-1", "test", "COMPUTED", 3e17),
    beam_diameter_cm=0.5,
    equilibrium_cm3=Sourced(8e-23, "cm^3", "test", "COMPUTED", 1e-23),
    rotation=Sourced(33.0, "1", "test", "COMPUTED", 8.0),
)
EMPTY = Surroundings(temperature_K=333.0, cell=FULL.cell, alkali_density_cm3=FULL.alkali_density_cm3)
SPEED = 100 * math.sqrt(8 * 8.314462618 * 333 / (math.pi * 0.0854678))


def by_name(around: Surroundings):
    return {process.name: process for process in ground_processes(RB, RB87, around)}


def changed(**fields):
    return dataclasses.replace(FULL, **fields)


def test_all_processes_are_there_with_unit_origin_and_error():
    found = by_name(FULL)
    assert list(found) == [WALL, TRANSIT, BY_GAS, PAIRS, BY_ALKALI, EXCHANGE]
    for process in found.values():
        assert process.rate.unit == "s^-1" and process.rate.value > 0 and process.rate.error > 0
        assert process.rate.source and process.rate.mark in species.MARKS and process.note
    assert [name for name, p in found.items() if not p.destroys] == [EXCHANGE]
    assert [name for name, p in found.items() if p.on_electron] == [BY_GAS, BY_ALKALI, EXCHANGE]


def test_rates_are_density_times_coefficient():
    found = by_name(FULL)
    twice = by_name(changed(gas_density_cm3=1.2e18, alkali_density_cm3=Sourced(9e11, "cm^-3", "t", "COMPUTED", 9e10)))
    assert twice[BY_GAS].rate.value == pytest.approx(2 * found[BY_GAS].rate.value, rel=1e-12)
    assert twice[EXCHANGE].rate.value == pytest.approx(3 * found[EXCHANGE].rate.value, rel=1e-12)
    assert twice[BY_ALKALI].rate.error == pytest.approx(3 * found[BY_ALKALI].rate.error, rel=1e-12)
    assert found[EXCHANGE].rate.error == pytest.approx(math.hypot(0.1, 0.1) * found[EXCHANGE].rate.value, rel=0.01)


def test_wall_and_transit_take_their_diffusion_from_the_gas():
    found = by_name(FULL)
    assert found[WALL].rate.value == pytest.approx(wall_rate(FULL.cell, 5.0, SPEED, 1.0), rel=1e-6)
    assert found[TRANSIT].rate.value == pytest.approx(transit_rate(0.5, 5.0, SPEED), rel=1e-6)
    assert found[WALL].rate.error / found[WALL].rate.value == pytest.approx(0.1, rel=0.05)
    assert "diffusion to the wall" in found[WALL].note


def test_without_gas_walls_and_transit_decide():
    found = by_name(dataclasses.replace(EMPTY, beam_diameter_cm=0.5))
    assert list(found) == [WALL, TRANSIT, BY_ALKALI, EXCHANGE]
    assert found[WALL].rate.value == pytest.approx(SPEED * 6 / (4 * 2.5), rel=1e-6)
    assert "bounces" in found[WALL].note and "free flight" in found[WALL].rate.source


def test_a_coated_wall_is_slower_and_carries_the_error_of_the_bounce():
    bare, coated = by_name(EMPTY)[WALL].rate, by_name(dataclasses.replace(EMPTY, wall="coated"))[WALL]
    assert coated.rate.value == pytest.approx(bare.value * 3.6e-4, rel=0.05)
    assert coated.rate.error / coated.rate.value == pytest.approx(0.73, abs=0.03)
    assert "melts" not in coated.note
    hot = by_name(dataclasses.replace(EMPTY, wall="coated", temperature_K=373.15))[WALL]
    assert "melts" in hot.note


def test_a_beam_that_fills_the_cell_has_no_transit():
    assert TRANSIT not in by_name(changed(beam_diameter_cm=2.5))
    assert TRANSIT not in by_name(changed(beam_diameter_cm=None))


def test_unknown_is_none_with_a_reason_never_zero():
    found = by_name(Surroundings(temperature_K=333.0, gas="3He", gas_density_cm3=6e17, beam_diameter_cm=0.5))
    assert all(process.rate is None and process.reason for process in found.values())
    assert "add --cell" in found[WALL].reason
    assert "diffusion coefficient of Rb in 3He is not known" in found[TRANSIT].reason
    assert "density of Rb vapour is not known" in found[EXCHANGE].reason and not found[EXCHANGE].destroys
    no_diffusion = by_name(changed(diffusion_nD=None))[WALL]
    assert no_diffusion.rate is None and "diffusion coefficient of Rb in Ar is not known" in no_diffusion.reason


def test_unknown_error_of_the_diffusion_stays_unknown():
    assert by_name(changed(diffusion_nD=Sourced(3e18, "cm^-1 s^-1", "t", "COMPUTED")))[WALL].rate.error is None


@pytest.mark.parametrize(
    ("fields", "rule"),
    [
        ({"temperature_K": 0.0}, r"temperature \[K\] = 0"),
        ({"gas_density_cm3": -1.0}, "gas density"),
        ({"gas_density_cm3": None}, "give both or neither"),
        ({"diffusion_nD": Sourced(math.nan, "cm^-1 s^-1", "t", "READ")}, "diffusion nD"),
        ({"beam_diameter_cm": 0.0}, "--beam-diameter"),
        ({"beam_diameter_cm": 3.0}, "--beam-diameter = 3 cm is larger than the cell .sphere, diameter 2.5 cm."),
    ],
)
def test_bad_surroundings_are_named(fields, rule):
    with pytest.raises(InputError, match=rule) as caught:
        changed(**fields)
    assert len(caught.value.problems) == 1


def test_unknown_wall_is_refused():
    with pytest.raises(UnknownNameError, match="wall 'glass'"):
        changed(wall="glass")


@pytest.mark.parametrize(("spin", "slow", "q"), [(1.5, 8, 6), (2.5, 18, 38 / 3), (3.5, 32, 22), (1.0, 4.5, 11 / 3)])
def test_observable_rates(spin, slow, q):
    """2/(2I+1)^2 (ratios 8:1, 18:1 READ: Franz & Volk 1976) and the low-polarisation slowing-down factor."""
    assert observable(100.0, spin, False) == pytest.approx(100 / slow, rel=1e-12)
    assert observable(100.0, spin, True) == pytest.approx(100 / q, rel=1e-12)


def test_observable_without_nuclear_spin_is_the_rate_itself():
    assert observable(7.0, 0.0, False) == pytest.approx(7.0) == observable(7.0, 0.0, True)


@pytest.mark.parametrize(("rate", "spin"), [(-1.0, 1.5), (math.nan, 1.5), (1.0, 0.3), (1.0, -1.0)])
def test_observable_refuses(rate, spin):
    with pytest.raises(InputError):
        observable(rate, spin, False)


def test_orientation_decay_scales_what_acts_on_the_electron_only():
    before, after = by_name(FULL), {p.name: p for p in orientation_decay(ground_processes(RB, RB87, FULL), 1.5)}
    assert not exchange_is_fast(before.values())  # transit is faster
    for name in (WALL, TRANSIT, PAIRS, EXCHANGE):
        assert after[name] == before[name]
    for name in (BY_GAS, BY_ALKALI):
        assert after[name].rate.value == pytest.approx(before[name].rate.value / 8, rel=1e-12)
        assert after[name].rate.error == pytest.approx(before[name].rate.error / 8, rel=1e-12)
        assert "slow eigenrate" in after[name].note


def test_dense_vapour_takes_the_spin_temperature():
    dense = changed(alkali_density_cm3=Sourced(1e14, "cm^-3", "t", "COMPUTED", 1e13))
    processes = ground_processes(RB, RB87, dense)
    assert exchange_is_fast(processes)
    exchange = next(p.rate.value for p in processes if p.name == EXCHANGE)
    # Light that damps the electron spin faster than exchange restores it leaves no spin temperature.
    for light, fast in ((0.99 * exchange, True), (1.01 * exchange, False)):
        assert exchange_is_fast(processes, light) is fast
        lit = {p.name: p for p in orientation_decay(processes, 1.5, light)}
        dark = next(p.rate.value for p in processes if p.name == BY_GAS)
        assert lit[BY_GAS].rate.value == pytest.approx(dark / (6 if fast else 8), rel=1e-12)
    before, after = ({p.name: p for p in some} for some in (processes, orientation_decay(processes, 1.5)))
    assert after[BY_GAS].rate.value == pytest.approx(before[BY_GAS].rate.value / 6, rel=1e-12)
    assert "spin temperature" in after[BY_GAS].note
