"""Tabulate the curve errors of the 25 default sets: pertcalc/data/model_errors.json (see notes/model-error.md).

Run from the project's root: python notes/scripts/make_model_errors.py. About three minutes on two cores.
"""

from __future__ import annotations

import json
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import numpy as np

from pertcalc.curves import files
from pertcalc.model_error import curve_errors

TEMPERATURES = (300.0, 400.0, 500.0)
TARGET = Path(__file__).parents[2] / "pertcalc" / "data" / "model_errors.json"


def entry(name: str) -> tuple[str, dict]:
    """sha256 and table of one default set."""
    curves = files.load(files.default_folder() / f"{name}.toml")
    errors = curve_errors(curves, np.array(TEMPERATURES))
    relative = {" ".join(key): [float(f"{x:.2g}") for x in values] for key, values in sorted(errors.items())}
    return curves.sha256, {"id": name, "temperatures_K": list(TEMPERATURES), "relative": relative}


def main() -> None:
    """Write the table, one line per rate."""
    with ProcessPoolExecutor(2) as pool:
        table = dict(pool.map(entry, files.default_ids()))
    TARGET.write_text(json.dumps(table, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
