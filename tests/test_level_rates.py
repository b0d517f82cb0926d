"""Rates of the P levels in a cell: traces, detailed balance of the gains, and what cannot be answered."""

from __future__ import annotations

import numpy as np
import pytest

from pertcalc.errors import InputError
from pertcalc.species import alkali
from pertcalc.vapour.level_rates import J_OF, OTHER_LEVEL, P_LEVELS, free_rates, level_rates, population_gain
from tests.report_fakes import fake_rates

DENSITY = 3.0e17


@pytest.mark.parametrize("level", P_LEVELS)
def test_what_leaves_one_level_arrives_in_the_other(level: str) -> None:
    """Law: the trace. rho_00 = Tr(rho)/sqrt(2J+1), so the gain of rank 0 weighs sqrt(2J'+1)/sqrt(2J+1) of a trace."""
    other = OTHER_LEVEL[level]
    weight = np.sqrt((2 * J_OF[other] + 1) / (2 * J_OF[level] + 1))
    assert population_gain(level, 7.0) * weight == pytest.approx(7.0, rel=1e-14)


def test_every_rate_is_the_coefficient_times_the_density() -> None:
    rates = fake_rates("Rb", "Ar", 330.0)
    found = level_rates(alkali("Rb"), rates, DENSITY)
    assert found.loss["P3/2"][2] == pytest.approx(DENSITY * rates.multipole_loss["P3/2"][2].values[0])
    assert found.loss["P1/2"][0] == pytest.approx(DENSITY * rates.transfer["P1/2"].values[0])
    assert found.gain["P3/2"][1] < 0  # the fake transfers orientation with the sign of the real one
    assert found.decay["P1/2"] == alkali("Rb").decay_rate("P1/2")


def test_another_temperature_is_another_row() -> None:
    rates = fake_rates("Rb", "Ar", [300.0, 400.0])
    cold, hot = (level_rates(alkali("Rb"), rates, DENSITY, i) for i in (0, 1))
    assert hot.loss["P3/2"][1] > cold.loss["P3/2"][1]


def test_without_a_gas_only_decay_is_left() -> None:
    free = free_rates(alkali("Cs"))
    assert all(rate == 0 for level in P_LEVELS for rate in free.loss[level].values())
    assert set(free.loss["P3/2"]) == {0, 1, 2, 3}
    assert free.decay["P3/2"] > free.decay["P1/2"] > 0


def test_the_closed_form_cannot_say_how_the_levels_relax() -> None:
    with pytest.raises(InputError, match="closed-form.*P1/2.*--method semiclassical"):
        level_rates(alkali("Rb"), fake_rates("Rb", "Ar", 330.0, "closed-form"), DENSITY)
