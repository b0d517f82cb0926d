"""Ground-level relaxation against published numbers; the source stands beside each."""

from __future__ import annotations

import re

import pytest

from pertcalc.vapour.cell import depolarisation_per_bounce
from pertcalc.vapour.ground import observable
from pertcalc.vapour.spin_destruction import BY_ALKALI, BY_GAS, EXCHANGE, choose, rate_coefficient, spin_rows

FROM_NOTES = [row for row in spin_rows() if re.search(r"k [=~].*?[\d.]+e-\d+ cm3/s computed", row.note)]


@pytest.mark.parametrize("row", FROM_NOTES, ids=lambda r: f"{r.alkali}-{r.partner}")
def test_rates_beside_the_cross_sections(row):
    """Franz & Volk 1976, Tornos & Amare 1986 (READ): sigma; the k of the note was computed elsewhere, two digits."""
    stated = float(re.search(r"([\d.]+e-\d+) cm3/s computed", row.note)[1])
    assert rate_coefficient(row, row.temperature_K).value == pytest.approx(stated, rel=0.02)


def test_the_rates_are_the_known_ones():
    stated = {(row.alkali, row.partner): rate_coefficient(row, row.temperature_K).value for row in FROM_NOTES}
    expected = {("Rb", "He"): 4.0e-19, ("Rb", "Ne"): 1.2e-18, ("Rb", "Ar"): 3.1e-17, ("Rb", "N2"): 4.6e-18}
    assert set(expected) <= set(stated)
    for pair, k in expected.items():
        assert stated[pair] == pytest.approx(k, rel=0.02)


def test_rubidium_rubidium():
    """9e-18 cm^2 and 4.2e-13 cm^3/s at 450 K belong together by k = sigma vbar (READ: Ben-Amar Baranga et al. 1998)."""
    chosen = choose("Rb", "Rb", BY_ALKALI, 450.0)
    assert chosen.row.value == 9e-18
    assert chosen.rate.value == pytest.approx(4.2e-13, rel=0.02)


def test_share_of_rubidium_in_hot_helium():
    """Rb-Rb gives about 45 % of the loss at 473 K and 8 amagat He (READ: Erickson et al., PRL 85, 4237 (2000)).

    Rb density 9.1e14 cm^-3 at 473 K from log10 p/atm = 4.312 - 4040/T (FROM MEMORY: Alcock et al. 1984), good to 5 %.
    """
    alkali = 9.1e14 * choose("Rb", "Rb", BY_ALKALI, 473.0).rate.value
    helium = 8 * 2.6868e19 * choose("Rb", "He", BY_GAS, 473.0).rate.value
    assert alkali / (alkali + helium) == pytest.approx(0.45, abs=0.12)


@pytest.mark.parametrize("alkali", ["K", "Rb", "Cs"])
def test_spin_exchange_rates(alkali):
    """About 1e-9 cm^3/s for K, 8e-10 for Rb, 7e-10 for Cs near 400 K (FROM MEMORY, order of magnitude)."""
    remembered = {"K": 1.1e-9, "Rb": 8e-10, "Cs": 7e-10}[alkali]
    assert choose(alkali, alkali, EXCHANGE, 400.0).rate.value == pytest.approx(remembered, rel=0.25)


def test_eigenrate_ratios():
    """8:1 and 18:1 for I = 3/2 and 5/2 (READ: Franz & Volk 1976, https://www.osti.gov/biblio/7350745)."""
    assert 1 / observable(1.0, 1.5, False) == pytest.approx(8) and 1 / observable(1.0, 2.5, False) == pytest.approx(18)


def test_paraffin_stands_thousands_of_bounces():
    """About 1e4 bounces (READ: Balabas et al. 2010)."""
    assert 1e3 < 1 / depolarisation_per_bounce("coated").value <= 1e4
