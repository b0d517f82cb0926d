"""Curve files: the contract, every bad field at once, hostile input, the default sets."""

from __future__ import annotations

import copy
import os
import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1, HARTREE_EV, KELVIN_HARTREE
from pertcalc.curves import build, files
from pertcalc.curves.forms import LennardJones, MorseVanDerWaals, TangToennies, VanDerWaals
from pertcalc.curves.schema import Table
from pertcalc.curves.tabulated import Tabulated
from pertcalc.errors import DataFileError, InputError, UnknownNameError

SOURCE = {"cite": "an invented curve for this test", "status": "model", "where": "this file"}
C_RB_AR = {"C6_au": 338.0, "C8_au": 26138.0, "C10_au": 2.66e6}
TT = {"form": "tang-toennies", "A_hartree": 10.63, "b_per_bohr": 1.011, **C_RB_AR}
GOOD: dict[str, Any] = {
    "id": "mine",
    "alkali": "Rb",
    "noble_gas": "Ar",
    "what": "invented",
    "masses_u": {"alkali": 86.909, "perturber": 39.962},
    "fine_structure": {"splitting": 237.595},
    "states": {name: {**TT, "source": dict(SOURCE), "uncertainty": {"De": 0.1}} for name in ("X", "A", "B")},
}
FORM_KEYS = {
    "tang-toennies": ["A_hartree", "b_per_bohr", "C6_au", "C8_au", "C10_au"],
    "lennard-jones": ["De", "R_min"],
    "van-der-waals": ["C6_au", "R_core"],
    "morse-van-der-waals": ["De", "Re", "a_per_bohr", "R_join", "C6_au"],
    "table": ["points", "file", "C6_au"],
}
POINTS = [[5.0, 12000.0], [6.0, 3000.0], [8.0, 300.0], [10.0, -30.0], [12.0, -20.0], [15.0, -6.0], [20.0, -1.2]]


def to_toml(value: Any) -> str:
    """A value as inline TOML: enough for these tests."""
    if isinstance(value, dict):
        return "{" + ", ".join(f"{k} = {to_toml(v)}" for k, v in value.items()) + "}"
    if isinstance(value, list):
        return "[" + ", ".join(to_toml(v) for v in value) + "]"
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return '"' + value.replace("\\", "\\\\").replace('"', '\\"').replace("\a", "\\u0007") + '"'
    return repr(value)


def write(folder: Path, document: dict[str, Any], name: str = "mine.toml") -> Path:
    path = folder / name
    path.write_text("".join(f"{key} = {to_toml(value)}\n" for key, value in document.items()), encoding="utf-8")
    return path


def changed(place: str, value: Any) -> dict[str, Any]:
    """GOOD with one field (dotted) replaced, or removed where value is Ellipsis."""
    document = copy.deepcopy(GOOD)
    *parents, last = place.split(".")
    table = document
    for key in parents:
        table = table.setdefault(key, {})
    if value is ...:
        del table[last]
    else:
        table[last] = value
    return document


def with_state(state: dict[str, Any]) -> dict[str, Any]:
    return changed("states.X", {**state, "source": SOURCE})


def test_a_good_file_loads(tmp_path: Path) -> None:
    path = write(tmp_path, GOOD)
    curves = files.load(path)
    assert (curves.id, curves.alkali, curves.noble_gas, curves.what) == ("mine", "Rb", "Ar", "invented")
    assert (curves.mass_alkali_u, curves.mass_perturber_u, curves.splitting_cm1) == (86.909, 39.962, 237.595)
    assert curves.X == TangToennies(10.63, 1.011, 338.0, 26138.0, 2.66e6)
    assert curves.states["A"].source.cite == SOURCE["cite"]
    assert curves.states["B"].uncertainty == {"De": 0.1}
    assert curves.states["B"].mark == "COMPUTED"
    assert curves.path == path and len(curves.sha256) == 64
    assert files.check(path) == []


def test_optional_sections_may_be_missing(tmp_path: Path) -> None:
    document = {key: value for key, value in GOOD.items() if key not in ("masses_u", "fine_structure")}
    for state in ("X", "A", "B"):
        document = copy.deepcopy(document)
        del document["states"][state]["uncertainty"]
    curves = files.load(write(tmp_path, document))
    assert curves.mass_alkali_u is curves.mass_perturber_u is curves.splitting_cm1 is None
    assert curves.states["X"].uncertainty == {}


