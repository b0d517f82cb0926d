"""Make pertcalc/data/vapour/{spin_destruction,pairs}.csv from spin_destruction.csv.

Usage: python notes/scripts/make_spin_destruction.py DIRECTORY_WITH_THE_CSV_FILE [OUTPUT_DIRECTORY]

Numbers are copied as printed; nothing is converted but A^3 to cm^3. Rows left out are printed with the reason.
"""

from __future__ import annotations

import csv
import re
import sys
from pathlib import Path

ALKALIS = ("Li", "Na", "K", "Rb", "Cs")
GASES = ("He", "3He", "Ne", "Ar", "Kr", "Xe", "N2")
BY_GAS, BY_ALKALI, EXCHANGE = "spin destruction by gas", "alkali-alkali spin destruction", "spin exchange"
COLUMNS = ("alkali", "partner", "kind", "quantity", "value", "unit", "error", "temperature_K", "low_K", "high_K",
           "exponent", "use", "published", "definition", "source", "year", "mark", "grade", "note")  # fmt: skip
PAIR_COLUMNS = ("alkali", "noble_gas", "coupling_MHz", "lifetime_torr_s", "equilibrium_cm3", "temperature_K",
                "source", "mark", "note")  # fmt: skip
NUMBER = r"\d[\d.]*(?:e-?\d+)?"
ELECTRON = "electron-randomisation: d<S>/dt = -n k <S>, nuclear spin not touched"
DEFINITIONS = {
    "sigma <Sz> sudden binary": f"{ELECTRON}; sudden binary collisions, independent of the nuclear spin",
    "sigma relaxation of hyperfine orientation": f"relaxation of <S.I>, taken as {ELECTRON} (inferred)",
    "disorientation": f"disorientation of the ground level, taken as {ELECTRON} (inferred)",
    "spin exchange": "spin-exchange cross section; rate per atom n sigma vbar",
}
USES = ("value", "superseded", "order of magnitude", "upper limit")
HEADER = """# {title}
# Made by notes/scripts/make_spin_destruction.py from spin_destruction.csv; do not edit by hand. notes/ground-level.md
# explains every column. mark: READ (address in source) or FROM MEMORY. An empty error: the source states none.
"""


def number(text: str) -> tuple[float, float | None]:
    """Return (value, half range or None) of '9e-18', '<=2e-18', '(1-3)e-14', '~1e-20 (...)', 'a (T/298)^m'."""
    if spread := re.match(r"\((\d+)-(\d+)\)(e-\d+)", text):
        low, high = (float(spread[i] + spread[3]) for i in (1, 2))
        return (low + high) / 2, (high - low) / 2
    return float(re.match(rf"(?:<=|~)?({NUMBER})", text)[1]), None  # type: ignore[index]


def stated_error(text: str, value: float) -> float | None:
    """Return the absolute error of '0.05e-21', '10 %' or 'factor 3' (which is +200 %); None for anything else."""
    if factor := re.match(rf"factor ({NUMBER})", text):
        return (float(factor[1]) - 1) * value
    if percent := re.match(rf"({NUMBER}) %", text):
        return float(percent[1]) / 100 * value
    return float(text) if re.fullmatch(NUMBER, text) else None


def temperatures(text: str, law: re.Match[str] | None) -> tuple[str, str, str]:
    """Return (reference, low, high) of '~305 (...)', '298-470' or ''."""
    found = re.match(r"~?(\d+)(?:-(\d+))?", text)
    if not found:
        return "", "", ""
    low, high = found[1], found[2] or found[1]
    return (law[1] if law else f"{(float(low) + float(high)) / 2:g}"), low, high


def kind_of(row: dict[str, str]) -> str:
    if "spin exchange" in row["quantity"]:
        return EXCHANGE
    return BY_ALKALI if row["gas"] == row["alkali"] else BY_GAS


def use_of(row: dict[str, str]) -> str:
    """Return how far a number may stand for the pair."""
    if row["value"].startswith("<="):
        return "upper limit"
    if row["value"].startswith("~"):
        return "order of magnitude"
    return "superseded" if "uncorrected" in row["note"] else "value"


