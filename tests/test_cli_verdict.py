"""The command ``pertcalc verdict``: contract, formats, sentences, exact messages and exit codes.

Rates are invented (tests/report_fakes.py) except in the one real run; everything else of the cell is real.
"""

from __future__ import annotations

import csv
import io
import json
import math
import re
from dataclasses import replace
from typing import Any

import pytest
from click.testing import CliRunner

import pertcalc.vapour.verdict as module
from pertcalc.cli import cli
from pertcalc.cli_verdict import NO_GAS
from pertcalc.errors import NotConvergedError
from pertcalc.report import verdict_words
from pertcalc.report.verdict_text import verdict_text
from pertcalc.species import alkali
from pertcalc.vapour import question
from pertcalc.vapour.excited import COLLISIONS, DECAY, FIELD
from pertcalc.vapour.question import ask
from pertcalc.vapour.verdict import verdict
from tests.report_fakes import Broken, fake_rates
from tests.test_verdict import diffusion

REAL_RATES = module.collision_rates
CELL_EXAMPLES = "'sphere 25 mm' (diameter), 'cylinder 25 mm x 50 mm' (diameter x length) or 'cube 10 mm' (edge)."


@pytest.fixture(autouse=True)
def _invented_rates(monkeypatch):
    monkeypatch.setattr(module, "collision_rates", fake_rates)
    monkeypatch.setattr(module, "diffusion", diffusion)


@pytest.fixture
def no_rates(monkeypatch):
    """Bad input must be refused before the long computation."""

    def refuse(*_: Any, **__: Any) -> None:
        raise AssertionError("collision rates were computed")

    monkeypatch.setattr(module, "collision_rates", refuse)


def run(*words: str):
    """Run one command in this process; a traceback would be in result.exception."""
    result = CliRunner().invoke(cli, ["verdict", *words], prog_name="pertcalc")
    assert result.exception is None or isinstance(result.exception, SystemExit), result.exception
    return result


def spoken(words: str) -> list[str]:
    """Arguments, "_" for a space inside one."""
    return [word.replace("_", " ") for word in words.split()]


def flat(text: str) -> str:
    """Text without its line ends."""
    return " ".join(text.split())


def as_json(words: str) -> dict[str, Any]:
    result = run(*spoken(words), "--json")
    assert (result.exit_code, result.stderr) == (0, "")
    return json.loads(result.stdout, parse_constant=lambda name: pytest.fail(f"{name} in JSON"))


def rows(words: str) -> dict[str, dict[str, str]]:
    result = run(*spoken(words), "--csv")
    assert result.exit_code == 0 and all(line.startswith("warning: ") for line in result.stderr.splitlines())
    return {row["line"]: row for row in csv.DictReader(io.StringIO(result.stdout))}


def numbers(value: Any) -> list[float]:
    """Every number in a JSON object."""
    if isinstance(value, dict):
        return [number for one in value.values() for number in numbers(one)]
    if isinstance(value, list):
        return [number for one in value for number in numbers(one)]
    return [value] if isinstance(value, float) else []


# JSON -----------------------------------------------------------------------------------------------------------------


def test_names_known_to_the_command_line_are_those_of_the_library():
    assert NO_GAS == question.NO_GAS


CELLS = [
    "Cs Ar",
    "Na He --field 0_G --wall coated",
    "K Xe --pressure 1_mTorr --field 1e-6_G",
    "Li Ne --field 1000_G",
    "Rb He --power 1_W --beam-diameter 2_cm --temperature 150_degC --pressure 700_Torr",
    "Cs none --wall coated --cell cube_1_cm",
    "Rb --gas none --power 1_mW --beam-diameter 5_mm --line D2 --detuning -1_GHz --linewidth 2_MHz",
]


