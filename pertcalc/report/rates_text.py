"""The rates of one pair as text."""

from __future__ import annotations

from pertcalc.report.rows import RateRow, rate_rows
from pertcalc.report.tables import number, table, with_errors, wrapped
from pertcalc.report.words import READING, quantity_words
from pertcalc.results import LEVEL_UNIT, LINE_UNIT, CollisionRates


def rates_text(rates: CollisionRates, notes: tuple[str, ...] = ()) -> str:
    """Every coefficient at every temperature as tables of at most 100 columns; ``notes`` go below the title."""
    lines = [
        f"{rates.alkali} + {rates.noble_gas}: collision rates, method {rates.method}",
        f"curves {rates.curves_id}, sha256 {rates.curves_sha256}",
        *(line for note in notes for line in wrapped(note, "")),
    ]
    rows = rate_rows(rates)
    for T in dict.fromkeys(row.temperature_K for row in rows):
        here = [row for row in rows if row.temperature_K == T]
        lines += ["", f"At {T:.6g} K, all values COMPUTED"]
        lines += coefficient_table([row for row in here if row.unit == LINE_UNIT], LINE_UNIT)
        lines += ["", *coefficient_table([row for row in here if row.unit == LEVEL_UNIT], LEVEL_UNIT)]
    lines += reason_lines(rows)
    lines += ["", *(line for note in READING[:3] for line in wrapped(note))]
    for warning in rates.warnings:
        lines += wrapped(f"warning: {warning}")
    return "\n".join(lines)


def coefficient_table(rows: list[RateRow], unit: str) -> list[str]:
    """Rows of one unit: value with errors, exponent and, for widths and shifts, MHz/Torr."""
    in_mhz = unit == LINE_UNIT
    headers = ["", "", f"k [{unit}]\n+- numerical / model", "exponent", *(["MHz/Torr\nat this T"] if in_mhz else [])]
    return table(
        headers,
        [
            [
                row.line_or_level,
                quantity_words(row.quantity, row.line_or_level, row.rank),
                value_with_errors(row),
                number(row.exponent, 2, sign=True),
                *([number(row.mhz_per_torr, 4, row.quantity == "shift")] if in_mhz else []),
            ]
            for row in rows
        ],
        left=2,
    )


def value_with_errors(row: RateRow) -> str:
    """The coefficient of a row with its two errors in per cent."""
    sign = row.quantity in ("shift", "multipole_transfer")
    return with_errors(number(row.value, 4, sign), row.numerical_error_relative, row.model_error_relative)


def reason_lines(rows: list[RateRow]) -> list[str]:
    """Why values are missing, each reason once."""
    reasons: dict[str, list[str]] = {}
    for row in rows:
        if row.value is None and row.reason:
            what = f"{row.line_or_level} {quantity_words(row.quantity, row.line_or_level, row.rank)}"
            reasons.setdefault(row.reason, []).append(what)
    return [
        line
        for reason, what in reasons.items()
        for line in wrapped(f"- {', '.join(dict.fromkeys(what))}: {reason}", indent="    ", first="  ")
    ]