@pytest.mark.parametrize(
    "De, Re",
    [
        ({"value": 39.0, "unit": "cm^-1"}, {"value": 5.6, "unit": "angstrom"}),
        ({"value": 39.0 / HARTREE_CM1, "unit": "hartree"}, {"value": 5.6 / BOHR_ANGSTROM, "unit": "bohr"}),
        ({"value": 39.0 / HARTREE_CM1 * HARTREE_EV, "unit": "eV"}, {"value": 5.6, "unit": "angstrom"}),
        ({"value": 39e3 / HARTREE_CM1 * HARTREE_EV, "unit": "meV"}, {"value": 5.6, "unit": "angstrom"}),
        ({"value": 39.0 / HARTREE_CM1 / KELVIN_HARTREE, "unit": "K"}, {"value": 5.6, "unit": "angstrom"}),
    ],
)
def test_a_well_in_any_unit_comes_back(tmp_path: Path, De: dict[str, Any], Re: dict[str, Any]) -> None:
    state = {"form": "tang-toennies", "De": De, "Re": Re, **C_RB_AR}
    curve = files.load(write(tmp_path, with_state(state))).X
    well = curve.well()
    assert well is not None
    assert well.depth * HARTREE_CM1 == pytest.approx(39.0, rel=1e-8)
    assert well.position * BOHR_ANGSTROM == pytest.approx(5.6, rel=1e-8)
    # The parameters printed for this well in the contract of the format: A = 10.63, b = 1.0110 (rounded, C10 too).
    assert isinstance(curve, TangToennies)
    assert (curve.A, curve.b) == pytest.approx((10.63, 1.0110), rel=2e-3)


def test_every_form_can_be_read(tmp_path: Path) -> None:
    De, Re = {"value": 40.0, "sd": 4.0, "unit": "cm^-1"}, {"value": 10.0, "unit": "bohr"}
    C = {"C6_au": 300.0, "C8_au": 2.2e4, "C10_au": 2.1e6}
    (tmp_path / "x.csv").write_text("# invented\nR_bohr,V_cm-1\n" + "\n".join(f"{r},{v}" for r, v in POINTS))
    for state, kind in [
        ({"form": "lennard-jones", "De": De, "R_min": Re}, LennardJones),
        ({"form": "lennard-jones", "epsilon": De, "R_min": Re}, LennardJones),
        ({"form": "van-der-waals", "C6_au": 300.0}, VanDerWaals),
        ({"form": "van-der-waals", "C6_au": 300.0, "R_core": {"value": 3.0, "unit": "angstrom"}}, VanDerWaals),
        ({"form": "morse-van-der-waals", "De": De, "Re": Re, **C}, MorseVanDerWaals),
        ({"form": "morse-van-der-waals", "De": De, "Re": Re, "a_per_bohr": 0.6, **C}, MorseVanDerWaals),
        ({"form": "table", "points": POINTS, **C}, Tabulated),
        ({"form": "table", "file": "x.csv", **C}, Tabulated),
    ]:
        curves = files.load(write(tmp_path, with_state(state)))
        assert isinstance(curves.X, kind)
        if "De" in state or "epsilon" in state:
            assert curves.states["X"].uncertainty["De"] == pytest.approx(0.1)
            assert curves.X.well().depth * HARTREE_CM1 == pytest.approx(40.0)


def test_a_table_in_a_file_equals_the_same_points_inline_and_is_in_the_digest(tmp_path: Path) -> None:
    (tmp_path / "x.csv").write_text("\n".join(f"{r},{v}" for r, v in POINTS))
    inline = files.load(write(tmp_path, with_state({"form": "table", "points": POINTS, "C6_au": 338.0})))
    path = write(tmp_path, with_state({"form": "table", "file": "x.csv", "C6_au": 338.0}))
    beside = files.load(path)
    R = np.linspace(3, 40, 200)
    assert np.array_equal(inline.X(R), beside.X(R))
    (tmp_path / "x.csv").write_text("\n".join(f"{r},{v}" for r, v in POINTS[:-1]))
    assert files.load(path).sha256 != beside.sha256