@pytest.mark.parametrize("words", CELLS)
def test_json_follows_the_contract(words):
    found = as_json(words)
    assert found["schema"] == "pertcalc.verdict/1"
    assert set(found["W2"]) == {"D1", "D2"} and found["W2"]["D1"] == 0 < found["W2"]["D2"] < 0.5
    assert set(found["levels"]) == {"S1/2", "P1/2", "P3/2"}
    for level, ranks in (("P1/2", "1"), ("P3/2", "123")):
        assert list(found["levels"][level]) == list(ranks)
        for one in found["levels"][level].values():
            assert one["radiative_s"] > 0 and one["hanle_field_G"] >= one["hanle_free_field_G"] > 0
            assert one["larmor_mark"] == one["g_factor"]["mark"] and one["g_factor"]["source"]
            for field in ("hanle_field", "crossover_field"):
                low, high = one[f"{field}_low_G"], one[f"{field}_high_G"]
                assert 0 < low <= high == pytest.approx(one[f"{field}_G"], rel=1e-12)
            assert one["dominant"] in (DECAY, COLLISIONS, FIELD)
            effects = {DECAY: one["radiative_s"], COLLISIONS: one["collisional_s"], FIELD: one["larmor_rad_s"]}
            assert one["dominant"] == max(effects, key=effects.get)
            if found["noble_gas"] is None:
                assert one["collisional_s"] == 0 and one["crossover_pressure_Torr"] is None
            else:
                assert one["collisional_s"] > 0 and one["crossover_pressure_Torr"] > 0
                at_crossover = one["collisional_s"] * one["crossover_pressure_Torr"]
                rival = max(one["radiative_s"], one["larmor_rad_s"])
                assert at_crossover / found["conditions"]["pressure_torr"] == pytest.approx(rival, rel=1e-9)
    ground = found["levels"]["S1/2"]
    assert {"relaxation_s", "larmor_rad_s", "hanle_field_G", "dominant", "crossover_pressure_Torr"} <= set(ground)
    for process in ground["processes"]:
        assert (process["rate_s"] is None) == bool(process["reason"])
    assert all(map(math.isfinite, numbers(found)))
    assert set(found["sentences"]) == set(found["levels"])


def test_json_survives_a_round_trip_through_text():
    text = run("Cs", "Ar", "--json").stdout
    assert json.dumps(json.loads(text), indent=2) == text.rstrip("\n")
    assert "NaN" not in text and "Infinity" not in text


def test_conditions_name_every_default():
    found = as_json("Cs Ar --pressure 5_Torr")["conditions"]
    assert found["defaults"] == ["temperature", "fill temperature", "field", "cell"]
    assert found["defaults_origin"] == "common practice, no source"
    bare = as_json("Cs none")
    assert bare["method"] is None and bare["curves"] is None and bare["diffusion"] is None
    assert bare["conditions"]["pressure_torr"] is None and bare["conditions"]["gas_density_cm3"] == 0


def test_light_shows_in_the_ground_level_only_when_given():
    dark, lit = as_json("Cs Ar"), as_json("Cs Ar --power 1_mW --beam-diameter 5_mm")
    assert dark["pumping"] is None and dark["levels"]["S1/2"]["pumping_s"] is None
    assert lit["pumping"]["line"] == "D1" and lit["levels"]["S1/2"]["pumping_s"]["value"] > 0
    fields = lit["levels"]["S1/2"]["hanle_fields_G"]
    assert fields["relaxation + pumping"] > fields["relaxation"]
    # One number: all damping along the beam, exchange (which only dephases) left out.
    assert lit["levels"]["S1/2"]["hanle_field_G"] == fields["relaxation + pumping"]
    assert dark["levels"]["S1/2"]["hanle_field_G"] == dark["levels"]["S1/2"]["hanle_fields_G"]["relaxation"]
    assert "transit through the beam" in [one["name"] for one in lit["levels"]["S1/2"]["processes"]]
    assert dark["levels"]["P3/2"] == lit["levels"]["P3/2"]


