"""Tables of notes/model-curves.md: the one-electron model beside published wells, satellites and other tables.

    python notes/scripts/compare_model_curves.py REFERENCE

REFERENCE is a directory with wells.csv and curves/*.csv (READ, FROM MEMORY and older model values). The text between
the two marks in the note is replaced; a clock time is that of the machine the script ran on.
"""

from __future__ import annotations

import csv
import re
import sys
import time
from collections.abc import Iterator
from functools import cache
from pathlib import Path

import numpy as np
from scipy.optimize import minimize_scalar
from threadpoolctl import threadpool_limits

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.curves.fine_structure import line_differences, splitting_of
from pertcalc.one_electron import pair
from pertcalc.one_electron.atom import build_atom
from pertcalc.one_electron.curve_file import curve_set
from pertcalc.one_electron.gas_electron import MODELS, gas_electron
from pertcalc.one_electron.gas_orbitals import even_tempered
from pertcalc.one_electron.model_curves import R_MAX, SIZE, STATES, ModelCurves, compute_model
from pertcalc.species import ALKALIS, GASES

NOTE = Path(__file__).resolve().parents[1] / "model-curves.md"
BEGIN, END = "<!-- tables: begin -->", "<!-- tables: end -->"
# Blue satellites: pair, distance from D2 [cm^-1], mark, source.
SATELLITES = [
    ("Cs", "Ar", 216.0, "READ", "8367 A"),
    ("Cs", "He", 388.0, "READ", "about 825 nm"),
    ("Rb", "Ar", 428.0, "FROM MEMORY", "about 755 nm"),
    ("Rb", "He", 789.0, "FROM MEMORY", "about 735 nm"),
]
TABLED = [("Na", "Ar"), ("Cs", "Ar"), ("Cs", "He")]


@cache
def curves(alkali_symbol: str, gas: str, model: str) -> ModelCurves:
    """One calculation per pair and electron-gas model."""
    return compute_model(alkali_symbol, gas, model=model)


def markdown(headers: list[str], rows: list[list[str]]) -> list[str]:
    """Lines of a table."""
    return [
        "| " + " | ".join(headers) + " |",
        "|" + "---|" * len(headers),
        *("| " + " | ".join(r) + " |" for r in rows),
    ]


def well(model: ModelCurves, state: str) -> str:
    """Depth [cm^-1] and position [angstrom] as text."""
    found = model.well(state)
    return "none" if found is None else f"{found.depth * HARTREE_CM1:.4g} at {found.position * BOHR_ANGSTROM:.2f}"


def published(reference: Path) -> Iterator[tuple[str, str, str, str, str]]:
    """pair, state, well as printed, mark, source of every row that is not computed."""
    for row in csv.DictReader((reference / "wells.csv").open(encoding="utf-8")):
        if "COMPUTED" not in row["provenance"]:
            De = re.sub(r"\s*\[.*\]", "", row["De_cm-1"])
            Re = re.sub(r"\s*\(\d+\.\d.*a0\)", "", row["Re_angstrom"]) or "-"
            mark = "READ" if row["provenance"].startswith("READ") else "FROM MEMORY"
            if "low confidence" in row["provenance"]:
                mark += ", low"
            yield f"{row['alkali']}-{row['gas']}", row["state"], f"{De} at {Re}", mark, row["source"]


def older(reference: Path) -> dict[tuple[str, str], str]:
    """(pair, state) -> well of the older model tables."""
    rows = csv.DictReader((reference / "wells.csv").open(encoding="utf-8"))
    return {
        (f"{row['alkali']}-{row['gas']}", row["state"]): f"{row['De_cm-1']} at {row['Re_angstrom']}"
        for row in rows
        if "calibrated set" in row["extra_params"] + row["source"]
    }


