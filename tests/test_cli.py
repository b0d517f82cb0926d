"""The command line: words in, exit codes and exact messages out. Rates are invented here (tests/report_fakes.py)."""

from __future__ import annotations

import csv
import io
import json
import re
import subprocess
import sys
import time

import click
import pytest
from click.shell_completion import ShellComplete
from click.testing import CliRunner

import pertcalc.rates
from pertcalc import __version__, species
from pertcalc.cli import cli
from pertcalc.cli_options import METHODS, progress_bar
from pertcalc.errors import NotConvergedError
from tests.report_fakes import Broken, fake_rates, pertcalc_error

REAL_RATES = pertcalc.rates.collision_rates


@pytest.fixture(autouse=True)
def _invented_rates(monkeypatch):
    monkeypatch.setattr(pertcalc.rates, "collision_rates", fake_rates)


@pytest.fixture
def real_rates(monkeypatch, _invented_rates):
    """The real library, which refuses bad input before it computes."""
    monkeypatch.setattr(pertcalc.rates, "collision_rates", REAL_RATES)


def run(*words: str):
    """Run one command in this process; a traceback would be in result.exception."""
    result = CliRunner().invoke(cli, list(words), prog_name="pertcalc")
    assert result.exception is None or isinstance(result.exception, SystemExit), result.exception
    return result


TEMPERATURE_HINT = "write --temperature as '333 K' or '60 degC'."
PRESSURE_HINT = "write --pressure as '20 Torr', '3 kPa' or '5 mbar'."
BAD_INPUT = [
    ("report Rbb", 2, "alkali 'Rbb' is not known. Did you mean Rb? Known: Li, Na, K, Rb, Cs."),
    ("rates Rb Argon", 2, "noble gas 'Argon' is not known. Did you mean Ar? Known: He, 3He, Ne, Ar, Kr, Xe."),
    ("report Rb --gas Argon", 2, "noble gas 'Argon' is not known. Did you mean Ar? Known: He, 3He, Ne, Ar, Kr, Xe."),
    ("curves Rb Argon", 2, "noble gas 'Argon' is not known. Did you mean Ar? Known: He, 3He, Ne, Ar, Kr, Xe."),
    ("report Rb --pressure 20", 2, f"--pressure = '20': a unit is missing; {PRESSURE_HINT}"),
    ("report Rb --pressure much", 2, f"--pressure = 'much': must begin with a number; {PRESSURE_HINT}"),
    (
        "report Rb --pressure 20_K",
        2,
        f"--pressure = '20 K': 'K' is a temperature, but --pressure must be a pressure; {PRESSURE_HINT}",
    ),
    ("report Rb --pressure=-3_Torr", 2, f"--pressure = '-3 Torr': must be above zero; {PRESSURE_HINT}"),
    (
        "report Rb --temperature 0_K",
        2,
        f"--temperature = '0 K': is 0 K, and an absolute temperature must be above 0 K; {TEMPERATURE_HINT}",
    ),
    ("rates Rb Ar --temperature nan", 2, f"--temperature = 'nan': the number must be finite; {TEMPERATURE_HINT}"),
    (
        "report Rb --field 5",
        2,
        "--field = '5': a unit is missing; write --field as '0.5 G' or '50 uT'.",
    ),
    ("rates Rb Ar --method foo", 2, "method 'foo' is not known. Known: semiclassical, quantum, closed-form."),
    ("rates Rb Ar --json --csv", 2, "--json and --csv exclude each other; give one of them."),
    ("curves Rb --plot x.png", 2, "--plot draws one pair: give ALKALI and GAS, or --curves FILE."),
    ("curves Rb Ar --plot x.pdf", 2, "figure file = 'x.pdf': must end in .png or .svg; choose one of these"),
    ("curves Rb --check x.toml", 2, "--check FILE stands alone; give the file only."),
]


