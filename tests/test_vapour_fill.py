"""A filled cell against the ideal gas law, the conversions of the rates contract and published Hanle fields."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from pertcalc import constants
from pertcalc.errors import InputError
from pertcalc.species import ALKALIS, alkali
from pertcalc.vapour.fill import (
    DEFAULT_TEMPERATURE_K,
    IMPACT_LIMIT,
    Fill,
    hanle_field_G,
    impact_parameter,
    larmor_rad_s,
    level_balance,
)

# Hanle field of P3/2 without nuclear spin, B = hbar Gamma/(g_J mu_B), to the two decimals given with the natural
# lifetimes (FROM MEMORY, compilations of D-line data; COMPUTED from them): K stands for both 39K and 41K.
HANLE_P32_G = {"Li": 3.15, "Na": 5.25, "K": 3.23, "Rb": 3.25, "Cs": 2.81}
CELL = Fill(pressure_torr=20.0, fill_temperature_K=293.15, temperature_K=333.15, field_G=0.5)


def test_density_is_that_of_an_ideal_gas():
    # Loschmidt constant, CODATA: 1 atm at 273.15 K; n = 9.656500e18 p[Torr]/T cm^-3 to its seven printed digits.
    assert Fill(760.0, 273.15, 500.0, 0.0).density_cm3 == pytest.approx(constants.AMAGAT_CM3, rel=1e-12)
    assert Fill(1.0, 1.0, 500.0, 0.0).density_cm3 == pytest.approx(9.656500e18, rel=1e-6)


def test_a_sealed_cell_keeps_its_density_and_gains_pressure():
    hot = Fill(20.0, 293.15, 400.0, 0.0)
    assert hot.density_cm3 == CELL.density_cm3 == pytest.approx(9.656500e18 * 20 / 293.15, rel=1e-6)
    assert hot.pressure_in_use_torr == pytest.approx(20 * 400 / 293.15)


@pytest.mark.parametrize("symbol", ALKALIS)
def test_hanle_fields_of_p32_agree_with_the_published_lifetimes(symbol):
    level = alkali(symbol).levels["P3/2"]
    field = hanle_field_G(level.gJ.value, alkali(symbol).decay_rate("P3/2"))
    assert field == pytest.approx(HANLE_P32_G[symbol], abs=0.012)


@pytest.mark.parametrize("symbol", ALKALIS)
def test_hanle_fields_of_p12_are_about_twice_those_of_p32(symbol):
    fields = [
        hanle_field_G(alkali(symbol).levels[level].gJ.value, alkali(symbol).decay_rate(level))
        for level in ("P1/2", "P3/2")
    ]
    assert fields[0] / fields[1] == pytest.approx(2.0, rel=0.15)


def test_larmor_frequency_of_a_free_electron_spin():
    # 2.8025 MHz/G for g = 2.00232 (any text on magnetic resonance).
    assert larmor_rad_s(2.00231930436, 1.0) / (2 * math.pi * 1e6) == pytest.approx(2.80249514, rel=1e-7)


def test_at_the_hanle_field_larmor_frequency_and_decay_are_equal():
    assert larmor_rad_s(1.3341, hanle_field_G(1.3341, 3.8e7)) == pytest.approx(3.8e7, rel=1e-12)


def test_collisions_widen_the_hanle_field_by_their_share():
    balance = level_balance("P3/2", 4e7, 4 / 3, {1: 1e-10, 2: 2e-10, 3: None}, CELL)
    n = CELL.density_cm3
    assert balance.losses == pytest.approx({1: n * 1e-10, 2: n * 2e-10})
    assert balance.hanle_G[2] / balance.hanle_free_G == pytest.approx(1 + n * 2e-10 / 4e7)
    # The error of the sum is that of its only uncertain part.
    loss = balance.losses[2]
    changed = hanle_field_G(4 / 3, 4e7 + 1.1 * loss)
    assert balance.hanle_relative_error(2, 0.1) == pytest.approx(changed / balance.hanle_G[2] - 1, rel=1e-9)


@pytest.mark.parametrize(
    ("loss", "field", "winner", "comparable"),
    [
        (1e-9, 0.0, "collisions", ("collisions",)),
        (1e-13, 0.0, "radiative decay", ("radiative decay",)),
        (1e-13, 1e4, "field", ("field",)),
        (5e-11, 0.0, "radiative decay", ("radiative decay", "collisions")),
    ],
)
def test_the_largest_rate_wins(loss, field, winner, comparable):
    cell = Fill(20.0, 293.15, 333.15, field)
    balance = level_balance("P3/2", 4e7, 4 / 3, {2: loss}, cell)
    assert (balance.winner, balance.comparable) == (winner, comparable)


def test_rank_two_stands_for_the_collisions_where_it_is_known():
    ranks = [
        level_balance("P3/2", 4e7, 4 / 3, losses, CELL).rank
        for losses in ({1: 1e-10, 2: 1e-11, 3: 1e-9}, {1: 1e-10}, {1: None})
    ]
    assert ranks == [2, 1, None]


def test_without_known_losses_nothing_is_called_the_winner():
    balance = level_balance("P1/2", 4e7, 2 / 3, {1: None}, CELL)
    assert balance.losses == {} and [name for name, _ in balance.ranking] == ["radiative decay", "field"]
    assert balance.winner is None and balance.comparable == ()


@given(st.floats(1e-11, 1e-8), st.floats(50, 1500), st.floats(1e3, 2e5), st.floats(1e15, 1e21))
def test_impact_number_is_two_pi_times_the_perturbers_in_the_collision(k, T, mass, n):
    # From the definition: half-width cross section k/(2 vbar) = pi b^2, number 2 pi n b^3.
    vbar = math.sqrt(8 * T * constants.KELVIN_HARTREE / (math.pi * mass)) * constants.AU_VELOCITY_CM_S
    b = math.sqrt(k / (2 * vbar) / math.pi)
    assert impact_parameter(k, T, mass, n) == pytest.approx(2 * math.pi * n * b**3, rel=1e-9)


def test_twenty_torr_is_well_inside_the_impact_approximation_and_a_hundred_bar_is_not():
    mu = 27.2 * constants.AMU_AU  # Rb-Ar
    fills = (Fill(pressure, 293.15, 333.15, 0.0) for pressure in (20.0, 76000.0))
    low, high = (impact_parameter(4.2e-9, 333.15, mu, fill.density_cm3) for fill in fills)
    assert low < IMPACT_LIMIT < high


def test_every_broken_condition_is_named_in_one_error():
    with pytest.raises(InputError) as caught:
        Fill(pressure_torr=-1.0, fill_temperature_K=0.0, temperature_K=math.nan, field_G=-0.5)
    assert str(caught.value).splitlines() == [
        "pressure = -1 Torr must be finite and > 0; give another value.",
        "fill temperature = 0 K must be finite and > 0; give another value.",
        "temperature = nan K must be finite and > 0; give another value.",
        "field = -0.5 G must be finite and >= 0 (a magnitude); give another value.",
    ]


def test_every_alkali_has_a_default_temperature():
    assert set(DEFAULT_TEMPERATURE_K) == set(ALKALIS)
