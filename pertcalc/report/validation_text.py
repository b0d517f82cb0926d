"""What `pertcalc validate` found, as text within 100 columns."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from pertcalc.measured import QUANTITIES, UNITS
from pertcalc.report.report_text import Citations
from pertcalc.report.tables import UNKNOWN, WIDTH, number, percent, table, with_total, wrapped
from pertcalc.report.validation_run import Validation
from pertcalc.species import READ, SPECIES_GASES
from pertcalc.validation.check import Check
from pertcalc.validation.methods import ORIGIN, temperatures_K
from pertcalc.validation.scores import ASSUMED_ERROR, LIMIT, UNFIT, Median, Score

WORDS = {
    "fwhm": "Full width (FWHM)",
    "shift": "Shift (blue > 0)",
    "transfer": "Fine-structure transfer, out of the level",
    "multipole_loss": "Loss of multipole K, outflow included",
}
READING = (
    "What gates (exit code 4): wells and rates that are READ, and exact laws, each against a tolerance stated "
    "beforehand. FROM MEMORY values are compared and never gate. Rates: only READ values of high grade whose "
    "definition is not inferred and that other sources do not contradict; the rest is scored.",
    f"sigma: deviation in units of the combined error, + when ours is larger; of the logarithm for widths and cross "
    f"sections, of the difference for shifts. a: no error is printed, {100 * ASSUMED_ERROR['high']:.0f} % assumed "
    f"(a factor 2 for grade low). !: outside {LIMIT:g} combined errors. G: this row gates.",
    "Our error: numerical, curves and method together; an estimate, not a calibrated interval. FROM MEMORY: recalled "
    "from a published source, perhaps wrong in a digit. Cross section: rate / mean relative speed.",
)


def validation_text(found: Validation) -> str:
    """The whole result, without colour."""
    cite = Citations()
    lines = _head(found)
    lines += ["", _title("Published values"), *_values(found.checks, cite)]
    lines += ["", _title("Exact laws on real input"), *_laws(found.checks, cite)]
    lines += ["", _title("Semiclassical against quantum"), *_methods(found)]
    for quantity in QUANTITIES:
        rows = [one for one in found.scores if one.measurement.quantity == quantity]
        if rows:
            lines += ["", _title(f"Measured: {WORDS[quantity]}, {UNITS[quantity]}"), *_measured(rows, cite)]
    if found.scores:
        lines += ["", _title("Ours against measured"), *_medians(found)]
    if found.missing:
        lines += ["", _title("Not in this result")]
        lines += [line for pair, why in found.missing.items() for line in wrapped(why, " " * 10, f"  {pair:8}")]
    lines += ["", _title("Sources"), *cite.lines()]
    lines += ["", _title("How to read this"), *(line for note in READING for line in wrapped(note))]
    lines += ["", _title("Verdict"), *_verdict(found)]
    return "\n".join(lines)


def _title(words: str) -> str:
    return f"== {words} ".ljust(WIDTH, "=")


def _head(found: Validation) -> list[str]:
    extent = (
        "every pair with a measurement"
        if found.everything
        else f"{len(found.pairs) + len(found.missing)} of the {found.pairs_total} measured pairs: those with a READ "
        "measurement; --all takes every pair (a minute or two)"
    )
    return [
        f"Validation of pertcalc {found.version}, rates by method {found.method}",
        *wrapped(f"{', '.join(found.quantities)}; {extent}."),
    ]


def _verdict_of(check: Check) -> str:
    return "ok" if check.passed else ("FAILED" if check.gates else "outside")


def _values(checks: Iterable[Check], cite: Citations) -> list[str]:
    rows = [
        [
            check.name + (f", {check.unit}" if check.unit != "1" else ""),
            f"{check.theirs:.6g} +- {check.tolerance:.3g}",
            number(check.ours),
            _verdict_of(check),
            f"{check.mark}{', gates' if check.gates else ''}",
            cite(f"{check.mark}: {check.source}"),
        ]
        for check in checks
        if check.group in ("well", "constant")
    ]
    return [
        *table(["", "published\n+- tolerance", "ours", "", "", ""], rows),
        *wrapped(
            "Wells a curve file was built on check the curve in use, not the physics. Tolerances: the printed error; "
            "half of the last digit where rounded; A1/2, A3/2: one splitting (no error, no zero of energy printed)."
        ),
    ]


def _laws(checks: Iterable[Check], cite: Citations) -> list[str]:
    rows = [
        [
            check.name,
            f"{check.difference:.1e}",
            f"{check.tolerance:.0e}",
            _verdict_of(check),
            check.note,
            cite(check.source),
        ]
        for check in checks
        if check.group == "law"
    ]
    return table(["", "off by", "tolerance", "", "", ""], rows, left=1)


def _methods(found: Validation) -> list[str]:
    rows = [
        [
            one.name,
            str(one.count),
            percent(one.median),
            percent(one.ninety),
            percent(one.worst),
            one.worst_where,
            UNKNOWN if one.goal is None else f"{percent(one.goal)} {'reached' if one.reached else 'MISSED'}",
        ]
        for one in found.differences
    ]
    temperatures = ", ".join(f"{T:g}" for T in temperatures_K())
    return [
        *table(["|ratio - 1|", "rates", "median", "90 %\nbelow", "worst", "", "goal for\nthe median"], rows),
        *wrapped(
            f"{ORIGIN}. 25 default pairs at {temperatures} K. A relative difference means nothing where a shift "
            "passes zero; the transfer of Rb and Cs is below 1 bohr^2."
        ),
    ]


def _measured(rows: Sequence[Score], cite: Citations) -> list[str]:
    headers = ["pair", "", "T, K", "published", "ours", "ratio", "sigma", "", "mark, grade", ""]
    return table(headers, [_row(one, cite) for one in rows], left=2)


def _row(one: Score, cite: Citations) -> list[str]:
    m = one.measurement
    sign = m.quantity == "shift"
    value = number(m.value, 3, sign and m.kind != "bound")
    relative = percent(abs(one.theirs_error / m.value)) + ("a" if one.assumed else "")
    return [
        f"{m.alkali}-{m.noble_gas}",
        m.line_or_level + (f" K={m.rank}" if m.rank else ""),
        f"{m.temperature_K:g}",
        f"|k| < {value}" if m.kind == "bound" else f"{value}+-{relative}",
        with_total(number(one.ours, 3, sign), one.numerical_error, one.model_error),
        number(one.ratio, 3),
        UNKNOWN if one.deviation is None else f"{one.deviation:+.1f}",
        ("G" if one.gates else "") + ("!" if one.outside else ""),
        f"{m.mark}, {m.grade}",
        cite(f"{m.mark}: {m.source}"),
    ]


def _medians(found: Validation) -> list[str]:
    alone = [one for one in found.medians if one.quantity is None or one.noble_gas is None]
    headers = ["", "rows", "compared", "wrong\nsign", "median\n|ln ratio|", "without\ngrade low"]
    headers += ["within\n1 sigma", f"within\n{LIMIT:g} sigma", "goal for\nthe median"]
    lines = table(headers, [_median_row(one) for one in alone])
    both = {(one.quantity, one.noble_gas): one for one in found.medians}
    gases = [gas for gas in SPECIES_GASES if (None, gas) in both]
    matrix = [
        [quantity, *(number(both[quantity, gas].median_good, 2) if (quantity, gas) in both else "" for gas in gases)]
        for quantity in QUANTITIES
        if (quantity, None) in both
    ]
    lines += ["", *wrapped("Median |ln ratio| by quantity and gas, without grade low:")]
    lines += table(["", *gases], matrix)
    part = "" if found.everything else " The goals are meant for every row (--all), not for this part."
    return [*lines, *wrapped(f"A wrong sign counts as infinitely far off in a median.{part}")]


def _median_row(one: Median) -> list[str]:
    return [
        one.quantity or one.noble_gas or "",
        str(one.rows),
        str(one.compared),
        str(one.opposite),
        number(one.median, 2),
        f"{number(one.median_good, 2)} ({one.good})",
        UNKNOWN if one.within_one is None else f"{100 * one.within_one:.0f}%",
        UNKNOWN if one.within_three is None else f"{100 * one.within_three:.0f}%",
        UNKNOWN if one.goal is None else number(one.goal, 2),
    ]


def _verdict(found: Validation) -> list[str]:
    gating = [check for check in found.checks if check.gates]
    groups = (("well", "published wells (depths and positions)"), ("law", "exact laws"), ("rate", "measured rates"))
    counts = ", ".join(f"{sum(check.group == name for check in gating)} {words}" for name, words in groups)
    if found.failed:
        names = "; ".join(check.name for check in found.failed)
        result = f"FAILED: {len(found.failed)} of {len(gating)} gating checks ({counts}): {names}."
    else:
        result = f"All {len(gating)} gating checks within their stated tolerance: {counts}."
    lines = wrapped(result)
    outside = [one for one in found.scores if one.outside and not one.gates]
    if outside:
        lines += wrapped(f"Outside {LIMIT:g} combined errors, reported and not gating:")
        lines += [line for one in outside for line in wrapped(_outside(one), "    ", "  - ")]
    if found.missing:
        lines += wrapped(f"Not checked in this run: {', '.join(found.missing)}.")
    return lines


def _outside(one: Score) -> str:
    m = one.measurement
    rank = f" K={m.rank}" if m.rank else ""
    conflict = UNFIT.get((m.alkali, m.quantity, m.line_or_level)) if m.mark == READ else None
    return (
        f"{m.alkali}-{m.noble_gas} {m.line_or_level} {m.quantity}{rank}: {number(m.value, 3)} published, "
        f"{number(one.ours, 3)} here [{m.unit}]; {conflict or one.no_gate}."
    )
