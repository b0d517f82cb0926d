"""Make pertcalc/data/species/*.toml from atoms.csv and gases.csv and the values listed here.

Usage: python notes/scripts/make_species.py DIRECTORY_WITH_THE_CSV_FILES [OUTPUT_DIRECTORY]

Every row of atoms.csv and every column of gases.csv ends in a file, with its source and its mark; a row the script
does not understand stops it. Derived values (natural mean mass, oscillator strengths) are not written:
pertcalc/species.py computes them when it reads the files, so they cannot go stale.
"""

from __future__ import annotations

import csv
import re
import sys
from fractions import Fraction
from pathlib import Path

READ, MEMORY, COMPUTED = "READ", "FROM MEMORY", "COMPUTED"
NAMES = {"Li": "lithium", "Na": "sodium", "K": "potassium", "Rb": "rubidium", "Cs": "caesium"}
SHELL = {"Li": 2, "Na": 3, "K": 4, "Rb": 5, "Cs": 6}
GAS_NAMES = {"He": "helium", "Ne": "neon", "Ar": "argon", "Kr": "krypton", "Xe": "xenon"}
LEVELS = {"ns1/2": "S1/2", "np1/2": "P1/2", "np3/2": "P3/2"}

AME = "AME2020 atomic mass evaluation, Wang et al., Chin. Phys. C 45, 030003 (2021)"
MASSES_U = {
    "6Li": 6.0151228874, "7Li": 7.0160034366, "23Na": 22.9897692820, "39K": 38.9637064864, "40K": 39.96399817,
    "41K": 40.9618252579, "85Rb": 84.9117897379, "87Rb": 86.909180531, "133Cs": 132.905451961,
    "3He": 3.0160293201,
}  # fmt: skip

MODEL = "one-electron model potential of the valence electron (notes/species.md)"
MODEL_KEYS = {
    "alpha_d(ns)": "alpha_d_s",
    "alpha_d(np) scalar, fine-structure averaged": "alpha_d_p",
    "alpha_d(np) tensor (= np3/2 tensor)": "alpha_d_p_tensor",
    "alpha_q(ns)": "alpha_q_s",
    "alpha_o(ns)": "alpha_o_s",
    "<r2> ns": "r2_s",
    "<r2> np": "r2_p",
    "<r4> np": "r4_p",
}
UNITS = {"cm-1": "cm^-1", "a0^2": "bohr^2", "a0^4": "bohr^4", "": "1", "%": "1"}
# The scalar polarisabilities of P1/2 and P3/2 and the tensor one of P3/2 share one printed cell; this is its reading.
P_POLARIZABILITIES = {
    "Li": ("126.9 scalar / 1.6 tensor", 126.9, 126.9, 1.6),
    "Na": ("359.9 (3p1/2), 361.6 (3p3/2) / -88.4", 359.9, 361.6, -88.4),
    "K": ("606 (4p1/2), 616 (4p3/2) / -109", 606.0, 616.0, -109.0),
    "Rb": ("810 (5p1/2), 870 (5p3/2) / -166", 810.0, 870.0, -166.0),
    "Cs": ("1328 (6p1/2), 1641 (6p3/2) / -262", 1328.0, 1641.0, -262.0),
}
# Remarks that go with one value, found by comparing it with other known values.
REMARKS = {
    ("6Li", "P3/2", "B"): "published with an error of 0.14 MHz, so not distinct from 0 (the quadrupole moments of "
    "6Li and 7Li, ratio 0.02, suggest -0.005 MHz)",
}


def quoted(text: str) -> str:
    """Return the text as a TOML basic string."""
    return '"' + text.replace("\\", "\\\\").replace('"', '\\"') + '"'


def certificate(value: float, unit: str, source: str, mark: str, error: float | None = None) -> str:
    """Return one value with its birth certificate as a TOML inline table."""
    extra = "" if error is None else f", error = {error!r}"
    return f"{{ value = {value!r}, unit = {quoted(unit)}, source = {quoted(source)}, mark = {quoted(mark)}{extra} }}"


def printed(text: str) -> tuple[float, float | None, str]:
    """Return (value, error, remark) of a cell such as '164(0)', '163(1)', '27.3(2)' or '1.19 (1.16-1.19)'."""
    text = text.strip()
    if match := re.fullmatch(r"([-\d.]+)\((\d+)\)", text):
        value, digits = match.groups()
        decimals = len(value.partition(".")[2])
        error = int(digits) * 10.0**-decimals
        return float(value), round(error, decimals + 1) or None, f"; printed as {text}"
    if match := re.fullmatch(r"([-+\d.]+) \(([-+\d.]+?)(?:-| to )([-+\d.]+)\)", text):
        value, low, high = (float(part) for part in match.groups())
        return value, round(max(abs(value - low), abs(value - high)), 4), f"; range as printed: {text}"
    return float(text), None, ""


