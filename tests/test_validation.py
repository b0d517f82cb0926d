"""The rules of `pertcalc validate`: what gates, that every check can fail, scores and medians by another route."""

from __future__ import annotations

import dataclasses
import json
import math
import statistics
from importlib.resources import files

import numpy as np
import pytest

from pertcalc import species
from pertcalc.constants import HARTREE_CM1, KELVIN_HARTREE
from pertcalc.curves.files import load_default
from pertcalc.errors import DataFileError, PublishedCheckError, UnknownNameError
from pertcalc.measured import QUANTITIES, measurements
from pertcalc.report import validation_run
from pertcalc.validation import laws, methods, published, scores
from pertcalc.validation.check import failure_message, failures
from pertcalc.validation.published import WELLS, PublishedWell, check_constants, check_wells
from pertcalc.validation.scores import LIMIT, medians, rate_check, score
from tests.report_fakes import fake_rates

ROWS = measurements()


def row_of(quantity: str, **changes):
    """A measurement of a quantity with some fields changed."""
    return dataclasses.replace(next(row for row in ROWS if row.quantity == quantity), **changes)


# Published values ------------------------------------------------------------------------------------------------


def test_only_read_values_gate_and_every_well_has_a_source_and_a_basis():
    assert {well.mark for well in WELLS if well.gates} == {"READ"}
    for well in WELLS:
        assert well.source and well.basis and well.note and well.depth_tolerance > 0
        assert well.mark != "READ" or "http" in well.source, "READ without an address"


# Schwarzhans & Zimmermann 1997: 41.9(5) cm^-1, 5.01(2) A. Lapatovich 1980: X 8.1(9), 5.29(5); A 145(5), 2.70(5);
# B 3.0(5), 7.62(16).
PRINTED = {
    ("Ar", "X"): (41.9, 0.5, 5.01, 0.02),
    ("Ne", "X"): (8.1, 0.9, 5.29, 0.05),
    ("Ne", "A"): (145.0, 5.0, 2.70, 0.05),
    ("Ne", "B"): (3.0, 0.5, 7.62, 0.16),
}


def test_the_printed_wells_and_errors():
    found = {(well.noble_gas, well.state): well for well in reversed(WELLS) if well.alkali == "Na"}
    for key, (De, De_error, Re, Re_error) in PRINTED.items():
        well, state = found[key], load_default("Na", key[0]).states[key[1]]
        assert (well.depth, well.position) == (De, Re)
        if well.basis == "the printed error":  # the curve goes through the well
            assert (well.depth_tolerance, well.position_tolerance) == (De_error, Re_error)
            continue
        # Computed without it: 1.5 times the printed error and that of the curve (of the published value) together.
        for tolerance, value, error, name in (
            (well.depth_tolerance, De, De_error, "De"),
            (well.position_tolerance, Re, Re_error, "Re"),
        ):
            both = 1.5 * math.hypot(error, state.uncertainty[name] * (state.curve.well().depth * HARTREE_CM1
                                    if name == "De" else value))  # fmt: skip
            assert tolerance == pytest.approx(both, rel=0.1)


def test_the_default_files_pass():
    checks = check_wells()
    assert failures(checks) == () and sum(check.gates for check in checks) == 14
    assert all(check.passed for check in checks)


def test_a_wrong_read_well_fails_and_is_named():
    wrong = dataclasses.replace(WELLS[0], depth=60.0)
    (failed,) = failures(check_wells((wrong, *WELLS[1:])))
    assert failed.name == "Na-Ar X De" and failed.difference == pytest.approx(failed.ours - 60.0, abs=1e-9)
    message = failure_message([failed])
    for words in ("1 check failed", "Na-Ar X De", "expected 60", "found 42.0", "cm^-1", "READ"):
        assert words in message
    with pytest.raises(PublishedCheckError) as caught:
        raise PublishedCheckError(message)
    assert caught.value.exit_code == 4


