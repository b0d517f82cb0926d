"""The tables of published measurements: units, marks, completeness, and the laws the numbers must obey."""

from __future__ import annotations

import csv
import dataclasses
import itertools
import math
import re
from importlib.resources import files

import pytest
from scipy import constants as si

from pertcalc import species
from pertcalc.constants import AMU_AU
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.measured import GRADES, KINDS, QUANTITIES, TABLES, UNITS, Measurement, as_rate, measurements

ROWS = measurements()
FOLDER = files("pertcalc") / "data" / "measured"
LINES = [row for row in ROWS if row.quantity in ("fwhm", "shift")]


def name(row: Measurement) -> str:
    return f"{row.alkali}-{row.noble_gas} {row.quantity} {row.line_or_level} {row.temperature_K:g} K {row.published}"


@pytest.mark.parametrize("row", ROWS, ids=name)
def test_every_row_is_complete(row):
    assert row.mark in ("READ", "FROM MEMORY") and row.grade in GRADES and row.kind in KINDS
    assert row.mark != "READ" or "http" in row.source, "READ without an address"
    assert row.source.strip() and row.definition.strip() and row.published.strip() and row.note.strip()
    assert row.unit == UNITS[row.quantity]
    assert math.isfinite(row.value) and (row.error is None or row.error > 0)
    assert 250 < row.temperature_K < 1000
    assert row.quantity == "shift" or row.value > 0
    assert row.line_or_level in (("D1", "D2") if row.quantity in ("fwhm", "shift") else ("P1/2", "P3/2"))
    highest = {"P1/2": 1, "P3/2": 3}
    if row.quantity == "multipole_loss":
        assert row.rank is not None and 1 <= row.rank <= highest[row.line_or_level]
    else:
        assert row.rank is None


def test_only_alkalis_with_noble_gases():
    assert {row.alkali for row in ROWS} <= set(species.ALKALIS)
    assert {row.noble_gas for row in ROWS} == set(species.SPECIES_GASES)
    text = "".join((FOLDER / table).read_text(encoding="utf-8") for table in TABLES)
    assert not re.search(r"^\w+,(N2|CH4),", text, re.MULTILINE)


def test_row_counts_by_quantity():
    # Counted by hand in the literature list. Widths: Na-He 2; Rb 1997 (MHz/Torr) D2 x 5 gases + D1 x 2, (GHz/amagat)
    # 3He 2 + He 2 + Xe 1, 2011 1; Cs 2009 D1 x 6 gases, 2010 D2 x 5. Shifts: the same without Rb-Xe D1.
    # Transfer: Na, K, Rb 2 x 5 each, Cs 2 x 5 less Kr, Xe upward. Loss: Na 5, Rb 2 + 1, Cs 5.
    expected = {"fwhm": 2 + 7 + 5 + 1 + 6 + 5, "shift": 2 + 7 + 4 + 1 + 6 + 5, "transfer": 38, "multipole_loss": 13}
    assert {quantity: len(measurements(quantity=quantity)) for quantity in QUANTITIES} == expected
    lines = [line for table in TABLES for line in (FOLDER / table).read_text(encoding="utf-8").splitlines()]
    assert len([line for line in lines if not line.startswith("#")]) - len(TABLES) == len(ROWS)


@pytest.mark.parametrize("row", LINES, ids=name)
def test_widths_and_shifts_follow_from_the_published_number_and_unit(row):
    number = float(re.search(r"[-+]?\d[\d.]*", row.published).group())
    if "MHz/torr" in row.published:
        density = si.torr / (si.k * row.temperature_K) * 1e-6  # ideal gas [cm^-3 per Torr]
        value = 2 * math.pi * number * 1e6 / density * 1e9
    elif "GHz/amagat" in row.published:
        density = si.physical_constants["Loschmidt constant (273.15 K, 101.325 kPa)"][0] * 1e-6
        value = 2 * math.pi * number * 1e9 / density * 1e9
    else:
        assert "1e-9 rad s-1 cm3" in row.published
        value = number
    full = 2 if row.definition.startswith("HWHM") else 1
    assert row.value == pytest.approx(full * value, rel=2e-5, abs=6e-5)  # four decimals in the table


def test_density_convention_of_the_trade():
    # n(1 Torr, T) = 9.656500e18/T cm^-3 and 1 amagat = 2.6868e19 cm^-3: the two conventions of the tables.
    assert si.torr / si.k * 1e-6 == pytest.approx(9.656500e18, rel=1e-5)
    assert si.atm / (si.k * 273.15) * 1e-6 == pytest.approx(2.6868e19, rel=1e-5)


@pytest.mark.parametrize("row", [row for row in LINES if "ASSUMED" in row.note], ids=name)
def test_an_assumed_temperature_is_part_of_the_error(row):
    percent = int(re.search(r"/\+(\d+) %", row.note).group(1))
    assert row.error == pytest.approx(abs(row.value) * percent / 100, rel=0.05, abs=1e-4)


def test_a_read_half_width_of_unsure_definition_is_not_high_grade():
    inferred = [row for row in ROWS if "INFERRED" in row.definition]
    assert len(inferred) == 2 and {row.grade for row in inferred} == {"medium"}