def mark_of(provenance: str) -> str:
    """Return the mark a provenance cell starts with; anything else stops the script."""
    for mark in (READ, MEMORY, COMPUTED):
        if provenance.startswith(mark):
            return mark
    raise SystemExit(f"provenance {provenance!r} starts with none of the three marks")


def source_of(row: dict[str, str]) -> str:
    """Return the source text of a row: the publication and, for a READ row, the address it was read at."""
    source = row["source"].replace("Steck-type compilations", "D-line data compilations")
    provenance = row["provenance"]
    if provenance.startswith(COMPUTED):
        return MODEL
    return source + ("; read at " + provenance.removeprefix("READ ") if provenance.startswith(READ) else "")


def place(row: dict[str, str], tree: dict) -> None:
    """Put one row of atoms.csv into ``tree`` {"top" | "model" | ("level", name) | ("isotope", label): {key: toml}}."""
    symbol, quantity, unit = row["alkali"], row["quantity"], UNITS.get(row["unit"], row["unit"])
    mark, source = mark_of(row["provenance"]), source_of(row)

    def put(where: object, key: str, value: float, error: float | None = None, more: str = "") -> None:
        if tree.setdefault(where, {}).setdefault(key, None) is not None:
            raise SystemExit(f"{symbol} {where} {key}: two rows for one value")
        tree[where][key] = certificate(value, unit, source + more, mark, error)

    if quantity == "alpha_d(np) published scalar/tensor":
        cell, p12, p32, tensor = P_POLARIZABILITIES[symbol]
        assert cell == row["value"], f"{symbol}: {row['value']!r} is not what was read by hand"
        put(("level", "P1/2"), "polarizability_au", p12)
        put(("level", "P3/2"), "polarizability_au", p32)
        put(("level", "P3/2"), "tensor_polarizability_au", tensor)
    elif mark == COMPUTED:
        put("model", MODEL_KEYS[quantity], float(row["value"]))
    elif row["isotope"] == "all":
        place_common(quantity, row["value"], put)
    else:
        place_isotope(row["isotope"], quantity, row["value"], put, tree)


def place_common(quantity: str, text: str, put) -> None:
    """Place a row that holds for all isotopes of an alkali."""
    value, error, remark = printed(text)
    words = quantity.split()
    if quantity == "alpha_d(ns)":
        put(("level", "S1/2"), "polarizability_au", value, error=error, more=remark)
    elif words[0] in ("D1", "D2") and words[1] == "term":
        put(("level", LEVELS[words[2]]), "term_cm1", value)
    elif words[0] in ("lifetime", "linewidth", "gJ"):
        key = {"lifetime": "lifetime_ns", "linewidth": "linewidth_MHz", "gJ": "gJ"}[words[0]]
        put(("level", LEVELS[words[1]]), key, value)
    else:
        names = {"alpha_d core ion": "core_polarizability_au", "ionisation energy": "ionisation_cm1",
                 "fine-structure splitting": "fine_structure_cm1"}  # fmt: skip
        put("top", names[quantity], value)


def place_isotope(label: str, quantity: str, text: str, put, tree: dict) -> None:
    """Place a row of one isotope; gJ of the ground level is the same for all of them and is checked to be."""
    where = ("isotope", label)
    if quantity == "gJ ns1/2":
        earlier = tree.get(("level", "S1/2"), {}).get("gJ")
        if earlier is None:
            put(("level", "S1/2"), "gJ", float(text))
        else:
            assert f"value = {float(text)!r}," in earlier, f"{label}: gJ differs between isotopes"
    elif quantity == "nuclear spin I":
        put(where, "spin", float(Fraction(text)))
    elif quantity == "abundance":
        put(where, "abundance", round(float(text) / 100, 8), more="; printed in per cent")
    else:
        constant, level = quantity.split()
        remark = REMARKS.get((label, LEVELS[level], constant))
        key = ("hyperfine", label, LEVELS[level])
        put(key, constant, float(text), more=f"; {remark}" if remark else "")


