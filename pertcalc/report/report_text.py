"""The report as text: conditions, one line per gas, details per gas, sources, cautions."""

from __future__ import annotations

from pertcalc.report.comparison import Comparison
from pertcalc.report.compute import GasReport, Report, first
from pertcalc.report.rates_text import reason_lines, value_with_errors
from pertcalc.report.rows import LINE_QUANTITIES, FillRow, fill_rows
from pertcalc.report.tables import UNKNOWN, WIDTH, number, percent, table, with_total, wrapped
from pertcalc.report.words import CAUTIONS, READING, comparable_note, field_words, level_words, quantity_words
from pertcalc.results import LEVEL_UNIT, LINE_UNIT, Coefficient
from pertcalc.species import Sourced, alkali
from pertcalc.units import mhz
from pertcalc.vapour.fill import DEFAULTS_ORIGIN

CELSIUS_ZERO_K = 273.15


class Citations:
    """Numbers the sources in the order of their first mention."""

    def __init__(self) -> None:
        self._numbers: dict[str, int] = {}

    def __call__(self, source: str) -> str:
        """The mark "[n]" of a source."""
        return f"[{self._numbers.setdefault(source, len(self._numbers) + 1)}]"

    def lines(self) -> list[str]:
        """The list of sources."""
        return [line for text, n in self._numbers.items() for line in wrapped(text, " " * 7, f"  [{n}]".ljust(7))]


def report_text(report: Report) -> str:
    """The whole report within 100 columns, without colour."""
    cite = Citations()
    lines = _conditions(report, cite)
    if report.gases:
        lines += ["", *_overview(report)]
    for gas in report.gases:
        lines += ["", *_gas_section(gas, report, cite)]
    lines += _missing(report)
    lines += ["", _title("Sources"), *cite.lines()]
    lines += ["", _title("How to read the numbers"), *(line for note in READING for line in wrapped(note))]
    lines += ["", _title("Cautions"), *(line for note in CAUTIONS for line in wrapped(note, "    ", "  - "))]
    return "\n".join(lines)


def _title(words: str) -> str:
    return f"== {words} ".ljust(WIDTH, "=")


def _conditions(report: Report, cite: Citations) -> list[str]:
    request, fill = report.request, report.request.fill
    record = alkali(request.alkali)
    rows = [
        ("temperature", "cell temperature", _kelvin(fill.temperature_K)),
        ("pressure", "pressure at the fill", f"{fill.pressure_torr:.6g} Torr"),
        ("fill temperature", "fill temperature", _kelvin(fill.fill_temperature_K)),
        ("field", "magnetic field", f"{fill.field_G:.6g} G"),
    ]
    lines = [
        f"{record.name.capitalize()} in {', '.join(request.gases)}: collision rates, method {request.method}",
        "",
        *(
            f"  {words:22}{value:26}{f'default ({DEFAULTS_ORIGIN})' if name in request.defaults else ''}".rstrip()
            for name, words, value in rows
        ),
        f"  {'gas density n':22}{fill.density_cm3:.4e} cm^-3; a sealed cell keeps it, its pressure is now "
        f"{fill.pressure_in_use_torr:.4g} Torr",
    ]
    for name in ("P1/2", "P3/2"):
        level = record.levels[name]
        assert level.lifetime_ns is not None  # only the ground level has none
        lines.append(
            f"  {level.term:22}lifetime {_sourced(level.lifetime_ns, cite)}, decay {record.decay_rate(name):.4g} s^-1, "
            f"g_J {_sourced(level.gJ, cite)}"
        )
    return lines


def _kelvin(T: float) -> str:
    return f"{T:.6g} K ({T - CELSIUS_ZERO_K:.6g} degC)"


def _sourced(value: Sourced, cite: Citations) -> str:
    unit = "" if value.unit == "1" else f" {value.unit}"
    return f"{value.value:.6g}{unit} {cite(f'{value.mark}: {value.source}')}"


def _overview(report: Report) -> list[str]:
    """One row per gas, then one line per gas on what rules the levels."""
    fill = report.request.fill
    lines_of = [f"{line} {what}\nMHz" for line in ("D1", "D2") for what in ("width", "shift")]
    headers = ["gas", *lines_of, "loss/decay", "Hanle field\nG"]
    rows = [_overview_row(gas, fill.density_cm3) for gas in report.gases]
    lines = [
        _title("At this fill"),
        *table(headers, rows),
        *wrapped(
            "COMPUTED; +- numerical and model error together (apart below). Full widths. Loss and Hanle field are "
            "those of the alignment (K=2) of P3/2, the field with collisions."
        ),
        "",
        *wrapped(f"What rules the excited levels. {comparable_note()} {_fields(report.gases[0])}"),
    ]
    for gas in report.gases:
        levels = "; ".join(level_words(gas.balances[level]) for level in ("P3/2", "P1/2"))
        lines += wrapped(levels, " " * 7, f"  {gas.noble_gas:5}")
    return lines


def _fields(gas: GasReport) -> str:
    """Larmor frequency beside decay: the same in every gas."""
    return "In this field " + ", ".join(f"{level} {field_words(b)}" for level, b in gas.balances.items()) + "."


def _overview_row(gas: GasReport, density: float) -> list[str]:
    cells = [gas.noble_gas]
    for line in gas.rates.fwhm:
        for coefficient, sign in ((gas.rates.fwhm[line], False), (gas.rates.shift[line], True)):
            k = first(coefficient)
            cells.append(_total(coefficient, number(None if k is None else float(mhz(k, density)), 3, sign)))
    balance, loss = gas.balances["P3/2"], gas.rates.multipole_loss["P3/2"].get(2)
    if loss is None or 2 not in balance.losses:
        return [*cells, UNKNOWN, UNKNOWN]
    cells.append(_total(loss, number(balance.losses[2] / balance.decay, 3)))
    errors = [first(loss, name) for name in ("numerical_error", "model_error")]
    shares = [None if error is None else balance.hanle_relative_error(2, error) for error in errors]
    return [*cells, with_total(number(balance.hanle_G[2], 3), *shares)]


