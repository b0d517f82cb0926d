"""Make pertcalc/data/measured/*.csv from broadening_measured.csv, fine_structure.csv and depolarisation.csv.

Usage: python notes/scripts/make_measured.py DIRECTORY_WITH_THE_CSV_FILES [OUTPUT_DIRECTORY]

Widths and shifts are recomputed from the published number and unit and compared with the converted column of the
input; a difference beyond its printed digits stops the script. Rows left out are printed with the reason.
"""

from __future__ import annotations

import csv
import math
import re
import sys
from pathlib import Path

ALKALIS = ("Li", "Na", "K", "Rb", "Cs")
GASES = ("He", "3He", "Ne", "Ar", "Kr", "Xe")
COLUMNS = ("alkali", "noble_gas", "quantity", "line_or_level", "rank", "kind", "value", "unit", "error",
           "temperature_K", "published", "definition", "source", "mark", "grade", "note")  # fmt: skip
TORR_DENSITY_K = 9.656500e18  # n [cm^-3] = this * p [Torr] / T [K]
AMAGAT = 2.6868e19  # [cm^-3]
GRADE_OF = {"R": "high", "M1": "medium", "M2": "low"}
ORDER = ("high", "medium", "low")
HEADER = """# {title}
# Made by notes/scripts/make_measured.py from {origin}; do not edit by hand. notes/measured.md explains every column.
# mark: READ (address in source) or FROM MEMORY. grade: high, medium, low (order of magnitude, doubtful, unsure digits).
# error: same unit as value; empty when the source states none or when the number itself is only approximate.
"""


def to_1e9(published: float, unit: str, temperature: float) -> float:
    """Return a published width or shift in 1e-9 rad s^-1 cm^3; half widths are still half widths."""
    if unit == "MHz/torr":
        return 2 * math.pi * published * 1e6 / (TORR_DENSITY_K / temperature) * 1e9
    if unit == "GHz/amagat":
        return 2 * math.pi * published * 1e9 / AMAGAT * 1e9
    if unit.startswith("1e-9 rad s-1 cm3"):
        return published
    raise SystemExit(f"unit {unit!r} is not known")


def plain(note: str) -> str:
    """Return a note without its first person."""
    for mine, neutral in (("my inference", "inferred"), ("estimate of mine", "estimate"), ("my N2 D2 recollection",
                          "the recalled N2 D2 value"), ("my R&P recollection", "the 1997 MHz/torr value")):  # fmt: skip
        note = note.replace(mine, neutral)
    return note


def conversion_error(note: str) -> float:
    """Return the relative error of a conversion whose temperature is assumed ('moves the converted value -6/+8 %')."""
    match = re.search(r"moves the converted value -(\d+)/\+(\d+) %", note)
    return max(int(part) for part in match.groups()) / 100 if match else 0.0


def spread(text: str) -> float | None:
    """Return the number of a cell like '+-0.1'; None for an empty one."""
    return float(text.removeprefix("+-")) if text else None


def line_row(row: dict[str, str]) -> dict[str, object]:
    """Return one width or shift as a full width or a signed shift in 1e-9 rad s^-1 cm^3."""
    quantity = {"broadening": "fwhm", "shift": "shift"}[row["quantity"]]
    unit, temperature, bound = row["unit_as_published"], float(row["temperature_K"]), row["uncertainty"] == "bound"
    number = float(row["value"].removeprefix("|d|<")) if bound else float(row["value"])
    full = 2.0 if row["definition"].startswith("HWHM") else 1.0
    value = full * to_1e9(number, unit, temperature)
    column = row["fwhm_or_shift_in_1e-9_rad_s-1_cm3_converted"]
    if abs(value - float(column.removeprefix("|d|<"))) > 0.001:  # the column has three decimals
        raise SystemExit(f"{row}: recomputed {value:.4f}, column says {column}")
    stated = None if bound else spread(row["uncertainty"])
    # An assumed temperature is an error of the converted number, whatever the published one is good to.
    error = math.hypot(full * to_1e9(stated or 0.0, unit, temperature), conversion_error(row["note"]) * value)
    grade, remark = re.match(r"grade (\w+)\. (.*)", row["note"], re.S).groups()  # type: ignore[union-attr]
    read = row["provenance"].startswith("read:")
    inferred = "INFERRED" in row["definition"]
    return {
        "quantity": quantity, "line_or_level": row["line"], "rank": "", "kind": "bound" if bound else "value",
        "value": f"{value:.4f}", "unit": "1e-9 rad s^-1 cm^3",
        "error": f"{error:.4f}" if error and not bound else "",
        "temperature_K": row["temperature_K"],
        "published": f"{row['value']} {unit}" + (f" ({row['uncertainty']})" if stated is not None else ""),
        "definition": row["definition"] + ("; doubled here to the full width" if full == 2 else ""),
        "source": f"{row['source']} ({row['year']})" + (f"; read at {row['provenance'][5:]}" if read else ""),
        "mark": "READ" if read else "FROM MEMORY",
        "grade": "medium" if inferred else GRADE_OF[grade],  # a read number whose definition is a guess is not "high"
        "note": plain(f"reference grade {grade}; {remark}"),
    }  # fmt: skip


