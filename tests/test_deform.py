"""Curves moved in C8, C10 and wall, and correlations of their errors: against their definitions."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from pertcalc.collisions.pair import pair_of
from pertcalc.curves import files
from pertcalc.curves.correlation import correlation_matrix
from pertcalc.curves.deform import WALL_ENERGY, Deformed, wall_of
from pertcalc.curves.forms import LennardJones
from pertcalc.errors import DataFileError
from pertcalc.model_error import moved_pair

CURVES = files.load_default("K", "Ar")


@pytest.mark.parametrize("name, power", [("C8", 8), ("C10", 10)])
def test_a_tail_coefficient_moves_its_own_power_and_spares_the_well(name, power):
    curve = CURVES.X
    moved = Deformed(curve, **{name: 0.2})
    R = np.array([60.0, 120.0])
    # Far out g = 1/(1 + (R/1.5 Re)^8) is below 1e-4: what is added is -0.2 C_n/R^n alone.
    extra = -0.2 * getattr(curve, name) / R**power
    assert moved(R) - curve(R) == pytest.approx(extra, rel=1e-3)
    assert moved.dispersion == pytest.approx(
        [getattr(curve, C) * (1.2 if C == name else 1) for C in ("C6", "C8", "C10")]
    )
    well = curve.well()
    assert float(moved(well.position)) == pytest.approx(-well.depth, rel=0.02)


def test_the_pair_gets_the_differences_of_the_moved_tails():
    pair, base = (
        moved_pair(CURVES, {"B": {"C8": 0.1, "De": 0.2}, "X": {"C10": -0.1}, "A": {"C6": 0.05}}),
        pair_of(CURVES),
    )
    change = np.subtract(pair.isotropic, base.isotropic)
    exact = (2 * 0.05 * CURVES.A.C6 / 3, 0.1 * CURVES.B.C8 / 3, 0.1 * CURVES.X.C10)
    assert change == pytest.approx(exact)
    assert pair.anisotropy - base.anisotropy == pytest.approx(-0.05 * CURVES.A.C6)


def test_the_wall_of_lennard_jones():
    """12-6: zero at Rm 2^(-1/6); where V = W on the wall, beta follows from dV/dR in closed form."""
    De, Rm = 2e-4, 9.0
    crossing, slope = wall_of(LennardJones(De, Rm))
    assert crossing == pytest.approx(Rm * 2 ** (-1 / 6), rel=1e-9)
    u = 1 + np.sqrt(1 + WALL_ENERGY / De)  # (Rm/R)^6 with De (u^2 - 2u) = W
    R = Rm * u ** (-1 / 6)
    assert slope == pytest.approx(12 * De * (u**2 - u) / R / WALL_ENERGY, rel=1e-6)


def test_a_steeper_wall_leaves_well_and_crossing_and_has_the_steeper_logarithm():
    curve = CURVES.X
    crossing, slope = wall_of(curve)
    moved = Deformed(curve, wall=0.1)
    R = np.linspace(crossing, 30.0, 50)
    assert np.array_equal(moved(R), curve(R))
    # Depth and position stay: the ratio of the curves is exp(0.1 beta (R0 - R)).
    inner = np.linspace(0.6 * crossing, 0.98 * crossing, 20)
    assert moved(inner) / curve(inner) == pytest.approx(np.exp(0.1 * slope * (crossing - inner)))
    joint = crossing + np.array([-1e-5, 1e-5])
    assert np.diff(moved(joint)) == pytest.approx(np.diff(curve(joint)), rel=1e-4)


def write(folder: Path, correlation: str, errors: str = "De = 0.1\nRe = 0.02\nC6 = 0.05") -> Path:
    text = (files.default_folder() / "k-ar_default.toml").read_text(encoding="utf-8")
    head, tail = text.split("[states.X.uncertainty]", 1)
    rest = tail[tail.index("[states.A]") :]
    place = folder / "k-ar_mine.toml"
    section = f"[states.X.uncertainty]\n{errors}\n{correlation}\n\n"
    place.write_text(head.replace('id = "k-ar_default"', 'id = "k-ar_mine"') + section + rest, encoding="utf-8")
    return place


def test_correlations_are_read_and_absent_ones_are_zero(tmp_path):
    curves = files.load(write(tmp_path, "correlation = { De_Re = -0.5, C6_De = 0.25 }\nwall = 0.03"))
    state = curves.states["X"]
    assert state.correlation == {"De_Re": -0.5, "C6_De": 0.25} and curves.states["A"].correlation == {}
    assert state.uncertainty["wall"] == 0.03
    matrix = correlation_matrix(["De", "Re", "C6"], state.correlation)
    assert np.array_equal(matrix, [[1, -0.5, 0.25], [-0.5, 1, 0], [0.25, 0, 1]])


BAD = [
    ("correlation = 0.5", "uncertainty.correlation = 0.5: must be a table"),
    ("correlation = { De_Re = 1.0 }", "correlation.De_Re = 1.0: must be above -1 and below 1"),
    ('correlation = { De_Re = "no" }', "correlation.De_Re = 'no': must be a number"),
    ("correlation = { De_Rx = 0.5 }", "correlation.De_Rx = 0.5: must name two of "),
    ("correlation = { De_C8 = 0.5 }", "correlation.De_C8 = 0.5: must name two of "),
    ("correlation = { De_De = 0.5 }", "correlation.De_De = 0.5: must name two of "),
    ("correlation = { De_Re = 0.5, Re_De = 0.5 }", "correlation.Re_De = 0.5: is the same pair as De_Re"),
    ("correlation = { De_Re = 0.9, Re_C6 = 0.9, De_C6 = -0.9 }", "contradict each other"),
]


@pytest.mark.parametrize("text, message", BAD, ids=[text for text, _ in BAD])
def test_a_bad_correlation_is_one_clear_problem(tmp_path, text, message):
    with pytest.raises(DataFileError) as caught:
        files.load(write(tmp_path, text))
    assert len(caught.value.problems) == 1 and message in caught.value.problems[0]
