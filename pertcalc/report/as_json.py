"""The report as one JSON object, ``pertcalc.report/1``: plain types, units in the names, no nan."""

from __future__ import annotations

import json
import math
from dataclasses import asdict
from typing import Any

from pertcalc.report.comparison import Comparison
from pertcalc.report.compute import GasReport, Report
from pertcalc.report.rows import FillRow, fill_rows
from pertcalc.report.words import CAUTIONS, balance_line
from pertcalc.species import alkali
from pertcalc.vapour.fill import DEFAULTS_ORIGIN


def dump(value: Any) -> str:
    """One JSON object as text; a nan is a bug and raises ValueError."""
    return json.dumps(value, indent=2, sort_keys=False, allow_nan=False)


def report_json(report: Report) -> dict[str, Any]:
    """The object of ``pertcalc report --json``; ``gases[i].rates`` follows the contract ``pertcalc.rates/1``."""
    request, fill = report.request, report.request.fill
    record = alkali(request.alkali)
    return {
        "schema": "pertcalc.report/1",
        "alkali": request.alkali,
        "method": request.method,
        "conditions": {
            "temperature_K": fill.temperature_K,
            "pressure_torr": fill.pressure_torr,
            "fill_temperature_K": fill.fill_temperature_K,
            "density_cm3": fill.density_cm3,
            "pressure_in_use_torr": fill.pressure_in_use_torr,
            "field_G": fill.field_G,
            "defaults": list(request.defaults),
            "defaults_origin": DEFAULTS_ORIGIN,
        },
        "atom": {
            level: {
                "lifetime_ns": _sourced(record.levels[level].lifetime_ns),
                "decay_s": record.decay_rate(level),
                "gJ": _sourced(record.levels[level].gJ),
            }
            for level in ("P1/2", "P3/2")
        },
        "gases": [_gas(gas, fill.density_cm3) for gas in report.gases],
        "missing": dict(report.missing),
        "interrupted": report.interrupted,
        "cautions": list(CAUTIONS),
        "version": report.version,
    }


def _gas(gas: GasReport, density: float) -> dict[str, Any]:
    return {
        "noble_gas": gas.noble_gas,
        "rates": gas.rates.to_json(),
        "at_fill": [_at_fill(row) for row in fill_rows(gas, density)],
        "levels": {level: _balance(gas, level) for level in gas.balances},
        "measured": [_measured(one) for one in gas.comparisons],
        "curve_sources": {
            name: asdict(state.source) | {"mark": state.mark} for name, state in gas.curves.states.items()
        },
        "width_times_collision_duration": gas.impact if math.isfinite(gas.impact) else None,
        "warnings": list(gas.warnings),
    }


def _at_fill(row: FillRow) -> dict[str, Any]:
    rate = row.rate
    return {
        "quantity": rate.quantity,
        "line_or_level": rate.line_or_level,
        "rank": rate.rank,
        "value": row.at_fill,
        "unit": row.at_fill_unit,
        "mhz_per_torr": rate.mhz_per_torr,
        "ratio_to_decay": row.ratio_to_decay,
        "numerical_error_relative": rate.numerical_error_relative,
        "model_error_relative": rate.model_error_relative,
        "mark": rate.mark,
    }


def _balance(gas: GasReport, level: str) -> dict[str, Any]:
    balance = gas.balances[level]
    return {
        "decay_s": balance.decay,
        "loss_s": {str(K): rate for K, rate in balance.losses.items()},
        "larmor_rad_s": balance.larmor,
        "hanle_free_G": balance.hanle_free_G,
        "hanle_G": {str(K): field for K, field in balance.hanle_G.items()},
        "dominant": balance.winner,
        "comparable": list(balance.comparable),
        "sentence": balance_line(balance),
    }


def _measured(one: Comparison) -> dict[str, Any]:
    return asdict(one.measurement) | {
        "ours": one.ours,
        "ours_numerical_error_relative": one.numerical_error,
        "ours_model_error_relative": one.model_error,
        "ratio": one.ratio,
    }


def _sourced(value: Any) -> dict[str, Any] | None:
    return None if value is None else asdict(value)