def test_bounds_are_marked():
    bounds = [row for row in ROWS if row.kind == "bound"]
    assert [(row.alkali, row.noble_gas, row.quantity, row.value) for row in bounds] == [("Na", "He", "shift", 0.05)] * 2


def test_approximate_numbers_are_low_grade_and_ranges_carry_half_their_length():
    approximate = [row for row in ROWS if row.published.startswith("~")]
    assert len(approximate) == 6 + 5 + 6  # Rb and Cs transfer, Cs and Rb disorientation
    assert {row.grade for row in approximate} == {"low"}
    (ranged,) = [row for row in ROWS if " to " in row.published]
    assert (ranged.value, ranged.error) == pytest.approx((3.3e-5, 1.7e-5))
    factor_two = [row for row in ROWS if "factor 2" in row.note]
    assert factor_two and all(row.error == row.value for row in factor_two)


def test_blue_and_red_shifts_have_the_known_signs():
    # Helium pushes the D1 lines to the blue, the heavy gases pull to the red (e.g. Allard & Kielkopf, RMP 54, 1103).
    for row in measurements(quantity="shift"):
        if row.kind == "value":
            assert (row.value > 0) == (row.noble_gas in ("He", "3He")), name(row)


@pytest.mark.parametrize("alkali, gas", list(itertools.product(("Na", "K", "Rb", "Cs"), species.GASES)))
def test_transfer_up_and_down_are_in_detailed_balance(alkali, gas):
    # k(1/2->3/2)/k(3/2->1/2) = 2 exp(-splitting/kT); 25 % covers the stated 10-20 % of each cross section.
    rows = {row.line_or_level: row for row in measurements(alkali, gas, "transfer") if row.grade != "low"}
    if len(rows) < 2:
        assert alkali in ("Rb", "Cs") and gas != "He"  # only those are order-of-magnitude rows
        return
    up, down = rows["P1/2"], rows["P3/2"]
    assert up.temperature_K == down.temperature_K
    splitting_K = species.alkali(alkali).fine_structure_cm1.value * 100 * si.h * si.c / si.k
    assert up.value / down.value == pytest.approx(2 * math.exp(-splitting_K / up.temperature_K), rel=0.25)


def test_cross_section_times_mean_speed():
    # Independent route in SI units: Na-Ar at 397 K, mu = 22.99*39.95/(62.94) u.
    row = next(row for row in measurements("Na", "Ar", "transfer") if row.line_or_level == "P1/2")
    mu = 22.98977 * 39.948 / (22.98977 + 39.948)
    speed = math.sqrt(8 * si.k * row.temperature_K / (math.pi * mu * si.atomic_mass))
    rate = as_rate(row, mu * AMU_AU)
    assert rate.value == pytest.approx(row.value * 1e-20 * speed * 1e6, rel=1e-6)
    assert rate.error == pytest.approx(0.2 * rate.value, rel=1e-6)
    assert (rate.unit, rate.mark) == ("cm^3/s", "FROM MEMORY")
    assert row.source in rate.source and "397 K" in rate.source


def test_widths_are_rates_already_and_bounds_say_so():
    width = measurements("Rb", "Ar", "fwhm")[0]
    assert as_rate(width, 1.0) == as_rate(width, 5e4)
    assert as_rate(width, 1.0).value == pytest.approx(width.value * 1e-9)
    assert as_rate(width, 1.0).unit == "rad s^-1 cm^3" and as_rate(width, 1.0).error is None
    bound = measurements("Na", "He", "shift")[0]
    assert "bound" in as_rate(bound, 1.0).source and as_rate(bound, 1.0).mark == "READ"


@pytest.mark.parametrize("mass", [0.0, -1.0, math.nan, math.inf])
def test_a_reduced_mass_that_is_none_is_refused(mass):
    with pytest.raises(InputError, match="reduced_mass_au"):
        as_rate(ROWS[0], mass)


def test_filters():
    assert measurements("rb", "HE") == tuple(r for r in ROWS if (r.alkali, r.noble_gas) == ("Rb", "He"))
    assert {row.noble_gas for row in measurements("Rb", "3He")} == {"3He"}
    assert measurements("Li") == ()  # nothing usable is known to the tables
    best_first = [GRADES.index(row.grade) for row in measurements("Rb", "He", "multipole_loss")]
    assert best_first == sorted(best_first) and len(best_first) == 2


@pytest.mark.parametrize(
    "arguments, near",
    [(("Rbb",), "Rb"), (("Rb", "Hee"), "He"), (("Rb", "N2"), "Known"), ((None, None, "fwhmm"), "Did you mean fwhm")],
)
def test_unknown_names(arguments, near):
    with pytest.raises(UnknownNameError, match=near):
        measurements(*arguments)


def test_files_have_a_header_comment_and_one_column_set():
    columns = {field.name for field in dataclasses.fields(Measurement)}
    for table in TABLES:
        lines = (FOLDER / table).read_text(encoding="utf-8").splitlines()
        assert lines[0].startswith("# ") and "notes/scripts/make_measured.py" in lines[1]
        assert set(next(csv.reader(line for line in lines if not line.startswith("#")))) == columns
