"""The command ``pertcalc molecule``: contract, formats, exact messages and exit codes."""

from __future__ import annotations

import csv
import io
import json
import math

import pytest
from click.testing import CliRunner

from pertcalc.cli import cli
from pertcalc.cli_molecule import STATES, State
from pertcalc.molecules import radial
from pertcalc.report.molecule_text import runs


def run(*words: str):
    """Run one command in this process; a traceback would be in result.exception."""
    result = CliRunner().invoke(cli, ["molecule", *words], prog_name="pertcalc")
    assert result.exception is None or isinstance(result.exception, SystemExit), result.exception
    return result


@pytest.fixture(scope="module")
def rb_ar():
    result = run("Rb", "Ar", "--json")
    assert (result.exit_code, result.stderr) == (0, "")
    return json.loads(result.stdout)


def test_states_of_the_command_are_those_of_the_library():
    assert STATES == radial.STATES
    assert [State().convert(name.lower(), None, None) for name in STATES] == list(STATES)


def test_json_follows_the_contract(rb_ar):
    assert rb_ar["schema"] == "pertcalc.molecule/1" and rb_ar["state"] == "X"
    counts, levels = rb_ar["counts"], rb_ar["levels"]
    assert counts["N0"] == sum(level["N"] == 0 for level in levels)
    assert counts["total"] == len(levels) and counts["N_max"] == max(level["N"] for level in levels)
    assert counts["agree"] and counts["by_nodes"]["total"] == counts["total"]
    for level in levels:
        assert level["energy_cm-1"] < 0 < level["R_inner_bohr"] < level["R_outer_bohr"]
        assert level["B_cm-1"] > 0 and level["R_extent_bohr"] > level["R_inner_bohr"]
        assert level["model_error_cm-1"] > 0
    for level in rb_ar["metastable"]:
        assert 0 < level["energy_cm-1"] < level["barrier_cm-1"]
        assert level["width_cm-1"] > 0 and level["width_method"] in ("delay", "flux")
    balance = rb_ar["equilibrium"]
    assert balance["temperature_K"] == 300.0 and balance["reason"] is None
    assert balance["K_total_cm3"] == pytest.approx(balance["K_bound_cm3"] + balance["K_metastable_cm3"])
    assert 1e-23 < balance["K_bound_cm3"] < 1e-22
    assert balance["K_classical_cm3"] == pytest.approx(balance["K_bound_cm3"], rel=0.03)
    assert rb_ar["cell"]["bound_fraction"] == pytest.approx(
        rb_ar["cell"]["density_cm3"] * balance["K_total_cm3"], rel=1e-3
    )


def test_text_has_units_marks_and_fits_a_hundred_columns():
    text = run("Rb", "Ar").stdout
    assert max(map(len, text.splitlines())) <= 100
    for words in (
        "X COMPUTED",
        "The three ways",
        "Bound levels of N = 0, COMPUTED",
        "cm^-1",
        "angstrom",
        "scattering length",
        "Quasi-bound levels",
        "classical",
        "ESTIMATE",
    ):
        assert words in " ".join(text.split()), words  # wherever a line ends


@pytest.mark.parametrize("words", ["Li He --isotope 6Li --isotope 3He", "Rb He --state A1/2 --equilibrium", "Na Ne"])
def test_other_pairs_fit_too(words):
    text = run(*words.split()).stdout
    assert text and max(map(len, text.splitlines())) <= 100


def test_csv_holds_every_level(rb_ar):
    rows = list(csv.DictReader(io.StringIO(run("Rb", "Ar", "--csv").stdout)))
    kinds = [row["kind"] for row in rows]
    assert kinds.count("bound") == len(rb_ar["levels"]) and kinds.count("quasi-bound") == len(rb_ar["metastable"])
    assert {row["mark"] for row in rows} == {"COMPUTED"}
    assert all(row["width_cm-1"] == "" for row in rows if row["kind"] == "bound")
    assert all(math.isfinite(float(row["energy_cm-1"])) for row in rows)


def test_one_rotation_only(rb_ar):
    shown = json.loads(run("Rb", "Ar", "--rotation", "38", "--json").stdout)
    assert {level["N"] for level in shown["levels"] + shown["metastable"]} == {38}
    # The counts are those of the whole state.
    assert shown["counts"] == rb_ar["counts"]


def test_excited_state_says_why_it_has_no_equilibrium():
    found = json.loads(run("Rb", "He", "--state", "a1/2", "--json").stdout)
    assert found["state"] == "A1/2" and found["equilibrium"]["K_bound_cm3"] is None
    assert "no thermal equilibrium" in found["equilibrium"]["reason"]
    assert found["scattering_length_bohr"] is None
    asked = json.loads(run("Rb", "He", "--state", "A1/2", "--equilibrium", "--json").stdout)
    assert asked["equilibrium"]["K_bound_cm3"] > 0


def test_no_level_is_no_error():
    result = run("Li", "3He", "--isotope", "6Li", "--state", "B")
    assert result.exit_code == 0 and "No level, bound or quasi-bound" in result.stdout
    found = json.loads(run("Cs", "He", "--state", "B", "--json").stdout)
    assert found["counts"] | {"N0": 0, "total": 0, "N_max": None} == found["counts"]


