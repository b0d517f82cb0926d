"""Make pertcalc/data/vapour/vapour_pressure.csv and diffusion.csv from the two files of the same names.

Usage: python notes/scripts/make_vapour.py DIRECTORY_WITH_THE_CSV_FILES [OUTPUT_DIRECTORY]

Vapour pressure: every formula becomes log10(quantity) = a + b/T + c T + d log10 T. Diffusion: numbers stay as printed;
conversions are made in pertcalc/vapour/diffusion.py. Rows left out are printed with the reason.
"""

from __future__ import annotations

import csv
import math
import re
import sys
from collections.abc import Callable
from pathlib import Path

ALKALIS = ("Li", "Na", "K", "Rb", "Cs")
GASES = ("He", "Ne", "Ar", "Kr", "Xe", "N2")
NUMBER = r"[-+]?\d*\.?\d+"
HEADER = """# {title}
# Made by notes/scripts/make_vapour.py from {origin}; do not edit by hand. {note} explains every column.
# mark: READ (address in source) or FROM MEMORY. An empty error: none is stated.
"""
PRESSURE_COLUMNS = ("alkali", "phase", "formula", "quantity", "a", "b", "c", "d", "error_relative", "low_K", "high_K",
                    "warn_above_K", "published", "source", "mark", "grade", "note")  # fmt: skip
DIFFUSION_COLUMNS = ("alkali", "gas", "quantity", "value", "unit", "error", "temperature_K", "exponent",
                     "exponent_error", "standing", "year", "published", "source", "mark", "grade", "note")  # fmt: skip
# Temperature of a potassium or sodium vapour cell where the source as seen gives none (common practice, no source).
ASSUMED_K = "400"
# The source whose formulas are the default, and the newest diffusion set, which an abstract quotes in an older form.
DEFAULT, SUPERSEDED = "Alcock", "same authors"
# What the cells "same authors, ..." and "same" stand for.
FULL_SOURCE = {
    "same authors": "Pouliot et al. (2026), values quoted in the abstract at NIST; newer reduction: arXiv:2602.12319",
    "same": "Alcock, Itkin & Horrigan, Can. Metall. Q. 23, 309 (1984) via CRC",
}


def coefficients(text: str) -> tuple[float, float, float, float]:
    """Return a, b, c, d of 'a - b/T + c T - d log10 T'."""
    plain = text.replace(" ", "")
    found = {}
    for name, ending in (("b", r"/T"), ("d", r"log10T"), ("c", r"T")):
        # The constant c is what is left once "/T" and "log10T" are gone.
        match = re.search(rf"({NUMBER}|[-+])(?:\*)?{ending}(?![a-z0-9])", plain)
        if match:
            found[name] = float(match[1] + ("1" if match[1] in "+-" else ""))
            plain = plain.replace(match[0], "", 1)
    return float(plain), found.get("b", 0.0), found.get("c", 0.0), found.get("d", 0.0)


def pressure_range(cell: str) -> tuple[str, str, str]:
    """Return (low, high, warn above) of '370.9-550/600', '>312.5', '<301.6' or nothing."""
    if match := re.fullmatch(rf"({NUMBER})-({NUMBER})(?:/({NUMBER}))?", cell):
        low, high, highest = match.groups()
        return low, highest or high, high if highest else ""
    return (cell[1:], "", "") if cell.startswith(">") else ("", cell[1:], "")


def pressure_row(row: dict[str, str]) -> dict[str, object] | str:
    """Return one formula, or why it is left out."""
    quantity = re.fullmatch(r"log10\((P/Pa|P/Torr)\)|log10\(n cm\^-3\)", row["quantity"])
    if not quantity:
        return f"quantity {row['quantity']!r} is not a pressure or density"
    a, b, c, d = coefficients(row["value"])
    low, high, warn = pressure_range(row["T_K"])
    source = full(row["published_source"])
    return {
        "alkali": row["alkali"], "phase": row["state"], "formula": "default" if DEFAULT in source else "other",
        "quantity": quantity[1] or "n/cm^-3", "a": a, "b": b, "c": c, "d": d,
        "error_relative": relative(row["uncertainty"]), "low_K": low, "high_K": high, "warn_above_K": warn,
        "published": f"{row['quantity']} = {row['value']}", "source": sourced(row, source), "mark": row["status"],
        "grade": row["confidence"].split()[0], "note": row["note"],
    }  # fmt: skip


def full(source: str) -> str:
    """Return a source written out where the cell only says that it is the same as before."""
    return next((text for start, text in FULL_SOURCE.items() if source.split(",")[0] == start), source)


def relative(cell: str) -> str:
    """Return '0.05' of '5 %', nothing of nothing."""
    return f"{float(cell.removesuffix('%')) / 100:g}" if cell else ""


def sourced(row: dict[str, str], source: str) -> str:
    """Return the source with the address where it was read."""
    return source + (f"; read at {row['address']}" if row["status"] == "READ" else "")


