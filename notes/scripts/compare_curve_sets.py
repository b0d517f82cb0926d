"""Rates of several curve sets beside the measurements: which curve of which set serves best, per quantity.

    python notes/scripts/compare_curve_sets.py [MODEL_FOLDER]

Sets: "default" (potentials/*_default.toml as they are), "model" (X, A, B of MODEL_FOLDER/*_model.toml, potentials/ of
the checkout unless given), "B of model" (X, A as default), "published wells" (X and A of the default where their well
is published or recalled from a publication, else of the model; B of the model), "A of default" (X, B of the model).
Semiclassical, without error estimates.
Prints medians of |ln(ours/theirs)| and every row. Some six minutes on two cores.
"""

from __future__ import annotations

import sys
from concurrent.futures import ProcessPoolExecutor
from dataclasses import replace
from pathlib import Path

import numpy as np

from pertcalc.collisions.pair import pair_of
from pertcalc.collisions.recipe import averaged, family_tables, thermal_rates
from pertcalc.constants import AU_RATE_CM3_S
from pertcalc.curves import files
from pertcalc.curves.curveset import CurveSet
from pertcalc.measured import QUANTITIES, Measurement, as_rate, measurements
from pertcalc.species import ALKALIS, GASES

PUBLISHED = ("published", "from-memory")
SETS = ("default", "model", "B of model", "published wells", "A of default")


def sets_of(alkali: str, gas: str, folder: Path) -> dict[str, CurveSet]:
    """The curve sets to compare for one pair."""
    default = files.load_default(alkali, gas)
    model = files.load(folder / f"{alkali}-{gas}_model.toml".lower())
    wells = {
        name: (default if default.states[name].source.status in PUBLISHED else model).states[name] for name in "XA"
    }
    return {
        "default": default,
        "model": model,
        "B of model": replace(default, states={**default.states, "B": model.states["B"]}),
        "A of default": replace(model, states={**model.states, "A": default.states["A"]}),
        "published wells": replace(default, states={**wells, "B": model.states["B"]}),
    }


def compare(task: tuple[str, str, Path]) -> list[tuple[str, Measurement, float]]:
    """Set, measurement and ratio ours/theirs of every measured value of one pair."""
    alkali, gas, folder = task
    rows = [one for one in measurements(alkali, gas) if one.kind == "value" and one.value]
    if not rows:
        return []
    temperatures = np.unique([one.temperature_K for one in rows])
    found = []
    for name, curves in sets_of(alkali, gas, folder).items():
        pair = pair_of(curves)
        rates = averaged(thermal_rates, pair, temperatures, family_tables(pair, temperatures))
        for one in rows:
            key = (one.quantity, one.line_or_level)
            key = ("loss", one.line_or_level, str(one.rank)) if one.quantity == "multipole_loss" else key
            i = int(np.argmin(np.abs(temperatures - one.temperature_K)))
            ours = rates[key][i].rate * AU_RATE_CM3_S
            found.append((name, one, ours / as_rate(one, pair.reduced_mass).value))
    return found


def main() -> None:
    """Print the tables."""
    folder = Path(sys.argv[1]) if len(sys.argv) > 1 else files.default_folder()
    tasks = [(alkali, gas, folder) for alkali in ALKALIS for gas in GASES]
    with ProcessPoolExecutor(2) as pool:
        rows = [row for part in pool.map(compare, tasks) for row in part]
    print("| quantity | rows | " + " | ".join(SETS) + " |\n|---|---|" + "---|" * len(SETS))
    for quantity in QUANTITIES:
        for grade in ("READ", "all but low", "all"):
            chosen = [r for r in rows if r[1].quantity == quantity and _counts(r[1], grade)]
            cells = [_median([ratio for name, _, ratio in chosen if name == one]) for one in SETS]
            print(f"| {quantity}, {grade} | {len(chosen) // len(SETS)} | " + " | ".join(cells) + " |")
    print()
    for one in dict.fromkeys(m for _, m, _ in rows):
        cells = [f"{next(r for n, m, r in rows if n == name and m is one):.2f}" for name in SETS]
        what = (
            f"{one.alkali}-{one.noble_gas} {one.line_or_level} {one.quantity} {one.rank or ''} {one.temperature_K:g} K"
        )
        print(f"| {what} | {one.mark} {one.grade} | " + " | ".join(cells) + " |")


def _counts(measurement: Measurement, grade: str) -> bool:
    if grade == "READ":
        return measurement.mark == "READ"
    return grade == "all" or measurement.grade != "low"


def _median(ratios: list[float]) -> str:
    if not ratios:
        return "-"
    sizes = [abs(np.log(ratio)) if ratio > 0 else np.inf for ratio in ratios]
    return f"{100 * float(np.median(sizes)):.1f} %"


if __name__ == "__main__":
    main()
