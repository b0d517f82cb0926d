"""What `pertcalc validate` found, for other programs: one JSON object ``pertcalc.validation/1``, or flat CSV rows."""

from __future__ import annotations

import csv
import io
import math
from dataclasses import asdict
from typing import Any

from pertcalc.report.validation_run import Validation
from pertcalc.species import COMPUTED
from pertcalc.validation.methods import ORIGIN, temperatures_K
from pertcalc.validation.scores import ASSUMED_ERROR, LIMIT, Score

DEFINITION = (
    "deviation: ln(ours/theirs) / hypot(relative errors) for fwhm, transfer, multipole_loss; (ours - theirs) / "
    "hypot(errors) for shift; max(0, |ours| - bound) / error of ours for a bound"
)
COLUMNS = (
    "record", "name", "alkali", "noble_gas", "quantity", "line_or_level", "rank", "temperature_K", "unit", "theirs",
    "theirs_error", "theirs_error_assumed", "ours", "ours_numerical_error_relative", "ours_model_error_relative",
    "ratio", "deviation", "difference", "tolerance", "tolerance_unit", "passed", "gates", "rows", "median", "ninety",
    "worst", "goal", "mark", "grade", "source", "note",
)  # fmt: skip


def validation_json(found: Validation) -> dict[str, Any]:
    """The object of ``pertcalc validate --json``: plain types, units in the names, no nan."""
    return _clean(
        {
            "schema": "pertcalc.validation/1",
            "method": found.method,
            "everything": found.everything,
            "quantities": list(found.quantities),
            "passed": not found.failed,
            "failed": [check.name for check in found.failed],
            "checks": [asdict(check) | {"passed": check.passed} for check in found.checks],
            "method_differences": {
                "origin": ORIGIN,
                "temperatures_K": temperatures_K(),
                "classes": [asdict(one) | {"reached": one.reached} for one in found.differences],
            },
            "measured": [_measured(one) for one in found.scores],
            "medians": [asdict(one) for one in found.medians],
            "definition": DEFINITION,
            "limit": LIMIT,
            "assumed_error_relative": dict(ASSUMED_ERROR),
            "pairs": list(found.pairs),
            "pairs_total": found.pairs_total,
            "missing": dict(found.missing),
            "interrupted": found.interrupted,
            "version": found.version,
        }
    )


def _measured(one: Score) -> dict[str, Any]:
    return asdict(one.measurement) | {
        "error": None if one.measurement.kind == "bound" else one.theirs_error,
        "error_assumed": one.assumed,
        "ours": one.ours,
        "ours_numerical_error_relative": one.numerical_error,
        "ours_model_error_relative": one.model_error,
        "ours_mark": COMPUTED,
        "ratio": one.ratio,
        "log_ratio": one.log_ratio,
        "deviation": one.deviation,
        "outside": one.outside,
        "gates": one.gates,
        "no_gate": one.no_gate,
    }


def _clean(value: Any) -> Any:
    """The same without numbers JSON has no word for: they become null."""
    if isinstance(value, dict):
        return {key: _clean(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_clean(item) for item in value]
    return None if isinstance(value, float) and not math.isfinite(value) else value


def validation_csv(found: Validation) -> str:
    """Rows with the columns COLUMNS: ``record`` is check, measured, method or median."""
    text = io.StringIO()
    writer = csv.DictWriter(text, COLUMNS, lineterminator="\n")
    writer.writeheader()
    for record in (*_check_rows(found), *_measured_rows(found), *_summary_rows(found)):
        writer.writerow(_clean(record))
    return text.getvalue()


def _check_rows(found: Validation) -> list[dict[str, Any]]:
    names = ("name", "unit", "theirs", "ours", "difference", "tolerance", "tolerance_unit", "gates", "mark", "source")
    return [
        {name: getattr(check, name) for name in names}
        | {"record": "check", "quantity": check.group, "passed": check.passed, "note": check.note}
        for check in found.checks
    ]


def _measured_rows(found: Validation) -> list[dict[str, Any]]:
    shared = ("alkali", "noble_gas", "quantity", "line_or_level", "rank", "temperature_K", "unit", "mark", "grade")
    rows = []
    for one in found.scores:
        m = one.measurement
        row = {name: getattr(m, name) for name in (*shared, "source", "note")}
        row |= {
            "record": "measured",
            "name": m.published,
            "theirs": m.value,
            "theirs_error": None if m.kind == "bound" else one.theirs_error,
            "theirs_error_assumed": one.assumed,
            "ours": one.ours,
            "ours_numerical_error_relative": one.numerical_error,
            "ours_model_error_relative": one.model_error,
            "ratio": one.ratio,
            "deviation": one.deviation,
            "gates": one.gates,
        }
        rows.append(row)
    return rows


def _summary_rows(found: Validation) -> list[dict[str, Any]]:
    methods = [
        {
            "record": "method",
            "name": f"|semiclassical/quantum - 1|, {one.name}",
            "unit": "1",
            "rows": one.count,
            "median": one.median,
            "ninety": one.ninety,
            "worst": one.worst,
            "goal": one.goal,
            "passed": one.reached,
            "gates": False,
            "mark": COMPUTED,
            "note": f"worst: {one.worst_where}; {ORIGIN}",
        }
        for one in found.differences
    ]
    groups = [
        {
            "record": "median",
            "name": "|ln ratio|",
            "noble_gas": one.noble_gas,
            "quantity": one.quantity,
            "unit": "1",
            "rows": one.compared,
            "median": one.median,
            "goal": one.goal,
            "mark": COMPUTED,
        }
        for one in found.medians
    ]
    return [*methods, *groups]