@pytest.mark.parametrize("suffix", ["png", "svg"])
def test_plot_is_written_beside_the_text(tmp_path, suffix):
    place = tmp_path / f"levels.{suffix}"
    result = run("Na", "Ne", "--plot", str(place))
    assert result.exit_code == 0 and result.stderr == f"wrote {place}\n" and "Na + Ne" in result.stdout
    first = place.read_bytes()
    assert first[:4] == b"\x89PNG" if suffix == "png" else b"<svg" in first
    assert run("Na", "Ne", "--plot", str(place)).exit_code == 2
    assert run("Na", "Ne", "--plot", str(place), "--force").exit_code == 0
    assert place.read_bytes() == first


def test_output_file(tmp_path):
    place = tmp_path / "levels.csv"
    result = run("Na", "Ne", "--csv", "-o", str(place))
    assert (result.stdout, result.stderr) == ("", f"wrote {place}\n")
    assert place.read_text().startswith("kind,v,N,energy_cm-1")


TEMPERATURE = "write --temperature as '333 K' or '60 degC'."
BAD_INPUT = [
    ("Rb Ar --state C", 2, "state 'C' is not known. Known: X, A1/2, A3/2, B."),
    ("Rb Argon", 2, "noble gas 'Argon' is not known. Did you mean Ar? Known: He, 3He, Ne, Ar, Kr, Xe."),
    ("Rb Ar --isotope 40Ar", 2, "isotope of Rb-Ar '40Ar' is not known. Known: 85Rb, 87Rb."),
    ("Rb Ar --rotation -1", 2, "rotation N = -1 must be >= 0; give another value."),
    (
        "Rb Ar --rotation 500",
        1,
        "rotation N = 500 (a quantum number) is outside 0 .. 59 (a quantum number). Beyond it the centrifugal barrier "
        "leaves neither a bound nor a quasi-bound level; ask for a smaller N.",
    ),
    (
        "Rb Ar --points 20",
        2,
        "points = 20 must lie in 57 .. 1200: the well is too deep for fewer; 79 are the default.",
    ),
    (
        "Rb Ar --temperature 0",
        2,
        f"--temperature = '0': is 0 K, and an absolute temperature must be above 0 K; {TEMPERATURE}",
    ),
    (
        "Rb Ar --temperature 5",
        1,
        "temperature = 5 K is outside 20 .. 2000 K. Choose a temperature of a gas cell within this range.",
    ),
    (
        "Rb Ar --pressure 20",
        2,
        "--pressure = '20': a unit is missing; write --pressure as '20 Torr', '3 kPa' or '5 mbar'.",
    ),
    ("Rb Ar --json --csv", 2, "--json and --csv exclude each other; give one of them."),
    ("Rb Ar --plot x.pdf", 2, "figure file = 'x.pdf': must end in .png or .svg; choose one of these"),
]


@pytest.mark.parametrize(("words", "code", "message"), BAD_INPUT, ids=[words for words, *_ in BAD_INPUT])
def test_bad_input_gives_one_message_and_its_exit_code(words, code, message, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    result = run(*words.split())
    assert (result.exit_code, result.stdout, result.stderr) == (code, "", f"Error: {message}\n")
    assert list(tmp_path.iterdir()) == []


def curve_file(folder, points: str, C6: float) -> str:
    """A file for Rb with an invented perturber whose ground curve is a table."""
    source = 'source = { cite = "invented", status = "model", where = "this test" }\n'
    other = 'form = "lennard-jones"\nDe = { value = 30.0, unit = "cm^-1" }\nRe = { value = 5.0, unit = "angstrom" }\n'
    text = (
        'id = "made"\nalkali = "Rb"\nnoble_gas = "Zz"\nwhat = "invented"\n[masses_u]\nperturber = 40.0\n'
        f'[states.X]\nform = "table"\nC6_au = {C6}\npoints = [{points}]\n{source}'
        f"[states.A]\n{other}{source}[states.B]\n{other}{source}"
    )
    place = folder / "made.toml"
    place.write_text(text)
    return str(place)


def test_repulsive_curve_of_a_file_is_exit_0(tmp_path):
    points = ", ".join(f"[{R}, {2000 * math.exp(-0.8 * (R - 5))}]" for R in range(5, 26))
    result = run("Rb", "Zz", "--curves", curve_file(tmp_path, points, 1e-3))
    assert (result.exit_code, result.stderr) == (0, "")
    assert "No level, bound or quasi-bound: the curve is repulsive" in result.stdout


def test_table_that_ends_in_the_well_is_exit_1(tmp_path):
    points = ", ".join(f"[{0.1 * R}, {40 * ((106 / R) ** 12 - 2 * (106 / R) ** 6)}]" for R in range(75, 116))
    result = run("Rb", "Zz", "--curves", curve_file(tmp_path, points, 517.0))
    assert (result.exit_code, result.stdout) == (1, "")
    assert "states.X.points end at R = 11.5 bohr inside the classically allowed region" in result.stderr


def test_runs_of_equal_counts():
    import numpy as np

    assert runs(np.array([3, 3, 2, 1, 1])) == "0-1: 3, 2: 2, 3-4: 1"
    assert runs(np.array([1])) == "0: 1"


def test_help_has_examples():
    assert "pertcalc molecule Cs Xe --state A1/2" in run("--help").stdout