# place, value, words the one problem must contain: field name, value or rule, next step.
BAD_FIELDS = [
    ("id", "other", ["id = 'other'", "'mine.toml'"]),
    ("id", 7, ["id = 7", "text"]),
    ("alkali", "Rubidium", ["alkali = 'Rubidium'", "Rb"]),
    ("alkali", ..., ["alkali: is missing"]),
    ("noble_gas", "", ["noble_gas", "empty"]),
    ("what", ..., ["what: is missing"]),
    ("what", "bell \x07", ["control characters"]),
    ("what", "x" * 5000, ["5000 characters"]),
    ("masses_u.alkali", -3.0, ["masses_u.alkali = -3.0", "above"]),
    ("masses_u.alkali", "87", ["masses_u.alkali = '87'", "without quotes"]),
    ("masses_u.alkalii", 3.0, ["masses_u.alkalii", "did you mean 'alkali'"]),
    ("masses_u", 5, ["masses_u = 5", "must be a table"]),
    ("fine_structure.splitting", float("nan"), ["splitting = nan", "finite"]),
    ("fine_structure.splitting", -1.0, ["splitting = -1.0", "at least 0"]),
    ("states", ..., ["states: is missing"]),
    ("states.B", ..., ["states.B: is missing", "X, A and B"]),
    ("states.C", dict(TT), ["states.C", "unknown key"]),
    ("states.X", [1, 2], ["states.X = [1, 2]", "must be a table"]),
    ("states.X.form", "tang-tonnies", ["did you mean 'tang-toennies'"]),
    ("states.X.form", ..., ["states.X.form: is missing"]),
    ("states.X.form", True, ["states.X.form = True", "text"]),
    ("states.X.C6_aus", 338.0, ["states.X.C6_aus = 338.0", "did you mean 'C6_au'"]),
    ("states.X.C6_au", ..., ["states.X.C6_au: is missing"]),
    ("states.X.C6_au", 0.0, ["C6_au = 0.0", "above 0"]),
    ("states.X.C6_au", -338.0, ["C6_au = -338.0", "above 0"]),
    ("states.X.C6_au", True, ["C6_au = True", "finite number"]),
    ("states.X.C6_au", float("inf"), ["C6_au = inf", "finite"]),
    ("states.X.C6_au", "338", ["C6_au = '338'", "without quotes"]),
    ("states.X.C6_au", 10**400, ["C6_au", "finite"]),
    ("states.X.C6_au", {"value": 338}, ["C6_au", "without quotes"]),
    ("states.X.C8_au", -1.0, ["C8_au = -1.0", "at least 0"]),
    ("states.X.C10_au", [], ["C10_au = []"]),
    ("states.X.A_hartree", ..., ["A_hartree: is missing", "together"]),
    ("states.X.b_per_bohr", ..., ["b_per_bohr: is missing", "together"]),
    ("states.X.b_per_bohr", 1e6, ["b_per_bohr = 1000000.0", "below 50"]),
    ("states.X.A_hartree", 1e-6, ["states.X", "wall"]),
    ("states.X.A_hartree", 1e300, ["A_hartree = 1e+300", "below 1e+08"]),
    ("states.X.C6_au", 1e300, ["C6_au = 1e+300", "below"]),
    ("states.X.De", {"value": 39.0, "unit": "hartree"}, ["De.value = 39.0", "below 1 hartree", "unit"]),
    ("states.X.Re", {"value": 1e300, "unit": "angstrom"}, ["Re.value = 1e+300", "below 200 bohr"]),
    ("states.X.De", 39.0, ["states.X.De = 39.0", "unit", "cm^-1"]),
    ("states.X.De", {"value": 39.0}, ["states.X.De.unit: is missing"]),
    ("states.X.De", {"value": 39.0, "unit": "cm-1"}, ["De.unit = 'cm-1'", "did you mean 'cm^-1'"]),
    ("states.X.De", {"value": 39.0, "unit": "angstrom"}, ["De.unit = 'angstrom'", "cm^-1"]),
    ("states.X.De", {"value": "39", "unit": "cm^-1"}, ["De.value = '39'"]),
    ("states.X.De", {"value": 39.0, "sd": -1.0, "unit": "cm^-1"}, ["De.sd = -1.0"]),
    ("states.X.De", {"value": 39.0, "unit": "cm^-1", "err": 2.0}, ["De.err", "unknown key"]),
    ("states.X.De", {"value": 93.0, "unit": "cm^-1"}, ["93 cm^-1", "the curve has its well", "38.999"]),
    ("states.X.Re", {"value": 6.5, "unit": "angstrom"}, ["6.5 angstrom", "the curve has its well"]),
    ("states.X.De_cm", 39.0, ["De_cm", "unknown key"]),
    ("states.X.source", ..., ["states.X.source: is missing", "cite"]),
    ("states.X.source.cite", "  ", ["source.cite", "empty"]),
    ("states.X.source.status", ..., ["source.status: is missing"]),
    ("states.X.source.status", "guess", ["status = 'guess'", "published", "from-memory", "model", "combining-rule"]),
    ("states.X.source.year", 1999, ["source.year", "unknown key"]),
    ("states.X.uncertainty.De", -0.1, ["uncertainty.De = -0.1"]),
    ("states.X.uncertainty.Dee", 0.1, ["uncertainty.Dee", "did you mean 'De'"]),
    ("states.X.uncertainty", "small", ["uncertainty = 'small'", "must be a table"]),
    ("states.X.points", POINTS, ["points", "unknown key"]),
    ("potentials", {}, ["potentials", "unknown key"]),
]