@pytest.mark.parametrize(("words", "code", "message"), BAD_INPUT, ids=[words for words, *_ in BAD_INPUT])
def test_bad_input_gives_one_message_and_its_exit_code(words, code, message, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    result = run(*(word.replace("_", " ") for word in words.split()))
    assert (result.exit_code, result.stdout) == (code, "")
    assert result.stderr == f"Error: {message}\n"
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    ("words", "message"),
    [
        ("report", "Missing argument 'ALKALI'."),
        ("report Rb --fil 3", "No such option '--fil'. Did you mean '--field'?"),
        ("reprot Rb", "No such command 'reprot'."),
        ("report Rb --jobs 0", "Invalid value for '--jobs': 0 is not in the range x>=1."),
    ],
)
def test_bad_usage_is_exit_2_with_a_hint_of_click(words, message):
    result = run(*words.split())
    assert result.exit_code == 2 and result.stdout == ""
    assert f"Error: {message.split('.')[0]}" in result.stderr and "Traceback" not in result.stderr


@pytest.mark.usefixtures("real_rates")
def test_temperatures_beyond_the_curves_are_exit_1():
    for words in (("rates", "Rb", "Ar", "--temperature", "5000"), ("report", "Rb", "--temperature", "5000 K")):
        result = run(*words)
        assert result.exit_code == 1 and result.stdout == ""
        assert result.stderr.startswith("Error: temperature = 5000 K is outside 20 .. 2000 K.")


@pytest.mark.parametrize("command", ["report Rb --curves", "rates Rb Ar --curves", "curves --curves", "curves --check"])
@pytest.mark.usefixtures("real_rates")
def test_unusable_curve_files_are_exit_1(command, tmp_path):
    nothing, broken = tmp_path / "nothing.toml", tmp_path / "broken.toml"
    broken.write_text("id = 3\n")
    for path, count in ((tmp_path, "1 problem"), (nothing, "1 problem"), (broken, r"[2-9] problems")):
        result = run(*command.split(), str(path))
        assert result.exit_code == 1 and result.stdout == ""
        assert re.match(rf"Error: {re.escape(str(path))}: {count}\n  - ", result.stderr)


def test_curves_of_another_pair_and_several_gases_are_refused(pair_file):
    result = run("report", "Rb", "--curves", pair_file)
    assert (result.exit_code, result.stderr.splitlines()[0][:40]) == (2, "Error: curves 'na-ar_default' are for Na")
    result = run("report", "Na", "--curves", pair_file, "--gas", "He", "--gas", "Ar")
    assert result.exit_code == 2
    assert result.stderr == (
        "Error: --gas = He, Ar: a curve file holds one pair, so give exactly one gas with --curves.\n"
    )
    assert run("report", "Na", "--curves", pair_file, "--gas", "He").exit_code == 2


def test_a_curve_file_brings_its_gas(pair_file):
    made = json.loads(run("report", "Na", "--curves", pair_file, "--json").stdout)
    assert [gas["noble_gas"] for gas in made["gases"]] == ["Ar"]


@pytest.fixture
def pair_file() -> str:
    """A curve file as a user would have one: here a copy of the default of Na-Ar."""
    from pertcalc.curves.files import default_folder

    return str(default_folder() / "na-ar_default.toml")


@pytest.fixture
def foreign_file(tmp_path, pair_file) -> str:
    """Curves of sodium with a perturber the species table does not have."""
    with open(pair_file, encoding="utf-8") as file:
        text = file.read()
    text = text.replace('id = "na-ar_default"', 'id = "na-zz"').replace('noble_gas = "Ar"', 'noble_gas = "Zz"')
    path = tmp_path / "na-zz.toml"
    path.write_text(text + "\n[masses_u]\nperturber = 50.0\n")
    return str(path)


