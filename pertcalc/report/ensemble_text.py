"""An ensemble of rates as text: what is sampled, the interval of every rate, and which inputs it comes from."""

from __future__ import annotations

from pertcalc.ensemble_result import Ensemble, Sensitivity
from pertcalc.report.ensemble_data import dominant, key_of, known
from pertcalc.report.rates_text import rates_text
from pertcalc.report.rows import RateRow, rate_rows
from pertcalc.report.tables import UNKNOWN, number, percent, table, wrapped
from pertcalc.report.words import quantity_words
from pertcalc.results import LEVEL_UNIT, LINE_UNIT

READING = (
    "16 ... 84 %: so many of the members lie below. sd: of the members, relative to the value above. Shares of the "
    "variance in first order; in brackets d ln|k| / d ln(parameter), or of k in units of |k| where its sign changes. "
    "What the shares leave out is curvature, interaction and the noise of the coarse grids (about 1 % of a width)."
)
# A share smaller than this [1] is not named.
_LEAST = 0.01


def rates_ensemble_text(found: Ensemble) -> str:
    """The rates and, below them, their ensemble."""
    return rates_text(found.nominal) + "\n\n" + "\n".join(ensemble_lines(found))


def ensemble_lines(found: Ensemble) -> list[str]:
    """What was sampled and one table per temperature and unit, at most 100 columns."""
    curves = [one for one in found.inputs if one.kind == "curve"]
    stated = ", ".join(f"{one.name} {percent(one.relative)}" for one in curves if one.relative)
    method = " and the difference of the method to quantum close coupling" if len(curves) < len(found.inputs) else ""
    sets = f" Curve sets: {', '.join(found.sets)}." if len(found.sets) > 1 else ""
    spread = f" Its standard deviations are known to {percent(found.sd_error)}." if found.size > 1 else ""
    lines = wrapped(
        f"Ensemble of {found.size} members (seed {found.seed}), COMPUTED: {stated or 'no stated error of the curves'}"
        f"{method}, sampled together.{sets}{spread}",
        "",
    )
    if found.size < found.asked:
        lines += wrapped(f"{found.size} of {found.asked} members were finished.", "")
    for reason in dict.fromkeys(f"failed: {why}" for why in found.failed.values()):
        lines += wrapped(reason)
    rows = rate_rows(found.nominal)
    for at, T in enumerate(found.nominal.temperatures):
        here = [row for row in rows if row.temperature_K == T and row.value is not None]
        for unit in (LINE_UNIT, LEVEL_UNIT):
            lines += ["", f"At {T:.6g} K, ensemble, k [{unit}]"]
            lines += _table(found, [row for row in here if row.unit == unit], at)
    key = next(iter(found.samples))
    questions = (lambda: found.sd(key), lambda: found.interval(key), lambda: found.fit(key))
    for reason in dict.fromkeys(known(question)[1] for question in questions):
        if reason:
            lines += wrapped(f"- {reason}", indent="    ", first="  ")
    return [*lines, "", *wrapped(READING)]


def _table(found: Ensemble, rows: list[RateRow], at: int) -> list[str]:
    headers = ["", "", "comes from", "16 %", "84 %", "sd"]
    return table(headers, [_cells(found, row, at) for row in rows], left=3, indent=0)


def _cells(found: Ensemble, row: RateRow, at: int) -> list[str]:
    key, sign = key_of(row), row.quantity in ("shift", "multipole_transfer")
    interval, _ = known(lambda: found.interval(key)[:, at])
    sd, _ = known(lambda: found.sd(key)[at])
    named = [one for one in dominant(found, key, at) if one.share[at] >= _LEAST]
    return [
        row.line_or_level,
        quantity_words(row.quantity, row.line_or_level, row.rank),
        ", ".join(_share(one, at) for one in named) or UNKNOWN,
        *([UNKNOWN] * 2 if interval is None else [number(float(value), 3, sign) for value in interval]),
        UNKNOWN if sd is None or not row.value else percent(float(sd) / abs(row.value)),
    ]


def _share(one: Sensitivity, at: int) -> str:
    slope = "" if one.derivative is None else f" ({one.derivative[at]:+.2g})"
    return f"{one.name.split('.')[0] if one.derivative is None else one.name} {percent(float(one.share[at]))}{slope}"