@pytest.mark.parametrize("place, value, words", BAD_FIELDS, ids=[f"{p}={str(v)[:20]!r}" for p, v, _ in BAD_FIELDS])
def test_a_bad_field_gives_one_clear_problem(tmp_path: Path, place: str, value: Any, words: list[str]) -> None:
    problems = files.check(write(tmp_path, changed(place, value)))
    assert len(problems) == 1, problems
    for word in words:
        assert word in problems[0]


BAD_STATES = [
    ({"form": "tang-toennies", "C6_au": 338.0}, "needs A_hartree and b_per_bohr, or both De and Re"),
    (
        {"form": "tang-toennies", "C6_au": 338.0, "De": {"value": 5e4, "unit": "cm^-1"},
         "Re": {"value": 12.0, "unit": "bohr"}},
        "no Tang-Toennies wall",
    ),
    ({"form": "lennard-jones", "R_min": {"value": 10.0, "unit": "bohr"}}, "states.X.epsilon: is missing"),
    (
        {"form": "lennard-jones", "epsilon": {"value": 1.0, "unit": "K"}, "De": {"value": 1.0, "unit": "K"},
         "R_min": {"value": 10.0, "unit": "bohr"}},
        "synonym",
    ),
    ({"form": "van-der-waals", "C6_au": 338.0, "R_core": {"value": -3.0, "unit": "bohr"}}, "R_core.value = -3.0"),
    ({"form": "table", "C6_au": 338.0}, "either points or file"),
    ({"form": "table", "C6_au": 338.0, "points": POINTS, "file": "x.csv"}, "either points or file"),
    ({"form": "table", "C6_au": 338.0, "points": POINTS[:4]}, "between 5 and"),
    ({"form": "table", "C6_au": 338.0, "points": POINTS[::-1]}, "rise strictly"),
    ({"form": "table", "C6_au": 338.0, "points": [POINTS[0], *POINTS]}, "rise strictly"),
    ({"form": "table", "C6_au": 338.0, "points": [[0.0, 9e9], *POINTS]}, "must be > 0"),
    ({"form": "table", "C6_au": 338.0, "points": [[-1.0, 9e9], *POINTS]}, "must be > 0"),
    ({"form": "table", "C6_au": 338.0, "points": [*POINTS, [25.0, float("nan")]]}, "point 8"),
    ({"form": "table", "C6_au": 338.0, "points": [*POINTS, [float("inf"), 0.0]]}, "point 8"),
    ({"form": "table", "C6_au": 338.0, "points": [*POINTS, [25.0, "0.1"]]}, "point 8"),
    ({"form": "table", "C6_au": 338.0, "points": [*POINTS, [25.0]]}, "point 8"),
    ({"form": "table", "C6_au": 338.0, "points": [*POINTS, 25.0]}, "point 8"),
    ({"form": "table", "C6_au": 338.0, "points": POINTS[2:][::1]}, "begin on the repulsive wall"),
    ({"form": "table", "C6_au": 338.0, "points": "none"}, "must be a list"),
    ({"form": "table", "C6_au": 338.0, "points": [[5 + k * 1e-3, 1e4 - k / 2] for k in range(20_001)]}, "20001 points"),
    ({"form": "table", "C6_au": 338.0, "file": "/etc/passwd"}, "same folder"),
    ({"form": "table", "C6_au": 338.0, "file": "../x.csv"}, "same folder"),
    ({"form": "table", "C6_au": 338.0, "file": ".."}, "same folder"),
    ({"form": "table", "C6_au": 338.0, "file": "a\\b.csv"}, "same folder"),
    ({"form": "table", "C6_au": 338.0, "file": "absent.csv"}, "no such file"),
    ({"form": "table", "C6_au": 338.0, "file": "folder"}, "folder"),
    ({"form": "table", "C6_au": 338.0, "file": "binary.csv"}, "UTF-8"),
    ({"form": "table", "C6_au": 338.0, "file": "words.csv"}, "line 2"),
    ({"form": "table", "C6_au": 338.0, "file": "nan.csv"}, "not finite"),
    ({"form": "table", "C6_au": 338.0, "file": "long.csv"}, "at most 20000"),
    ({"form": "table", "C6_au": 338.0, "file": "huge.csv"}, "larger than 2 MB"),
    ({"form": "table", "C6_au": 338.0, "file": "link.csv"}, "out of the folder"),
    ({"form": "table", "C6_au": 338.0, "file": "empty.csv"}, "0 points"),
]  # fmt: skip


