"""`pertcalc validate`: exit codes, the JSON and CSV contract, widths, interrupts. Rates are invented."""

from __future__ import annotations

import csv
import dataclasses
import io
import json

import numpy as np
import pytest
from click.testing import CliRunner

import pertcalc.rates
from pertcalc import __version__, cli_options, measured
from pertcalc.cli import cli
from pertcalc.errors import NotConvergedError
from pertcalc.measured import as_rate, measurements
from pertcalc.validation import published
from tests.test_validation import balanced


def run(*words: str):
    """Run one command in this process; a traceback would be in result.exception."""
    result = CliRunner().invoke(cli, ["validate", "--jobs", "1", *words], prog_name="pertcalc")
    assert result.exception is None or isinstance(result.exception, SystemExit), result.exception
    return result


def good_rates(alkali, gas, temperatures, method="semiclassical", **_):
    """Invented rates in detailed balance whose sodium disalignment is the measured one at every temperature."""
    found = balanced(alkali, gas, temperatures, method)
    losses = dict(found.multipole_loss["P3/2"])
    for row in measurements(alkali, gas, "multipole_loss"):
        if row.rank == 2:
            value = as_rate(row, found.reduced_mass).value
            losses[2] = dataclasses.replace(losses[2], values=np.full(found.temperatures.shape, value))
    return dataclasses.replace(found, multipole_loss=found.multipole_loss | {"P3/2": losses})


class Failing:
    """good_rates that raises for some pairs."""

    def __init__(self, errors):
        self.errors = errors

    def __call__(self, alkali, gas, *others, **named):
        if (alkali, gas) in self.errors:
            raise self.errors[alkali, gas]
        return good_rates(alkali, gas, *others, **named)


@pytest.fixture(autouse=True)
def _invented(monkeypatch):
    monkeypatch.setattr(pertcalc.rates, "collision_rates", good_rates)


def test_all_is_well():
    result = run()
    assert (result.exit_code, result.stderr) == (0, "")
    assert "All 27 gating checks within their stated tolerance" in result.stdout
    assert "7 of the 22 measured pairs" in result.stdout


def test_a_failing_read_value_is_exit_4_after_everything_is_printed(monkeypatch):
    wrong = dataclasses.replace(published.WELLS[3], depth=12.0)
    monkeypatch.setattr(published, "WELLS", (*published.WELLS[:3], wrong, *published.WELLS[4:]))
    result = run()
    assert result.exit_code == 4
    assert result.stderr.startswith(
        "Error: 1 check failed the stated tolerance:\n  - Na-Ne X De: expected 12, found 7.57"
    )
    assert "FAILED: 1 of 27 gating checks" in result.stdout and "== Ours against measured" in result.stdout
    as_json = run("--json")
    assert as_json.exit_code == 4
    found = json.loads(as_json.stdout)
    assert found["passed"] is False and found["failed"] == ["Na-Ne X De"]


@pytest.mark.parametrize("factor, code", [(0.5, 0), (0.2, 4), (2.0, 0), (5.0, 4)])
def test_a_wrong_rate_is_exit_4(factor, code, monkeypatch):
    def scaled(alkali, gas, *others, **named):
        found = good_rates(alkali, gas, *others, **named)
        loss = found.multipole_loss["P3/2"][2]
        losses = found.multipole_loss["P3/2"] | {2: dataclasses.replace(loss, values=factor * loss.values)}
        return dataclasses.replace(found, multipole_loss=found.multipole_loss | {"P3/2": losses})

    monkeypatch.setattr(pertcalc.rates, "collision_rates", scaled)
    result = run("--quantity", "multipole_loss")
    assert result.exit_code == code
    assert ("Na-Xe P3/2 multipole_loss K=2 383 K" in result.stderr) == (code == 4)


def test_values_from_memory_never_fail(monkeypatch):
    rows = tuple(
        row if row.mark == "READ" else dataclasses.replace(row, value=1e3 * row.value, grade="high", error=None)
        for row in measurements()
    )
    wells = tuple(
        well if well.mark == "READ" else dataclasses.replace(well, depth=1e4, gates=True) for well in published.WELLS
    )
    monkeypatch.setattr(measured, "_all", lambda: rows)
    monkeypatch.setattr(published, "WELLS", wells)
    result = run("--all", "--json")
    assert (result.exit_code, result.stderr) == (0, "")
    found = json.loads(result.stdout)
    outside = [row for row in found["measured"] if row["outside"]]
    assert len(outside) > 60 and not any(row["gates"] for row in outside)


@pytest.mark.parametrize("words", [(), ("--all",), ("--method", "closed-form"), ("--method", "quantum", "--all")])
def test_text_stays_within_100_columns(words):
    result = run(*words)
    assert result.exit_code == 0, result.stderr
    assert max(len(line) for line in result.stdout.splitlines()) <= 100
    assert "our own output, not a validation" in result.stdout.replace("\n  ", " ")


