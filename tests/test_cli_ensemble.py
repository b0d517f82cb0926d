"""`pertcalc rates --ensemble`: the contract stays, the spread and its sources are beside it. Rates are invented."""

from __future__ import annotations

import csv
import io
import json

import numpy as np
import pytest
from click.testing import CliRunner

from pertcalc import ensemble as module
from pertcalc.cli import cli
from pertcalc.report.ensemble_data import key_of
from pertcalc.report.rows import rate_rows
from tests.ensemble_fakes import KEYS, install, power_law
from tests.report_fakes import fake_rates
from tests.test_cli import check_rates_contract


@pytest.fixture(autouse=True)
def _invented(monkeypatch):
    install(monkeypatch)


def run(*words: str):
    result = CliRunner().invoke(cli, ["rates", "K", "Ar", "--temperature", "300", *words], prog_name="pertcalc")
    assert result.exception is None or isinstance(result.exception, SystemExit), result.exception
    return result


def stop_after(monkeypatch, members: int) -> None:
    calls = iter(range(1000))

    def stopped(*arguments):
        if next(calls) > members:
            raise KeyboardInterrupt
        return power_law(*arguments)

    monkeypatch.setattr(module, "coarse_rates", stopped)


def test_every_row_has_its_key():
    assert {key_of(row) for row in rate_rows(fake_rates("K", "Ar", 300.0))} == set(KEYS)


def test_json_keeps_the_contract_and_adds_one_key():
    plain, more = json.loads(run("--json").stdout), json.loads(run("--ensemble", "64", "--json").stdout)
    check_rates_contract(more, [300.0])
    extra = more.pop("ensemble")
    assert more == plain
    assert (extra["samples"], extra["finished"], extra["interrupted"], extra["reasons"]) == (64, 64, False, {})
    names = {one["name"]: one["relative_error"] for one in extra["inputs"]}
    assert names["X.C6"] > 0 and names["method.widths"] is None
    for tree in ("mean", "sd", "q16", "q84"):
        assert set(extra[tree]) == {"lines", "levels"} and len(extra[tree]["lines"]["D1"]["fwhm_rad_s_cm3"]) == 1
    loss = more["levels"]["P3/2"]["multipole_loss_cm3_s"]["2"][0]
    low, high = (extra[q]["levels"]["P3/2"]["multipole_loss_cm3_s"]["2"][0] for q in ("q16", "q84"))
    assert low < loss < high
    found = extra["sensitivities"]["levels.P3/2.multipole_loss_cm3_s.2"]
    by_name = {one["name"]: one for one in found["inputs"]}
    # The invented rate is a power law: +3 in Re of B, up to the spread of the method on top of it.
    assert by_name["B.Re"]["d_ln_rate_d_ln_parameter"][0] == pytest.approx(3.0, abs=0.1)
    assert by_name["method.losses"]["d_ln_rate_d_ln_parameter"] is None
    assert sum(one["share_of_variance"][0] for one in found["inputs"]) == pytest.approx(found["explained"][0])
    matrix = np.array(extra["correlation"]["by_temperature"][0])
    assert matrix.shape == (len(KEYS),) * 2 and np.diag(matrix) == pytest.approx(1.0)


def test_text_names_what_is_sampled_and_where_the_spread_comes_from():
    result = run("--ensemble", "64")
    assert result.exit_code == 0 and result.stdout.startswith("K + Ar: collision rates")
    assert "Ensemble of 64 members (seed 0), COMPUTED: X.De" in result.stdout
    assert "known to 9%" in result.stdout.replace("\n", " ")
    (line,) = (line for line in result.stdout.splitlines() if "loss K=2" in line and "B." in line)
    assert line.index("B.") > line.index("loss K=2") and line.rstrip().endswith("%")
    assert max(map(len, result.stdout.splitlines())) <= 100


def test_csv_has_the_rows_of_the_rates_with_more_columns():
    plain, more = (
        list(csv.DictReader(io.StringIO(run(*words, "--csv").stdout))) for words in ((), ("--ensemble", "64"))
    )
    assert [{key: row[key] for key in plain[0]} for row in more] == plain
    row = next(row for row in more if row["quantity"] == "multipole_loss" and row["rank"] == "2")
    assert float(row["ensemble_q16"]) < float(row["value"]) < float(row["ensemble_q84"])
    assert len(row["dominant_inputs"].split()) == 3


@pytest.mark.parametrize("words", [("--json",), (), ("--csv",)])
def test_ctrl_c_prints_the_finished_members_and_ends_with_130(monkeypatch, words):
    stop_after(monkeypatch, 10)
    result = run("--ensemble", "64", *words)
    assert result.exit_code == 130
    assert result.stderr == "Error: stopped by the user; 10 of 64 members were finished.\n"
    if words == ("--json",):
        extra = json.loads(result.stdout)["ensemble"]
        assert (extra["finished"], extra["interrupted"], extra["q16"], extra["sensitivities"]) == (10, True, None, None)
        assert "too few for the 16 % quantile" in extra["reasons"]["q16"] and extra["sd"] is not None
    if not words:
        text = " ".join(result.stdout.split())
        assert "10 of 64 members were finished." in text and "needs at least 32" in text


def test_ctrl_c_before_the_first_member_still_prints_the_rates(monkeypatch):
    for words in ((), ("--json",), ("--csv",)):
        stop_after(monkeypatch, 0)
        result = run("--ensemble", "64", *words)
        assert result.exit_code == 130 and "0 of 64" in result.stderr and "loss" in result.stdout


@pytest.mark.parametrize(
    "words, code, message",
    [
        (("--ensemble", "16"), 2, "samples = 16: too few for the 16 % quantile, which needs at least 32"),
        (("--ensemble", "0"), 2, "samples = 0: too few"),
        (("--ensemble", "many"), 2, "'many' is not a valid integer"),
        (("--ensemble", "1000000"), 2, "samples = 1000000 must be a whole number from 2 to 65536"),
        (("--ensemble", "64", "--method", "closed-form"), 2, "method of an ensemble 'closed-form' is not known"),
        (("--ensemble", "64", "--json", "--csv"), 2, "--json and --csv exclude each other"),
    ],
)
def test_bad_input_is_one_message(words, code, message):
    result = run(*words)
    assert (result.exit_code, result.stdout) == (code, "") and message in result.stderr
    assert "Traceback" not in result.stderr
