"""The report: conditions, numbers at the fill, measured values, text within 100 columns. Rates are invented here."""

from __future__ import annotations

import json
import math

import pytest

import pertcalc.rates
from pertcalc import constants
from pertcalc.errors import InputError, UnknownNameError
from pertcalc.measured import measurements
from pertcalc.report.as_json import dump, report_json
from pertcalc.report.comparison import compare
from pertcalc.report.compute import compute_report, first, restrict
from pertcalc.report.report_text import report_text
from pertcalc.report.request import make_request
from pertcalc.report.rows import fill_rows, rate_rows, report_csv
from pertcalc.report.tables import WIDTH, number, percent, table, with_errors, with_total
from pertcalc.species import ALKALIS, GASES, alkali
from tests.report_fakes import Broken, fake_rates, pertcalc_error
from tests.test_cli import check_rates_contract


@pytest.fixture(autouse=True)
def _invented_rates(monkeypatch):
    monkeypatch.setattr(pertcalc.rates, "collision_rates", fake_rates)


def made(alkali_symbol="Rb", gases=(), **conditions):
    return compute_report(make_request(alkali_symbol, gases, **conditions))


def test_defaults_fill_every_condition_and_say_so():
    request = make_request("rb")
    assert (request.alkali, request.gases, request.method) == ("Rb", GASES, "semiclassical")
    assert request.fill.temperature_K == 333.15 and request.fill.pressure_torr == 20.0
    assert request.defaults == ("temperature", "pressure", "fill temperature", "field")
    text = report_text(made())
    assert text.count("default (common practice, no source)") == 4
    assert "333.15 K (60 degC)" in text and "20 Torr" in text and "0.5 G" in text


def test_a_given_condition_is_no_default():
    request = make_request("Rb", ["Ar", "ar"], temperature_K=350.0, field_G=0.0)
    assert request.gases == ("Ar",) and request.defaults == ("pressure", "fill temperature")
    assert report_text(compute_report(request)).count("default (common practice") == 2


def test_bad_conditions_and_names():
    with pytest.raises(InputError, match="pressure = -1 Torr must be finite and > 0"):
        make_request("Rb", pressure_torr=-1.0)
    with pytest.raises(UnknownNameError, match="Did you mean Rb"):
        make_request("Rbb")


def test_numbers_at_the_fill_are_coefficient_times_density():
    report = made("Rb", ["Ar"], pressure_torr=50.0)
    density = 9.656500e18 * 50 / 293.15  # the rates contract, seven digits
    for row in fill_rows(report.gases[0], report.request.fill.density_cm3):
        assert row.rate.value is not None
        expected = row.rate.value * density
        if row.at_fill_unit == "MHz":
            expected /= 2 * math.pi * 1e6
            assert row.ratio_to_decay is None
        else:
            lifetime = alkali("Rb").levels[row.rate.line_or_level].lifetime_ns
            assert row.ratio_to_decay == pytest.approx(expected * lifetime.value * 1e-9, rel=1e-6)
        assert row.at_fill == pytest.approx(expected, rel=1e-6)


def test_hot_cell_keeps_the_density_but_not_the_coefficients():
    cold, hot = (made("Rb", ["Ar"], temperature_K=T).gases[0] for T in (300.0, 600.0))
    widths = [first(gas.rates.fwhm["D1"]) for gas in (cold, hot)]
    assert widths[1] / widths[0] == pytest.approx(2**0.3)
    losses = [gas.balances["P3/2"].losses[2] for gas in (cold, hot)]
    assert losses[1] / losses[0] == pytest.approx(2**0.4)


