"""Curves of the one-electron model: long range, joins, errors, bad input, and the file they are written to."""

from __future__ import annotations

import math
import tomllib
from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest

from pertcalc.constants import HARTREE_CM1
from pertcalc.curves.files import check, load
from pertcalc.errors import InputError, OutOfRangeError, PertcalcError, UnknownNameError
from pertcalc.one_electron import curve_file, long_range, model_curves
from pertcalc.one_electron.atom import build_atom, solve_atom
from pertcalc.one_electron.core import HYDROGEN
from pertcalc.one_electron.core_gas import core_gas
from pertcalc.one_electron.gas_electron import custom_gas_electron, gas_electron
from pertcalc.one_electron.gas_orbitals import even_tempered
from pertcalc.one_electron.model_curves import ModelCurves, compute_model
from pertcalc.one_electron.pair import Basis
from pertcalc.one_electron.radial_basis import bspline_basis

SMALL = Basis(n_states=14, l_max=4, nodes=40, gas_orbitals=even_tempered({0: (0.05, 3.0, 4), 1: (0.1, 1.0, 3)}))


@pytest.fixture(scope="module")
def lithium_argon() -> ModelCurves:
    return compute_model("Li", "Ar", basis=SMALL)


# --- the long range --------------------------------------------------------------------------------------------------


def dipole_only(alpha: float = 2.0) -> SimpleNamespace:
    return SimpleNamespace(alpha_d=alpha, alpha_q=0.0, tail_q=0.0)


def test_C6_of_the_model_is_the_mean_square_dipole():
    # |E|^2 = (1 + 3 x^2) d^2/R^6: C6 = alpha <d^2>, 7/5 and 4/5 times that for X, B and A; d with the core's part.
    atom = build_atom("Cs")
    d2 = [float(np.sum(atom.weights * u[0] ** 2 * atom.dipole_operator(atom.r) ** 2)) for u in atom.radial[:2]]
    C = long_range.model_coefficients(atom, dipole_only(), {6: 0.5})
    assert C["X"][6] == pytest.approx(2.0 * d2[0] + 0.5, rel=1e-12)
    assert C["B"][6] == pytest.approx(2.0 * 7 / 5 * d2[1] + 0.5, rel=1e-12)
    assert C["A"][6] == pytest.approx(2.0 * 4 / 5 * d2[1] + 0.5, rel=1e-12)


@pytest.mark.parametrize("state, l, density", [("X", 0, lambda x: 0.5 + 0 * x), ("B", 1, lambda x: 1.5 * x**2)])
def test_coefficients_of_the_model_from_the_charges_themselves(state, l, density):
    # Hydrogen (no core to polarise), independent of any multipole: -alpha/2 |E|^2 of two point charges, averaged at
    # three large R and solved for C6, C8, C10; C12/C10 R^-2 is what the tolerance leaves room for.
    atom = solve_atom(HYDROGEN, 1, bspline_basis(44, 60.0))
    x, w = np.polynomial.legendre.leggauss(40)
    R = np.array([300.0, 400.0, 500.0])
    r, z = atom.r[:, None], atom.r[:, None] * x
    V = []
    for one in R:
        u2 = r**2 + one**2 - 2 * one * z
        axial = 1 / one**2 - (one - z) / u2**1.5
        radial = np.sqrt(np.maximum(r**2 - z**2, 0)) / u2**1.5
        mean = (axial**2 + radial**2) @ (w * density(x))
        V.append(-0.5 * 2.0 * np.sum(atom.weights * atom.radial[l][0] ** 2 * mean))
    C = np.linalg.solve(-np.array([R**-6, R**-8, R**-10]).T * R[:, None] ** 6, np.array(V) * R**6)
    found = long_range.model_coefficients(atom, dipole_only(), {})[state]
    for n, value, tolerance in zip((6, 8, 10), C, (1e-6, 1e-3, 0.2), strict=True):
        assert found[n] == pytest.approx(value, rel=tolerance), n


def test_quadrupole_of_the_gas_begins_at_C8_unless_it_lags():
    # The field gradient of a neutral atom falls off as R^-4: C6 = 0, C8 = alpha_q/2 <gradient^2> > 0. A tail that
    # differs from alpha_q (6 beta_1 for the electron, which moves) leaves -3 beta_1/R^6 behind: C6 = -3 beta_1.
    follows = long_range.model_coefficients(build_atom("Na"), SimpleNamespace(alpha_d=0.0, alpha_q=5.0, tail_q=5.0), {})
    lags = long_range.model_coefficients(build_atom("Na"), SimpleNamespace(alpha_d=0.0, alpha_q=5.0, tail_q=-1.0), {})
    for state in "XAB":
        assert follows[state][6] == pytest.approx(0.0, abs=1e-12)
        assert follows[state][8] > 0
        assert lags[state][6] == pytest.approx(-3.0, rel=1e-12)