@pytest.mark.parametrize("state, words", BAD_STATES, ids=[f"{k}-{w[:24]}" for k, (_, w) in enumerate(BAD_STATES)])
def test_a_bad_state_gives_one_clear_problem(tmp_path: Path, state: dict[str, Any], words: str) -> None:
    folder = tmp_path / "here"
    folder.mkdir()
    (folder / "folder").mkdir()
    (folder / "binary.csv").write_bytes(bytes(range(256)))
    (folder / "words.csv").write_text("R,V\n5.0,much\n")
    (folder / "nan.csv").write_text("\n".join(f"{r},{v}" for r, v in POINTS) + "\n30,nan\n")
    (folder / "long.csv").write_text("1,2\n" * 20_500)
    (folder / "huge.csv").write_text("#" * 2_000_001)
    (folder / "empty.csv").write_text("")
    (tmp_path / "outside.csv").write_text("\n".join(f"{r},{v}" for r, v in POINTS))
    (folder / "link.csv").symlink_to(tmp_path / "outside.csv")
    problems = files.check(write(folder, with_state(state)))
    assert len(problems) == 1, problems
    assert words in problems[0]


def test_all_bad_fields_are_reported_at_once(tmp_path: Path) -> None:
    document = changed("states.X.C6_au", -1.0)
    document["alkali"] = "Kx"
    document["colour"] = "red"
    document["masses_u"]["perturber"] = "heavy"
    document["states"]["A"]["form"] = "spline"
    document["states"]["B"]["source"] = {"status": "guess"}
    del document["what"]
    with pytest.raises(DataFileError) as caught:
        files.load(write(tmp_path, document))
    text = str(caught.value)
    for field in ("alkali", "colour", "masses_u.perturber", "what", "states.X.C6_au", "states.A.form",
                  "states.B.source.cite", "states.B.source.status"):  # fmt: skip
        assert sum(problem.startswith(field) for problem in caught.value.problems) == 1, (field, text)
    assert len(caught.value.problems) == 8
    assert caught.value.exit_code == 1 and "8 problems" in text


@pytest.mark.parametrize("label, mass, good", [("Hg", None, False), ("Hg", 200.59, True), ("3He", None, True)])
def test_a_perturber_outside_the_species_table_needs_its_mass(
    tmp_path: Path, label: str, mass: float | None, good: bool
) -> None:
    document = {**GOOD, "noble_gas": label, "masses_u": {} if mass is None else {"perturber": mass}}
    problems = files.check(write(tmp_path, document))
    if good:
        assert problems == []
    else:
        assert len(problems) == 1 and "masses_u.perturber" in problems[0] and "'Hg'" in problems[0]