def table_row(row: dict[str, str]) -> dict[str, object]:
    """Return one cross section or rate coefficient."""
    law = re.search(r"\(T/(\d+)\)\^([\d.]+)", row["value"])
    value, half = number(row["value"])
    error = half if half is not None else stated_error(row["uncertainty"], value)
    reference, low, high = temperatures(row["T_K"], law)
    year = re.search(r"\(((?:19|20)\d\d)\)", row["published_source"])
    read = row["status"] == "READ"
    doubtful = row["quantity"] not in ("sigma <Sz> sudden binary",) and "(inferred)" in definition(row)
    grade = {"medium-high": "medium", "low-medium": "low"}.get(row["confidence"], row["confidence"])
    uncertainty = row["uncertainty"].replace("not in excerpt", "")
    remarks = [row["note"].replace("computed here", "computed"), f"temperature as printed: {row['T_K'] or 'none'}",
               f"stated uncertainty: {uncertainty}" if uncertainty else "no stated uncertainty"]  # fmt: skip
    return {
        "alkali": row["alkali"], "partner": row["gas"], "kind": kind_of(row),
        "quantity": "rate" if row["unit"] == "cm^3/s" else "cross section",
        "value": f"{value:g}", "unit": row["unit"], "error": "" if error is None else f"{error:.3g}",
        "temperature_K": reference, "low_K": low, "high_K": high, "exponent": law[2] if law else "",
        "use": use_of(row), "published": f"{row['value']} {row['unit']}", "definition": definition(row),
        "source": row["published_source"] + (f"; read at {row['address']}" if read else ""),
        "year": year[1] if year else "", "mark": "READ" if read else "FROM MEMORY",
        "grade": "medium" if doubtful and grade == "high" else grade, "note": "; ".join(r for r in remarks if r),
    }  # fmt: skip


def definition(row: dict[str, str]) -> str:
    return DEFINITIONS.get(row["quantity"], f"{ELECTRON} (spin-destruction cross section or rate, sigma = k/vbar)")


def pair_row(row: dict[str, str]) -> dict[str, object]:
    """Return what is published about one weakly bound pair."""
    parts = [part.strip() for part in row["value"].split(";")]
    coupling, lifetime, equilibrium = "", "", ""
    if len(parts) == 3:
        coupling, lifetime = parts[0].split()[0], parts[1].split()[0]
        size, unit = parts[2].split()
        equilibrium = f"{float(size) * {'A^3': 1e-24, 'cm3': 1.0}[unit]:.3g}"
    else:
        lifetime = re.match(NUMBER, row["value"])[0]  # type: ignore[index]
    note = f"as printed: {row['quantity']} = {row['value']}; {row['note']}"
    return {
        "alkali": row["alkali"], "noble_gas": row["gas"], "coupling_MHz": coupling, "lifetime_torr_s": lifetime,
        "equilibrium_cm3": equilibrium, "temperature_K": row["T_K"],
        "source": f"{row['published_source']}; read at {row['address']}", "mark": row["status"], "note": note,
    }  # fmt: skip


def reason_out(row: dict[str, str]) -> str | None:
    """Return why a row is left out of the table of cross sections, or None."""
    if row["alkali"] not in ALKALIS or row["gas"] not in (*GASES, row["alkali"]):
        return "not one alkali with one partner"
    if row["unit"] not in ("cm^2", "cm^3/s"):
        return "not a cross section or rate coefficient of one pair"
    return None


def is_pair(row: dict[str, str]) -> bool:
    return row["quantity"].startswith(("gamma/h", "quasi-molecular correlation time"))


def completed(rows: list[dict[str, str]]) -> None:
    """Write out 'same as above' and 'same compilation'."""
    for before, row in zip(rows, rows[1:], strict=False):
        if row["address"] == "same as above":
            row["address"] = before["address"]
        if row["published_source"] == "same compilation":
            row["published_source"] = before["published_source"]


def write(path: Path, title: str, columns: tuple[str, ...], rows: list[dict[str, object]]) -> None:
    with path.open("w", newline="", encoding="utf-8") as stream:
        stream.write(HEADER.format(title=title))
        writer = csv.DictWriter(stream, columns, lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)
    print(f"{path.name}: {len(rows)} rows")


def main(source: str, target: str | None = None) -> None:
    """Write the two tables."""
    out = Path(target) if target else Path(__file__).parents[2] / "pertcalc" / "data" / "vapour"
    out.mkdir(parents=True, exist_ok=True)
    with (Path(source) / "spin_destruction.csv").open(newline="", encoding="utf-8") as stream:
        rows = list(csv.DictReader(stream))
    completed(rows)
    table, pairs = [], []
    for row in rows:
        if is_pair(row):
            pairs.append(pair_row(row))
        elif reason := reason_out(row):
            print(f"left out: {row['alkali']} {row['gas']} {row['quantity']} = {row['value']}: {reason}")
        else:
            table.append(table_row(row))
    place = {symbol: index for index, symbol in enumerate(GASES + ALKALIS)}
    table.sort(key=lambda r: (ALKALIS.index(str(r["alkali"])), str(r["kind"]), place[str(r["partner"])],
                              USES.index(str(r["use"])), str(r["mark"]) != "READ"))  # fmt: skip
    write(out / "spin_destruction.csv", "Spin destruction and spin exchange of alkali atoms.", COLUMNS, table)
    title = "Weakly bound pairs: spin-rotation constant gamma/h, lifetime times pressure, equilibrium constant."
    write(out / "pairs.csv", title, PAIR_COLUMNS, pairs)


if __name__ == "__main__":
    main(*sys.argv[1:])
