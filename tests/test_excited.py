"""One rank of a P level: who wins, where that changes, and the rates a model of polarised lines takes."""

from __future__ import annotations

from dataclasses import replace

import pytest

from pertcalc.species import Sourced, alkali
from pertcalc.vapour.excited import COLLISIONS, DECAY, FIELD, model_rates, rank_balance
from pertcalc.vapour.fill import Fill, hanle_field_G
from pertcalc.vapour.level_rates import LevelRates, free_rates, level_rates
from tests.report_fakes import fake_rates

RB = alkali("Rb")
FILL = Fill(20.0, 293.15, 333.15, 0.5)
G_J = 4 / 3
WITH_G_J = Sourced(G_J, "1", "Lande factor of J = 3/2", "COMPUTED")


def rates_at(fill: Fill) -> LevelRates:
    return level_rates(RB, fake_rates("Rb", "Ar", fill.temperature_K), fill.density_cm3)


def balance(fill: Fill = FILL, rank: int = 2):
    return rank_balance(RB, "P3/2", rank, rates_at(fill), 0.2, WITH_G_J, "g_J", fill)


def test_collisions_equal_decay_at_the_crossover_pressure() -> None:
    found = balance()
    at_crossover = balance(replace(FILL, pressure_torr=found.crossover_pressure_torr))
    assert at_crossover.collisional.value == pytest.approx(RB.decay_rate("P3/2"), rel=1e-12)
    assert set(at_crossover.comparable) == {DECAY, COLLISIONS}


def test_the_field_takes_over_at_the_crossover_field() -> None:
    found = balance()
    below, above = (balance(replace(FILL, field_G=f * found.crossover_field_G)) for f in (0.99, 1.01))
    assert below.dominant == COLLISIONS
    assert above.dominant == FIELD


def test_in_a_strong_field_pressure_must_beat_the_field_not_the_decay() -> None:
    strong = replace(FILL, field_G=1e3)
    found = balance(strong)
    at_crossover = balance(replace(strong, pressure_torr=found.crossover_pressure_torr))
    assert at_crossover.collisional.value == pytest.approx(found.larmor, rel=1e-12)


def test_the_hanle_field_grows_with_the_collisions() -> None:
    found = balance()
    total = found.radiative.value + found.collisional.value
    assert found.hanle_G == pytest.approx(hanle_field_G(G_J, total), rel=1e-14)
    assert found.hanle_error_G == pytest.approx(0.2 * (found.hanle_G - found.hanle_free_G), rel=1e-12)


def test_hanle_field_of_free_caesium_and_sodium() -> None:
    """2.81 G and 5.25 G for P3/2 with g_J (lifetimes FROM MEMORY behind them: Hanle fields of the free D2 levels)."""
    for symbol, field in (("Cs", 2.81), ("Na", 5.25)):
        record = alkali(symbol)
        free = rank_balance(record, "P3/2", 2, free_rates(record), None, WITH_G_J, "g_J", FILL, has_gas=False)
        assert free.hanle_G == pytest.approx(field, abs=0.015)
        assert free.crossover_pressure_torr is None
        assert free.dominant == DECAY


def test_elastic_and_inelastic_rates_add_up_to_the_collisional_width() -> None:
    """Definition: gamma_E + gamma_I = collisional full width; D_0 = 0 (Omont 1977, FROM MEMORY)."""
    width, rates = 4.0e8, rates_at(FILL)
    made = model_rates(RB, "D2", rates, width, {"width": 0.1, "gamma_I": 0.5, "loss_2": 0.2})
    assert made.gamma_E + made.gamma_I == pytest.approx(width, rel=1e-14)
    assert made.depolarising[2] + made.gamma_I == pytest.approx(rates.loss["P3/2"][2], rel=1e-14)
    assert made.errors["gamma_E"] == pytest.approx(0.1 * width / made.gamma_E)
    assert made.errors["D1"] is None
    assert set(model_rates(RB, "D1", rates, width, {}).depolarising) == {1}