HOSTILE_BYTES = [
    (b"\xff\xfe\x00binary", "UTF-8"),
    (b"id = \n", "not valid TOML"),
    (b"x = " + b"[" * 50_000, "nested too deeply"),
    (b"a." * 900_000 + b"a = 1", "nested too deeply"),
    (b"x = { " + b"'a.b' . " * 200_000 + b"a = 1 }", "nested too deeply"),
    (b"x = " + b"9" * 10_000, "not valid TOML"),
    (b"#" * (build.MAX_BYTES + 1), "larger than 2 MB"),
    (b"", "is missing"),
    (b"id = 'mine'\nid = 'mine'\n", "not valid TOML"),
    (b"when = 2020-01-01\n", "unknown key"),
    (b"".join(b"k%d = 1\n" % k for k in range(50_000)), "49980 more unknown keys"),
    (b'"\\u001b[31m" = 1\n', r"'\\x1b\[31m' = 1: unknown key"),
]


@pytest.mark.parametrize("content, words", HOSTILE_BYTES, ids=[w[:20] for _, w in HOSTILE_BYTES])
def test_hostile_files_end_in_one_error(tmp_path: Path, content: bytes, words: str) -> None:
    path = tmp_path / "mine.toml"
    path.write_bytes(content)
    with pytest.raises(DataFileError, match=words):
        files.load(path)


values = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=5),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.sampled_from(["value", "unit", "De"]), inner),
    max_leaves=6,
)


@settings(deadline=None, derandomize=True)
@given(st.sampled_from(list(FORM_KEYS.items())), st.data())
def test_no_document_whatever_ends_in_a_traceback(kind: tuple[str, list[str]], data: st.DataObject) -> None:
    # What the parser could hand over, with any values in the right places: a list of problems or a finite curve.
    form, keys = kind
    document = with_state({"form": form, **{key: data.draw(values) for key in keys}})
    problems: list[str] = []
    curves, _ = files._read(Table(document, "", problems), Path("mine.toml"))
    assert (curves is None) == bool(problems)
    assert all(len(problem) < 400 for problem in problems)


@settings(deadline=None, derandomize=True)
@given(st.lists(st.tuples(st.floats(-1, 60), st.floats(-1e308, 1e308)), max_size=12), st.floats(1e-300, 1e7))
def test_no_table_whatever_ends_in_nan(points: list[tuple[float, float]], C6: float) -> None:
    ordered = [list(point) for point in sorted(points)]
    problems: list[str] = []
    document = with_state({"form": "table", "points": ordered, "C6_au": C6})
    curves, _ = files._read(Table(document, "", problems), Path("mine.toml"))
    assert (curves is None) == bool(problems)
    if curves is not None:
        assert np.all(np.isfinite(curves.X(np.geomspace(0.1, 1e5, 500))))


def test_places_that_are_no_files(tmp_path: Path) -> None:
    with pytest.raises(DataFileError, match="it is a folder"):
        files.load(tmp_path)
    with pytest.raises(DataFileError, match="no such file"):
        files.load(tmp_path / "absent.toml")
    with pytest.raises(DataFileError, match="cannot be read"):
        files.load("bad\x00name.toml")
    if hasattr(os, "mkfifo"):
        os.mkfifo(tmp_path / "pipe.toml")
        with pytest.raises(DataFileError, match="not an ordinary file"):
            files.load(tmp_path / "pipe.toml")


def test_default_sets_by_name() -> None:
    assert len(files.default_ids()) == 25
    assert files.load_default("rb", "ar") is files.load_default("Rb", "Ar")
    with pytest.raises(UnknownNameError):
        files.load_default("Rx", "Ar")
    with pytest.raises(UnknownNameError):
        files.load_default("Rb", "Argon")