@pytest.mark.parametrize("number", range(len(WELLS)))
def test_from_memory_never_gates_whatever_it_says(number):
    recalled = dataclasses.replace(WELLS[number], depth=1e4, mark="FROM MEMORY", gates=True)
    checks = check_wells((recalled,))
    assert not checks[0].passed and failures(checks) == ()


def test_a_curve_without_a_well_fails(monkeypatch):
    monkeypatch.setattr(published, "well_of", lambda curves, state: (math.nan, math.nan))
    checks = check_wells(WELLS[:1])
    assert len(failures(checks)) == 2 and checks[0].ours is None
    assert "found nothing" in failure_message(failures(checks))


def test_the_width_rule_is_recalled_and_agrees():
    (rule,) = check_constants()
    # Width constant by its integral: 2 pi (3 pi/8)^(2/5) Gamma(3/5) cos(pi/5), times (2 pi)^(2/5).
    width = 2 * math.pi * (3 * math.pi / 8) ** 0.4 * math.gamma(0.6) * math.cos(math.pi / 5)
    assert rule.ours == pytest.approx(width * (2 * math.pi) ** 0.4, rel=1e-12)
    assert rule.passed and not rule.gates and rule.mark == "FROM MEMORY"


# Exact laws ------------------------------------------------------------------------------------------------------


def test_the_laws_hold_on_real_input():
    checks = laws.check_laws()
    assert len(checks) == 7 and all(check.passed and check.gates for check in checks)


def broken_scatter(change):
    real = laws.scatter

    def scatter(*arguments):
        found = real(*arguments)
        return dataclasses.replace(found, block_a=change(found.block_a))

    return scatter


def test_lost_probability_is_seen(monkeypatch):
    monkeypatch.setattr(laws, "scatter", broken_scatter(lambda S: 1.0001 * S))
    failed = {check.name for check in failures(laws.check_laws())}
    assert failed == {"semiclassical S unitary", "semiclassical K=0: lost = gained", "no splitting: sudden limit"}


def test_a_spin_that_takes_part_is_seen(monkeypatch):
    # A phase on one state keeps S unitary and symmetric in probabilities, but the spin is then no spectator.
    turn = np.diag([1.0, 1.0, np.exp(0.1j)])
    monkeypatch.setattr(laws, "scatter", broken_scatter(lambda S: S @ turn))
    assert "no splitting: sudden limit" in {check.name for check in failures(laws.check_laws())}


def test_caesium_is_not_sudden(monkeypatch):
    monkeypatch.setattr(laws, "SUDDEN_PAIR", ("Cs", "He"))
    assert "lithium: nearly sudden" in {check.name for check in failures(laws.check_laws())}


def test_broken_quantum_matrices_are_seen(monkeypatch):
    real = laws.scattering_matrices

    def skewed(*arguments):
        found = real(*arguments)
        for S in found.S.values():
            S[:, 0, 1] *= 1.001
        return found

    monkeypatch.setattr(laws, "scattering_matrices", skewed)
    failed = {check.name for check in failures(laws.check_laws())}
    assert failed >= {"quantum S unitary", "quantum S symmetric"}


def balanced(alkali: str, gas: str, temperatures, method: str = "semiclassical", **_):
    """Invented rates in detailed balance."""
    found = fake_rates(alkali, gas, temperatures, method)
    if method == "closed-form":
        return found
    splitting = species.alkali(alkali).fine_structure_cm1.value / HARTREE_CM1
    down = found.transfer["P3/2"]
    factor = 2 * np.exp(-splitting / (KELVIN_HARTREE * found.temperatures))
    up = dataclasses.replace(down, values=down.values * factor)
    return dataclasses.replace(found, transfer={"P1/2": up, "P3/2": down})


def test_detailed_balance_names_the_worst_pair():
    good = balanced("Rb", "Ar", [300.0, 350.0])
    (check,) = laws.check_balance([good])
    assert check.passed and check.difference < 1e-12
    (check,) = laws.check_balance([good, fake_rates("Cs", "Xe", 300.0)])
    assert not check.passed and "Cs-Xe" in check.note
    assert laws.check_balance([fake_rates("Cs", "Xe", 300.0, "closed-form")]) == []


