"""Every measurement beside ours, pair by pair, and what the worst pairs tell about their curves.

Makes notes/validation.md and notes/validation.png. Run from the project's root: python
notes/scripts/make_validation_note.py [JOBS]. Half a minute to two on two cores.
"""

from __future__ import annotations

import math
import statistics
import sys
from collections.abc import Callable, Iterable, Sequence
from pathlib import Path

from pertcalc.measured import QUANTITIES, UNITS
from pertcalc.report.compute import default_jobs
from pertcalc.report.validation_figures import own_error, pulls, save_validation, share_within_one
from pertcalc.report.validation_run import Validation, validate
from pertcalc.species import SPECIES_GASES
from pertcalc.validation.scores import ASSUMED_ERROR, GOALS, UNFIT, Median, Score

ROOT = Path(__file__).parents[2]
NOTE = ROOT / "notes" / "validation.md"
FIGURE = ROOT / "notes" / "validation.png"
WORDS = {"fwhm": "full width", "shift": "shift", "transfer": "transfer", "multipole_loss": "multipole loss"}
BEYOND = 2.0  # combined errors: what lies further is a worst row
SHARE_GOAL = (0.60, 0.75)
NORMAL_SHARE = math.erf(math.sqrt(0.5))  # within one sigma
# Van der Waals width and shift go as C6^(2/5) of the difference curve.
C6_POWER = 2.5


def pair(one: Score) -> str:
    """ "Na-Ar" of a score."""
    return f"{one.measurement.alkali}-{one.measurement.noble_gas}"