def test_measured_values_stand_beside_ours_at_their_own_temperature():
    gas = made("Na", ["He"]).gases[0]
    by_name = {(c.measurement.quantity, c.measurement.line_or_level): c for c in gas.comparisons}
    width = by_name["fwhm", "D1"]
    # Deleage et al. 1973 (READ) at 450 K, in 1e-9 rad s^-1 cm^3; the invented width is 1.5e-9 (T/300)^0.3.
    assert width.measurement.temperature_K == 450.0
    assert width.ours == pytest.approx(1.5 * 1.5**0.3)
    assert width.ratio == pytest.approx(width.ours / 3.04)
    loss = by_name["multipole_loss", "P3/2"]
    speed = math.sqrt(8 * 383 * constants.KELVIN_HARTREE / (math.pi * 5e4)) * constants.AU_VELOCITY_CM_S
    assert loss.ours == pytest.approx(3e-10 * (383 / 300) ** 0.4 / speed * 1e16)
    bound = by_name["shift", "D1"]
    assert bound.ratio is None and bound.ours < 0


def test_no_measurement_is_lost_and_none_is_invented():
    report = made("Rb")
    assert sum(len(gas.comparisons) for gas in report.gases) == len(measurements("Rb")) - len(measurements("Rb", "3He"))
    assert "nothing usable is known to us for Li + He" in report_text(made("Li", ["He"]))


def test_a_temperature_the_curves_do_not_support_leaves_ours_out():
    rates = fake_rates("Rb", "He", [333.15])
    shown = {c.measurement.temperature_K: c.ours for c in compare(rates)}
    assert shown[394.0] is None and compare(fake_rates("Rb", "He", [394.0]))[0].ours is not None


def test_restricting_keeps_the_first_temperatures_only():
    rates = restrict(fake_rates("Rb", "He", [300.0, 400.0, 500.0]), 1)
    assert rates.temperatures.tolist() == [300.0]
    assert {row.temperature_K for row in rate_rows(rates)} == {300.0}
    check_rates_contract(rates.to_json(), [300.0])


def test_the_json_has_no_nan_and_carries_marks_errors_and_rates():
    parsed = json.loads(dump(report_json(made("Cs"))))
    assert parsed["schema"] == "pertcalc.report/1" and not parsed["interrupted"] and parsed["missing"] == {}
    assert [gas["noble_gas"] for gas in parsed["gases"]] == list(GASES)
    for gas in parsed["gases"]:
        check_rates_contract(gas["rates"], [313.15])
        assert {entry["unit"] for entry in gas["at_fill"]} == {"MHz", "s^-1"}
        assert all(entry["model_error_relative"] == pytest.approx(0.2) for entry in gas["at_fill"])
        assert set(gas["levels"]) == {"P1/2", "P3/2"}
        assert set(gas["levels"]["P3/2"]["hanle_G"]) == {"1", "2", "3"}
        assert all(one["mark"] in ("READ", "FROM MEMORY") and one["source"] for one in gas["measured"])
        assert set(gas["curve_sources"]) == {"X", "A", "B"}
    assert parsed["atom"]["P3/2"]["lifetime_ns"]["mark"] == "FROM MEMORY"


def test_unknown_values_are_null_in_json_and_empty_in_csv():
    report = made("K", ["Ar"], method="closed-form")
    level = report_json(report)["gases"][0]["levels"]["P1/2"]
    assert level["loss_s"] == {} and level["dominant"] is None and level["comparable"] == []
    assert level["sentence"].startswith("P1/2 undecided (collisional loss unknown by this method)")
    row = next(line for line in report_csv(report).splitlines() if ",multipole_loss,P1/2,1," in line)
    assert ",,cm^3 s^-1," in row and "cannot know it" in row


def test_the_closed_form_has_no_rank_two_when_it_is_unknown(monkeypatch):
    def without(*arguments, **named):
        rates = fake_rates(*arguments, **named)
        del rates.multipole_loss["P3/2"][2]
        return rates

    monkeypatch.setattr(pertcalc.rates, "collision_rates", without)
    report = made("K", ["Ar"])
    overview = next(line for line in report_text(report).splitlines() if line.startswith("  Ar "))
    assert overview.split()[-2:] == ["-", "-"]