# Method differences ----------------------------------------------------------------------------------------------


def test_the_method_summary_by_another_route():
    table = json.loads((files("pertcalc") / "data" / methods.TABLE).read_text(encoding="utf-8"))
    found = {one.name: one for one in methods.method_differences()}
    assert len(found) == len(methods.CLASSES)
    widths = [x for entry in table.values() for line in ("D1", "D2") for x in entry["relative"][f"fwhm {line}"]]
    one = found["full width, D1 and D2"]
    assert (one.count, one.pairs) == (len(widths), 25)
    assert one.median == pytest.approx(statistics.median(widths)) and one.worst == max(widths)
    # 90 % below: linear between the order statistics, as statistics.quantiles does with method "inclusive".
    assert one.ninety == pytest.approx(statistics.quantiles(widths, n=10, method="inclusive")[-1])
    assert one.reached == (one.median <= 0.02)
    light = [
        x
        for entry in table.values()
        if entry["id"].startswith(("li-", "na-", "k-"))
        for level in ("P1/2", "P3/2")
        for x in entry["relative"][f"transfer {level}"]
    ]
    assert found["transfer of Li, Na, K"].median == pytest.approx(statistics.median(light))
    assert found["transfer of Li, Na, K"].goal == 0.10 and found["transfer of Rb, Cs"].goal is None


def test_goals_of_the_issue():
    goals = {one.name: one.goal for one in methods.CLASSES if one.goal}
    assert goals == {
        "full width, D1 and D2": 0.02,
        "shift, D1 and D2": 0.03,
        "P1/2 loss K=1": 0.04,
        "P3/2 loss K=1": 0.03,
        "P3/2 loss K=2": 0.03,
        "transfer of Li, Na, K": 0.10,
    }


def test_a_missed_goal_is_said():
    names = {name for one in methods.CLASSES for name in one.rates}
    relative = {name: [0.5, 0.01] for name in names}
    table = {"x": {"id": "na-ar_default", "temperatures_K": [300.0, 400.0], "relative": relative}}
    found = methods.method_differences(table)
    # Rb, Cs have no entry: their class is left out, not invented.
    assert [one.name for one in found] == [one.name for one in methods.CLASSES if one.name != "transfer of Rb, Cs"]
    assert found[0].reached is False and found[0].worst_where.startswith("Na-Ar fwhm") and found[0].median == 0.255


@pytest.mark.parametrize("text", [None, "{broken"])
def test_a_missing_or_damaged_table_is_one_clear_error(text, monkeypatch, tmp_path):
    (tmp_path / "data").mkdir()
    if text is not None:
        (tmp_path / "data" / methods.TABLE).write_text(text)
    monkeypatch.setattr(methods.resources, "files", lambda package: tmp_path)
    methods.shipped_differences.cache_clear()
    try:
        with pytest.raises(DataFileError, match="reinstall pertcalc"):
            methods.method_differences()
    finally:
        methods.shipped_differences.cache_clear()


# Scores ----------------------------------------------------------------------------------------------------------


def test_deviation_of_a_positive_quantity_is_symmetric_in_the_factor():
    row = row_of("fwhm", value=4.0, error=0.4)
    high, low = score(row, 8.0, 0.0, 0.2), score(row, 2.0, 0.0, 0.2)
    assert high.deviation == pytest.approx(math.log(2) / math.hypot(0.1, 0.2)) == pytest.approx(-low.deviation)
    assert (high.ratio, low.ratio) == (2.0, 0.5)
    # For small errors it is the plain difference over the combined error.
    near = score(row_of("fwhm", value=4.0, error=0.04), 4.08, 0.003, 0.02)
    assert near.deviation == pytest.approx(0.08 / math.sqrt(0.04**2 + (0.003 * 4.08) ** 2 + 0.0816**2), rel=0.02)
    # A factor ten is outside even when we claim no better than 33 %.
    assert score(row, 40.0, 0.0, 0.33).outside and score(row, 0.4, 0.0, 0.33).outside