def test_a_perturber_of_the_users_own(foreign_file):
    made = json.loads(run("report", "Na", "--curves", foreign_file, "--json").stdout)
    assert [(gas["noble_gas"], gas["measured"]) for gas in made["gases"]] == [("Zz", [])]
    assert run("rates", "Na", "Zz", "--curves", foreign_file).stdout.startswith("Na + Zz: ")
    assert run("curves", "Na", "Zz", "--curves", foreign_file).stdout.startswith("na-zz: Na-Zz")
    assert run("curves", "Na", "--curves", foreign_file).exit_code == 0
    refused = run("report", "Rb", "--curves", foreign_file)
    assert (refused.exit_code, refused.stderr) == (
        2,
        "Error: curves 'na-zz' are for Na-Zz, not Rb-Zz; name that pair or another file\n",
    )


RATES_KEYS = {
    "schema",
    "alkali",
    "noble_gas",
    "method",
    "curves",
    "temperatures_K",
    "lines",
    "levels",
    "numerical_error_relative",
    "model_error_relative",
    "work",
    "version",
}


def check_rates_contract(rates: dict, temperatures: list[float]) -> None:
    """Section 4 of the design: names, shapes and units of ``pertcalc.rates/1``."""
    assert rates["schema"] == "pertcalc.rates/1" and set(rates) >= RATES_KEYS
    assert set(rates["curves"]) == {"id", "sha256"}
    assert rates["temperatures_K"] == pytest.approx(temperatures)
    for tree in (rates, rates["numerical_error_relative"], rates["model_error_relative"]):
        assert set(tree["lines"]) == {"D1", "D2"} and set(tree["levels"]) == {"P1/2", "P3/2"}
        for line in tree["lines"].values():
            assert set(line) == {"fwhm_rad_s_cm3", "shift_rad_s_cm3"}
        for level, ranks in (("P1/2", {"1"}), ("P3/2", {"1", "2", "3"})):
            entry = tree["levels"][level]
            assert set(entry) == {"multipole_loss_cm3_s", "transfer_cm3_s", "multipole_transfer_cm3_s"}
            assert set(entry["multipole_loss_cm3_s"]) == ranks
            assert set(entry["multipole_transfer_cm3_s"]) == {"1"}
    for values in rates["lines"]["D1"].values():
        assert len(values) == len(temperatures) and all(isinstance(value, float) for value in values)


def test_rates_json_follows_the_contract():
    result = run("rates", "k", "ar", "--temperature", "368", "--temperature", "95 degC", "--json")
    assert (result.exit_code, result.stderr) == (0, "")
    rates = json.loads(result.stdout)
    check_rates_contract(rates, [368.0, 368.15])
    assert (rates["alkali"], rates["noble_gas"], rates["method"]) == ("K", "Ar", "semiclassical")


def test_what_a_method_cannot_know_is_null_with_a_reason():
    rates = json.loads(run("rates", "K", "Ar", "--method", "closed-form", "--json").stdout)
    assert rates["levels"]["P1/2"]["multipole_loss_cm3_s"]["1"] is None
    assert rates["levels"]["P1/2"]["transfer_cm3_s"] is None
    assert rates["reasons"]["levels.P1/2.transfer_cm3_s"]
    text = run("rates", "K", "Ar", "--method", "closed-form").stdout
    assert "P1/2 loss K=1, P1/2 transfer to P3/2" in text and "cannot know it" in text


def test_the_default_temperature_is_stated():
    assert "At 300 K" in run("rates", "K", "Ar").stdout
    assert "300 K" in run("rates", "--help").stdout


def test_rates_csv_has_one_row_per_number():
    rows = list(csv.DictReader(io.StringIO(run("rates", "K", "Ar", "--temperature", "300", "--csv").stdout)))
    assert len(rows) == 4 + 1 + 3 + 2 + 2
    first = rows[0]
    assert (first["quantity"], first["line_or_level"], first["unit"]) == ("fwhm", "D1", "rad s^-1 cm^3")
    # MHz/Torr from the contract's number; six digits are printed there.
    assert float(first["mhz_per_torr"]) == pytest.approx(float(first["value"]) * 1.536880e12 / 300, rel=1e-6)
    assert {row["mark"] for row in rows} == {"COMPUTED"}


