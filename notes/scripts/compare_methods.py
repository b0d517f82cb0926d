"""Semiclassical against quantum close coupling over the 25 default pairs at 300, 400 and 500 K.

Makes pertcalc/data/method_differences.json (part of the model error), notes/method-comparison.md and .png. Run from the
project's root: python notes/scripts/compare_methods.py [FOLDER]. About five minutes on two cores; finished pairs are
kept in FOLDER (default: a folder of the system's temporary files) and not computed again.
"""

from __future__ import annotations

import json
import pickle
import sys
import tempfile
from concurrent.futures import ProcessPoolExecutor
from functools import partial
from pathlib import Path

import matplotlib
import numpy as np

from pertcalc.collisions import quantum, recipe
from pertcalc.collisions.pair import pair_of
from pertcalc.curves import files
from pertcalc.thermal import mean_speed

TEMPERATURES = (300.0, 400.0, 500.0)
ROOT = Path(__file__).parents[2]
DATA = ROOT / "pertcalc" / "data" / "method_differences.json"
NOTE = ROOT / "notes" / "method-comparison.md"
FIGURE = ROOT / "notes" / "method-comparison.png"
# Column title, rate key, goal for the median of |ratio - 1|.
COLUMNS = (
    ("D1 width", ("fwhm", "D1"), 0.02),
    ("D2 width", ("fwhm", "D2"), 0.02),
    ("D1 shift", ("shift", "D1"), 0.03),
    ("D2 shift", ("shift", "D2"), 0.03),
    ("P1/2 K=1", ("loss", "P1/2", "1"), 0.04),
    ("P3/2 K=1", ("loss", "P3/2", "1"), 0.03),
    ("P3/2 K=2", ("loss", "P3/2", "2"), 0.03),
    ("P3/2 K=3", ("loss", "P3/2", "3"), 0.03),
    ("transfer", ("transfer", "P3/2"), 0.10),
    ("gain", ("gain", "P3/2", "1"), None),
)
# Transfer counts in the medians where its cross section exceeds this [bohr^2].
LEAST_TRANSFER = 1.0


def rates(name: str, folder: Path) -> tuple[dict, dict, float]:
    """Thermal rates of both methods by key (arrays over TEMPERATURES) and the reduced mass, from FOLDER if there."""
    curves = files.load(files.default_folder() / f"{name}.toml")
    pair = pair_of(curves)
    T = np.array(TEMPERATURES)
    store = folder / f"{name}-{curves.sha256[:12]}.pkl"
    if store.exists():
        made = pickle.loads(store.read_bytes())
    else:
        made = quantum.level_tables(pair, T), recipe.family_tables(pair, T)
        store.write_bytes(pickle.dumps(made))
    found = []
    for table, average in zip(made, (quantum.thermal_rates, recipe.thermal_rates), strict=True):
        by_key = recipe.averaged(average, pair, T, table)
        found.append({key: np.array([one.rate for one in row]) for key, row in by_key.items()})
    return found[0], found[1], pair.reduced_mass


def mass_of(name: str) -> float:
    """Reduced mass of a default pair [electron masses]."""
    return pair_of(files.load(files.default_folder() / f"{name}.toml")).reduced_mass


def main(folder: Path) -> None:
    """Compute what is missing, write data, note and figure."""
    folder.mkdir(parents=True, exist_ok=True)
    names = files.default_ids()
    # The heaviest pairs take longest and go first.
    with ProcessPoolExecutor(2) as pool:
        heavy_first = sorted(
            names, key=lambda name: -pair_of(files.load(files.default_folder() / f"{name}.toml")).reduced_mass
        )
        results = dict(zip(heavy_first, pool.map(partial(rates, folder=folder), heavy_first), strict=True))
    table = {}
    for name in names:
        exact, ours, _ = results[name]
        sha = files.load(files.default_folder() / f"{name}.toml").sha256
        relative = {" ".join(key): [float(f"{x:.2g}") for x in np.abs(ours[key] / exact[key] - 1)] for key in exact}
        table[sha] = {"id": name, "temperatures_K": list(TEMPERATURES), "relative": relative}
    DATA.write_text(json.dumps(table, indent=1) + "\n", encoding="utf-8")
    NOTE.write_text(note(names, results), encoding="utf-8")
    draw(names, results)


def counted(key: tuple[str, ...], exact: dict, reduced_mass: float) -> np.ndarray:
    """Which temperatures count in the median of a rate, boolean."""
    if key[0] not in ("transfer", "gain"):
        return np.ones(len(TEMPERATURES), dtype=bool)
    return exact["transfer", "P3/2"] / mean_speed(np.array(TEMPERATURES), reduced_mass) > LEAST_TRANSFER


def deviations(key: tuple[str, ...], names: list[str], results: dict) -> np.ndarray:
    """|semiclassical/quantum - 1| of all pairs and temperatures that count."""
    found = []
    for name in names:
        exact, ours, mass = results[name]
        found.append(np.abs(ours[key] / exact[key] - 1)[counted(key, exact, mass)])
    return np.concatenate(found)