def wells_table(reference: Path) -> list[str]:
    """Every published well beside ours."""
    rows, before = [], older(reference)
    for name, state, theirs, mark, source in published(reference):
        key = state[0]  # A1/2 and A3/2 stand beside the spin-free A
        ours = [well(curves(*name.split("-"), model), key) for model in MODELS]
        rows.append([name, state, theirs, mark, before.get((name, key), "-"), *ours, source])
    return markdown(["pair", "state", "published", "mark", "older tables", *MODELS, "source"], rows)


def numbers(text: str) -> tuple[float, float] | None:
    """De and Re out of "De at Re"; None where one is missing."""
    found = [re.match(r"~?([\d.]+)", part) for part in text.split(" at ")]
    return (float(found[0][1]), float(found[1][1])) if len(found) == 2 and found[0] and found[1] else None


def deviation_table(reference: Path) -> list[str]:
    """Median, spread and scatter of De ours/theirs and of Re, per state and model."""
    found: dict[tuple[str, str], list[tuple[float, float]]] = {}
    before = older(reference)
    for name, state, text, _, _ in published(reference):
        theirs, key = numbers(text), state[0]
        values = {model: well(curves(*name.split("-"), model), key) for model in MODELS}
        values["older tables"] = before.get((name, key), "-")
        for model, mine in values.items():
            ours = numbers(mine)
            if theirs and ours:
                found.setdefault((key, model), []).append((ours[0] / theirs[0], ours[1] / theirs[1]))
    rows = []
    for (state, model), ratios in sorted(found.items()):
        De, Re = np.array(ratios).T
        rows.append([state, model, str(len(De)), f"{np.median(De):.2f}", f"{De.min():.2f} .. {De.max():.2f}",
                     f"{100 * np.sqrt(np.mean(np.log(De) ** 2)):.0f} %", f"{np.median(Re):.3f}",
                     f"{100 * np.sqrt(np.mean(np.log(Re) ** 2)):.1f} %"])  # fmt: skip
    headers = [
        "state",
        "model",
        "wells",
        "De ours/theirs, median",
        "range",
        "rms of ln De",
        "Re, median",
        "rms of ln Re",
    ]
    return markdown(headers, rows)


def satellite(model: ModelCurves) -> tuple[float, float]:
    """Maximum of (upper Omega = 1/2) - X from the D2 line [cm^-1] and where [bohr]."""
    splitting = splitting_of(curve_set(model))
    X, A, B = (model.curve(state) for state in STATES)

    def negative(R: float) -> float:
        return -float(line_differences(X, A, B, R, splitting).d2_half) * HARTREE_CM1

    R = np.linspace(max(5.0, X.R[0]), 16.0, 400)
    k = int(np.argmin([negative(r) for r in R]))
    best = minimize_scalar(negative, bounds=(R[max(k - 1, 0)], R[min(k + 1, 399)]), method="bounded")
    return -float(best.fun), float(best.x)


def satellite_table() -> list[str]:
    """Blue satellites of D2."""
    rows = []
    for a, g, value, mark, words in SATELLITES:
        ours = ["{:.0f} at {:.1f} bohr".format(*satellite(curves(a, g, model))) for model in MODELS]
        rows.append([f"{a}-{g}", f"{value:.0f} ({words})", mark, *ours])
    return markdown(["pair", "from D2, cm^-1", "mark", *MODELS], rows)


def machinery_table(reference: Path) -> list[str]:
    """Electronic differences A - X and B - X beside older tables of the same parameters."""
    rows = []
    for a, g in TABLED:
        lines = (x for x in (reference / "curves" / f"{a}{g}.csv").open(encoding="utf-8") if not x.startswith("#"))
        table = [row for row in csv.DictReader(lines) if float(row["R_au"]) in (6.2, 9.2, 11.2, 13.2, 17.2, 23.2)]
        R = np.array([float(row["R_au"]) for row in table])
        V = {key: np.array([float(row[f"{key}_cm-1"]) for row in table]) for key in ("X", "A", "B_cal")}
        electron, atom = gas_electron(g, "calibrated"), build_atom(a, 7)
        truncated = pair.energies(atom, electron, R, pair.Basis(16, 7, 64, ()), estimate=False)
        full = pair.energies(build_atom(a, 6, SIZE, R_MAX), electron, R, pair.Basis(), estimate=False)
        for upper, old in (("A", "A"), ("B", "B_cal")):
            for label, values in (
                ("older table", V[old] - V["X"]),
                ("16 states, l <= 7, no Gaussians", (getattr(truncated, upper) - truncated.X) * HARTREE_CM1),
                ("converged", (getattr(full, upper) - full.X) * HARTREE_CM1),
            ):
                rows.append([f"{a}-{g}", f"{upper} - X", label, *(f"{v:.1f}" for v in values)])
    return markdown(["pair", "cm^-1", "basis", *(f"{r:g} bohr" for r in R)], rows)


