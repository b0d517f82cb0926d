"""README cannot rot: its commands exist and run, every command and the examples are in it."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner

import pertcalc.rates
import pertcalc.vapour.verdict
from pertcalc.cli import cli
from tests.report_fakes import fake_rates

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
SPANS = re.findall(r"`(pertcalc [^`]+)`", README)
COMMANDS = sorted({span for span in SPANS if len(span.split()) > 2 and "FILE" not in span and "--check" not in span})


def block(mark: str) -> str:
    """The fenced block below a comment."""
    found = re.search(rf"<!-- {re.escape(mark)} -->\n```\w+\n(.*?)```", README, re.DOTALL)
    assert found, f"README has no block for {mark}"
    return found[1]


def test_the_set_up_is_exactly_two_commands():
    assert len(re.findall(r"^```sh$", README, re.MULTILINE)) == 2
    install, test = block("command: install").strip(), block("command: test").strip()
    assert "\n" not in install + test
    assert "python3 -m venv" in install and "pip install" in install and install.endswith("pertcalc report Rb")
    assert "[test]" in test and "python -m pytest" in test


def test_ci_finds_the_same_commands():
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    function = re.search(r"^readme_command\(\) \{.*?^\}", script, re.DOTALL | re.MULTILINE)
    assert function
    for name in ("install", "test"):
        ran = subprocess.run(
            ["bash", "-c", f"{function[0]}\nreadme_command {name}"],
            cwd=ROOT,
            capture_output=True,
            text=True,
            check=True,
        )
        assert ran.stdout == block(f"command: {name}")


def test_every_command_is_in_the_readme():
    for name, command in cli.commands.items():
        assert command.help and f"`pertcalc {name}`" in README, name


@pytest.mark.parametrize("words", COMMANDS)
def test_commands_shown_run(words, monkeypatch, tmp_path):
    import shlex

    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr(pertcalc.rates, "collision_rates", fake_rates)
    monkeypatch.setattr(pertcalc.vapour.verdict, "collision_rates", fake_rates)
    arguments = [word for word in shlex.split(words)[1:] if word != "COMMAND"]
    result = CliRunner().invoke(cli, arguments, prog_name="pertcalc")
    # Invented rates break detailed balance: `validate` must see that, whatever else it finds.
    assert result.exit_code == (4 if words.startswith("pertcalc validate") else 0), result.output


def test_enough_commands_were_found():
    assert len(COMMANDS) >= 4 and any("report" in words for words in COMMANDS)


def test_the_example_prints_what_the_readme_shows():
    kept = (ROOT / "examples" / "choose_gas.txt").read_text(encoding="utf-8")
    assert block("output: examples/choose_gas.txt") == kept


def test_the_python_line_of_the_readme_runs(monkeypatch):
    monkeypatch.setattr(pertcalc.rates, "collision_rates", fake_rates)
    found = re.search(r"From Python: `(.+?)`", README)
    assert found
    rates = eval(found[1], {"pertcalc": pertcalc})  # noqa: S307  our own README
    assert rates.temperatures.tolist() == [300.0, 350.0]


def test_module_and_script_are_the_same_program():
    ran = subprocess.run([sys.executable, "-m", "pertcalc", "--version"], cwd=ROOT, capture_output=True, text=True)
    assert ran.returncode == 0 and ran.stdout.startswith("pertcalc, version ")
