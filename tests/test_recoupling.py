"""Interface of vapour/recoupling.py and vapour/hyperfine.py: shapes, bookkeeping, species data, errors."""

from __future__ import annotations

import math

import numpy as np
import pytest

from pertcalc import species
from pertcalc.errors import InputError
from pertcalc.vapour.hyperfine import f_values, hyperfine_energies, isotope_energies
from pertcalc.vapour.level_rates import LevelRates
from pertcalc.vapour.recoupling import p_levels_relaxation, recoupling, relaxation, relaxation_matrix
from pertcalc.vapour.relaxation_matrix import Pair

RATES = LevelRates(
    decay={"P1/2": 3.4e7, "P3/2": 3.8e7},
    loss={"P1/2": {0: 4e6, 1: 9e6}, "P3/2": {0: 3e6, 1: 3e7, 2: 4e7, 3: 3.5e7}},
    gain={"P1/2": {0: 4e6 / math.sqrt(2), 1: -1e6}, "P3/2": {0: 3e6 * math.sqrt(2), 1: -1.4e6}},
)
ISOTOPES = [(s, i.label) for s in ("Li", "Na", "K", "Rb", "Cs") for i in species.alkali(s).isotopes]


def isotope(symbol: str, label: str) -> species.Isotope:
    return next(i for i in species.alkali(symbol).isotopes if i.label == label)


def test_hyperfine_levels():
    np.testing.assert_array_equal(f_values(1.5, 1.5), [0, 1, 2, 3])
    np.testing.assert_array_equal(f_values(0.5, 4), [3.5, 4.5])
    np.testing.assert_array_equal(f_values(1.5, 1), [0.5, 1.5, 2.5])
    np.testing.assert_array_equal(f_values(1.5, 0), [1.5])


@pytest.mark.parametrize(("J", "I"), [(0.5, 3.5), (1.5, 1), (1.5, 1.5), (1.5, 4)])
def test_casimir_formula_has_the_interval_rule_and_no_mean(J, I):
    """E(F) - E(F-1) = A F (interval rule); neither A nor B shifts the mean over all sublevels (traceless operators)."""
    F, E = f_values(J, I), hyperfine_energies(J, I, 100.0)
    np.testing.assert_allclose(np.diff(E), 100.0 * F[1:], rtol=1e-13)
    assert (2 * F + 1) @ E == pytest.approx(0, abs=1e-10)
    if J > 1:
        assert (2 * F + 1) @ hyperfine_energies(J, I, 0.0, 40.0) == pytest.approx(0, abs=1e-10)


def test_caesium_ground_splitting_is_the_second():
    """9 192.631770 MHz by the definition of the SI second."""
    low, high = isotope_energies(isotope("Cs", "133Cs"), "S1/2")
    assert high - low == pytest.approx(9192.631770, rel=1e-8)


def test_quadrupole_of_the_stretched_state():
    """E = A I J + B/4 for F = I + J: both operators at their largest value."""
    assert hyperfine_energies(1.5, 2.5, 25.0, 26.0)[-1] == pytest.approx(25.0 * 3.75 + 26.0 / 4, rel=1e-13)


@pytest.mark.parametrize(("symbol", "label"), ISOTOPES)
def test_every_natural_isotope(symbol, label):
    one = isotope(symbol, label)
    I = one.nuclear_spin
    found = p_levels_relaxation(RATES, one, 0, decay=False)
    assert len(found.pairs) == sum(len(f_values(J, I)) for J in (0.5, 1.5))
    np.testing.assert_allclose(found.population_matrix().sum(axis=0), 0, atol=1e-6)
    for K in (1, 2, 3):
        full = p_levels_relaxation(RATES, one, K)
        assert np.iscomplexobj(full.matrix)
        assert np.all(full.eigenvalues().real > 3.3e7)  # every multipole radiates at least
        secular = p_levels_relaxation(RATES, one, K, secular=True)
        assert {p.F1 == p.F2 for p in secular.pairs} == {True}
        assert secular.losses() == pytest.approx({p: full.losses()[p] for p in secular.pairs}, rel=1e-12)


def test_energies_of_the_isotope_reach_the_matrix():
    found = p_levels_relaxation(RATES, isotope("Rb", "85Rb"), 1)
    row = found.pairs.index(Pair(0.5, 3.0, 2.0))
    assert found.matrix[row, row].imag == pytest.approx(2e6 * math.pi * 3 * 120.527, rel=1e-12)
    unresolved = p_levels_relaxation(RATES, isotope("Rb", "85Rb"), 1, structure=False)
    assert np.isrealobj(unresolved.matrix)
    np.testing.assert_allclose(unresolved.matrix, found.matrix.real)


def test_losses_name_the_level_and_its_rank():
    found = relaxation({0.5: {0: 0.0, 1: 1.0}}, 1.5, 1, secular=True, decay={0.5: 0.25})
    F, M = relaxation_matrix(0.5, 1.5, (0, 1), 1)
    assert found.losses() == pytest.approx({Pair(0.5, f, f): M[i, i] + 0.25 for i, f in enumerate(F)})