def md_table(headers: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    """A table of Markdown."""
    lines = ["| " + " | ".join(cells) + " |" for cells in [headers, ["---"] * len(headers), *rows]]
    return "\n".join(lines)


def percent(x: float | None) -> str:
    """A share or relative size [1] as percent."""
    return "-" if x is None else f"{100 * x:.1f} %" if abs(x) < 0.2 else f"{100 * x:.0f} %"


def ratio(x: float | None) -> str:
    """ours/theirs [1]: two decimals, one digit where that would show nothing."""
    return "-" if x is None else f"{x:.2f}" if abs(x) >= 0.1 else f"{x:.1g}"


def signed_median(rows: Sequence[Score]) -> float | None:
    """Median of ln(ours/theirs) [1] over the rows of the same sign; None without one."""
    logs = [one.log_ratio for one in rows if one.log_ratio is not None]
    return statistics.median(logs) if logs else None


def median_row(one: Median, scores: Sequence[Score]) -> list[str]:
    """Cells of one group: its medians and shares, with the goal where it has one."""
    rows = [s for s in scores if one.quantity in (None, s.measurement.quantity)]
    rows = [s for s in rows if one.noble_gas in (None, s.measurement.noble_gas)]
    goal = "-" if one.goal is None else f"{percent(one.goal)}: {verdict(one.median, one.goal)}"
    bias, share = signed_median(rows), share_within_one(rows)
    return [
        WORDS.get(one.quantity or "", one.noble_gas or ""), str(one.rows), str(one.compared), str(one.opposite),
        percent(one.median), f"{percent(one.median_good)} ({one.good})",
        "-" if bias is None else f"{math.exp(bias):.2f}",
        f"{len(pulls(rows))}", "-" if share is None else f"{100 * share:.0f} %", goal,
    ]  # fmt: skip


def verdict(reached: float | None, goal: float) -> str:
    """Whether a median reaches its goal."""
    return "reached" if reached is not None and reached <= goal else "MISSED"


def matrix(found: Validation, value: Callable[[Median], float | None], count: Callable[[Median], int]) -> str:
    """Quantity by gas, one number [1] of a median each, with its number of rows."""
    both = {(one.quantity, one.noble_gas): one for one in found.medians}
    rows = []
    for quantity in QUANTITIES:
        cells = [both.get((quantity, gas)) for gas in SPECIES_GASES]
        rows.append([WORDS[quantity], *("" if c is None else f"{percent(value(c))} ({count(c)})" for c in cells)])
    return md_table(["", *SPECIES_GASES], rows)


def score_row(one: Score) -> list[str]:
    """Cells of one measurement beside ours."""
    m, own = one.measurement, own_error(one)
    theirs = f"\\|k\\| < {m.value:.3g}" if m.kind == "bound" else f"{m.value:.3g} +- {one.theirs_error:.2g}"
    ours = "-" if one.ours is None else f"{one.ours:.3g}"
    ours += " (no error)" if own is None or one.ours is None else f" +- {own * abs(one.ours):.2g}"
    return [
        pair(one), m.line_or_level + (f" K={m.rank}" if m.rank else ""), f"{m.temperature_K:g}",
        theirs + (" a" if one.assumed else ""), ours,
        ratio(one.ratio),
        "-" if one.deviation is None else f"{one.deviation:+.1f}", f"{m.mark}, {m.grade}",
        ("G" if one.gates else "") + ("!" if one.outside else ""),
    ]  # fmt: skip


def tables(scores: Sequence[Score]) -> str:
    """The pair-by-pair table of each quantity."""
    parts = []
    for quantity in QUANTITIES:
        rows = [score_row(one) for one in scores if one.measurement.quantity == quantity]
        headers = ["pair", "", "T, K", "theirs", "ours", "ratio", "pull", "mark, grade", ""]
        parts.append(f"### {WORDS[quantity].capitalize()}, {UNITS[quantity]}\n\n{md_table(headers, rows)}")
    return "\n\n".join(parts)


def pair_table(scores: Sequence[Score]) -> str:
    """Median ratio of each pair and quantity, signs apart counted as such."""
    rows = []
    for name in dict.fromkeys(map(pair, scores)):
        mine = [one for one in scores if pair(one) == name and one.ratio is not None]
        cells = []
        for quantity in QUANTITIES:
            here = [one.ratio for one in mine if one.measurement.quantity == quantity and one.ratio is not None]
            cells.append(f"{ratio(statistics.median(here))} ({len(here)})" if here else "")
        found = pulls(mine)
        worst = max(found, key=abs) if found else None
        rows.append([name, *cells, "-" if worst is None else f"{worst:+.1f}"])
    order = sorted(rows, key=lambda row: SPECIES_GASES.index(row[0].split("-")[1]))
    return md_table(["pair", *WORDS.values(), "worst pull"], order)


def alkali_table(scores: Sequence[Score]) -> str:
    """Per alkali and quantity: median ratio and how many rows lie low and high; what is common to all gases."""
    rows = []
    for metal, quantity in dict.fromkeys((one.measurement.alkali, one.measurement.quantity) for one in scores):
        mine = [o for o in scores if (o.measurement.alkali, o.measurement.quantity) == (metal, quantity)]
        logs = [one.log_ratio for one in mine if one.log_ratio is not None]
        if not logs:
            continue
        low, high = sum(x < 0 for x in logs), sum(x > 0 for x in logs)
        gases = {one.measurement.noble_gas for one in mine if one.log_ratio is not None}
        one_sided = len(gases) > 2 and 0 in (low, high)
        cells = [f"{math.exp(statistics.median(logs)):.2f}", str(low), str(high), str(len(gases))]
        rows.append([metal, WORDS[quantity], *cells, "one side in every gas" if one_sided else ""])
    return md_table(["alkali", "", "median ratio", "low", "high", "gases", ""], rows)


def worst_paragraphs(scores: Sequence[Score]) -> str:
    """One paragraph per pair with a row beyond BEYOND combined errors, the worst pair first."""
    far = [one for one in scores if one.deviation is not None and abs(one.deviation) > BEYOND]
    far.sort(key=lambda one: -abs(one.deviation or 0.0))
    parts = []
    for name in dict.fromkeys(map(pair, far)):
        mine = [one for one in scores if pair(one) == name]
        rows = "; ".join(map(describe, (one for one in far if pair(one) == name)))
        parts.append(f"- **{name}**: {rows}. {' '.join(meaning(mine, [o for o in far if pair(o) == name]))}")
    return "\n".join(parts) if parts else f"None lies beyond {BEYOND:g} combined errors."


def describe(one: Score) -> str:
    """A row in words: what, ratio, pull, mark."""
    m = one.measurement
    rank = f" K={m.rank}" if m.rank else ""
    times = "" if one.ratio is None else f"ours/theirs {ratio(one.ratio)}, "
    conflict = UNFIT.get((m.alkali, m.quantity, m.line_or_level))
    what = f"{m.line_or_level} {WORDS[m.quantity]}{rank} at {m.temperature_K:g} K ({m.mark}, {m.grade})"
    return f"{what}: {times}pull {one.deviation:+.1f}" + (f" ({conflict})" if conflict else "")


def meaning(mine: Sequence[Score], far: Sequence[Score]) -> list[str]:
    """What the rows of a pair say about its curves, by rule, from the signs and sizes of its deviations."""
    found = [company(mine, far)]
    quantities = {one.measurement.quantity for one in far}
    if quantities & {"fwhm", "shift"}:
        found += line_meaning(mine)
    if "transfer" in quantities:
        low = sum(math.copysign(1, o.deviation or 0) for o in far if o.measurement.quantity == "transfer") < 0
        found.append(
            f"Transfer too {'low' if low else 'high'}: the levels mix too {'little' if low else 'much'} where B - A is "
            "of the size of the splitting, on the inner wall; it says nothing about the tails."
        )
    if "multipole_loss" in quantities:
        low = sum(math.copysign(1, o.deviation or 0) for o in far if o.measurement.quantity == "multipole_loss") < 0
        found.append(
            f"Multipole loss too {'low' if low else 'high'}: B - A reaches {'less' if low else 'further'} than the "
            "measurement wants, if the measurement is right."
        )
    return found


def company(mine: Sequence[Score], far: Sequence[Score]) -> str:
    """Whether the pair's other rows agree: a lone deviation points at the row, a common one at the curves."""
    signs = {math.copysign(1, one.deviation or 0.0) for one in far}
    same = {one.measurement.quantity for one in far}
    others = [o for o in mine if o not in far and o.measurement.quantity in same and o.deviation is not None]
    if not others:
        return "No other row of the quantity stands beside it."
    along = sum(math.copysign(1, o.deviation or 0.0) in signs and abs(o.deviation or 0.0) > 0.5 for o in others)
    cause = "the curves are the likelier cause" if 2 * along > len(others) else "the row is as suspect as the curves"
    return f"{along} of {len(others)} other rows of the quantity lie more than half an error off to that side: {cause}."


def line_meaning(mine: Sequence[Score]) -> list[str]:
    """Width and shift factors of a pair, and what a common or an opposite deviation implies."""
    width = signed_median([one for one in mine if one.measurement.quantity == "fwhm"])
    shift = signed_median([one for one in mine if one.measurement.quantity == "shift"])
    found = []
    if width is not None:
        words = f"Widths {math.exp(width):.2f} of the measured (median)"
        if not mine[0].measurement.noble_gas.endswith("He"):  # in helium the wall broadens, not the tail
            words += (
                f"; read as van der Waals broadening, C6 of the difference curve is {math.exp(C6_POWER * width):.2f} "
                "times what the measured widths want"
            )
        found.append(words + ".")
    if width is not None and shift is not None:
        if abs(shift) < abs(width) / 3:
            words = f"The shifts agree ({math.exp(shift):.2f}); C6 alone would move both by one factor, so"
        elif width * shift < 0:
            words = f"The shifts deviate the other way ({math.exp(shift):.2f}), which no C6 alone can do:"
        else:
            words = ""
            found.append(
                f"The shifts deviate alike ({math.exp(shift):.2f}): another range of A - X and B - X suffices."
            )
        if words:
            found.append(f"{words} De and Re of A and B against X, which balance red tail and blue wall, are suspect.")
    if any(one.opposite for one in mine):
        found.append("A shift of opposite sign: the balance of red tail and blue wall is off.")
    return found


def size_of_errors(scores: Sequence[Score], quantity: str) -> str:
    """What the share of pulls within one sigma says about the combined errors of a quantity."""
    rows = [one for one in scores if one.measurement.quantity == quantity]
    share = share_within_one(rows)
    if share is None:
        return "no pull."
    low, high = SHARE_GOAL
    count = len(pulls(rows))
    chance = math.sqrt(NORMAL_SHARE * (1 - NORMAL_SHARE) / count)
    words = "the errors are of the right size"
    if not low <= share <= high:
        words = f"the errors are too {'small' if share < low else 'large'}"
        if abs(share - NORMAL_SHARE) < 2 * chance:
            words = "outside the goal, yet within two standard deviations of the chance of so few rows"
    return f"{100 * share:.0f} +- {100 * chance:.0f} % of {count} pulls within one combined error: {words}."


def text(found: Validation) -> str:
    """The whole note."""
    alone = [one for one in found.medians if one.quantity is None or one.noble_gas is None]
    headers = ["", "rows", "compared", "wrong sign", "median \\|ln ratio\\|", "without grade low", "median ratio"]
    headers += ["pulls", "within 1 sigma", "goal for the median"]
    every = pulls(found.scores)
    share = share_within_one(found.scores)
    low, high = SHARE_GOAL
    where = "no pull"
    if share is not None:
        where = "reached" if low <= share <= high else "above: our errors are too large" if share > high else "MISSED"
    by_quantity = {one.quantity: one for one in found.medians if one.noble_gas is None}
    reached = [
        f"- {WORDS[q]}: median deviation {percent(by_quantity[q].median)} ("
        f"{percent(by_quantity[q].median_good)} without "
        f"grade low), goal {percent(goal)}: {verdict(by_quantity[q].median, goal)}."
        for q, goal in GOALS.items()
    ]
    reached.append(
        f"- {'-' if share is None else f'{100 * share:.1f} %'} of {len(every)} pulls within one combined error, goal "
        f"{100 * low:.0f}-{100 * high:.0f} %: {where}. Mean pull {statistics.mean(every):+.2f}, root mean square "
        f"{math.sqrt(statistics.mean(x * x for x in every)):.2f}."
    )
    agreed = [
        o
        for o in found.scores
        if (o.measurement.alkali, o.measurement.quantity, o.measurement.line_or_level) not in UNFIT
    ]
    reached.append(
        "- without the rows in conflict with other sources (Rb P1/2 disorientation), root mean square pull "
        f"{math.sqrt(statistics.mean(x * x for x in pulls(agreed))):.2f}: calibrated errors give 1."
    )
    reached += [f"- {WORDS[q]}: {size_of_errors(found.scores, q)}" for q in QUANTITIES]
    missing = "".join(f"\n- not computed: {name}, {why}" for name, why in found.missing.items())
    return TEXT.format(
        method=found.method, version=found.version, reached="\n".join(reached) + missing,
        medians=md_table(headers, [median_row(one, found.scores) for one in alone]),
        matrix=matrix(found, lambda one: one.median, lambda one: one.compared),
        good=matrix(found, lambda one: one.median_good, lambda one: one.good),
        pairs=pair_table(found.scores), alkalis=alkali_table(found.scores),
        worst=worst_paragraphs(found.scores), tables=tables(found.scores),
        beyond=f"{BEYOND:g}", assumed=f"{100 * ASSUMED_ERROR['high']:.0f} %", pair_count=len(found.pairs),
        failed=", ".join(check.name for check in found.failed) or "none",
    )  # fmt: skip


TEXT = """# Ours against everything published, pair by pair

Made by notes/scripts/make_validation_note.py; do not edit. pertcalc {version}, method {method}, default curves,
{pair_count} measured pairs. Ours: COMPUTED, error = numerical, curves and method in quadrature. Theirs: the tables of
notes/measured.md (source of each row there and in `pertcalc validate --all`); a: no error printed, {assumed} assumed (a
factor e for grade low). Pull: deviation in combined errors, > 0 when ours is larger (notes/validation-command.md).
FROM MEMORY: recalled from a published source, perhaps wrong in a digit. Gating checks that failed: {failed}.

## Goals

{reached}

Medians of |ln ratio|; a wrong sign counts as infinitely far off, a bound has neither ratio nor pull. The rows of one
pair share its curves and often one experiment: their pulls are not independent, and the share is less certain than its
count of rows suggests. A bar of ours that crosses the figure is a relative error far above 1.

![ours against measured, and pulls](validation.png)

## Medians

{medians}

Median |ln ratio| by quantity and gas (rows):

{matrix}

The same without grade low:

{good}

## Median ratio ours/theirs of each pair (rows)

A negative ratio is a shift of opposite sign.

{pairs}

## What an alkali has in common

A deviation to one side in every gas is hardly the chance error of one curve; likelier it is the source (one experiment
for all gases), the method, or the way the curves of that alkali were made.

{alkalis}

## What the worst pairs tell about their curves

Pairs with a row beyond {beyond} combined errors, the worst first. The sentences follow from the numbers by rule
(`meaning` in the script): they say what kind of change of the curves would help, not that the measurement is right.

{worst}

## Row by row

G: this row gates. !: beyond 3 combined errors.

{tables}
"""


def main(jobs: int) -> None:
    """Compute, write the note and the figure."""
    found = validate(everything=True, jobs=jobs, progress=lambda done, total: print(f"\r{done}/{total}", end=""))
    save_validation(found.scores, FIGURE, f"pertcalc {found.version} against published measurements, {found.method}")
    NOTE.write_text(text(found), encoding="utf-8")
    print(f"\nwrote {NOTE} and {FIGURE}")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else default_jobs())
