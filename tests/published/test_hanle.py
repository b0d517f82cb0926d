"""Scattering polarisability and Hanle fields against numbers of others.

W2(D2), its fully split limit, the two degrees of polarisation and the Hanle field of P3/2 of eight isotopes: an
independent computation (explicit hyperfine sums), not by this program and not a measurement. Its constants A, B and
lifetimes are FROM MEMORY (Arimondo, Inguscio & Violino, Rev. Mod. Phys. 49, 31 (1977), and later compilations) and
need not be ours digit for digit: W2 is compared to 0.003 absolute (41K, splittings near the natural width, differs by
0.002), the fully split limit, which needs no constant, to the printed half digit. 3/7 and 0.6 for a 3/2 - 1/2 line
without nuclear spin: any text on resonance fluorescence. D1 zero: common practice, no source.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from pertcalc.species import ALKALIS, alkali, isotope
from pertcalc.vapour.hanle import BEAMS, GEOMETRIES, hanle_curves
from pertcalc.vapour.hanle_fields import ground_hanle_field, hanle_fields
from pertcalc.vapour.level_rates import free_rates
from pertcalc.vapour.liouville import responses
from pertcalc.vapour.scattering import scattering_polarisability
from tests.vapour_cases import made_isotope, scaled_isotope

# isotope, W2(D2), fully split, P at 90 degrees, p linear, Hanle field of P3/2 with g_J [G]
TABLE = [
    ("6Li", 0.440, 0.147, 0.371, 0.541, 3.15),
    ("7Li", 0.248, 0.135, 0.198, 0.331, 3.15),
    ("23Na", 0.148, 0.135, 0.116, 0.207, 5.25),
    ("39K", 0.184, 0.135, 0.144, 0.252, 3.23),
    ("41K", 0.273, 0.135, 0.222, 0.363, 3.23),
    ("85Rb", 0.119, 0.117, 0.092, 0.168, 3.25),
    ("87Rb", 0.135, 0.135, 0.105, 0.190, 3.25),
    ("133Cs", 0.1095, 0.1093, 0.084, 0.156, 2.81),
]
W2_TOLERANCE = 0.003
SPLIT_TOLERANCE = 0.0006  # half a printed digit; Cs has one more


def of(name: str):
    return alkali(isotope(name).symbol)


@pytest.mark.parametrize("name, W2, split, P, p, B", TABLE)
def test_polarisability_of_the_table(name, W2, split, P, p, B):
    found = scattering_polarisability(of(name), "D2", free_rates(of(name)), name)
    assert found.W2.value == pytest.approx(W2, abs=W2_TOLERANCE)
    assert found.unpolarised == pytest.approx(P, abs=W2_TOLERANCE)
    assert found.linear == pytest.approx(p, abs=W2_TOLERANCE)
    assert found.W2.mark == "FROM MEMORY"  # as the hyperfine constants are


@pytest.mark.parametrize("name, W2, split, P, p, B", TABLE)
def test_fully_split_limit_of_the_table(name, W2, split, P, p, B):
    wide = scaled_isotope(isotope(name), 1e4)
    found = 0.5 * responses(wide, "D2", free_rates(of(name)), [0.0]).G[0, 0].real
    assert found == pytest.approx(split, abs=SPLIT_TOLERANCE)


@pytest.mark.parametrize("name, W2, split, P, p, B", TABLE)
def test_hanle_field_of_the_table(name, W2, split, P, p, B):
    """1 %: the lifetimes of both are from memory."""
    electronic = [one for one in hanle_fields(of(name), "P3/2", free_rates(of(name))) if one.F is None]
    assert [one.free_G for one in electronic] == pytest.approx([B] * 3, rel=0.01)


@pytest.mark.parametrize("name, F, B", [("133Cs", 5, 9.4), ("87Rb", 3, 6.5)])
def test_hanle_field_of_the_stretched_levels(name, F, B):
    """The same independent computation, with g_F of the stretched F; two printed digits."""
    found = [one for one in hanle_fields(of(name), "P3/2", free_rates(of(name)), name) if F == one.F]
    assert [one.free_G for one in found] == pytest.approx([B, B], rel=0.01)


@pytest.mark.parametrize("symbol", ALKALIS)
def test_fields_of_P12_are_about_twice_those_of_P32(symbol):
    rates = free_rates(alkali(symbol))
    low, high = (hanle_fields(alkali(symbol), level, rates)[0].free_G for level in ("P1/2", "P3/2"))
    assert low / high == pytest.approx(2.0, rel=0.15)  # g_J 2/3 and 4/3; the lifetimes differ by up to 15 % (Cs)


def test_without_nuclear_spin_a_32_12_line_gives_three_sevenths_and_six_tenths():
    bare = replace(alkali("Na"), isotopes=(made_isotope(0.0, symbol="Na"),))
    found = scattering_polarisability(bare, "D2", free_rates(bare))
    assert found.unpolarised == pytest.approx(3 / 7, rel=1e-12)
    assert found.linear == pytest.approx(0.6, rel=1e-12)


@pytest.mark.parametrize("symbol", ALKALIS)
def test_D1_of_an_unpolarised_ground_level_is_not_polarised_in_any_field(symbol):
    rates = free_rates(alkali(symbol))
    assert scattering_polarisability(alkali(symbol), "D1", rates).W2.value == 0.0
    for beam in BEAMS:
        found = hanle_curves(alkali(symbol), "D1", rates, [0.0, 0.1, 5.0, 300.0], beam)
        for direction in GEOMETRIES:
            assert found.curves[direction].degree == pytest.approx(np.zeros(4), abs=1e-15)
            assert np.isnan(found.curves[direction].angle_deg).all()


@pytest.mark.parametrize("name", ["7Li", "23Na", "87Rb", "85Rb", "133Cs"])
def test_ground_level_turns_with_two_over_two_I_plus_one(name):
    """g_F = 2/(2I+1), any text on optical pumping; g_J is 0.12 % above 2. At 0.01 G it is past a damping of 1e4/s."""
    found = ground_hanle_field(isotope(name), 1e4)
    assert found.g == pytest.approx(2 / (2 * isotope(name).nuclear_spin + 1), rel=2e-3)
    assert found.field_G < 0.01  # common practice, no source: a long-lived ground level depolarises near 0.01 G