# CSV ------------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("words", ["Cs Ar --pressure 3_Torr", "Na He", "Rb none"])
def test_csv_holds_the_rates_of_models_of_polarised_lines(words):
    table, found = rows(words), as_json(words)
    assert list(table) == ["D1", "D2"]
    n, T = found["conditions"]["gas_density_cm3"], found["conditions"]["temperature_K"]
    rates = None if n == 0 else fake_rates(found["alkali"], found["noble_gas"], T)
    for line, row in table.items():
        level = {"D1": "P1/2", "D2": "P3/2"}[line]
        R, inelastic, elastic = (float(row[name]) for name in ("Gamma_R", "Gamma_I", "Gamma_E"))
        assert R == pytest.approx(alkali(found["alkali"]).decay_rate(level)) and row["unit"] == "s^-1"
        # Gamma_E + Gamma_I = collisional full width; D_K = n (loss_K - loss_0): definitions of notes/verdict.md.
        width = 0.0 if rates is None else n * float(rates.fwhm[line].values[0])
        assert inelastic + elastic == pytest.approx(width, rel=1e-9)
        for K, one in found["levels"][level].items():
            assert float(row[f"D{K}"]) + inelastic == pytest.approx(one["collisional_s"], rel=1e-9)
        assert float(row["W2"]) == found["W2"][line] and row["W2_mark"] == found["scattering"][line]["W2"]["mark"]
    assert table["D1"]["D2"] == "" and table["D2"]["D3"] != ""
    assert table["D1"]["method"] == ("" if rates is None else "semiclassical")


# Text -----------------------------------------------------------------------------------------------------------------

LIGHT = "--power 1_W --beam-diameter 2_cm"
TEXTS = [
    *(f"{symbol} {gas}" for symbol in ("Li", "Na", "K", "Rb", "Cs") for gas in ("He", "Xe", "none")),
    *(f"{symbol} none --wall coated {LIGHT}" for symbol in ("Li", "Na", "K", "Rb", "Cs")),
    *(f"Cs Ar --field {field} {light}" for field in ("0_G", "1e-6_G", "1_G", "1000_G") for light in ("", LIGHT)),
    f"Na Ar --pressure 5_atm --field 1000_G --wall coated --line D2 {LIGHT}",
    f"Li Xe --pressure 100_atm {LIGHT}",
    "Cs Xe --pressure 1e-7_Torr --field 1000_G",
    "Cs Ar --pressure 5_atm",
    "Cs He --pressure 5_atm --field 2e5_G",
    "K He --temperature 300_degC --cell cylinder_25_mm_x_50_mm",
]


@pytest.mark.parametrize("words", TEXTS)
def test_text_fits_a_hundred_columns(words):
    result = run(*spoken(words))
    assert (result.exit_code, result.stderr) == (0, "")
    wide = [line for line in result.stdout.splitlines() if len(line) > 100 and "http" not in line]
    assert wide == []
    assert not re.search(r"\bnan\b|\binf\b|None", result.stdout)


def test_text_answers_every_question_of_the_job():
    text = flat(run("Cs", "Ar").stdout)
    for words in (
        "What rules each level",
        "S1/2: of the known processes wall relaxes the orientation most",
        "P1/2: collisions rule the orientation (K=1)",
        "P3/2: collisions rule the alignment (K=2)",
        "radiative decay does",
        "G the field does",
        "s^-1",
        "rad/s",
        "g_F = 0.4002 of F=5",
        "FROM MEMORY",
        "READ",
        "COMPUTED",
        "common practice, no source",
        "optical depth",
        "Gamma_I",
        "depopulation pumping",
        "photons per polarised atom",
        "walls and gas relax it equally at 108 +-",
        "radiative decay 3.29e+07 +-",
    ):
        assert words in text, words


def test_text_says_what_is_unknown_and_why():
    text = flat(run("Li", "Ne").stdout)
    assert "of the known processes wall relaxes the orientation most" in text
    assert "unknown: spin destruction by gas, weakly bound pairs, alkali-alkali spin destruction" in text
    assert "no published spin destruction by gas of Li and Ne in the tables" in text


def test_a_vapour_without_gas_is_not_mixed():
    text = flat(run("Cs", "none").stdout)
    assert "Cs without buffer gas" in text and "collisions mix P1/2 not at all" in text
    assert "12.0 photons per polarised atom" in text
    assert "Torr" not in text.split("How to read")[0].split("== Excited")[0]


def test_mixing_is_called_fast_by_its_ratio_to_the_decay():
    """Invented K + Ar: 4.4 times the decay, about equal, and a tenth; the kind of pumping is mixed in all three."""
    for pressure, said in ((29.0, "faster than"), (6.6, "about as fast as"), (1.0, "more slowly than")):
        mixing = verdict(ask("K", "Ar", pressure_torr=pressure)).mixing["D1"]
        assert mixing.pumping == "mixed"
        assert f"collisions mix P1/2 {said} it decays" in verdict_words.mixing_sentence(mixing)