def test_the_computed_curve_approaches_its_own_coefficients():
    R = np.array([22.0, 28.0])
    found = compute_model("Li", "Ne", R, SMALL)
    V, C = found.V["X"] - found.correction["X"], found.own["X"]
    series = -sum(C[n] / R**n for n in long_range.ORDERS)
    # Left out: C12/R^12, about (C10/C8)^1.1 of the last term kept: 0.2 % at 22 bohr.
    np.testing.assert_allclose(V, series, rtol=4e-3)


def test_correction_is_the_missing_tail_far_away_and_nothing_inside():
    wanted, own, R = {6: 10.0, 8: 200.0, 10: 3e3}, {6: 12.0, 8: 150.0, 10: 3e3}, np.array([0.5, 40.0, 100.0])
    added = long_range.correction(R, 0.5, wanted, own)
    np.testing.assert_allclose(added[1:], 2.0 / R[1:] ** 6 - 50.0 / R[1:] ** 8, rtol=3e-3)
    assert abs(added[0]) < 1e-5 * (2.0 / 0.5**6)


@pytest.mark.parametrize("state", ["X", "A", "B"])
def test_tail_has_the_dispersion_coefficients_and_joins_smoothly(lithium_argon, state):
    curve = lithium_argon.curve(state)
    far = 300.0
    assert -float(curve(far)) * far**6 == pytest.approx(lithium_argon.dispersion[state][6], rel=0.01)
    last = curve.R[-1]
    for value in (curve, curve.derivative):
        assert float(value(last - 1e-6)) == pytest.approx(float(value(last + 1e-6)), rel=1e-5)
    # What the join adds as C12 is small: the correction has already brought the table to the tail.
    assert abs(curve.tail.C12 / last**12) < 0.06 * abs(float(curve(last)))


# --- the table and its errors ----------------------------------------------------------------------------------------


def test_error_estimate_bounds_what_a_larger_basis_changes():
    R = np.array([4.0, 5.5, 8.0, 11.0])
    large = Basis(
        40, 8, 96, even_tempered({0: (0.02, 12.0, 11), 1: (0.04, 4.0, 8), 2: (0.06, 1.0, 5), 3: (0.1, 0.4, 2)})
    )
    usual, better = compute_model("Rb", "Ar", R + 1), compute_model("Rb", "Ar", R + 1, large)
    for state in "XAB":
        true = np.abs(usual.V[state] - better.V[state])
        assert np.all(true <= 3 * usual.numerical_error(state) + 1e-8), state
        # 0.3 cm^-1 at 5 bohr, less outside: small beside any error of the model.
        assert np.all(true < 1e-5)


def test_default_distances_reach_from_the_wall_to_the_tail():
    for pair in (("Li", "He"), ("Cs", "Xe")):
        core = core_gas(*pair)
        R = model_curves.default_distances(core)
        assert 40 <= len(R) <= 65 and np.all(np.diff(R) > 0)
        assert core(R[0]) > model_curves.WALL_TOP and R[-1] == model_curves.LAST_R


def test_table_leaves_out_what_is_above_the_wall_or_turned_over(lithium_argon):
    R, V = lithium_argon.table("X")
    assert V[0] <= model_curves.WALL_TOP and V[0] > V[1] > 0
    bent = replace(lithium_argon, V={**lithium_argon.V, "X": lithium_argon.V["X"].copy()})
    start = int(np.flatnonzero(lithium_argon.R == R[0])[0])
    bent.V["X"][start] = bent.V["X"][start + 1] / 2
    assert bent.table("X")[0][0] == R[1]


def test_work_is_counted_and_bounded(lithium_argon):
    work = lithium_argon.work
    assert work["distances"] == len(lithium_argon.R) <= 65
    assert work["sigma_functions"] == 14 * 5 + 4 + 3
    assert work["pi_functions"] == 14 * 4 + 3
    assert work["diagonalisations"] == 8 * work["distances"] + 12
    assert Basis().n_states * 7 + len(Basis().gas_orbitals) <= 260  # the cost of a default calculation


def test_progress_is_reported():
    seen: list[tuple[int, int]] = []
    compute_model("Li", "He", [5.0, 6.0], SMALL, progress=lambda *step: seen.append(step))
    assert seen == [(1, 2), (2, 2)]


def test_helium_3_has_the_curves_of_helium():
    R = [5.0, 8.0]
    light, heavy = compute_model("Na", "3He", R, SMALL), compute_model("Na", "He", R, SMALL)
    assert light.gas == "3He"
    np.testing.assert_array_equal(light.V["B"], heavy.V["B"])


