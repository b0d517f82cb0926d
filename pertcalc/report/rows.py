"""Rates as flat rows, one number each: what --csv prints and what the text tables are made of."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, fields
from typing import Any

from pertcalc.report.compute import GasReport, Report
from pertcalc.results import Coefficient, CollisionRates
from pertcalc.species import COMPUTED
from pertcalc.units import mhz, mhz_per_torr

LINE_QUANTITIES = ("fwhm", "shift")


@dataclass(frozen=True, slots=True)
class RateRow:
    """One coefficient at one temperature.

    ``quantity`` "fwhm" | "shift" | "multipole_loss" | "transfer" | "multipole_transfer"; ``line_or_level``;
    ``rank`` K or None; ``temperature_K`` [K]; ``value`` [``unit``] per unit perturber density, None with a ``reason``;
    relative errors [1]; ``exponent`` d ln|k|/d ln T [1]; ``mhz_per_torr`` of widths and shifts [MHz/Torr at T].
    """

    alkali: str
    noble_gas: str
    method: str
    curves: str
    quantity: str
    line_or_level: str
    rank: int | None
    temperature_K: float
    value: float | None
    unit: str
    numerical_error_relative: float | None
    model_error_relative: float | None
    exponent: float | None
    mhz_per_torr: float | None
    mark: str
    reason: str | None


@dataclass(frozen=True, slots=True)
class FillRow:
    """A RateRow in one cell: ``at_fill`` [``at_fill_unit``] and, for levels, its ratio to radiative decay [1]."""

    rate: RateRow
    at_fill: float | None
    at_fill_unit: str
    ratio_to_decay: float | None


def rate_rows(rates: CollisionRates) -> list[RateRow]:
    """Every coefficient at every temperature, lines first, in the order of the JSON contract."""
    return [
        _row(rates, quantity, where, rank, coefficient, i)
        for quantity, where, rank, coefficient in _coefficients(rates)
        for i in range(len(rates.temperatures))
    ]


def fill_rows(gas: GasReport, density: float) -> list[FillRow]:
    """The rows of one gas of a report at its density [cm^-3]."""
    rows = []
    for row in rate_rows(gas.rates):
        if row.quantity in LINE_QUANTITIES:
            rows.append(FillRow(row, None if row.value is None else float(mhz(row.value, density)), "MHz", None))
        else:
            rate = None if row.value is None else row.value * density
            ratio = None if rate is None else rate / gas.balances[row.line_or_level].decay
            rows.append(FillRow(row, rate, "s^-1", ratio))
    return rows


def rates_csv(rates: CollisionRates) -> str:
    """The rows of one pair as CSV with a header."""
    return as_csv(_named(row) for row in rate_rows(rates))


def report_csv(report: Report) -> str:
    """The rows of all gases of a report as CSV with a header; the conditions stand in every row."""
    fill = report.request.fill
    conditions = {
        "pressure_torr": fill.pressure_torr,
        "fill_temperature_K": fill.fill_temperature_K,
        "density_cm3": fill.density_cm3,
        "field_G": fill.field_G,
    }
    return as_csv(
        _named(row.rate)
        | {"at_fill": row.at_fill, "at_fill_unit": row.at_fill_unit, "ratio_to_decay": row.ratio_to_decay}
        | {"hanle_G": _hanle(gas, row.rate)}
        | conditions
        for gas in report.gases
        for row in fill_rows(gas, fill.density_cm3)
    )


def as_csv(rows: Iterable[Mapping[str, Any]]) -> str:
    """Rows with the same keys as CSV text with a header; None is an empty cell."""
    table = list(rows)
    if not table:
        return ""
    text = io.StringIO()
    writer = csv.DictWriter(text, fieldnames=list(table[0]), lineterminator="\n")
    writer.writeheader()
    writer.writerows(table)
    return text.getvalue()


def _named(row: Any) -> dict[str, Any]:
    return {field.name: getattr(row, field.name) for field in fields(row)}


def _hanle(gas: GasReport, row: RateRow) -> float | None:
    """Hanle field with collisions [G] of a multipole, None for other quantities."""
    if row.quantity != "multipole_loss" or row.rank is None:
        return None
    return gas.balances[row.line_or_level].hanle_G.get(row.rank)


def _coefficients(rates: CollisionRates) -> Iterator[tuple[str, str, int | None, Coefficient]]:
    for line in rates.fwhm:
        yield "fwhm", line, None, rates.fwhm[line]
        yield "shift", line, None, rates.shift[line]
    for level in rates.transfer:
        for K, coefficient in rates.multipole_loss[level].items():
            yield "multipole_loss", level, K, coefficient
        yield "transfer", level, None, rates.transfer[level]
        for K, coefficient in rates.multipole_transfer[level].items():
            yield "multipole_transfer", level, K, coefficient


def _row(rates: CollisionRates, quantity: str, where: str, rank: int | None, c: Coefficient, i: int) -> RateRow:
    value, numerical, model, exponent = (
        None if (listed := c.listed(name)) is None else listed[i]
        for name in ("values", "numerical_error", "model_error", "exponent")
    )
    T = float(rates.temperatures[i])
    return RateRow(
        rates.alkali,
        rates.noble_gas,
        rates.method,
        rates.curves_id,
        quantity,
        where,
        rank,
        T,
        value,
        c.unit,
        numerical,
        model,
        exponent,
        float(mhz_per_torr(value, T)) if quantity in LINE_QUANTITIES and value is not None else None,
        COMPUTED,
        c.reason,
    )