def test_processes_of_one_size_are_said_to_be_equal():
    found = verdict(ask("Cs", "Ar", pressure_torr=100.0))
    assert found.ground.comparable == ("wall", "spin destruction by gas")
    said = verdict_words.ground_sentence(found.ground)
    assert "wall and spin destruction by gas weigh about equally on the orientation (largest" in said


SENTENCES = [
    ("Cs Ar --field 0_G", "P3/2", r"^P3/2: collisions rule the alignment \(K=2\), 24 times radiative decay; "
     r"below 0\.8\d+ \+- 0\.16 Torr radiative decay does, above \d+ to \d+ G the field does\.$"),
    ("Cs none --field 0_G", "P1/2", r"^P1/2: radiative decay rules the orientation \(K=1\), alone; above 39\.3 G the"),
    ("Cs none --field 1000_G", "P3/2", r"^P3/2: the field rules the alignment \(K=2\), 3\d\d times radiative decay; "
     r"below 9\.34 G radiative decay does\.$"),
    ("Cs Ar --field 1e4_G", "P3/2", r"^P3/2: the field rules the alignment \(K=2\), 1\d\d times collisions; above \d+ "
     r"\+- \d+ Torr \(beyond the range of the treatment\) collisions do, below \d+ to \d+ G collisions do\.$"),
    ("Cs Ar --field 80_G", "P3/2", r"below [\d.]+ \+- [\d.]+ Torr the field does,"),
    ("Cs none --field 12_G", "P3/2", r"^P3/2: the field and radiative decay weigh about equally on the alignment"),
    ("Cs He --pressure 4_Torr", "P3/2", r"^P3/2: collisions and radiative decay weigh about equally on the alignment"),
]  # fmt: skip


@pytest.mark.parametrize(("words", "level", "pattern"), SENTENCES, ids=[words for words, *_ in SENTENCES])
def test_sentences(words, level, pattern):
    assert re.search(pattern, as_json(words)["sentences"][level]), as_json(words)["sentences"][level]


def test_the_field_across_the_ground_level_has_its_own_scale():
    """Gauss for the excited levels, below 0.01 G for a long-lived ground level: common practice, no source."""
    found = as_json("Cs none")
    assert found["levels"]["P3/2"]["2"]["hanle_field_G"] > 1
    assert 0 < found["levels"]["S1/2"]["crossover_field_G"] < 0.01
    assert "a field across it above 0.0061 G (as here) turns it away first" in found["sentences"]["S1/2"]
    weak = as_json("Cs none --field 1_mG")["sentences"]["S1/2"]
    assert "(not reached here)" in weak


WARNED = [
    ("Li Ar --field 1_T", "the Zeeman energy is 1.4 of the fine structure of Li"),
    ("Cs Ar --temperature 130_degC", "along the beam (rates at the entrance do not hold at the far end)"),
    ("Cs Xe --pressure 5_atm", "collisions overlap, the impact and binary assumptions fail"),
    ("Cs none --wall coated --temperature 100_degC", "An alkane coating melts"),
    ("Cs none --power 1_W --beam-diameter 1_mm", "saturat"),
]


@pytest.mark.parametrize(("words", "warning"), WARNED, ids=[words for words, _ in WARNED])
def test_doubtful_conditions_are_warned_about_and_answered(words, warning):
    assert any(warning in one for one in as_json(words)["warnings"])
    text = flat(run(*spoken(words)).stdout)
    assert warning in text and "== Warnings" in text


def test_csv_says_its_warnings_on_stderr_one_line_each():
    words = ("Cs", "Ar", "--temperature", "130 degC")
    result, warnings = run(*words, "--csv"), as_json("Cs Ar --temperature 130_degC")["warnings"]
    assert warnings and result.stderr.splitlines() == [f"warning: {one}" for one in warnings]
    assert "warning" not in result.stdout