def test_inputs_of_your_own_change_the_curves():
    R, usual = [6.0, 10.0], compute_model("Na", "Ar", [6.0, 10.0], SMALL)
    # A larger scattering length is more repulsive: the whole of X rises where the electron meets the gas.
    softer = custom_gas_electron(0.5, usual.electron.alpha_d, 1.9, 0.35)
    mine = compute_model("Na", "Ar", R, SMALL, electron=softer, core=usual.core)
    assert np.all(mine.V["X"] > usual.V["X"])
    assert mine.electron.model == "custom"


def test_few_distances_warn_and_make_no_curve():
    few = compute_model("Li", "He", [4.0, 6.0], SMALL)
    assert "2 distances make no curve; at least 5 are needed" in few.warnings
    with pytest.raises(InputError, match="needs at least 5"):
        few.curve("X")
    with pytest.raises(InputError) as caught:
        curve_file.to_toml(few)
    assert [text[0] for text in caught.value.problems] == ["X", "A", "B"]  # every state in one error


# --- bad input -------------------------------------------------------------------------------------------------------

BAD = [
    (("Rb", "Ar", [1.0, 8.0]), OutOfRangeError, r"R of Rb\+ Ar = 1 bohr is outside"),
    (("Rb", "Ar", [8.0, 40.0]), OutOfRangeError, "distance = 40 bohr .* Farther out the C_n tail is the curve"),
    (("Rb", "Ar", [8.0, 7.0]), InputError, "must be finite and rise strictly"),
    (("Rb", "Ar", [8.0, math.nan]), InputError, "must be finite and rise strictly"),
    (("Rb", "Ar", []), InputError, "must be finite and rise strictly"),
    (("Rb", "N2", [8.0]), UnknownNameError, "noble gas 'N2' is not known"),
    (("Fr", "Ar", [8.0]), UnknownNameError, "alkali 'Fr' is not known"),
]


@pytest.mark.parametrize("arguments, kind, message", BAD, ids=[message for *_, message in BAD])
def test_bad_arguments_give_one_clear_error(arguments, kind, message):
    with pytest.raises(kind, match=message):
        compute_model(*arguments, basis=SMALL)


def test_models_and_atoms_that_do_not_exist_are_refused():
    with pytest.raises(UnknownNameError, match="electron-gas model 'hard' is not known"):
        compute_model("Rb", "Ar", [8.0], SMALL, model="hard")
    with pytest.raises(InputError, match="l_max = 6: the atom has partial waves up to l = 5"):
        compute_model("Rb", "Ar", [8.0], replace(SMALL, l_max=6), atom=build_atom("Rb", 5))
    with pytest.raises(InputError, match="atom: its box ends at 30 bohr, at least 55 are needed"):
        compute_model("Rb", "Ar", [8.0], SMALL, atom=build_atom("Rb", 5, 44, 30.0))


def test_a_scattering_length_that_needs_a_bound_state_is_refused():
    argon = gas_electron("Ar")
    with pytest.raises(PertcalcError, match="scattering_length_bohr = 40 bohr"):
        custom_gas_electron(40.0, argon.alpha_d, 1.9, 0.35)


# --- the curve file --------------------------------------------------------------------------------------------------


def test_curve_file_is_clean_and_says_where_it_comes_from(lithium_argon, tmp_path):
    path = tmp_path / "li-ar_model.toml"
    path.write_text(curve_file.to_toml(lithium_argon), encoding="utf-8")
    assert check(path) == []
    read = load(path)
    assert (read.id, read.alkali, read.noble_gas) == ("li-ar_model", "Li", "Ar")
    R = np.linspace(3.0, 40.0, 200)
    for state in "XAB":
        made, entry = lithium_argon.curve(state), read.states[state]
        # The file has four decimals of a cm^-1 and five digits of C_n.
        scale = np.maximum(np.abs(made(R)), 1e-9)
        assert np.max(np.abs(entry.curve(R) - made(R)) / scale) < 1e-3
        assert entry.mark == "COMPUTED" and entry.source.status == "model"
        for words in ("pertcalc", "not published"):
            assert words in entry.source.cite
        for words in ("Electron-gas model", "Numerical error", "Core and gas", "second-order sum"):
            assert words in entry.source.note
        assert set(entry.uncertainty) == {"De", "Re", "C6", "C8", "C10"}
        assert all(0 < error < 1 for error in entry.uncertainty.values())
    same = curve_file.curve_set(lithium_argon)
    assert same.id == read.id and same.states["B"].source == read.states["B"].source


def test_curve_file_repeats_and_takes_another_name(lithium_argon):
    text = curve_file.to_toml(lithium_argon, "mine")
    assert text == curve_file.to_toml(lithium_argon, "mine")
    data = tomllib.loads(text)
    assert data["id"] == "mine"
    points = np.array(data["states"]["A"]["points"])
    R, V = lithium_argon.table("A")
    np.testing.assert_allclose(points[:, 1], V * HARTREE_CM1, atol=6e-5)
    np.testing.assert_allclose(points[:, 0], R, atol=6e-4)