def cost_table() -> list[str]:
    """Cost and error against the size of the basis, caesium with argon."""
    electron = gas_electron("Ar")
    R = np.array([5.5, 7.0, 9.0, 12.0, 16.0])
    large = even_tempered({0: (0.02, 16.0, 13), 1: (0.04, 5.0, 9), 2: (0.06, 1.0, 5), 3: (0.08, 0.4, 2)})
    best = pair.energies(build_atom("Cs", 9, 50, 60.0), electron, R, pair.Basis(40, 9, 128, large), estimate=False)
    none, usual = (), pair.Basis().gas_orbitals
    sizes = [(16, 7, none), (24, 8, none), (32, 9, none), (16, 4, usual), (20, 6, usual), (32, 6, usual)]
    rows = []
    for n, l, gaussians in sizes:
        atom = build_atom("Cs", l, SIZE, R_MAX)
        begin = time.perf_counter()
        with threadpool_limits(1):
            found = pair.energies(atom, electron, R, pair.Basis(n, l, 64, gaussians))
        clock = (time.perf_counter() - begin) / len(R) * 60
        change = [np.abs(getattr(found, s) - getattr(best, s)) * HARTREE_CM1 for s in STATES]
        worst = [f"{max(c[k] for c in change):.2f}" for k in range(len(R))]
        rows.append([str(n), str(l), str(len(gaussians)), f"{found.size[0]} + {found.size[1]}", f"{clock:.1f}", *worst])
    return markdown(
        ["states per l", "l_max", "Gaussians", "functions", "60 distances, s", *(f"{r:g} bohr" for r in R)], rows
    )


def coefficients_table() -> list[str]:
    """C_n of the model alone over those of the sum over states."""
    rows = []
    for a in ALKALIS:
        for g in GASES:
            model = curves(a, g, MODELS[0])
            ratios = [f"{model.own[s][n] / model.dispersion[s][n]:.2f}" for s in STATES for n in (6, 8)]
            at = [f"{model.correction[s][int(np.argmin(model.V[s]))] * HARTREE_CM1:+.2f}" for s in STATES]
            rows.append([f"{a}-{g}", *ratios, *at])
    heads = [f"{s} C{n}" for s in STATES for n in (6, 8)]
    return markdown(["pair", *heads, *(f"{s} at its well, cm^-1" for s in STATES)], rows)


def main() -> None:
    """Replace the tables of the note."""
    reference = Path(sys.argv[1])
    parts = [
        ("Wells: De [cm^-1] at Re [angstrom]", wells_table(reference)),
        ("Deviations of the wells", deviation_table(reference)),
        ("Blue satellites of D2", satellite_table()),
        ("Cost and basis error, Cs-Ar (largest of X, A, B against a larger basis, cm^-1)", cost_table()),
        ("Machinery beside older tables of the same parameters", machinery_table(reference)),
        ("C_n of the model alone over those of the tail, and the correction", coefficients_table()),
    ]
    text = "\n".join(line for title, lines in parts for line in ("", f"### {title}", "", *lines))
    note = NOTE.read_text(encoding="utf-8")
    before, after = note.split(BEGIN)[0], note.split(END)[1]
    NOTE.write_text(f"{before}{BEGIN}\n{text}\n\n{END}{after}", encoding="utf-8")
    print(text)


if __name__ == "__main__":
    main()