def test_deviation_of_a_shift_is_a_difference():
    row = row_of("shift", value=-1.0, error=0.1, kind="value")
    found = score(row, 0.2, 0.0, 0.5)
    assert found.deviation == pytest.approx(1.2 / math.hypot(0.1, 0.1))
    assert found.log_ratio is None and found.opposite


def test_a_bound_counts_only_beyond_it():
    row = row_of("shift", value=0.05, error=None, kind="bound")
    assert score(row, -0.04, 0.0, 0.1).deviation == 0
    assert score(row, -0.10, 0.0, 0.1).deviation == pytest.approx(0.05 / 0.01)
    assert score(row, -0.10, 0.0, 0.1).ratio is None and not score(row, -0.10, 0.0, 0.1).gates


@pytest.mark.parametrize("grade, relative", [("high", 0.15), ("medium", 0.15), ("low", 1.0)])
def test_an_error_that_is_not_printed_is_assumed_and_said(grade, relative):
    found = score(row_of("transfer", value=8.0, error=None, grade=grade), 8.0, 0.0, 0.1)
    assert found.assumed and found.theirs_error == pytest.approx(8 * relative)
    assert not score(row_of("transfer", value=8.0, error=1.0), 8.0, 0.0, 0.1).assumed


def test_what_is_not_known_has_no_deviation():
    row = row_of("fwhm")
    assert score(row, None, None, None).deviation is None
    assert score(row, math.nan, 0.0, 0.1).ours is None
    assert score(row, 3.0, 0.01, None).deviation is None and score(row, 3.0, 0.01, None).ratio is not None
    assert score(row, -3.0, 0.0, 0.1).outside  # a negative width
    gone = rate_check(score(row_of("multipole_loss"), None, None, None))
    assert gone.gates and not gone.passed  # a gating rate that is not there is no success


def test_which_rates_gate():
    gating = [row for row in ROWS if score(row, row.value, 0.0, 0.1).gates]
    # READ, high grade, a value, not contradicted: the disalignment of sodium (Elbel, Kamke & Schneider 1974).
    assert [(r.alkali, r.noble_gas, r.line_or_level, r.rank, r.value) for r in gating] == [
        ("Na", gas, "P3/2", 2, value)
        for gas, value in (("He", 167), ("Ne", 174), ("Ar", 308), ("Kr", 341), ("Xe", 376))
    ]
    assert not any(score(row, row.value, 0.0, 0.1, "closed-form").gates for row in ROWS)


@pytest.mark.parametrize("row", [row for row in ROWS if row.mark != "READ"], ids=str)
def test_no_recalled_rate_gates_even_when_it_looks_perfect(row):
    for grade in ("high", row.grade):
        assert (
            scores.no_gate(dataclasses.replace(row, grade=grade, kind="value"), "quantum") == "FROM MEMORY never gates"
        )


def test_a_gating_rate_fails_beyond_three_combined_errors():
    row = row_of("multipole_loss", value=167.0, error=None, mark="READ", grade="high")
    assert row.alkali == "Na"
    edge = LIMIT * math.hypot(0.15, 0.1)
    for sign in (1, -1):
        assert rate_check(score(row, 167 * math.exp(sign * edge * 0.999), 0.0, 0.1)).passed
        assert failures([rate_check(score(row, 167 * math.exp(sign * edge * 1.001), 0.0, 0.1))])


def test_the_conflicting_rows_are_reported_not_tuned_away():
    for row in ROWS:
        if row.alkali == "Rb" and row.quantity == "multipole_loss" and row.mark == "READ":
            found = score(row, 9 * row.value, 0.0, 0.2)
            assert found.outside and not found.gates and "conflict" in found.no_gate