def test_the_closed_form_gates_no_rate():
    found = json.loads(run("--method", "closed-form", "--json").stdout)
    assert not any(check["group"] == "rate" for check in found["checks"])
    assert not any("detailed balance" in check["name"] for check in found["checks"])
    assert all(row["ours"] is None for row in found["measured"] if row["quantity"] == "transfer")


def test_the_json_contract():
    result = run("--all", "--json", "--quantity", "fwhm", "--quantity", "shift")
    assert (result.exit_code, result.stderr) == (0, "")
    found = json.loads(result.stdout, parse_constant=lambda name: pytest.fail(f"{name} in JSON"))
    assert (found["schema"], found["version"]) == ("pertcalc.validation/1", __version__)
    assert found["quantities"] == ["fwhm", "shift"] and {row["quantity"] for row in found["measured"]} == {
        "fwhm",
        "shift",
    }
    assert len(found["measured"]) == 26 + 25 and found["everything"] and found["passed"]
    assert len(found["pairs"]) == found["pairs_total"] == 1 + 6 + 6 and found["missing"] == {}
    for check in found["checks"]:
        assert check["mark"] in ("READ", "FROM MEMORY", "EXACT LAW") and check["unit"] and check["source"]
        assert check["basis"] and not (check["gates"] and check["mark"] == "FROM MEMORY")
    for row in found["measured"]:
        assert row["unit"] and row["source"] and row["grade"] and row["ours_mark"] == "COMPUTED"
        assert (
            row["ratio"] is None
            if row["kind"] == "bound"
            else row["ratio"] == pytest.approx(row["ours"] / row["value"])
        )
    goals = {one["name"]: one["goal"] for one in found["method_differences"]["classes"]}
    assert goals["full width, D1 and D2"] == 0.02 and "COMPUTED" in found["method_differences"]["origin"]


def test_csv_is_flat_and_complete():
    result = run("--csv")
    rows = list(csv.DictReader(io.StringIO(result.stdout)))
    counts = {name: sum(row["record"] == name for row in rows) for name in ("check", "measured", "method", "median")}
    found = json.loads(run("--json").stdout)
    assert counts == {
        "check": len(found["checks"]),
        "measured": len(found["measured"]),
        "method": len(found["method_differences"]["classes"]),
        "median": len(found["medians"]),
    }
    assert all(None not in row and row["mark"] for row in rows) and "nan" not in result.stdout


def test_output_file(tmp_path):
    target = tmp_path / "v.txt"
    assert run("-o", str(target)).exit_code == 0 and target.read_text().startswith("Validation of pertcalc")
    again = run("-o", str(target))
    assert again.exit_code == 2 and "add --force" in again.stderr
    assert run("-o", str(target), "--force", "--quantity", "transfer").exit_code == 0
    assert "fwhm" not in target.read_text().split("==")[0]


@pytest.mark.parametrize(
    "words, message",
    [
        (
            "--quantity fwhn",
            "quantity 'fwhn' is not known. Did you mean fwhm? Known: fwhm, shift, transfer, multipole_loss.",
        ),
        ("--method guess", "method 'guess' is not known. Known: semiclassical, quantum, closed-form."),
        ("--json --csv", "--json and --csv exclude each other; give one of them."),
    ],
)
def test_bad_input_is_one_message_and_exit_2(words, message):
    result = run(*words.split())
    assert (result.exit_code, result.stdout, result.stderr) == (2, "", f"Error: {message}\n")


def test_a_pair_that_fails_is_listed_and_ends_with_its_code(monkeypatch):
    errors = {("Na", "Xe"): NotConvergedError("width", 1.0, 0.1, 0.01)}
    monkeypatch.setattr(pertcalc.rates, "collision_rates", Failing(errors))
    result = run()
    assert result.exit_code == 3 and "did not converge" in result.stderr
    assert "== Not in this result" in result.stdout and "Not checked in this run: Na-Xe." in result.stdout
    assert "7 of the 22" in result.stdout and "4 measured rates" in result.stdout


def test_ctrl_c_keeps_the_finished_pairs(monkeypatch):
    # One process: heavy pairs first, so Na-Ar stops the run after Na-Xe and Na-Kr.
    monkeypatch.setattr(pertcalc.rates, "collision_rates", Failing({("Na", "Ar"): KeyboardInterrupt()}))
    result = run("--json")
    found = json.loads(result.stdout)
    assert result.exit_code == 130 and found["interrupted"]
    assert {"Na-Xe", "Na-Kr"} <= set(found["pairs"]) and "Na-Ar" in found["missing"]
    assert result.stderr.startswith("Error: stopped by the user; not finished: Na-He, ")


def test_two_processes_give_the_same_answer():
    here, there = run("--json"), run("--json", "--jobs", "2")
    assert here.exit_code == there.exit_code == 0 and here.stdout == there.stdout


def test_the_command_line_knows_every_quantity():
    assert cli_options.QUANTITIES == measured.QUANTITIES


@pytest.mark.slow
def test_the_quick_validation_on_real_rates(monkeypatch):
    monkeypatch.undo()
    result = run("--jobs", "2")
    assert result.exit_code == 0, result.stderr
    assert "Rb-He P1/2 multipole_loss K=1: 3.40 published" in result.stdout
