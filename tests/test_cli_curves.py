"""`pertcalc curves --compute`: a curve file or points, a summary on stderr, one message for bad words."""

from __future__ import annotations

import csv
import io
import json

import pytest
from click.testing import CliRunner

from pertcalc.cli import cli
from pertcalc.curves.files import load
from pertcalc.one_electron import model_curves
from pertcalc.one_electron.gas_orbitals import even_tempered
from pertcalc.one_electron.pair import Basis

SMALL = Basis(n_states=12, l_max=4, nodes=32, gas_orbitals=even_tempered({0: (0.05, 3.0, 4), 1: (0.1, 1.0, 3)}))


@pytest.fixture(autouse=True)
def _small_basis(monkeypatch):
    """The command line in full, the computation in a second."""
    real = model_curves.compute_model
    monkeypatch.setattr(model_curves, "compute_model", lambda *words, **named: real(*words, basis=SMALL, **named))


def run(*words: str):
    result = CliRunner().invoke(cli, ["curves", *words], prog_name="pertcalc")
    assert result.exception is None or isinstance(result.exception, SystemExit), result.exception
    return result


def test_the_curve_file_is_written_checked_and_used(tmp_path):
    target, picture = tmp_path / "mine.toml", tmp_path / "mine.svg"
    made = run("Li", "He", "--compute", "-o", str(target), "--plot", str(picture))
    assert (made.exit_code, made.stdout) == (0, "")
    lines = made.stderr.splitlines()
    assert lines[0].startswith("Li-He: ") and "COMPUTED" in lines[1] + lines[0]
    assert [line.split()[0] for line in lines if line.startswith("  ") and "De" in line] == ["X", "A", "B"]
    assert lines[-1] == f"wrote {target}" and picture.exists()
    assert load(target).id == "mine"
    assert run("--check", str(target)).exit_code == 0
    assert "COMPUTED (model)" in run("Li", "He", "--curves", str(target)).stdout


def test_without_a_file_the_curve_file_goes_to_stdout(tmp_path):
    text = run("Li", "He", "--compute", "--electron-gas", "soft").stdout
    target = tmp_path / "li-he_model.toml"
    target.write_text(text, encoding="utf-8")
    assert load(target).noble_gas == "He"


def test_points_as_json_and_csv():
    made = json.loads(run("Li", "He", "--compute", "--json").stdout)
    assert made["schema"] == "pertcalc.model-curves/1" and made["mark"] == "COMPUTED"
    assert set(made["states"]["B"]["C_au"]) == {"C6", "C8", "C10"}
    rows = list(csv.DictReader(io.StringIO(run("Li", "He", "--compute", "--csv").stdout)))
    assert len(rows) == len(made["points"]) == made["work"]["distances"]
    assert float(rows[3]["A_cm1"]) == pytest.approx(made["points"][3]["A_cm1"], rel=1e-12)
    assert all(float(row["B_numerical_error_cm1"]) > 0 for row in rows)


BAD = [
    ("Rb --compute", "--compute makes the curves of one pair: give ALKALI and GAS."),
    ("Rb Ar --compute --curves x.toml", "--compute makes curves of its own; leave --curves and --check out."),
    ("Rb Ar --electron-gas soft", "--electron-gas belongs to --compute; add it."),
    ("Rb Argon --compute", "noble gas 'Argon' is not known. Did you mean Ar? Known: He, 3He, Ne, Ar, Kr, Xe."),
    (
        "Rb Ar --compute -o x.txt",
        "output file = 'x.txt': a curve file ends in .toml; name it so, or add --json or --csv for the points.",
    ),
]


@pytest.mark.parametrize("words, message", BAD, ids=[words for words, _ in BAD])
def test_bad_words_give_one_message_and_exit_2(words, message, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    result = run(*words.split())
    assert (result.exit_code, result.stdout, result.stderr) == (2, "", f"Error: {message}\n")
    assert list(tmp_path.iterdir()) == []


def test_an_unknown_electron_gas_model_is_exit_2():
    result = run("Rb", "Ar", "--compute", "--electron-gas", "hard")
    assert result.exit_code == 2 and result.stderr.startswith("Error: electron-gas model 'hard' is not known.")