def test_mapping_and_sequence_of_rates_agree():
    by_rank = {3: 0.4, 0: 0.1, 2: 0.3, 1: 0.2}
    np.testing.assert_array_equal(
        relaxation_matrix(1.5, 1, by_rank, 2)[1], relaxation_matrix(1.5, 1, (0.1, 0.2, 0.3, 0.4), 2)[1]
    )


def test_eigenrates_count_every_row_and_sort():
    modes = p_levels_relaxation(RATES, isotope("Li", "6Li"), 1).eigenrates()
    assert [m.rate for m in modes] == sorted(m.rate for m in modes)
    assert sum(m.multiplicity for m in modes) == len(modes[0].hyperfine)
    for mode in modes:
        assert sum(mode.electronic.values()) == pytest.approx(1) == sum(mode.hyperfine.values())


def test_zero_rates_give_zero_eigenrates():
    (mode,) = relaxation({1.5: (0, 0, 0, 0)}, 1, 1, secular=True).eigenrates()
    assert (mode.rate, mode.frequency, mode.multiplicity) == (0.0, 0.0, 3)


def test_the_cached_matrix_is_protected():
    with pytest.raises(ValueError, match="read-only"):
        recoupling(0.5, 1, 1)[2][0, 0] = 3.0


GOOD = {0.5: (0, 1), 1.5: (0, 1, 1, 1)}
BAD = [
    (lambda: relaxation_matrix(0.7, 1, (0, 1), 1), r"J = 0\.7 must be a whole or half number"),
    (lambda: relaxation_matrix(0.5, -1, (0, 1), 1), r"I = -1 must be"),
    (lambda: relaxation_matrix(0.5, math.nan, (0, 1), 1), r"I = nan must be"),
    (lambda: relaxation_matrix("P", 1, (0, 1), 1), r"J = 'P' must be"),
    (lambda: relaxation_matrix(0.5, 1, (0, 1), 4), r"K = 4 must be an integer from 0 to 2\(J\+I\) = 3"),
    (lambda: relaxation_matrix(0.5, 1, (0, 1), 1.5), r"K = 1\.5 must be an integer"),
    (lambda: relaxation_matrix(0.5, 1, (0,), 1), r"loss\[0\.5\] has ranks \[0\]: it must have 0 \.\.\. 1"),
    (lambda: relaxation_matrix(0.5, 1, (0, -1), 1), r"loss\[0\.5\]\[1\] = -1 must be a finite number >= 0"),
    (lambda: relaxation_matrix(0.5, 1, (0, math.nan), 1), r"loss\[0\.5\]\[1\] = nan must be"),
    (lambda: relaxation_matrix(0.5, 1, {0: 0, 1: None}, 1), r"loss\[0\.5\]\[1\] = None must be"),
    (lambda: relaxation({}, 1, 1), r"loss = \{\} must hold at least one level"),
    (lambda: relaxation(GOOD, 1, 1, gain={(0.5, 0.5): (0, 0)}), r"gain\[\(0\.5, 0\.5\)\] must lead from one level"),
    (lambda: relaxation(GOOD, 1, 1, gain={(0.5, 2.5): (0, 0)}), r"gain\[\(0\.5, 2\.5\)\] must lead from one level"),
    (lambda: relaxation(GOOD, 1, 1, gain={(0.5, 1.5): (0, 0, 0)}), r"gain\[0\.5, 1\.5\] has ranks \[0, 1, 2\]"),
    (lambda: relaxation(GOOD, 1, 1, gain={(0.5, 1.5): (0, math.inf)}), r"gain\[0\.5, 1\.5\]\[1\] = inf must be a fin"),
    (lambda: relaxation(GOOD, 1, 1, decay={0.5: -1.0}), r"decay\[0\.5\] = -1\.0 must be a finite number >= 0"),
    (lambda: relaxation(GOOD, 1, 1, decay={2.5: 1.0}), r"decay\[2\.5\] belongs to no level"),
    (
        lambda: relaxation(GOOD, 1, 1, energies_MHz={0.5: [1, 2, 3]}),
        r"energies_MHz\[0\.5\] must hold 2 finite",
    ),
    (lambda: relaxation(GOOD, 1, 1, energies_MHz={0.5: [1, math.nan]}), r"energies_MHz\[0\.5\] must hold 2 finite"),
    (lambda: relaxation(GOOD, 1, 1).population_matrix(), r"K = 1 has no populations"),
    (lambda: hyperfine_energies(0.5, 1.5, 100, 3.0), r"B_MHz = 3\.0 must be 0 for J = 0\.5"),
    (lambda: hyperfine_energies(0.5, 1.5, math.inf), r"A_MHz = inf must be finite"),
]


@pytest.mark.parametrize(("call", "message"), BAD)
def test_bad_input_is_one_clear_error(call, message):
    with pytest.raises(InputError, match=message):
        call()


def test_all_bad_rates_at_once():
    with pytest.raises(InputError) as caught:
        relaxation_matrix(1.5, 1, (0, -1, math.nan, -2), 1)
    assert len(caught.value.problems) == 3
