"""Vapour density: formulas against their printed alternative forms, range, errors, choice of phase."""

from __future__ import annotations

import csv
import math
import re
from importlib.resources import files

import numpy as np
import pytest

from pertcalc.errors import InputError, OutOfRangeError, UnknownNameError
from pertcalc.species import ALKALIS
from pertcalc.vapour.density import Formula, alkali_density, formulas

ALL = [one for alkali in ALKALIS for one in formulas(alkali)]
DEFAULTS = [one for one in ALL if one.is_default]
ATM_TORR, ATM_PA = 760.0, 101325.0


def name(one: Formula) -> str:
    return f"{one.alkali}-{one.phase}-{one.published}"


def printed(text: str, T: float) -> float:
    """The right side of a printed formula such as '1.2 - 3/T + 4 T - 5 log10 T' at T."""
    right = text.split(" = ")[1].replace("log10 T", "L")
    return eval(re.sub(r"(\d) ([LT])", r"\1*\2", right), {"T": T, "L": math.log10(T)})  # a data file of the project


def at(alkali: str, phase: str) -> Formula:
    return next(one for one in DEFAULTS if (one.alkali, one.phase) == (alkali, phase))


@pytest.mark.parametrize("one", ALL, ids=name)
def test_every_row_is_complete_and_equals_its_printed_form(one):
    assert one.mark in ("READ", "FROM MEMORY") and (one.mark != "READ" or "http" in one.source)
    assert one.source.strip() and one.grade in ("high", "medium", "low") and one.low_K < one.high_K
    T = 310.0 if one.phase == "solid" else 500.0
    factor = {"P/Pa": 1.380649e-23 * T * 1e6, "P/Torr": 1.380649e-23 * T * 1e6 / (ATM_PA / ATM_TORR), "n/cm^-3": 1.0}
    assert one.density_cm3(T) * factor[one.quantity] == pytest.approx(10 ** printed(one.published, T), rel=1e-6)


@pytest.mark.parametrize("one", DEFAULTS, ids=name)
def test_printed_alternative_forms_agree(one):
    # The source prints the same formula in atm, Torr and cm^-3; each rounds its constant to three decimals.
    T = 0.5 * (one.low_K + one.high_K)
    torr = one.density_cm3(T) * T / 9.656500e18
    digits = math.log(10) * 1.1e-3
    atm = re.search(r"(?:atm\)|atm form) ([\d.]+) ?- ?(\d+)/T", one.note)
    assert atm, "no form in atm to compare with"
    assert torr / ATM_TORR == pytest.approx(10 ** (float(atm[1]) - float(atm[2]) / T), rel=digits)
    if one.alkali != "Li":
        in_torr = re.search(r"log10\(P/Torr\) ([\d.]+) - (\d+)/T", one.note)
        density = re.search(r"n = 10\^\(([\d.]+) - (\d+)/T\)/T", one.note)
        assert torr == pytest.approx(10 ** (float(in_torr[1]) - float(in_torr[2]) / T), rel=digits)
        assert one.density_cm3(T) == pytest.approx(10 ** (float(density[1]) - float(density[2]) / T) / T, rel=digits)


@pytest.mark.parametrize("alkali", ALKALIS)
def test_solid_and_liquid_meet_at_the_melting_point(alkali):
    solid, liquid = at(alkali, "solid"), at(alkali, "liquid")
    melting = solid.high_K
    assert liquid.low_K == melting
    # Two formulas of 5 % each.
    assert solid.density_cm3(melting) == pytest.approx(liquid.density_cm3(melting), rel=0.05 * math.sqrt(2))
    # The vapour pressure of the solid is the steeper one: heat of sublimation = heat of melting + of evaporation.
    assert solid.coefficients[1] < liquid.coefficients[1]
    assert alkali_density(alkali, melting - 0.01).phase == "solid"
    assert alkali_density(alkali, melting).phase == "liquid"


@pytest.mark.parametrize("alkali", ALKALIS)
def test_pressure_density_and_monotony(alkali):
    for T in np.linspace(299, 590, 12):
        found = alkali_density(alkali, float(T))
        # Ideal gas, n = 9.656500e18 p[Torr]/T cm^-3.
        assert found.density_cm3.value == pytest.approx(9.6565e18 * found.pressure_torr.value / T, rel=1e-5)
        assert found.density_cm3.error / found.density_cm3.value == pytest.approx(
            found.pressure_torr.error / found.pressure_torr.value
        )
        assert (found.pressure_torr.unit, found.density_cm3.unit) == ("Torr", "cm^-3")
    densities = [alkali_density(alkali, float(T)).density_cm3.value for T in np.linspace(299, 590, 60)]
    # It rises everywhere but for the 5 % step at the melting point, which a step of 5 K outweighs.
    assert (np.diff(densities) > 0).all()


def test_the_heavier_the_alkali_the_denser_its_vapour():
    densities = [alkali_density(alkali, 400.0).density_cm3.value for alkali in ALKALIS]
    assert densities == sorted(densities)


def test_error_holds_the_stated_five_per_cent_and_the_spread():
    alone = alkali_density("Na", 400.0)
    assert alone.others == () and alone.density_cm3.error == pytest.approx(0.05 * alone.density_cm3.value)
    several = alkali_density("Rb", 350.0)
    values = [several.density_cm3.value, *(one.density_cm3.value for one in several.others)]
    assert len(values) == 3
    half = (max(values) - min(values)) / 2
    assert several.density_cm3.error == pytest.approx(math.hypot(0.05 * values[0], half))
    assert all(one.density_cm3.error is None and one.phase == "liquid" for one in several.others)
    first, second = (f"{n / values[0]:.2f}" for n in values[1:])
    assert several.warnings == (f"Rb vapour: other published formulas give {first} and {second} times this density.",)
    assert len(alkali_density("Rb", 305.0).others) == 1  # one of the two others is for the liquid only
    assert alkali_density("Li", 500.0).others == ()  # the other lithium formula starts at 598 K


def test_formula_ranges():
    with pytest.raises(OutOfRangeError, match=r"Rb vapour = 297\.9 K is outside 298 \.\. 600 K.*choose"):
        alkali_density("Rb", 297.9)
    with pytest.raises(OutOfRangeError, match=r"600\.1 K is outside 298 \.\. 600 K"):
        alkali_density("cs", 600.1)
    with pytest.raises(OutOfRangeError, match=r"298 \.\. 1000 K"):
        alkali_density("Li", 1001)
    assert alkali_density("Li", 999).phase == "liquid"
    assert not any("550" in warning for warning in alkali_density("K", 550).warnings)
    assert any("550/600 K" in warning for warning in alkali_density("K", 551).warnings)


@pytest.mark.parametrize("bad", [math.nan, math.inf, "300", None])
def test_temperatures_that_are_no_numbers(bad):
    with pytest.raises(InputError, match="temperature"):
        alkali_density("Rb", bad)


def test_unknown_alkali():
    with pytest.raises(UnknownNameError, match="Rb"):
        alkali_density("Rubidium", 350)


def test_the_file_names_its_script():
    lines = (files("pertcalc") / "data" / "vapour" / "vapour_pressure.csv").read_text(encoding="utf-8").splitlines()
    assert "notes/scripts/make_vapour.py" in lines[1]
    rows = list(csv.DictReader(line for line in lines if not line.startswith("#")))
    assert len(rows) == len(ALL) == 16 and sum(row["formula"] == "default" for row in rows) == 10
