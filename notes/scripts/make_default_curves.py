"""Make the 25 default curve files of potentials/: X and B of the model files beside them, A through its well.

    python notes/scripts/make_default_curves.py REFERENCE [OUTPUT]

REFERENCE holds default_curves.csv and wells.csv (wells of A); OUTPUT, with *_model.toml of make_model_curves.py in it,
defaults to potentials/ of the checkout. The result is committed; nothing at run time needs REFERENCE. notes/curves.md
explains every choice made here.
"""

from __future__ import annotations

import csv
import math
import sys
from pathlib import Path

from pertcalc import constants
from pertcalc.curves.forms import TangToennies

NAMES = {"Li": "lithium", "Na": "sodium", "K": "potassium", "Rb": "rubidium", "Cs": "caesium",
         "He": "helium", "Ne": "neon", "Ar": "argon", "Kr": "krypton", "Xe": "xenon"}  # fmt: skip
# The printed A and b are rounded, and so is the C10 they were made with.
PRINTED_TOLERANCE = {"A": 0.012, "b": 1e-3, "De": 4e-3, "Re": 1e-3}
DISPERSION_ERROR = {"C6": 0.05, "C8": 0.10, "C10": 0.15}
# Relative error of De and Re by the kind of well, where the source prints none.
CLASS_ERROR = {"from-memory": (0.10, 0.02), "combining-rule": (0.20, 0.04), "model": (0.50, 0.08)}
DISPERSION_NOTE = (
    "C6, C8, C10: COMPUTED, second-order sum over states of a one-electron alkali model and one effective oscillator "
    "per multipole of the gas; judged errors as in the uncertainty section."
)
# Wells with an address: errors in cm^-1 and angstrom as printed (None: not printed, then the judged one of the note).
READ = {
    ("Na", "Ar", "A"): dict(
        sd=(3.0, 0.01), cite="Zimmermann, Braune, Schwarzhans and Bruehl, Verhandl. DPG 1999 (Heidelberg), A 15.4",
        where="https://dpg-verhandlungen.de/year/1999/conference/heidelberg/part/a/session/15/contribution/4",
        note="Mean of the READ wells of A1/2 (585 cm^-1 at 2.938 angstrom) and A3/2 (579 cm^-1 at 2.932 angstrom), "
        "preliminary values; no error is printed: sd is half the difference of the two, and 0.01 angstrom is judged.",
    ),
    ("Na", "Ne", "A"): dict(
        sd=(5.0, 0.05), cite="Lapatovich et al., J. Chem. Phys. 73, 5419 (1980)",
        where="abstract, https://ouci.dntb.gov.ua/en/works/9JBqBgq9",
        note='Well 145(5) cm^-1 at 2.70(5) angstrom READ in the abstract; the page prints the error as "05", so that '
        "0.5 is possible: the larger one is used.",
    ),
}  # fmt: skip


def main() -> None:
    """Write every file and print one line for each."""
    reference = Path(sys.argv[1])
    output = Path(sys.argv[2]) if len(sys.argv) > 2 else Path(__file__).resolve().parents[2] / "potentials"
    wells = list(csv.DictReader((reference / "wells.csv").open(encoding="utf-8")))
    pairs: dict[tuple[str, str], dict[str, dict[str, str]]] = {}
    for row in csv.DictReader((reference / "default_curves.csv").open(encoding="utf-8")):
        pairs.setdefault((row["alkali"], row["gas"]), {})[row["state"]] = row
    for (alkali, gas), states in pairs.items():
        identity = f"{alkali}-{gas}_default".lower()
        model = (output / f"{alkali}-{gas}_model.toml".lower()).read_text(encoding="utf-8")
        lines = header(identity, alkali, gas)
        lines += model_state(model, "X") + analytic_state(states["A"], wells) + model_state(model, "B")
        (output / f"{identity}.toml").write_text("\n".join(lines) + "\n", encoding="utf-8")
        print(identity)


def header(identity: str, alkali: str, gas: str) -> list[str]:
    """The lines before the first state."""
    return [
        "# Made by notes/scripts/make_default_curves.py; change the script, not this file.",
        f'id = "{identity}"',
        f'alkali = "{alkali}"',
        f'noble_gas = "{gas}"',
        f'what = "default curves of {NAMES[alkali]} with {NAMES[gas]}: X and B one-electron model, A through its well"',
    ]


def status_of(row: dict[str, str]) -> str:
    """The status word of a row of default_curves.csv from its 'support' column."""
    if row["support"].startswith("READ well"):
        return "published"
    if row["support"] == "well FROM MEMORY":
        return "from-memory"
    if row["support"].startswith("combining rule"):
        return "combining-rule"
    return "model"