def _total(coefficient: Coefficient, shown: str) -> str:
    return with_total(shown, first(coefficient, "numerical_error"), first(coefficient, "model_error"))


def _gas_section(gas: GasReport, report: Report, cite: Citations) -> list[str]:
    fill = report.request.fill
    rows = fill_rows(gas, fill.density_cm3)
    lines = [_title(f"{report.request.alkali} + {gas.noble_gas}")]
    lines += wrapped(f"curves {gas.rates.curves_id}, sha256 {gas.rates.curves_sha256[:16]}; " + _curve_marks(gas, cite))
    lines += ["", *_line_table([row for row in rows if row.rate.unit == LINE_UNIT], fill.temperature_K)]
    lines += ["", *_level_table(gas, [row for row in rows if row.rate.unit == LEVEL_UNIT])]
    free = ", ".join(f"{level} {number(b.hanle_free_G, 3)} G" for level, b in gas.balances.items())
    lines += wrapped(f"Hanle field without collisions: {free}; with collisions in the table.")
    lines += reason_lines([row.rate for row in rows])
    lines += ["", *_measured(gas, cite)]
    for warning in gas.warnings:
        lines += wrapped(warning, "    ", "  warning: ")
    return lines


def _curve_marks(gas: GasReport, cite: Citations) -> str:
    return ", ".join(
        f"{name} {state.mark} {cite(f'{state.mark}: {state.source.cite}')}" for name, state in gas.curves.states.items()
    )


def _line_table(rows: list[FillRow], T: float) -> list[str]:
    headers = ["line", "", f"k [{LINE_UNIT}]\n+- numerical / model", "exponent"]
    headers += [f"MHz/Torr\nat {T:.5g} K", "MHz\nat the fill"]
    return table(
        headers,
        [
            [
                row.rate.line_or_level,
                quantity_words(row.rate.quantity, row.rate.line_or_level, row.rate.rank),
                value_with_errors(row.rate),
                number(row.rate.exponent, 2, sign=True),
                number(row.rate.mhz_per_torr, 4, row.rate.quantity == "shift"),
                number(row.at_fill, 4, row.rate.quantity == "shift"),
            ]
            for row in rows
        ],
        left=2,
    )


def _level_table(gas: GasReport, rows: list[FillRow]) -> list[str]:
    headers = ["level", "", f"k [{LEVEL_UNIT}]\n+- numerical / model", "exponent"]
    headers += ["s^-1\nat the fill", "over\ndecay", "Hanle\nfield, G"]
    table_rows = []
    for row in rows:
        rate = row.rate
        sign = rate.quantity == "multipole_transfer"
        hanle = gas.balances[rate.line_or_level].hanle_G.get(rate.rank or 0)
        table_rows.append(
            [
                rate.line_or_level,
                quantity_words(rate.quantity, rate.line_or_level, rate.rank),
                value_with_errors(rate),
                number(rate.exponent, 2, sign=True),
                number(row.at_fill, 3, sign),
                number(row.ratio_to_decay, 3, sign),
                number(hanle, 3) if rate.quantity == "multipole_loss" else "",
            ]
        )
    return table(headers, table_rows, left=2)


def _measured(gas: GasReport, cite: Citations) -> list[str]:
    """Measurements in the unit they are given in, ours computed at their own temperature."""
    if not gas.comparisons:
        return [f"  Measured: nothing usable is known to us for {gas.rates.alkali} + {gas.noble_gas}."]
    lines = wrapped("Measured values, ours computed at the same temperature. Cross section: rate / mean speed.")
    groups = (
        (LINE_UNIT, [one for one in gas.comparisons if one.measurement.quantity in LINE_QUANTITIES]),
        ("A^2", [one for one in gas.comparisons if one.measurement.quantity not in LINE_QUANTITIES]),
    )
    for unit, group in groups:
        if group:
            headers = ["", "", "T, K", f"published\n{unit}", f"ours\n{unit}", "ours/\npubl.", "mark, grade", ""]
            lines += ["", *table(headers, [_measured_row(one, cite) for one in group], left=2)]
    return lines


def _measured_row(one: Comparison, cite: Citations) -> list[str]:
    m = one.measurement
    # Widths and shifts are tabled in 1e-9 rad s^-1 cm^3 and shown in rad s^-1 cm^3, the unit of the tables above.
    scale = 1e-9 if m.quantity in LINE_QUANTITIES else 1.0
    sign = m.quantity == "shift"
    value = number(m.value * scale, 3, sign and m.kind != "bound")
    error = "" if m.error is None or not m.value else f" +- {percent(abs(m.error / m.value))}"
    ours = number(None if one.ours is None else one.ours * scale, 3, sign)
    return [
        m.line_or_level,
        quantity_words(m.quantity, m.line_or_level, m.rank),
        f"{m.temperature_K:g}",
        f"|k| < {value}" if m.kind == "bound" else f"{value}{error}",
        with_total(ours, one.numerical_error, one.model_error),
        number(one.ratio, 3),
        f"{m.mark}, {m.grade}",
        cite(f"{m.mark}: {m.source}"),
    ]


def _missing(report: Report) -> list[str]:
    if not report.missing:
        return []
    lines = ["", _title("Not in this report")]
    for gas, reason in report.missing.items():
        lines += wrapped(reason, " " * 7, f"  {gas:5}")
    return lines