def test_helium_3_has_the_curves_of_helium_and_its_own_mass() -> None:
    light, heavy = files.load_default("K", "3He"), files.load_default("K", "He")
    assert light.states is heavy.states and light.sha256 == heavy.sha256
    assert light.noble_gas == "3He" and heavy.mass_perturber_u is None
    # Mass of the helium-3 atom 3.01602932 u (AME2020, FROM MEMORY).
    assert light.mass_perturber_u == pytest.approx(3.01602932, abs=1e-6)
    assert files.for_pair(heavy, "K", "3He") == light
    assert files.for_pair(heavy, "k", "he") is heavy
    with pytest.raises(InputError, match="are for K-He, not K-Ar"):
        files.for_pair(heavy, "K", "Ar")


@pytest.mark.parametrize("path", sorted(files.default_folder().glob("*")), ids=lambda p: p.name)
def test_every_file_in_potentials(path: Path) -> None:
    # No stray file, name = id = pair.
    document = tomllib.loads(path.read_text(encoding="utf-8"))
    pair = f"{document['alkali']}-{document['noble_gas']}".lower()
    assert document["id"] == path.stem and path.stem in (f"{pair}_default", f"{pair}_model")
    assert f"{pair}_default" in files.default_ids()
    curves = files.load(path)
    assert set(curves.states) == {"X", "A", "B"}
    for name, fields in document["states"].items():
        state, curve = curves.states[name], curves.states[name].curve
        # Provenance: a citation, a place, a note, and an error of every parameter that the model error needs.
        source = fields["source"]
        assert all(source[key].strip() for key in ("cite", "status", "where", "note"))
        assert set(fields["uncertainty"]) == {"De", "Re", "C6", "C8", "C10"}
        assert all(0 < value <= 0.5 for value in fields["uncertainty"].values())
        assert (state.mark == "READ") == (source["status"] == "published") == ("READ" in source["note"])
        if state.mark == "READ":
            assert "https://" in source["where"]
        # The redundant De and Re agree with the curve the parameters make, to the rounding of the printed numbers.
        well = curve.well()
        De, Re = fields["De"]["value"], fields["Re"]["value"]
        assert well is not None and fields["De"]["unit"] == "cm^-1" and fields["Re"]["unit"] == "angstrom"
        assert well.depth * HARTREE_CM1 == pytest.approx(De, rel=1e-3, abs=0.005)
        # Cs-He B is 0.32 cm^-1 deep and its table has steps of 0.001: the position is loose by 2e-3.
        assert well.position * BOHR_ANGSTROM == pytest.approx(Re, rel=2e-3)
        # Judged errors are printed with two digits.
        assert fields["De"]["sd"] / De == pytest.approx(fields["uncertainty"]["De"], rel=0.05)
        assert curve.r_min < well.position < 24.0
        # Sorted tables with an end in the tail; a wall that thermal atoms cannot pass.
        if fields["form"] == "table":
            R = np.array(fields["points"])[:, 0]
            assert np.all(np.diff(R) > 0) and R[-1] > 1.1 * well.position
            joins = [R[0], R[-1]]
        else:
            joins = []
        assert curve.wall_top * HARTREE_CM1 > 3500
        # Finite everywhere, C1 at the joins, right limit.
        R = np.geomspace(0.1, 1e6, 4000)
        for values in curve.with_derivative(R):
            assert np.all(np.isfinite(values))
        for join in joins:
            low, high = np.nextafter(join, 0), np.nextafter(join, 99)
            for function in (curve, curve.derivative):
                assert float(function(low)) == pytest.approx(float(function(high)), rel=1e-9)
        assert float(-curve(1e5) * 1e30) == pytest.approx(fields["C6_au"], rel=1e-6)


def test_every_pair_orders_its_dispersion_coefficients() -> None:
    # Along the row He, Ne, Ar, Kr, Xe the polarisability of the gas rises, and with it every C6; B feels the p orbital
    # along the axis, so C6(B) > C6(A) > C6(X) for every alkali (second-order perturbation theory; common practice).
    for alkali in ("Li", "Na", "K", "Rb", "Cs"):
        rows = [files.load_default(alkali, gas) for gas in ("He", "Ne", "Ar", "Kr", "Xe")]
        for row in rows:
            assert row.B.C6 > row.A.C6 > row.X.C6
        for state in ("X", "A", "B"):
            C6 = [row.states[state].curve.C6 for row in rows]
            assert C6 == sorted(C6)