@pytest.mark.parametrize("words", ["rates Rb Ar", "curves", "curves Rb", "curves Rb Ar", "report Cs"])
@pytest.mark.parametrize("format_option", ["", "--json", "--csv"])
def test_output_in_every_format_and_width(words, format_option):
    options = ["--jobs", "1"] if words.startswith("report") else []
    result = run(*words.split(), *options, *format_option.split())
    assert (result.exit_code, result.stderr) == (0, "")
    if format_option == "--json":
        parsed = json.loads(result.stdout, parse_constant=lambda name: pytest.fail(f"{name} in the JSON"))
        assert parsed["schema"].startswith("pertcalc.")
    elif format_option == "--csv":
        rows = list(csv.reader(io.StringIO(result.stdout)))
        assert len(rows) > 1 and {len(row) for row in rows} == {len(rows[0])}
    else:
        assert max(len(line) for line in result.stdout.splitlines()) <= 100
        assert "\x1b" not in result.stdout


def test_curves_list_shows_every_pair_with_wells_and_marks():
    lines = run("curves").stdout.splitlines()
    rows = [line.split() for line in lines if line[:2] in ("Li", "Na", "K-", "Rb", "Cs")]
    assert len(rows) == 75
    assert {" ".join(row[-2:]) if row[-1] == "MEMORY" else row[-1] for row in rows} <= set(species.MARKS)


def test_curves_plot_check_and_force(tmp_path, pair_file):
    picture = tmp_path / "na-ar.svg"
    assert run("curves", "Na", "Ar", "--plot", str(picture)).exit_code == 0
    assert picture.read_text().startswith("<?xml")
    refused = run("curves", "--curves", pair_file, "--plot", str(picture))
    assert refused.exit_code == 2
    assert refused.stderr == (
        f"Error: output file = {str(picture)!r} exists; add --force to replace it, or name another file.\n"
    )
    assert run("curves", "--curves", pair_file, "--plot", str(picture), "--force").exit_code == 0
    good = run("curves", "--check", pair_file)
    assert good.exit_code == 0 and good.stdout.startswith(f"{pair_file}: no problem found. Na-Ar, X ")


@pytest.mark.parametrize("words", ["report Rb --gas He --jobs 1", "rates Rb He", "curves Rb He"])
def test_output_files_are_never_replaced_unasked(words, tmp_path):
    target = tmp_path / "result.txt"
    first = run(*words.split(), "-o", str(target))
    assert (first.exit_code, first.stdout, first.stderr) == (0, "", f"wrote {target}\n")
    text = target.read_text()
    assert text == run(*words.split()).stdout
    target.write_text("mine")
    refused = run(*words.split(), "-o", str(target))
    assert refused.exit_code == 2 and target.read_text() == "mine"
    assert refused.stderr == (
        f"Error: output file = {str(target)!r} exists; add --force to replace it, or name another file.\n"
    )
    assert run(*words.split(), "-o", str(target), "--force").exit_code == 0
    assert target.read_text() == text and list(tmp_path.iterdir()) == [target]


def test_output_places_that_cannot_be(tmp_path):
    for place, words in ((tmp_path, "is a folder"), (tmp_path / "no" / "x.txt", "does not exist; make it first.")):
        result = run("rates", "Rb", "Ar", "-o", str(place))
        assert result.exit_code == 2 and words in result.stderr


def test_errors_of_the_library_carry_their_exit_code(monkeypatch):
    missed = NotConvergedError("D1 width", 4e-9, 0.2, 0.01)
    monkeypatch.setattr(pertcalc.rates, "collision_rates", Broken({"Ar": missed}))
    result = run("rates", "Rb", "Ar")
    assert (result.exit_code, result.stderr) == (3, f"Error: {missed}\n")


def test_one_failed_gas_does_not_lose_the_others(monkeypatch):
    monkeypatch.setattr(pertcalc.rates, "collision_rates", Broken({"Ne": pertcalc_error("no way; try Ar.", 1)}))
    result = run("report", "Rb", "--jobs", "1")
    assert (result.exit_code, result.stderr) == (1, "Error: no way; try Ar.\n")
    assert "== Rb + Xe" in result.stdout and "== Rb + Ne" not in result.stdout
    assert "  Ne   no way; try Ar." in result.stdout


