"""The tables of spin destruction and exchange: completeness, conversion, the rule of choice, reasons for nothing."""

from __future__ import annotations

import math
import re

import pytest

from pertcalc.errors import InputError, UnknownNameError
from pertcalc.species import ALKALIS, SPECIES_GASES
from pertcalc.vapour.spin_destruction import (
    BY_ALKALI,
    BY_GAS,
    EXCHANGE,
    KINDS,
    USES,
    bound_pair,
    choose,
    pair_speed_cm_s,
    rate_coefficient,
    spin_rows,
)

ROWS = spin_rows()


def name(row):
    return f"{row.alkali}-{row.partner} {row.kind} {row.published} {row.mark}"


@pytest.mark.parametrize("row", ROWS, ids=name)
def test_every_row_is_complete(row):
    assert row.alkali in ALKALIS and row.partner in (*SPECIES_GASES, "N2", row.alkali)
    assert row.kind in KINDS and row.use in USES and row.mark in ("READ", "FROM MEMORY")
    assert row.grade in ("high", "medium", "low") and row.definition and row.source and row.note
    assert row.unit == {"cross section": "cm^2", "rate": "cm^3/s"}[row.quantity]
    assert row.mark != "READ" or "http" in row.source
    assert (row.kind == BY_GAS) == (row.partner != row.alkali)
    assert 1e-27 < row.value < 1e-11 and (row.error is None or row.error > 0)
    if row.temperature_K is not None:
        assert 250 < row.low_K <= row.temperature_K <= row.high_K < 600
    if row.published.startswith("(1-3)e-14"):
        assert (row.value, row.error) == (2e-14, 1e-14)
    else:
        assert row.value == float(re.search(r"[\d.]+e-\d+", row.published)[0])


def test_counts():
    """32 usable rows of the source table, 3 pairs; the script prints the six left out."""
    assert len(ROWS) == 32
    assert {row.use for row in ROWS} == set(USES)
    assert [bound_pair("Rb", gas) is not None for gas in ("Ne", "Ar", "Kr", "Xe")] == [True, True, True, False]


def test_cross_section_becomes_rate_at_its_own_temperature():
    """k = sigma sqrt(8 k T/(pi mu)) in SI units."""
    (row,) = (r for r in spin_rows("Rb", "Ar", BY_GAS))
    mu = 85.4678 * 39.948 / (85.4678 + 39.948) * 1.66053906660e-27
    speed = 100 * math.sqrt(8 * 1.380649e-23 * 305 / (math.pi * mu))
    k = rate_coefficient(row, 305.0)
    assert k.value == pytest.approx(6.3e-22 * speed, rel=1e-5) and k.mark == "READ" and k.unit == "cm^3/s"
    assert k.error is None  # none stated, no change of temperature


def test_without_a_law_the_cross_section_is_constant_and_the_error_grows():
    (row,) = (r for r in spin_rows("Cs", "Ar", BY_GAS))
    near, far = (rate_coefficient(row, T) for T in (300.0, 400.0))
    assert far.value / near.value == pytest.approx(math.sqrt(4 / 3), rel=1e-12)
    assert near.error / near.value == pytest.approx(0.05 / 1.04, rel=1e-2)
    assert far.error / far.value == pytest.approx(math.hypot(0.05 / 1.04, (4 / 3) ** 3 - 1), rel=1e-2)


def test_own_law_is_followed():
    (row,) = (r for r in spin_rows("Rb", "Xe", BY_GAS))
    assert rate_coefficient(row, 400.0).value == pytest.approx(6.02e-15 * (400 / 298) ** 1.17, rel=1e-12)
    assert rate_coefficient(row, 400.0).error == pytest.approx(0.2 * rate_coefficient(row, 400.0).value, rel=0.01)
    outside = rate_coefficient(row, 500.0)
    assert outside.error / outside.value == pytest.approx(math.hypot(0.1993, 500 / 450 - 1), rel=0.01)


def test_borrowed_law_weakens_the_mark():
    at_home, away = choose("Rb", "He", BY_GAS, 305.0), choose("Rb", "He", BY_GAS, 340.0)
    assert at_home.row is away.row and at_home.rate.mark == "READ" and away.rate.mark == "FROM MEMORY"
    assert away.rate.value / at_home.rate.value == pytest.approx((340 / 305) ** 4.26, rel=1e-12)


def test_read_before_memory_nearest_then_smallest_error_then_newest():
    assert choose("Rb", "He", BY_GAS, 310.0).row.value == 3.1e-24
    assert choose("Rb", "He", BY_GAS, 450.0).row.value == 9e-24
    assert choose("Cs", "Cs", EXCHANGE, 310.0).row.value == 2.2e-14  # 7 % stated, the other READ row 8 %
    assert choose("Rb", "Rb", BY_ALKALI, 400.0).row.year == 1998  # 450 and 460 K are equally near; neither has an error
    assert choose("Rb", "N2", BY_GAS, 310.0).row.mark == "READ"


def test_spread_of_the_rows_is_in_the_error():
    chosen = choose("Rb", "Rb", BY_ALKALI, 455.0)
    (other,) = (r for r in spin_rows("Rb", "Rb", BY_ALKALI) if r is not chosen.row)
    assert chosen.rate.error >= abs(rate_coefficient(other, 455.0).value - chosen.rate.value)


def test_what_is_no_plain_value_says_so():
    krypton = choose("Rb", "Kr", BY_GAS, 330.0)
    assert krypton.note.startswith("order of magnitude only") and krypton.rate.error > krypton.rate.value
    neon = choose("Rb", "Ne", BY_GAS, 320.0)  # the superseded row was measured at 320 K
    assert neon.row.value == 1.9e-23
    assert any(row.use == "superseded" for row in spin_rows("Rb", "Ne", BY_GAS))


def test_nothing_has_a_reason():
    limit = choose("Rb", "3He", BY_GAS, 400.0)
    assert limit.rate is None and "only an upper limit" in limit.reason and "<=2e-18" in limit.reason
    missing = choose("Li", "Xe", BY_GAS, 400.0)
    assert missing.rate is None and missing.reason == (
        "no published spin destruction by gas of Li and Xe in the tables"
    )
    assert "helium-4 is not a substitute" in choose("K", "3He", BY_GAS, 400.0).reason


def test_a_row_without_temperature_carries_half_its_value_as_error():
    chosen = choose("K", "Ne", BY_GAS, 400.0)
    assert chosen.row.temperature_K is None and chosen.rate.error >= 0.5 * chosen.rate.value
    assert chosen.rate.value == pytest.approx(1e-23 * pair_speed_cm_s("K", "Ne", 400.0), rel=1e-12)


@pytest.mark.parametrize("temperature", [0.0, -5.0, math.nan, math.inf])
def test_bad_temperature(temperature):
    with pytest.raises(InputError, match="temperature"):
        rate_coefficient(ROWS[0], temperature)


def test_unknown_kind():
    with pytest.raises(UnknownNameError, match="kind"):
        spin_rows(kind="spin desctruction")