@pytest.mark.parametrize("symbol", ALKALIS)
@pytest.mark.parametrize(
    "conditions",
    [{}, {"pressure_torr": 7.6e5, "field_G": 1.2345e5, "temperature_K": 1999.9}, {"pressure_torr": 1.234e-7}],
)
@pytest.mark.parametrize("method", ["semiclassical", "closed-form"])
def test_text_fits_a_hundred_columns(symbol, conditions, method):
    report = made(symbol, ["He", "3He", "Ne", "Ar", "Kr", "Xe"], method=method, **conditions)
    lines = report_text(report).splitlines()
    assert max(map(len, lines)) <= WIDTH, max(lines, key=len)
    assert all(line == line.rstrip() and line.isprintable() for line in lines)


def test_the_text_says_what_the_job_asks_for():
    text = report_text(made("Rb", ["Xe"], method="semiclassical"))
    asked = ("MHz/Torr", "at the fill", "exponent", "decay", "Hanle", "loss K=3", "transfer to P1/2", "g_J", "Cautions")
    for words in asked:
        assert words in text, words
    line = next(line for line in text.splitlines() if line.startswith("  Xe   P3/2"))
    assert line.startswith("  Xe   P3/2 collisions (loss/decay K=1 ")
    for caution in ("Alkali metal", "glass", "lasers", "displace air", "Local codes"):
        assert caution in text


def test_too_much_pressure_is_a_warning_not_a_refusal():
    calm, dense = (made("Rb", ["Xe"], pressure_torr=p).gases[0] for p in (20.0, 1e5))
    assert calm.warnings == ()
    assert len(dense.warnings) == 1 and "impact approximation and binary collisions are doubtful" in dense.warnings[0]
    text = report_text(made("Rb", ["Xe"], pressure_torr=1e5))
    assert "  warning: line width x collision duration" in text


def test_missing_gases_are_named_and_the_first_error_kept(monkeypatch):
    problems = {"Ne": pertcalc_error("first", 1), "Kr": pertcalc_error("second", 3)}
    monkeypatch.setattr(pertcalc.rates, "collision_rates", Broken(problems))
    report = made("Rb")
    assert report.missing == {"Ne": "first", "Kr": "second"} and report.error is problems["Ne"]
    assert [gas.noble_gas for gas in report.gases] == ["He", "Ar", "Xe"]


def test_when_every_gas_fails_the_first_error_is_raised(monkeypatch):
    monkeypatch.setattr(pertcalc.rates, "collision_rates", Broken({gas: pertcalc_error(gas, 1) for gas in GASES}))
    with pytest.raises(Exception, match="^He$"):
        made("Rb")


@pytest.mark.parametrize(
    ("value", "digits", "shown"),
    [
        (None, 4, "-"),
        (0.0, 4, "0"),
        (4.24e-9, 4, "4.240e-09"),
        (99.996, 4, "100.0"),
        (123456.0, 3, "1.23e+05"),
        (12345.0, 3, "1.23e+04"),
        (1234.5, 3, "1234"),
        (0.00123456, 3, "0.00123"),
        (-2.5, 2, "-2.5"),
    ],
)
def test_numbers(value, digits, shown):
    assert number(value, digits) == shown


def test_signs_percents_and_errors():
    assert number(2.0, 2, sign=True) == "+2.0"
    assert [percent(x) for x in (None, math.nan, 0.0, 0.003, 0.02, 1.5)] == ["?", "?", "<0.1%", "0.3%", "2%", "150%"]
    assert with_errors("4.2", 0.003, None) == "4.2 +- 0.3% / ?"
    assert with_total("4.2", 0.3, 0.4) == "4.2+-50%"
    assert with_total("4.2", 0.3, None) == "4.2+-?" and with_total("-", 0.1, 0.1) == with_errors("-", 0.1, 0.1) == "-"


def test_table_columns_line_up():
    lines = table(["a", "b\nlong"], [["x", "1"], ["yyy", "22.5"]])
    assert lines == ["          b", "  a    long", "  ---------", "  x       1", "  yyy  22.5"]