def test_trapping_takes_one_line_per_line_and_one_explanation():
    warnings = as_json("Cs none --temperature 130_degC")["warnings"]
    lines = [one for one in warnings if "optical depth" in one]
    assert [one[:3] for one in lines] == ["D1:", "D2:"] and all("needs a quenching gas" in one for one in lines)
    (explained,) = [one for one in warnings if one.startswith("Radiation trapping")]
    assert warnings.index(explained) > warnings.index(lines[1])
    text = run("Cs", "none", "--temperature", "130 degC").stdout
    assert "quenching gas" in text and "to pump on it" in text
    # Thick along the beam, thin to the wall: pumping needs no quenching gas.
    text = flat(run("Cs", "Ar", "--temperature", "35 degC", "--cell", "cylinder 2 mm x 100 mm").stdout)
    assert "along the beam" in text and "needs a quenching gas" not in text and "not needed" in text


def test_a_range_stands_where_neither_g_factor_holds():
    """Cs P3/2, I = 7/2: g_J/g_F = F/J = 10/3."""
    found = as_json("Cs Ar")
    assert found["hyperfine"]["P3/2"]["g_factor"] is None and found["hyperfine"]["P1/2"]["g_factor"] == "g_F"
    one = found["levels"]["P3/2"]["2"]
    assert one["hanle_field_high_G"] / one["hanle_field_low_G"] == pytest.approx(10 / 3, rel=1e-9)
    assert one["crossover_field_high_G"] / one["crossover_field_low_G"] == pytest.approx(10 / 3, rel=1e-9)
    text = flat(run("Cs", "Ar").stdout)
    assert f" {one['hanle_field_low_G']:.0f} to {one['hanle_field_high_G']:.0f} " in text
    assert "neither g_J = 1.334 nor g_F = 0.4002 of F=5 [" in text and "see the curve" not in text


def test_whose_rank_it_is_is_said_with_its_reason():
    weak = flat(run("Na", "Ar", "--pressure", "1000 Torr").stdout)
    assert "23Na unresolved within decay and collisions, so rank K is electronic even in this weak field" in weak
    strong = flat(run("Cs", "none", "--field", "1 T").stdout)
    assert "nuclear spin of 133Cs decoupled in this field, so rank K is electronic, with g_J = 1.334 [" in strong


def test_a_crossover_pressure_says_what_it_is_worth(monkeypatch):
    """Past the pressure where collisions overlap, or with an error larger than itself, it is no plain number."""
    strong = as_json("Cs Ar --field 1e4_G")
    assert strong["levels"]["P3/2"]["2"]["crossover_pressure_caveats"] == ["beyond the range of the treatment"]
    assert "! beyond the range of the treatment: collisions overlap above" in run("Cs", "Ar", "--field", "1 T").stdout
    assert as_json("Cs Ar")["levels"]["P3/2"]["2"]["crossover_pressure_caveats"] == []

    def vague(*args: Any, **named: Any):
        rates = fake_rates(*args, **named)
        loss = rates.multipole_loss["P1/2"][1]
        loss = replace(loss, model_error=loss.model_error * 10)
        return replace(rates, multipole_loss=dict(rates.multipole_loss, **{"P1/2": {1: loss}}))

    monkeypatch.setattr(module, "collision_rates", vague)
    found, text = as_json("Cs Ar"), run("Cs", "Ar").stdout
    assert found["levels"]["P1/2"]["1"]["crossover_pressure_caveats"] == ["order of magnitude only"]
    assert "Torr (order of magnitude only) radiative decay does" in found["sentences"]["P1/2"]
    assert re.search(r"P1/2\*.* ~\d", text) and "~ order of magnitude only" in text


def test_every_number_of_the_ground_table_has_mark_and_source():
    text = run("Rb", "Ar", "--power", "1 uW", "--beam-diameter", "5 mm").stdout
    table = text.split("== Ground level")[1].split("spin exchange is")[0]
    for name in ("sum of the known", "pumping light", "field (F=3, g_F=0.3337)"):
        (row,) = [line for line in table.splitlines() if line.startswith(f"  {name}")]
        assert re.search(r"(FROM MEMORY|COMPUTED) +\[\d+\]$", row), row
    assert "sum of wall, transit through the beam, spin destruction by gas" in flat(text)
    scattered = text.split("== Scattered light")[1].split("== Absorption")[0]
    assert len(re.findall(r"FROM MEMORY$", scattered, re.MULTILINE)) == 2  # lifetime and hyperfine constants are


