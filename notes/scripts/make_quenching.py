"""Make pertcalc/data/vapour/quenching.csv from quenching.csv.

Usage: python notes/scripts/make_quenching.py DIRECTORY_WITH_THE_CSV_FILE [OUTPUT_DIRECTORY]

Cross sections printed as sigma^2 (cross section = pi sigma^2) are multiplied by pi. Upper limits become rows of kind
"bound". Rows left out are printed with the reason.
"""

from __future__ import annotations

import csv
import math
import re
import sys
from pathlib import Path

COLUMNS = ("alkali", "level", "gas", "kind", "value", "unit", "error", "low_K", "high_K", "published", "source", "mark",
           "grade", "note")  # fmt: skip
NUMBER = r"\d+\.?\d*(?:e-?\d+)?"
HEADER = """# Cross sections for quenching of the first P levels: return to the ground level without light.
# Made by notes/scripts/make_quenching.py from quenching.csv; do not edit by hand. notes/absorption-and-pumping.md.
# sigma = rate / (density x mean relative speed). kind: value, or bound when only sigma < value is known.
# mark: READ (address in source) or FROM MEMORY. error: same unit; empty for a bound.
"""
# "near room" of a cell experiment and "300-1000" of a trend.
TEMPERATURES = {"near room": ("300", "300")}


def temperatures(cell: str) -> tuple[str, str]:
    """Return (low, high) in K of '340', '1400-1800' or 'near room'."""
    if cell in TEMPERATURES:
        return TEMPERATURES[cell]
    low, _, high = cell.partition("-")
    return low, high or low


def quantity(row: dict[str, str]) -> tuple[str, float, float | None]:
    """Return (kind, value, error) in A^2 of one row."""
    text, factor = row["value"], math.pi if "sigma^2" in row["quantity"] else 1.0
    if "below" in text or text.startswith("<"):
        limit = re.search(rf"(?:below|<) ({NUMBER})", text)
        assert limit, row
        return "bound", factor * float(limit[1]), None
    numbers = [float(one) for one in re.findall(NUMBER, text.split("(")[0].split("near")[0])]
    if "+-" in text:
        return "value", factor * numbers[0], factor * numbers[1]
    value, half = sum(numbers) / len(numbers), (max(numbers) - min(numbers)) / 2
    stated = [float(one) for one in re.findall(NUMBER, row["uncertainty"])]
    error = value * max(stated) / 100 if "%" in row["uncertainty"] else max(stated)
    return "value", factor * value, factor * max(error, half)


def rows_of(row: dict[str, str]) -> list[dict[str, str]]:
    """Return the rows one input row stands for: one per alkali, level and gas."""
    kind, value, error = quantity(row)
    levels = [row["state"][1:]] if "/" in row["state"] else ["P1/2", "P3/2"]
    low, high = temperatures(row["T_K"])
    read = row["status"] == "READ"
    source = re.sub(r"\[(.*?) from memory\]", r"(\1 FROM MEMORY)", row["published_source"])
    source += f"; read at {row['address']}" if read else ""
    grade = re.search(r"high|medium|low", row["confidence"])
    assert grade, row
    common = {
        "kind": kind, "value": f"{value:.5g}", "unit": "A^2", "error": "" if error is None else f"{error:.3g}",
        "low_K": low, "high_K": high, "published": f"{row['quantity']}: {row['value']} {row['unit']}",
        "source": source, "mark": row["status"], "grade": grade[0], "note": row["note"],
    }  # fmt: skip
    return [
        {"alkali": alkali, "level": level, "gas": gas} | common
        for alkali in row["alkali"].split(",")
        for level in levels
        for gas in row["gas"].split(",")
    ]


def main(source: str, target: str | None = None) -> None:
    """Write the table."""
    out = Path(target) if target else Path(__file__).parents[2] / "pertcalc" / "data" / "vapour"
    found = []
    with (Path(source) / "quenching.csv").open(newline="") as stream:
        for row in csv.DictReader(stream):
            if not row["quantity"].startswith("quenching"):
                print(f"left out: {row['alkali']} {row['gas']} {row['quantity']}: a trend, no cross section")
                continue
            found += rows_of(row)
    place = {symbol: index for index, symbol in enumerate(("Li", "Na", "K", "Rb", "Cs"))}
    found.sort(key=lambda row: (place[row["alkali"]], row["level"], row["gas"], row["kind"], float(row["low_K"])))
    out.mkdir(parents=True, exist_ok=True)
    with (out / "quenching.csv").open("w", newline="", encoding="utf-8") as stream:
        stream.write(HEADER)
        writer = csv.DictWriter(stream, COLUMNS, lineterminator="\n")
        writer.writeheader()
        writer.writerows(found)
    print(f"quenching.csv: {len(found)} rows")


if __name__ == "__main__":
    main(*sys.argv[1:])