def alkali_toml(symbol: str, rows: list[dict[str, str]]) -> str:
    """Return the file of one alkali."""
    tree: dict = {}
    for row in rows:
        place(row, tree)
    tree[("level", "S1/2")]["term_cm1"] = certificate(0.0, "cm^-1", "by definition: terms count from here", COMPUTED)
    labels = [where[1] for where in tree if where[0] == "isotope"]
    for label in labels:
        tree[("isotope", label)]["mass_u"] = certificate(MASSES_U[label], "u", AME, MEMORY)
        for level in ("S1/2", "P1/2"):
            zero = certificate(0.0, "MHz", "zero by symmetry: B needs J >= 1 and I >= 1", COMPUTED)
            tree[("hyperfine", label, level)]["B"] = zero
    lines = [*header(symbol), f"name = {quoted(NAMES[symbol])}", *pairs(tree["top"])]
    for level in LEVELS.values():
        term = f"term = {quoted(f'{SHELL[symbol]}{level}')}"
        lines += ["", f"[levels.{quoted(level)}]", term, *pairs(tree[("level", level)])]
    lines += ["", "[one_electron_model]", *pairs(tree["model"])]
    for label in labels:
        lines += ["", f"[isotopes.{label}]", *pairs(tree[("isotope", label)])]
        for level in LEVELS.values():
            head = f"[isotopes.{label}.hyperfine.{quoted(level)}]"
            lines += [head, *pairs(tree[("hyperfine", label, level)])]
    return "\n".join(lines) + "\n"


def header(symbol: str) -> list[str]:
    """Return the first lines of a data file."""
    return ["# Made by notes/scripts/make_species.py; one value, one birth certificate. Do not edit by hand.",
            f"symbol = {quoted(symbol)}"]  # fmt: skip


def pairs(table: dict[str, str]) -> list[str]:
    """Return the key = value lines of one TOML table."""
    return [f"{key} = {value}" for key, value in table.items()]


def gas_toml(row: dict[str, str], helium3: bool = False) -> str:
    """Return the file of one gas; helium-3 takes everything but its mass from helium."""
    assert row["provenance"].startswith("alpha_d READ; all else FROM MEMORY"), row["provenance"]
    symbol = "3He" if helium3 else row["gas"]
    same = "; electronic property, taken equal to that of 4He" if helium3 else ""
    reference = "common tables of atomic data, no source recalled" + same
    alpha = "Schwerdtfeger & Nagle Mol Phys 117 1200 (2019); read at https://docslib.org/download/13021489/" + (
        "2018-table-of-polarizabilities"
    )
    columns = {"ionisation_eV": ("IP_eV", "eV"), "quadrupole_polarizability_au": ("alpha_q_au", "au"),
               "octupole_polarizability_au": ("alpha_o_au_approx", "au"),
               "C6_homonuclear_au": ("C6_homonuclear_au", "au"),
               "C8_homonuclear_au": ("C8_homonuclear_au", "au"),
               "electron_scattering_length_bohr": ("e_scattering_length_a0", "bohr")}  # fmt: skip
    mass = certificate(MASSES_U["3He"], "u", AME, MEMORY) if helium3 else certificate(
        float(row["mass_u"]), "u", "standard atomic weight (natural mean)", MEMORY)  # fmt: skip
    value, error, remark = printed(row["alpha_d_au"])
    lines = [*header(symbol), f"name = {quoted('helium-3' if helium3 else GAS_NAMES[symbol])}",
             f"atomic_number = {certificate(float(row['Z']), '1', 'order in the periodic table', MEMORY)}",
             f"mass_u = {mass}",
             f"polarizability_au = {certificate(value, 'au', alpha + remark + same, READ, error)}"]  # fmt: skip
    for key, (column, unit) in columns.items():
        value, error, remark = printed(row[column])
        remark += "; approximate" if column.endswith("approx") else ""
        lines.append(f"{key} = {certificate(value, unit, reference + remark, MEMORY, error)}")
    return "\n".join(lines) + "\n"


def main(source: str, target: str | None = None) -> None:
    """Write the ten files and helium-3's."""
    out = Path(target) if target else Path(__file__).parents[2] / "pertcalc" / "data" / "species"
    out.mkdir(parents=True, exist_ok=True)
    with (Path(source) / "atoms.csv").open(newline="") as stream:
        atoms = list(csv.DictReader(stream))
    with (Path(source) / "gases.csv").open(newline="") as stream:
        gases = list(csv.DictReader(stream))
    texts = {symbol: alkali_toml(symbol, [row for row in atoms if row["alkali"] == symbol]) for symbol in NAMES}
    texts |= {row["gas"]: gas_toml(row) for row in gases}
    texts["3He"] = gas_toml(next(row for row in gases if row["gas"] == "He"), helium3=True)
    for symbol, text in texts.items():
        (out / f"{symbol.lower()}.toml").write_text(text, encoding="utf-8")
    print(f"{len(texts)} files in {out}")


if __name__ == "__main__":
    main(*sys.argv[1:])