def test_a_rate_as_uncertain_as_itself_says_so():
    assert "only the order of magnitude is known" not in run("Cs", "Ar").stdout
    ground = verdict(ask("Rb", "Kr")).ground
    rough = [p.name for p in ground.processes if p.rate and p.rate.error and p.rate.error >= p.rate.value]
    assert rough
    text = run("Rb", "Kr").stdout
    assert all(f"  {name}: only the order of magnitude is known\n" in text for name in rough)


def test_small_shifts_are_in_megahertz():
    text = run("Cs", "Ar", "--pressure", "10 mTorr").stdout
    shift = 1e3 * as_json("Cs Ar --pressure 10_mTorr")["absorption"]["D1"]["shift_GHz"]
    assert 0 < abs(shift) < 1 and f" {shift:.4f} MHz " in text


# Files ----------------------------------------------------------------------------------------------------------------


def test_output_file(tmp_path):
    place = tmp_path / "rates.csv"
    result = run("Na", "none", "--csv", "-o", str(place))
    assert (result.exit_code, result.stdout, result.stderr) == (0, "", f"wrote {place}\n")
    assert place.read_text().startswith("alkali,noble_gas,line,upper_level,Gamma_R,Gamma_I,Gamma_E,D1,D2,D3,unit,")


@pytest.mark.usefixtures("no_rates")
def test_existing_files_are_kept_unless_forced(tmp_path):
    place = tmp_path / "kept.txt"
    place.write_text("mine")
    for option in ("-o", "--plot", "--plot-hanle"):
        result = run("Na", "Ar", option, str(place))
        assert (result.exit_code, result.stdout) == (2, "")
        assert (
            result.stderr
            == f"Error: output file = '{place}' exists; add --force to replace it, or name another file.\n"
        )
    assert place.read_text() == "mine"


def test_force_replaces(tmp_path):
    place = tmp_path / "kept.txt"
    place.write_text("mine")
    assert run("Na", "none", "-o", str(place), "--force").exit_code == 0
    assert place.read_text().startswith("Na without buffer gas")


def test_both_ways_to_name_the_gas_agree():
    assert run("cs", "--gas", "ar").stdout == run("Cs", "Ar").stdout == run("Cs", "ar", "--gas", "AR").stdout
    assert run("Cs", "NONE").stdout == run("Cs", "--gas", "none").stdout


def test_curves_option_and_progress_reach_the_library(monkeypatch):
    seen = {}

    def spy(*args: Any, **named: Any):
        seen.update(named)
        return fake_rates(*args, **named)

    monkeypatch.setattr(module, "collision_rates", spy)
    assert run("Na", "Ar", "--method", "quantum").exit_code == 0
    assert seen["method"] == "quantum" and seen["curves"] is None


def test_a_failure_of_the_rates_keeps_its_exit_code(monkeypatch):
    failure = NotConvergedError("quantum", 1.0, 0.2, 0.01)
    monkeypatch.setattr(module, "collision_rates", Broken({"Ar": failure}))
    result = run("Na", "Ar")
    assert (result.exit_code, result.stdout, result.stderr) == (3, "", f"Error: {failure}\n")


# Bad input ------------------------------------------------------------------------------------------------------------