def note(names: list[str], results: dict) -> str:
    """The text of notes/method-comparison.md."""
    lines = ["| pair | " + " | ".join(title for title, *_ in COLUMNS) + " | transfer, bohr^2 |"]
    lines.append("|---" * (len(COLUMNS) + 2) + "|")
    for name in names:
        exact, ours, mass = results[name]
        cells = [f"{ours[key][1] / exact[key][1]:.3f}" for _, key, _ in COLUMNS]
        size = exact["transfer", "P3/2"][1] / float(mean_speed(TEMPERATURES[1], mass))
        lines.append(f"| {name.removesuffix('_default')} | " + " | ".join(cells) + f" | {size:.2g} |")
    summary = ["| rate | median | 90 % below | worst | goal for the median |", "|---|---|---|---|---|"]
    for title, key, goal in COLUMNS:
        found = deviations(key, names, results)
        cells = [np.median(found), np.percentile(found, 90), found.max()]
        shown = " | ".join(f"{100 * x:.1f} %" for x in cells)
        summary.append(f"| {title} | {shown} | {'-' if goal is None else f'{100 * goal:.0f} %'} |")
    return TEXT.format(table="\n".join(lines), summary="\n".join(summary))


def draw(names: list[str], results: dict) -> None:
    """Figure: ratio semiclassical over quantum of every pair, one panel per rate."""
    matplotlib.use("Agg")
    import matplotlib.pyplot as plt

    figure, axes = plt.subplots(5, 2, figsize=(10, 12), sharex=True, constrained_layout=True)
    labels = [name.removesuffix("_default") for name in names]
    for axis, (title, key, goal) in zip(axes.ravel(), COLUMNS, strict=True):
        for T, marker, shade in zip(range(3), "ov^", ("0.0", "0.4", "0.65"), strict=True):
            ratio = [results[name][1][key][T] / results[name][0][key][T] for name in names]
            axis.plot(labels, ratio, marker, color=shade, ms=4, label=f"{TEMPERATURES[T]:.0f} K")
        axis.axhline(1, lw=0.8, color="k")
        if goal:
            axis.axhspan(1 - goal, 1 + goal, color="0.9", zorder=0)
        reach = 0.12 if key[0] not in ("transfer", "gain") else 0.5
        axis.set_ylim(1 - reach, 1 + reach)
        axis.set_title(f"{title} (grey: goal for the median)" if goal else title, fontsize=9)
        axis.set_ylabel("semiclassical / quantum", fontsize=8)
        axis.tick_params(axis="x", rotation=90, labelsize=7)
    axes[0, 0].legend(fontsize=7, ncols=3)
    figure.savefig(FIGURE, dpi=110)


TEXT = """# Semiclassical against quantum close coupling, 25 default pairs

Made by notes/scripts/compare_methods.py; do not edit. Ratio semiclassical/quantum at 400 K (figure:
method-comparison.png, all three temperatures, points outside a panel are not drawn):

{table}

Over 300, 400 and 500 K, deviation of the ratio from 1 (transfer and gain where the transfer cross section exceeds
1 bohr^2):

{summary}

## The rule, and what limits it

`collisions/recipe.py`. One classical path drives all states. P1/2 on its own lower Omega = 1/2 curve is right when
the levels stay adiabatic, `xi = splitting 10 bohr/vbar` well above 1 (K, Rb, Cs; Na nearly): then it is the true path
of the entrance level. P3/2 starts on two curves; equal weights of results on V_Pi and the upper curve come out for
ranks 2 and 3 (0.50, 0.42 fitted), as expected when both paths count alike; rank 1 wants V_Pi at 0.80. When xi is small
(Li) no level has a curve of its own; V_Pi, the curve of two of the three orbital states, does the line, and the upper
curve (mostly V_Sigma) enters with 0.1 to 0.3. The weights pass over at xi of about 3 (P3/2) and 0.15 (P1/2). Eight
numbers fitted to 25 pairs x 3 temperatures x 5 rates: it interpolates, and says nothing beyond.

- **Shifts of the helium pairs** (and D2 of Rb, Cs with He) are small differences of a red tail and a blue wall; the
  ratio means nothing where the shift passes zero. The absolute deviation is below 1 % of the width.
- **Tiny transfer** (Rb, Cs; below 1 bohr^2) hangs on the tail of the Maxwell distribution and on the meeting of curves
  high on the wall, where a common path is worst: up to a factor 3 for Cs.
- **Gain of orientation** is a small difference of larger terms, 5-15 % off where it is large.
- **Li**: 2-4 % remain in everything; no single path serves a level that is a mixture of both curves.

`pertcalc/data/method_differences.json` holds the deviations per pair; they are part of the model error
(notes/model-error.md).
"""

if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(tempfile.gettempdir()) / "pertcalc-method-comparison")