def test_an_interrupt_keeps_what_is_finished(monkeypatch):
    monkeypatch.setattr(pertcalc.rates, "collision_rates", Broken({"Ar": KeyboardInterrupt()}))
    result = run("report", "Rb", "--jobs", "1", "--json")
    made = json.loads(result.stdout)
    assert result.exit_code == 130 and made["interrupted"] is True
    # Heavy gases come first; the table keeps the order of the request.
    assert [gas["noble_gas"] for gas in made["gases"]] == ["Kr", "Xe"]
    assert set(made["missing"]) == {"He", "Ne", "Ar"}
    assert result.stderr == "Error: stopped by the user; not finished: He, Ne, Ar.\n"


def test_an_interrupt_with_nothing_finished(monkeypatch):
    monkeypatch.setattr(pertcalc.rates, "collision_rates", Broken({"Ar": KeyboardInterrupt()}))
    result = run("rates", "Rb", "Ar")
    assert (result.exit_code, result.stdout) == (130, "")
    assert result.stderr == "Error: stopped by the user; nothing was finished.\n"


def test_a_full_disk_is_one_message():
    command = [sys.executable, "-m", "pertcalc", "curves"]
    with open("/dev/full", "w") as full:
        result = subprocess.run(command, stdout=full, stderr=subprocess.PIPE, text=True, check=False)
    assert (result.returncode, result.stderr) == (1, "Error: cannot read or write: No space left on device.\n")


def test_a_reader_that_leaves_is_no_error():
    result = subprocess.run(
        f"{sys.executable} -m pertcalc curves | head -1", shell=True, capture_output=True, text=True, check=False
    )
    assert (result.returncode, result.stderr) == (0, "")


def test_help_is_fast_and_loads_nothing_heavy():
    heavy = ("numpy", "scipy", "pandas", "matplotlib", "pint", "mpmath")
    code = (
        "import sys, pertcalc.cli as c\n"
        "try: c.cli(['--help'])\n"
        f"except SystemExit: print([m for m in {heavy!r} if m in sys.modules], file=sys.stderr)"
    )
    times = []
    for _ in range(3):
        start = time.perf_counter()
        result = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
        times.append(time.perf_counter() - start)
    assert result.stderr == "[]\n" and "pertcalc report Rb" in result.stdout
    # The issue asks for 0.2 s; the best of three on a busy machine stands for the program's own time.
    assert min(times) < 0.2


def test_every_command_has_help_with_an_example():
    for name, command in cli.commands.items():
        assert command.help and f"pertcalc {name}" in command.help, name
        shown = run(name, "--help").stdout
        assert "Example" in shown
        for option in command.params:
            if isinstance(option, click.Option):
                assert option.help, f"{name} {option.opts}"


def test_short_helps_are_whole_sentences():
    assert "..." not in run("--help").stdout.split("Commands:")[1]


@pytest.mark.parametrize(
    ("before", "typed", "offered"),
    [
        (["report"], "", ["Li", "Na", "K", "Rb", "Cs"]),
        (["report"], "r", ["Rb"]),
        (["rates", "Rb"], "K", ["Kr"]),
        (["report", "Rb", "--gas"], "3", ["3He"]),
        (["report", "Rb", "--method"], "c", ["closed-form"]),
    ],
)
def test_the_shell_completes_species_and_methods(before, typed, offered):
    complete = ShellComplete(cli, {}, "pertcalc", "_PERTCALC_COMPLETE")
    assert [item.value for item in complete.get_completions(before, typed)] == offered


def test_methods_are_those_of_the_library():
    assert set(METHODS) == set(pertcalc.rates.METHODS)


def test_no_bar_off_a_terminal(capsys):
    with progress_bar("x") as progress:
        assert progress is None
    assert capsys.readouterr().err == ""


def test_version():
    assert run("--version").stdout == f"pertcalc, version {__version__}\n"