def value_and_error(text: str, uncertainty: str) -> tuple[float, float | None, str]:
    """Return (value, error, exponent) of '0.33', '.16-.20', '.332/.325' or '385*(T/300)^1.72' with its error cell.

    Two numbers become their middle; half their distance counts as error beside the stated one.
    """
    if match := re.fullmatch(rf"({NUMBER})\*\(T/300\)\^({NUMBER})", text):
        value, half, exponent = float(match[1]), 0.0, match[2]
    else:
        numbers = [float(part) for part in re.split(r"[-/]", text)]
        value, half, exponent = sum(numbers) / len(numbers), abs(numbers[-1] - numbers[0]) / 2, ""
    stated = uncertainty.split(";")[0].strip()
    error = float(stated.removesuffix("%")) / 100 * value if stated.endswith("%") else float(stated or 0)
    return value, math.hypot(error, half) or None, exponent


def diffusion_row(row: dict[str, str]) -> dict[str, object] | str:
    """Return one measurement, or why it is left out."""
    if row["alkali"] not in ALKALIS or row["gas"] not in GASES:
        return "not one alkali with a noble gas or nitrogen"
    kinds = {"cm^2/s": "D at 760 Torr", "cm^2 Torr s-1": "pressure times D", "A^2": "cross section"}
    if row["unit"] not in kinds or row["quantity"].startswith("velocity-changing"):
        return "a cross section of any change of velocity, small angles included, is not one of diffusion"
    value, error, exponent = value_and_error(row["value"], row["uncertainty"])
    temperature, standing, remarks = place(row)
    source = full(row["published_source"])
    year = max(re.findall(r"(?<!\d)(?:19|20)\d\d(?!\d)", source))
    exponent_error = re.search(rf"exponent ({NUMBER})", row["uncertainty"])
    return {
        "alkali": row["alkali"], "gas": row["gas"], "quantity": kinds[row["unit"]], "value": f"{value:.6g}",
        "unit": row["unit"].replace("s-1", "s^-1"), "error": "" if error is None else f"{error:.4g}",
        "temperature_K": temperature, "exponent": exponent,
        "exponent_error": exponent_error[1] if exponent_error else "", "standing": standing, "year": year,
        "published": f"{row['quantity']}: {row['value']}" + (f" ({row['uncertainty']})" if row["uncertainty"] else ""),
        "source": sourced(row, source), "mark": row["status"], "grade": row["confidence"].split()[0],
        "note": "; ".join(part for part in (row["note"], *remarks) if part),
    }  # fmt: skip


def place(row: dict[str, str]) -> tuple[str, str, list[str]]:
    """Return (temperature, standing, remarks): 'usable', 'superseded', or 'assumed' where a condition is a guess."""
    cell = row["T_K"]
    if cell == "211-424":
        return "300", "usable", ["temperature law measured between 211 and 424 K"]
    if "not in excerpt" in cell:
        return ASSUMED_K, "assumed", [f"temperature assumed ({ASSUMED_K} K), definition of the cross section too"]
    if "?" in cell:
        return cell.strip("~?"), "assumed", ["pressure (760 Torr) and temperature of the number are assumed"]
    if row["published_source"].startswith(SUPERSEDED):
        return cell, "superseded", ["replaced by the newer reduction of the same data"]
    return re.match(NUMBER, cell)[0], "usable", []  # type: ignore[index]


Maker = Callable[[dict[str, str]], "dict[str, object] | str"]
TABLES: dict[str, tuple[Maker, tuple[str, ...], str, str]] = {
    "vapour_pressure.csv": (pressure_row, PRESSURE_COLUMNS, "notes/vapour-density.md",
                            "Saturated vapour of the alkalis: log10(quantity) = a + b/T + c T + d log10 T, T in K."),
    "diffusion.csv": (diffusion_row, DIFFUSION_COLUMNS, "notes/diffusion.md",
                      "Measured diffusion of alkali atoms in noble gases and nitrogen."),
}  # fmt: skip


def main(source: str, target: str | None = None) -> None:
    """Write the two tables."""
    out = Path(target) if target else Path(__file__).parents[2] / "pertcalc" / "data" / "vapour"
    out.mkdir(parents=True, exist_ok=True)
    for name, (make, columns, note, title) in TABLES.items():
        rows = []
        with (Path(source) / name).open(newline="", encoding="utf-8") as stream:
            for row in csv.DictReader(stream):
                made = make(row)
                if isinstance(made, str):
                    what = f"{row['alkali']} {row['gas']} {row['quantity']} = {row['value']}"
                    print(f"left out of {name}: {what}: {made}")
                else:
                    rows.append(made)
        order = {symbol: index for index, symbol in enumerate(ALKALIS + GASES)}
        rows.sort(key=lambda r: (order[str(r["alkali"])], order.get(str(r.get("gas")), 0)))
        with (out / name).open("w", newline="", encoding="utf-8") as stream:
            stream.write(HEADER.format(title=title, origin=name, note=note))
            writer = csv.DictWriter(stream, columns, lineterminator="\n")
            writer.writeheader()
            writer.writerows(rows)
        print(f"{name}: {len(rows)} rows")


if __name__ == "__main__":
    main(*sys.argv[1:])