BAD_INPUT = [
    ("Rbb Ar", 2, "alkali 'Rbb' is not known. Did you mean Rb? Known: Li, Na, K, Rb, Cs."),
    ("Rb Argon", 2, "noble gas 'Argon' is not known. Did you mean Ar? Known: He, 3He, Ne, Ar, Kr, Xe."),
    ("Rb", 2, "no gas is named: add GAS after the alkali, or --gas none for a cell without buffer gas."),
    ("Rb Ar --gas Xe", 2, "GAS = Ar and --gas = Xe differ; name the gas once."),
    ("Rb Ar --gas none", 2, "GAS = Ar and --gas = none differ; name the gas once."),
    ("Rb none --pressure 1_Torr", 2, "gas = none has no --pressure: leave it out, or name a gas."),
    (
        "Rb none --fill-temperature 300 --curves x.toml",
        2,
        "gas = none has no --fill-temperature, --curves: leave it out, or name a gas.",
    ),
    ("Rb Ar --field=-1_G", 2, "--field = '-1 G': must not be negative; write --field as '0.5 G' or '50 uT'."),
    ("Rb Ar --field 5", 2, "--field = '5': a unit is missing; write --field as '0.5 G' or '50 uT'."),
    (
        "Rb Ar --pressure 0_Torr",
        2,
        "--pressure = '0 Torr': must be above zero; write --pressure as '20 Torr', '3 kPa' or '5 mbar'.",
    ),
    (
        "Rb Ar --temperature 0",
        2,
        "--temperature = '0': is 0 K, and an absolute temperature must be above 0 K; write --temperature as '333 K' or "
        "'60 degC'.",
    ),
    (
        "Rb Ar --power 1_mW",
        2,
        "--power = 0.001 W needs the size of the beam: add --beam-diameter, such as --beam-diameter '5 mm'.",
    ),
    ("Rb Ar --line D1", 2, "--line given without --power: add --power, such as --power '10 mW'."),
    (
        "Rb Ar --detuning 1_GHz --linewidth 1_MHz",
        2,
        "--detuning, --linewidth given without --power: add --power, such as --power '10 mW'.",
    ),
    ("Rb Ar --power 0_W --beam-diameter 1_cm", 2, "power = 0 W must be finite and > 0; give another value."),
    (
        "Rb Ar --power 1_mW --beam-diameter 3_cm",
        2,
        "--beam-diameter = 3 cm is larger than the cell (sphere, diameter 2.5 cm): give at most 2.5 cm, or a larger "
        "--cell.",
    ),
    (
        "Rb Ar --beam-diameter 2_cm --cell cube_1_cm",
        2,
        "--beam-diameter = 2 cm is larger than the cell (cube, edge 1 cm): give at most 1 cm, or a larger --cell.",
    ),
    (
        "Rb Ar --power 1_mW --beam-diameter 5_mm --detuning 1e9_rad/s",
        2,
        "--detuning = '1e9 rad/s': 'rad/s' is not in hertz; write --detuning as '500 MHz' or '-2 GHz'.",
    ),
    (
        "Rb Ar --power 1_mW --beam-diameter 5_mm --detuning 5_THz",
        2,
        "detuning = 5000 GHz must be finite and within 1000 GHz of the line; give another value.",
    ),
    (
        "Na Ar --power 1_mW --beam-diameter 5_mm --detuning 300_GHz",
        2,
        "detuning = 300 GHz is more than half the fine structure (257.8 GHz) away from D1: name line D2 and count the "
        "detuning from it.",
    ),
    (
        "Li none --power 1_mW --beam-diameter 5_mm --line D2 --detuning=-6_GHz",
        2,
        "detuning = -6 GHz is more than half the fine structure (5.022 GHz) away from D2: name line D1 and count the "
        "detuning from it.",
    ),
    (
        "Rb Ar --field 1.1e6_G",
        2,
        "--field = 1.1e+06 G is above 1e+06 G: the Zeeman energy there is comparable with the fine structure of every "
        "alkali (from 8 % of it, in Cs, to far above it, in Li), and no laboratory has such a field; give a smaller "
        "one.",
    ),
    (
        "Rb Ar --power 1_mW --beam-diameter 5_mm --linewidth=-1_GHz",
        2,
        "laser linewidth = -1 GHz must be finite and >= 0 (0 means narrow); give another value.",
    ),
    (
        "Rb Ar --cell box_3_mm",
        2,
        f"--cell = 'box 3 mm': must begin with sphere, cylinder, cube; write --cell as {CELL_EXAMPLES}",
    ),
    (
        "Rb Ar --cell cylinder_25_mm",
        2,
        "--cell = 'cylinder 25 mm': a cylinder needs diameter x length, 2 lengths, not 1; write --cell as "
        f"{CELL_EXAMPLES}",
    ),
    (
        "Rb Ar --cell sphere_25",
        2,
        f"--cell = 'sphere 25': diameter = '25': a unit is missing; write --cell as {CELL_EXAMPLES}",
    ),
    (
        "Rb Ar --method closed-form",
        2,
        "method = 'closed-form' does not know fine-structure transfer and the orientation of P1/2, which a verdict "
        "needs. Take semiclassical or quantum.",
    ),
    ("Rb Ar --method foo", 2, "method 'foo' is not known. Known: semiclassical, quantum, closed-form."),
    ("Rb Ar --json --csv", 2, "--json and --csv exclude each other; give one of them."),
    (
        "Rb none --plot x.png",
        2,
        "--plot draws rates against pressure, and gas = none has no pressure; leave --plot out.",
    ),
    ("Rb Ar --plot x.pdf", 2, "figure file = 'x.pdf': must end in .png or .svg; choose one of these"),
    ("Rb none --plot-hanle x", 2, "figure file = 'x': must end in .png or .svg; choose one of these"),
    ("Rb Ar -o no/x.txt", 2, "output file = 'no/x.txt': the folder 'no' does not exist; make it first."),
    (
        "Rb Ar --temperature 1500",
        1,
        "temperature of the Rb vapour = 1500 K is outside 298 .. 600 K. The vapour-pressure formula does not hold "
        "there: choose a temperature inside.",
    ),
]


