"""The model error: what it is made of, that it moves with the stated errors, and that the tables fit their files."""

from __future__ import annotations

import json
from dataclasses import replace
from importlib import resources

import numpy as np
import pytest

from pertcalc import model_error
from pertcalc.collisions.pair import pair_of
from pertcalc.curves import files
from pertcalc.curves.deform import Deformed

T = np.array([350.0])


@pytest.fixture(scope="module")
def k_ar():
    return files.load_default("K", "Ar")


@pytest.mark.parametrize("name", ["model_errors.json", "method_differences.json"])
def test_the_tables_cover_exactly_the_files_shipped(name):
    """A changed curve file must not keep the errors of the old one: run the script that the note names again."""
    table = json.loads((resources.files("pertcalc") / "data" / name).read_text(encoding="utf-8"))
    shipped = {files.load(files.default_folder() / f"{one}.toml").sha256: one for one in files.default_ids()}
    assert {sha: entry["id"] for sha, entry in table.items()} == shipped


@pytest.mark.parametrize("change", [-0.1, 0.1])
def test_depth_moves_the_well_and_spares_the_tail(k_ar, change):
    curve = k_ar.X
    moved = Deformed(curve, De=change)
    R = curve.well().position
    # g(Re) = 1/(1 + 1.5^-8) = 0.962 by definition.
    assert float(moved(R)) == pytest.approx(-curve.well().depth * (1 + change / (1 + 1.5**-8)), rel=1e-12)
    assert float(moved(100.0)) == pytest.approx(float(curve(100.0)), rel=1e-6)


def test_position_moves_the_minimum(k_ar):
    curve = k_ar.X
    R = np.linspace(8.0, 14.0, 6001)
    shifted = R[np.argmin(Deformed(curve, Re=0.02)(R))]
    assert shifted / curve.well().position == pytest.approx(1.02, abs=0.002)


def test_c6_moves_the_tail_and_spares_the_wall(k_ar):
    curve = k_ar.B
    moved = Deformed(curve, C6=0.1)
    assert -(200.0**6) * float(moved(200.0)) == pytest.approx(1.1 * -(200.0**6) * float(curve(200.0)), rel=1e-3)
    assert float(moved(5.0)) == pytest.approx(float(curve(5.0)), rel=1e-2)
    pair = model_error.deformed_pair(k_ar, "B", "C6", 0.1)
    base = pair_of(k_ar)
    # The isotropic tail takes a third of B, the anisotropy all of it.
    assert pair.isotropic[0] - base.isotropic[0] == pytest.approx(0.1 * curve.C6 / 3, rel=1e-12)
    assert pair.anisotropy - base.anisotropy == pytest.approx(0.1 * curve.C6, rel=1e-12)


def test_no_stated_error_is_no_curve_error(k_ar):
    exact = replace(k_ar, states={name: replace(one, uncertainty={}) for name, one in k_ar.states.items()})
    assert all(np.all(error == 0) for error in model_error.curve_errors(exact, T).values())


def test_the_ground_curve_moves_lines_only(k_ar):
    states = {name: replace(one, uncertainty={"De": 0.1} if name == "X" else {}) for name, one in k_ar.states.items()}
    found = model_error.curve_errors(replace(k_ar, states=states), T)
    assert all(float(error[0]) == 0 for key, error in found.items() if key[0] not in ("fwhm", "shift"))
    assert found["shift", "D1"][0] > 1e-3


def test_the_shipped_table_is_what_the_curves_give(k_ar):
    """Computed on the spot at a temperature of the table: the same numbers to their two printed digits."""
    ours = model_error.curve_errors(k_ar, np.array([300.0, 400.0, 500.0]))
    table = model_error.shipped_errors(k_ar, np.array([300.0, 400.0, 500.0]))
    assert set(ours) == set(table)
    for key, errors in table.items():
        np.testing.assert_allclose(ours[key], errors, rtol=0.06, atol=1e-3, err_msg=str(key))


def test_method_error_of_compared_and_of_other_curves(k_ar):
    own = model_error.method_errors(k_ar, T)
    other = model_error.method_errors(replace(k_ar, sha256="not compared"), T)
    assert set(own) == set(other) == set(model_error.shipped_errors(k_ar, T))
    assert all(np.all(error > 0) for error in own.values())
    assert all(other[key][0] >= own[key][0] for key in (("fwhm", "D1"), ("loss", "P3/2", "2")))


def test_quantum_has_no_method_error(k_ar):
    quantum, semiclassical = (model_error.model_errors(k_ar, T, method) for method in ("quantum", "semiclassical"))
    curves, own = model_error.shipped_errors(k_ar, T), model_error.method_errors(k_ar, T)
    for key, error in curves.items():
        assert quantum[key] == pytest.approx(error)
        assert semiclassical[key] == pytest.approx(np.sqrt(error**2 + own[key] ** 2))