def test_medians_by_another_route():
    rng = np.random.default_rng(7)
    made = []
    for row in ROWS:
        ours = row.value * math.exp(rng.normal(0, 0.3)) * (-1 if rng.random() < 0.1 and row.quantity == "shift" else 1)
        made.append(score(row, ours, 0.01, 0.2))
    found = {(one.quantity, one.noble_gas): one for one in medians(made)}
    assert {key[0] for key in found} == {*QUANTITIES, None} and ("transfer", "3He") not in found
    for (quantity, gas), one in found.items():
        rows = [s for s in made if s.measurement.quantity == (quantity or s.measurement.quantity)]
        rows = [s for s in rows if s.measurement.noble_gas == (gas or s.measurement.noble_gas)]
        ratios = [s.ours / s.measurement.value for s in rows if s.measurement.kind == "value"]
        sizes = sorted(abs(math.log(x)) if x > 0 else math.inf for x in ratios)
        middle = (sizes[(len(sizes) - 1) // 2] + sizes[len(sizes) // 2]) / 2
        assert (one.rows, one.compared, one.opposite) == (len(rows), len(ratios), sum(x <= 0 for x in ratios))
        assert one.median == (pytest.approx(middle) if math.isfinite(middle) else None)
        assert one.within_one == pytest.approx(sum(abs(s.deviation) <= 1 for s in rows) / len(rows))
    assert found["fwhm", None].goal == 0.06 and found["shift", None].goal == 0.12
    low = [s for s in made if s.measurement.quantity == "fwhm" and s.measurement.grade != "low"]
    expected = statistics.median(abs(math.log(s.ratio)) for s in low)
    assert found["fwhm", None].median_good == pytest.approx(expected) and found["fwhm", None].good == len(low)


def test_a_wrong_sign_is_worse_than_any_ratio():
    row = row_of("shift", value=1.0, error=0.1, kind="value")
    made = [score(row, value, 0.0, 0.1) for value in (-1.0, 2.0, 1.0)]
    (one,) = [one for one in medians(made) if (one.quantity, one.noble_gas) == ("shift", None)]
    assert one.median == pytest.approx(math.log(2)) and one.opposite == 1
    (none,) = [one for one in medians(made[:1]) if (one.quantity, one.noble_gas) == ("shift", None)]
    assert none.median is None


# Which pairs -----------------------------------------------------------------------------------------------------


def test_the_quick_pairs_hold_every_read_row():
    quick = validation_run.pairs_to_compute(QUANTITIES, False)
    rows = {row for found in quick.values() for row in found}
    assert {row for row in ROWS if row.mark == "READ"} <= rows and len(quick) == 7
    whole = validation_run.pairs_to_compute(QUANTITIES, True)
    assert sum(len(found) for found in whole.values()) == len(ROWS) and len(whole) == 22
    assert all(
        row.quantity == "fwhm" for found in validation_run.pairs_to_compute(["fwhm"], True).values() for row in found
    )


@pytest.mark.parametrize("named", [{"quantities": ["width"]}, {"method": "guess"}])
def test_unknown_names(named):
    with pytest.raises(UnknownNameError):
        validation_run.validate(**named)


def test_one_real_pair_end_to_end(monkeypatch):
    real = validation_run.pairs_to_compute
    monkeypatch.setattr(
        validation_run,
        "pairs_to_compute",
        lambda *names: {key: rows for key, rows in real(*names).items() if key == ("Na", "He")},
    )
    found = validation_run.validate(quantities=["multipole_loss", "transfer"])
    assert found.failed == () and found.failure() is None and found.pairs == ("Na-He",)
    assert {check.name for check in found.checks if check.group == "rate"} == {"Na-He P3/2 multipole_loss K=2 383 K"}
    assert any(check.name == "detailed balance of transfer" for check in found.checks)
    (alignment,) = [one for one in found.scores if one.gates]
    assert alignment.theirs_error == pytest.approx(0.15 * 167) and abs(alignment.deviation) < LIMIT


def test_a_well_is_a_frozen_record():
    assert isinstance(WELLS[0], PublishedWell)
    with pytest.raises(dataclasses.FrozenInstanceError):
        WELLS[0].depth = 1.0  # type: ignore[misc]