@pytest.mark.usefixtures("no_rates")
@pytest.mark.parametrize(("words", "code", "message"), BAD_INPUT, ids=[words for words, *_ in BAD_INPUT])
def test_bad_input_gives_one_message_and_its_exit_code(words, code, message, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    result = run(*spoken(words))
    assert (result.exit_code, result.stdout, result.stderr) == (code, "", f"Error: {message}\n")
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    ("words", "message"),
    [
        ("", "Missing argument 'ALKALI'."),
        ("Rb Ar --wall paraffin", "Invalid value for '--wall': 'paraffin' is not one of 'bare', 'coated'."),
        ("Rb Ar --line D3", "Invalid value for '--line': 'D3' is not one of 'D1', 'D2'."),
        ("Rb Ar --pres 1", "No such option '--pres'. Did you mean '--pressure'?"),
    ],
)
def test_bad_usage_is_exit_2_with_a_hint_of_click(words, message):
    result = run(*spoken(words))
    assert (result.exit_code, result.stdout) == (2, "")
    assert f"Error: {message.split('.')[0]}" in result.stderr and "Traceback" not in result.stderr


def test_an_unusable_curve_file_is_exit_1(tmp_path):
    broken = tmp_path / "broken.toml"
    broken.write_text("id = 3\n")
    result = run("Rb", "Zz", "--curves", str(broken))
    assert (result.exit_code, result.stdout) == (1, "") and result.stderr.startswith(f"Error: {broken}: ")


def test_help_has_examples_and_the_words_of_the_job():
    text = run("--help").stdout
    assert "pertcalc verdict Cs --gas none" in text and "Gamma_R, Gamma_I, Gamma_E, D1, D2" in flat(text)


# One real run ---------------------------------------------------------------------------------------------------------


def test_real_rubidium_in_argon(monkeypatch):
    """All three kinds of process with a published rate; where the answer changes lies near what it should be."""
    monkeypatch.setattr(module, "collision_rates", REAL_RATES)
    found = as_json("Rb Ar --pressure 20_Torr --field 0.1_G")
    assert found["curves"]["id"] == "rb-ar_default" and found["method"] == "semiclassical"
    one = found["levels"]["P3/2"]["2"]
    assert one["dominant"] == COLLISIONS and found["mixing"]["D2"]["pumping"] == "depopulation"
    # Order of the pressure that halves the alignment: cross sections of 100 .. 500 A^2, common practice, no source.
    speed_cm_s, n_per_Torr = 5.1e4, 3.3e16
    for sigma_A2, bound in ((500, min), (100, max)):
        p = one["radiative_s"] / (n_per_Torr * speed_cm_s * sigma_A2 * 1e-16)
        assert bound(p, one["crossover_pressure_Torr"]) == p
    assert found["levels"]["S1/2"]["unknown"] == []


@pytest.mark.slow
@pytest.mark.parametrize("symbol", ["Li", "Na", "K", "Rb", "Cs"])
@pytest.mark.parametrize("gas", ["He", "Ne", "Ar", "Kr", "Xe"])
def test_real_texts_of_every_pair_fit(symbol, gas, monkeypatch):
    monkeypatch.setattr(module, "collision_rates", REAL_RATES)
    for pressure in (1e-3, 20.0, 3800.0):
        text = verdict_text(verdict(ask(symbol, gas, pressure_torr=pressure, power_W=1.0, beam_diameter_cm=2.0)))
        assert [line for line in text.splitlines() if len(line) > 100 and "http" not in line] == []
