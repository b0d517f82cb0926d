"""Wells of the default curves against published ones that have an address (READ)."""

from __future__ import annotations

import pytest

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.curves.files import load_default
from pertcalc.curves.summary import adiabatic_wells

LAPATOVICH = "Lapatovich et al., J. Chem. Phys. 73, 5419 (1980), abstract READ at ouci.dntb.gov.ua/en/works/9JBqBgq9"
SCHWARZHANS = "Schwarzhans and Zimmermann, Verhandl. DPG 1997 Mainz MO 7.1, READ at dpg-verhandlungen.de"
ZIMMERMANN = "Zimmermann et al., Verhandl. DPG 1999 Heidelberg A 15.4, READ at dpg-verhandlungen.de"
# gas, state, De and printed error [cm^-1], Re and printed error [angstrom], source.
# The curve of A goes through its well; X and B are computed without any of these numbers.
THROUGH = [("Ne", "A", 145.0, 5.0, 2.70, 0.05, LAPATOVICH)]
COMPUTED = [
    ("Ar", "X", 41.9, 0.5, 5.01, 0.02, SCHWARZHANS),
    ("Ne", "X", 8.1, 0.9, 5.29, 0.05, LAPATOVICH),
    ("Ne", "B", 3.0, 0.5, 7.62, 0.16, LAPATOVICH),
]


def default_well(gas: str, state: str):
    """State curve, depth [cm^-1] and position [angstrom] of a default curve of sodium."""
    entry = load_default("Na", gas).states[state]
    well = entry.curve.well()
    assert well is not None
    return entry, well.depth * HARTREE_CM1, well.position * BOHR_ANGSTROM


@pytest.mark.parametrize("gas, state, De, De_error, Re, Re_error, source", THROUGH)
def test_curves_through_a_published_well(
    gas: str, state: str, De: float, De_error: float, Re: float, Re_error: float, source: str
) -> None:
    entry, depth, position = default_well(gas, state)
    # A tenth of the printed error is copying and table rounding.
    assert depth == pytest.approx(De, abs=0.1 * De_error), source
    assert position == pytest.approx(Re, abs=0.1 * Re_error), source
    assert entry.mark == "READ"
    assert entry.uncertainty["De"] == pytest.approx(De_error / De, rel=0.01)
    assert entry.uncertainty["Re"] == pytest.approx(Re_error / Re, rel=0.01)


@pytest.mark.parametrize("gas, state, De, De_error, Re, Re_error, source", COMPUTED)
def test_computed_wells_against_published_ones(
    gas: str, state: str, De: float, De_error: float, Re: float, Re_error: float, source: str
) -> None:
    # Within 1.5 combined errors: the printed one and the curve's own from its file.
    entry, depth, position = default_well(gas, state)
    assert entry.mark == "COMPUTED"
    assert abs(depth - De) < 1.5 * (De_error**2 + (entry.uncertainty["De"] * depth) ** 2) ** 0.5, source
    assert abs(position - Re) < 1.5 * (Re_error**2 + (entry.uncertainty["Re"] * position) ** 2) ** 0.5, source


def test_sodium_argon_fine_structure_wells() -> None:
    # ZIMMERMANN: A1/2 585 cm^-1 at 2.938 angstrom, A3/2 579 cm^-1 at 2.932 angstrom (no errors printed). The default A
    # is their mean without its own R-dependent spin-orbit coupling, so each agrees to half their difference, 3 cm^-1,
    # plus what the coupling to B changes (17 cm^-1 splitting): 2 % together.
    wells = adiabatic_wells(load_default("Na", "Ar"))
    for name, De, Re in (("A1/2", 585.0, 2.938), ("A3/2", 579.0, 2.932)):
        well = wells[name]
        assert well is not None
        assert well[0] == pytest.approx(De, rel=0.02), ZIMMERMANN
        assert well[1] == pytest.approx(Re, abs=0.01), ZIMMERMANN


@pytest.mark.parametrize(
    "gas, De, error",
    [("He", 410.0, 55.0), ("Ar", 550.0, 75.0), ("Kr", 678.0, 90.0)],
)
def test_sodium_A_wells_against_pair_additive_clusters(gas: str, De: float, error: float) -> None:
    # Half of the dissociation energy of Na*G_2: Lin, PhD thesis, U. New Hampshire 1987 (abstract READ at
    # scholars.unh.edu/dissertation/1510), under that thesis's own pair-additive statement; independent of our curves.
    # Allowed: twice the errors of both sides (the curve's own, from its file) in quadrature.
    entry = load_default("Na", gas).states["A"]
    well = entry.curve.well()
    assert well is not None
    depth = well.depth * HARTREE_CM1
    assert abs(depth - De) < 2 * (error**2 + (entry.uncertainty["De"] * depth) ** 2) ** 0.5
