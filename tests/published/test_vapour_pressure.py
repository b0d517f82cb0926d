"""Vapour pressures against handbook values and heats of sublimation and evaporation; all FROM MEMORY."""

from __future__ import annotations

import math

import pytest

from pertcalc.species import ALKALIS
from pertcalc.vapour.density import Formula, alkali_density, formulas

GAS_CONSTANT = 8.314462618e-3  # kJ/(mol K)


def heat(one: Formula, T: float) -> float:
    """Heat of sublimation or evaporation [kJ/mol] by Clausius and Clapeyron, -R d ln P/d(1/T), P as n T."""
    cold, hot = T - 0.5, T + 0.5
    slope = math.log(one.density_cm3(hot) * hot / (one.density_cm3(cold) * cold)) / (1 / hot - 1 / cold)
    return -GAS_CONSTANT * slope


# Source: CRC Handbook of Chemistry and Physics, vapour pressure of the metallic elements, temperature at which it is
# 1 Pa, rounded to 1 K; FROM MEMORY. d ln P/dT is up to 0.05/K there, the formula claims 5 %.
@pytest.mark.parametrize("alkali, kelvin", [("Li", 797), ("Na", 554), ("K", 473), ("Rb", 434), ("Cs", 418)])
def test_temperature_of_one_pascal(alkali, kelvin):
    pascal = alkali_density(alkali, kelvin).pressure_torr.value * 101325 / 760
    assert pascal == pytest.approx(1.0, rel=0.06)


# Source: CODATA key values for thermodynamics (Cox, Wagman and Medvedev 1989), enthalpy of formation of the gaseous
# atom at 298.15 K, that is of sublimation; FROM MEMORY. Stated errors 0.6-1.3 %.
@pytest.mark.parametrize("alkali, sublimation", [("Li", 159.3), ("Na", 107.5), ("K", 89.0), ("Rb", 80.9), ("Cs", 76.5)])
def test_slope_over_the_solid_is_the_heat_of_sublimation(alkali, sublimation):
    solid = next(one for one in formulas(alkali) if one.is_default and one.phase == "solid")
    assert heat(solid, 299.5) == pytest.approx(sublimation, rel=0.015)


# Heat of evaporation at the middle of the liquid's range = sublimation - melting - (heat capacity of liquid less gas)
# times the difference to 298 K. Heats of melting Li 3.00, Na 2.60, K 2.33, Rb 2.19, Cs 2.09 kJ/mol and heat
# capacities about 30 and 20.8 J/(mol K): CRC Handbook, FROM MEMORY.
@pytest.mark.parametrize(
    "alkali, at_298, melting",
    [("Li", 159.3, 3.00), ("Na", 107.5, 2.60), ("K", 89.0, 2.33), ("Rb", 80.9, 2.19), ("Cs", 76.5, 2.09)],
)
def test_slope_over_the_liquid_is_the_heat_of_evaporation(alkali, at_298, melting):
    liquid = next(one for one in formulas(alkali) if one.is_default and one.phase == "liquid")
    T = 0.5 * (liquid.low_K + liquid.high_K)
    assert heat(liquid, T) == pytest.approx(at_298 - melting - 0.0092 * (T - 298), rel=0.02)


# Source: CRC Handbook, melting points [K]; FROM MEMORY.
MELTING = (453.65, 370.94, 336.7, 312.45, 301.65)


@pytest.mark.parametrize("alkali, kelvin", list(zip(ALKALIS, MELTING, strict=True)))
def test_the_phase_changes_at_the_melting_point(alkali, kelvin):
    assert alkali_density(alkali, kelvin - 0.3).phase == "solid"
    assert alkali_density(alkali, kelvin + 0.3).phase == "liquid"
