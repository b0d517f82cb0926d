"""What ``pertcalc curves`` prints: the list, one pair in detail, the check of a file."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from pathlib import Path
from typing import Any

from pertcalc.curves.curveset import CurveSet
from pertcalc.curves.files import load, load_default
from pertcalc.curves.summary import CurveSummary, adiabatic_wells, describe, list_summaries, summarise
from pertcalc.errors import InputError
from pertcalc.report.as_json import dump
from pertcalc.report.request import check_pair
from pertcalc.report.rows import as_csv as csv_text
from pertcalc.report.tables import number, table, wrapped

Chosen = CurveSet | list[CurveSummary]


def choose(alkali: str | None, gas: str | None, curve_file: str | None) -> Chosen:
    """One curve set (a pair or a file), or the rows of all default sets, of one alkali where it is given.

    Raises
    ------
    DataFileError, InputError
        The file cannot be used, or belongs to another pair than the one named.
    """
    if curve_file is not None:
        curves = load(curve_file)
        if alkali is not None:
            check_pair(curves, alkali, gas)
        return curves
    if alkali is not None and gas is not None:
        return load_default(alkali, gas)
    return [row for row in list_summaries() if alkali is None or row.pair.startswith(f"{alkali}-")]


def shown(chosen: Chosen, as_json: bool, as_csv: bool) -> str:
    """The choice as text, JSON or CSV."""
    rows = summarise(chosen) if isinstance(chosen, CurveSet) else chosen
    if as_csv:
        return csv_text(asdict(row) for row in rows)
    if as_json:
        return dump(_json(chosen, rows))
    return describe(chosen) if isinstance(chosen, CurveSet) else _list(rows)


def plot(chosen: Chosen, path: str) -> Path:
    """Draw one pair; InputError when the choice is not one pair."""
    if not isinstance(chosen, CurveSet):
        raise InputError("--plot draws one pair: give ALKALI and GAS, or --curves FILE.")
    from pertcalc.report.curve_figures import save_figure

    return save_figure(chosen, path)


def checked(path: str, as_json: bool, as_csv: bool) -> str:
    """The good news about a curve file; every problem at once as DataFileError."""
    curves = load(path)
    if as_json:
        return dump({"schema": "pertcalc.curve-check/1", "path": path, "id": curves.id, "problems": []})
    if as_csv:
        return csv_text([{"path": path, "id": curves.id, "problems": 0}])
    states = ", ".join(f"{name} {state.form}" for name, state in curves.states.items())
    return f"{path}: no problem found. {curves.alkali}-{curves.noble_gas}, {states}, sha256 {curves.sha256}"


def _json(chosen: Chosen, rows: Sequence[CurveSummary]) -> dict[str, Any]:
    made: dict[str, Any] = {"schema": "pertcalc.curves/1", "states": [asdict(row) for row in rows]}
    if isinstance(chosen, CurveSet):
        wells = {
            name: None if well is None else {"De_cm1": well[0], "Re_angstrom": well[1]}
            for name, well in adiabatic_wells(chosen).items()
        }
        made |= {"id": chosen.id, "what": chosen.what, "sha256": chosen.sha256, "wells_with_fine_structure": wells}
    return made


def _list(rows: Sequence[CurveSummary]) -> str:
    headers = ["pair", "state", "form", "De, cm^-1", "Re, angstrom", "C6, au", "mark"]
    body = [
        [
            row.pair,
            row.state,
            row.form,
            _plus_minus(row.De_cm1, row.De_error_cm1),
            _plus_minus(row.Re_angstrom, row.Re_error_angstrom),
            _plus_minus(row.C6_au, row.C6_error_au),
            row.mark,
        ]
        for row in rows
    ]
    note = (
        "X: ground 2Sigma+, A: excited 2Pi, B: excited 2Sigma+, all without spin-orbit. De and Re of the well ('none': "
        "no well), C6 of the tail in hartree bohr^6; +- one standard deviation, 'none stated' where the source gives "
        "none. `pertcalc curves ALKALI GAS` shows one pair with its sources."
    )
    return "\n".join([*table(headers, body, left=3, indent=0), "", *wrapped(note, "")])


def _plus_minus(value: float | None, error: float | None) -> str:
    if value is None:
        return "none"
    return f"{number(value)} +- {'none stated' if error is None else number(error, 2)}"