def sigma_number(text: str, uncertainty: str) -> tuple[float, float | None, bool]:
    """Return (value, error, approximate) of a printed cross section.

    A range becomes its middle with half its length as error. "10-20 %" counts as 20 %; "factor 2" as the value itself.
    A "~" number has no error unless its row states a factor: the quoted per cents are the authors', not the recall's.
    """
    approximate = "~" in text or "suspect" in text or "factor" in uncertainty
    numbers = [float(part) for part in re.findall(r"\d[\d.]*(?:e-?\d+)?", text)]
    value = sum(numbers) / len(numbers)
    half = abs(numbers[-1] - numbers[0]) / 2
    if "factor" in uncertainty:
        error: float | None = value
    elif "%" in uncertainty and not approximate:
        error = value * max(float(part) for part in re.findall(r"[\d.]+", uncertainty)) / 100
    else:
        error = None
    return value, max(half, error or 0.0) or None, approximate


def graded(confidence: str, gas: str) -> str:
    """Return the grade that a confidence cell gives to one gas ('He,Ne medium (...); Ar Kr Xe low')."""
    for part in confidence.split(";"):
        words = re.sub(r"\(.*?\)", "", part).replace(",", " ").split()
        level = next((word for word in words if word in ORDER), None)
        named = [word for word in words if word in GASES]
        if level and (gas in named or "others" in words or not named):
            return level
    raise SystemExit(f"no grade for {gas} in {confidence!r}")


def level_of(state: str) -> str:
    """Return 'P1/2' or 'P3/2' of '3P1/2->3P3/2' or '3P3/2': the level a cross section starts from."""
    return re.fullmatch(r"\d(P[13]/2)", state.split("->")[0]).group(1)  # type: ignore[union-attr]


def sigma_row(row: dict[str, str]) -> dict[str, object]:
    """Return one cross section."""
    value, error, approximate = sigma_number(row["value"], row["uncertainty"])
    rank = "2" if "disalignment" in row["quantity"] else "1" if "disorientation" in row["quantity"] else ""
    read = row["status"] == "READ"
    grade = "low" if approximate else graded(row["confidence"], row["gas"])
    temperature = re.match(r"~?(\d+)", row["T_K"]).group(1)  # type: ignore[union-attr]
    stated = f"stated uncertainty: {row['uncertainty']}" if row["uncertainty"] else "no stated uncertainty"
    remarks = [plain(row["note"]), stated, f"confidence: {row['confidence']}",
               f"temperature as printed: {row['T_K']}" if temperature != row["T_K"] else ""]  # fmt: skip
    outflow = "population outflow to the other fine-structure level"
    loss = f"total loss of the rank-{rank} electronic multipole"
    return {
        "quantity": "multipole_loss" if rank else "transfer", "line_or_level": level_of(row["state"]), "rank": rank,
        "kind": "value", "value": f"{value:.6g}", "unit": "A^2", "error": "" if error is None else f"{error:.4g}",
        "temperature_K": temperature, "published": f"{row['value']} {row['unit']}",
        "definition": f"{loss if rank else outflow}, cross section = rate / mean relative speed ({row['quantity']})",
        "source": row["published_source"] + (f"; read at {row['address']}" if read else ""),
        "mark": "READ" if read else "FROM MEMORY", "grade": grade, "note": "; ".join(r for r in remarks if r),
    }  # fmt: skip


def reason_out(row: dict[str, str]) -> str | None:
    """Return why a row is left out, or None."""
    if row["gas"] not in GASES or row["alkali"] not in ALKALIS:
        return "not one alkali with one noble gas"
    if not re.match(r"[~|<d\d+-]", row["value"]):
        return "no number, or a trend without a level of origin"
    if row.get("unit", "A^2") != "A^2":
        return "not a cross section (a computed ratio)"
    return None


def made(path: Path) -> list[dict[str, object]]:
    """Return the rows of one input file, best grade first within a pair; print what is left out."""
    make, rows = (line_row if path.name.startswith("broadening") else sigma_row), []
    with path.open(newline="") as stream:
        for row in csv.DictReader(stream):
            if reason := reason_out(row):
                what = row.get("line") or row.get("state")
                print(f"left out of {path.name}: {row['alkali']} {what} {row['gas']} {row['quantity']}: {reason}")
                continue
            rows.append({"alkali": row["alkali"], "noble_gas": row["gas"], **make(row)})
    place = {symbol: index for index, symbol in enumerate(ALKALIS + GASES + ORDER)}
    return sorted(rows, key=lambda r: (place[str(r["alkali"])], place[str(r["noble_gas"])], r["quantity"],
                                       r["line_or_level"], r["rank"], place[str(r["grade"])]))  # fmt: skip


def main(source: str, target: str | None = None) -> None:
    """Write the three tables."""
    out = Path(target) if target else Path(__file__).parents[2] / "pertcalc" / "data" / "measured"
    out.mkdir(parents=True, exist_ok=True)
    tables = {
        "broadening_measured.csv": ("lines.csv", "Measured collisional full widths and shifts of D1 and D2."),
        "fine_structure.csv": ("fine_structure.csv", "Measured fine-structure transfer cross sections."),
        "depolarisation.csv": ("depolarisation.csv", "Measured multipole relaxation cross sections of P1/2 and P3/2."),
    }
    for origin, (name, title) in tables.items():
        rows = made(Path(source) / origin)
        with (out / name).open("w", newline="", encoding="utf-8") as stream:
            stream.write(HEADER.format(title=title, origin=origin))
            writer = csv.DictWriter(stream, COLUMNS, lineterminator="\n")
            writer.writeheader()
            writer.writerows(rows)
        print(f"{name}: {len(rows)} rows")


if __name__ == "__main__":
    main(*sys.argv[1:])