def source_of(row: dict[str, str], wells: list[dict[str, str]]) -> tuple[str, str, str, str]:
    """cite, status, where, note."""
    key = (row["alkali"], row["gas"], row["state"])
    status = status_of(row)
    if status == "published":
        known = READ[key]
        return known["cite"], status, known["where"], f"{known['note']} {DISPERSION_NOTE}"
    if status == "from-memory":
        found = [w for w in wells if (w["alkali"], w["gas"], w["state"]) == key and same_well(w, row)]
        if len(found) != 1:
            raise SystemExit(f"{key}: {len(found)} rows of wells.csv agree with the default well, one is needed")
        note = f"Well {found[0]['provenance']}. {DISPERSION_NOTE}"
        return found[0]["source"], status, "not re-read: citation and values from memory", note
    note = f"Well estimated between the neighbouring pairs and a one-electron model; no publication. {DISPERSION_NOTE}"
    return "combining rule or model estimate, not published", status, "notes/curves.md", note


def same_well(known: dict[str, str], row: dict[str, str]) -> bool:
    """Whether a row of wells.csv prints exactly the well of a default curve."""
    try:
        pairs = [(float(known[k]), float(row[k])) for k in ("De_cm-1", "Re_angstrom")]
    except ValueError:
        return False
    return "FROM MEMORY" in known["provenance"] and all(math.isclose(a, b, rel_tol=1e-9) for a, b in pairs)


def errors_of(row: dict[str, str], status: str) -> tuple[float, float]:
    """sd of De [cm^-1] and Re [angstrom]."""
    if status == "published":
        return READ[row["alkali"], row["gas"], row["state"]]["sd"]
    relative = CLASS_ERROR[status]
    return relative[0] * float(row["De_cm-1"]), relative[1] * float(row["Re_angstrom"])


def text(value: str) -> str:
    """A TOML basic string."""
    return '"' + value.replace("\\", "\\\\").replace('"', '\\"') + '"'


def well_lines(row: dict[str, str], sd: tuple[float, float]) -> list[str]:
    """De and Re as quantities."""
    return [
        f'De = {{ value = {float(row["De_cm-1"]):g}, sd = {sd[0]:.3g}, unit = "cm^-1" }}',
        f'Re = {{ value = {float(row["Re_angstrom"]):g}, sd = {sd[1]:.3g}, unit = "angstrom" }}',
    ]


def dispersion_lines(row: dict[str, str]) -> list[str]:
    """C_n as printed."""
    return [f"{key} = {float(row[key])!r}" for key in ("C6_au", "C8_au", "C10_au")]


def provenance_lines(row: dict[str, str], source: tuple[str, str, str, str], sd: tuple[float, float]) -> list[str]:
    """The source and uncertainty sections."""
    state = row["state"]
    lines = ["", f"[states.{state}.source]"]
    lines += [f"{key} = {text(value)}" for key, value in zip(("cite", "status", "where", "note"), source, strict=True)]
    relative = {"De": sd[0] / float(row["De_cm-1"]), "Re": sd[1] / float(row["Re_angstrom"]), **DISPERSION_ERROR}
    lines += ["", f"[states.{state}.uncertainty]  # relative"]
    return lines + [f"{key} = {value:.3g}" for key, value in relative.items()]


def analytic_state(row: dict[str, str], wells: list[dict[str, str]]) -> list[str]:
    """Tang-Toennies through De and Re; A and b are computed and compared with the printed ones."""
    De, Re = float(row["De_cm-1"]) / constants.HARTREE_CM1, float(row["Re_angstrom"]) / constants.BOHR_ANGSTROM
    dispersion = [float(row[key]) for key in ("C6_au", "C8_au", "C10_au")]
    curve = TangToennies.from_well(De, Re, *dispersion)
    printed_well = TangToennies(float(row["A_hartree"]), float(row["b_per_bohr"]), *dispersion).well()
    assert printed_well is not None
    ratios = {
        "A": curve.A / float(row["A_hartree"]),
        "b": curve.b / float(row["b_per_bohr"]),
        "De": printed_well.depth / De,
        "Re": printed_well.position / Re,
    }
    for name, ratio in ratios.items():
        if abs(ratio - 1) > PRINTED_TOLERANCE[name]:
            raise SystemExit(f"{row['alkali']}-{row['gas']} {row['state']}: {name} is {ratio:.5f} of the printed one")
    source = source_of(row, wells)
    sd = errors_of(row, source[1])
    lines = ["", f"[states.{row['state']}]", 'form = "tang-toennies"']
    lines += [f"A_hartree = {curve.A:.12g}  # from De, Re and C_n", f"b_per_bohr = {curve.b:.12g}"]
    return lines + well_lines(row, sd) + dispersion_lines(row) + provenance_lines(row, source, sd)


def model_state(model: str, name: str) -> list[str]:
    """The lines of one state of a model file, with a blank line before them."""
    begin = model.index(f"[states.{name}]")
    later = [model.find(f"\n[states.{other}]") for other in "XAB" if other > name or (name, other) == ("X", "A")]
    ends = [end for end in later if end > begin]
    return ["", *model[begin : min(ends, default=len(model))].rstrip("\n").split("\n")]


if __name__ == "__main__":
    main()
