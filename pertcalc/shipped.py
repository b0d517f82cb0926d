"""Tables that come with the package: CSV files below ``pertcalc/data``; lines that start with '#' are their header."""

from __future__ import annotations

import csv
from collections.abc import Callable
from importlib.resources import files
from typing import TypeVar

from pertcalc.errors import DataFileError

Row = TypeVar("Row")


def shipped_rows(folder: str, name: str, make: Callable[[dict[str, str]], Row]) -> tuple[Row, ...]:
    """Every row of ``pertcalc/data/folder/name``, made into a record.

    Parameters: ``folder``, ``name`` of the table; ``make`` the record of one row from its cells by column. Returns the
    records in the order of the file. Raises DataFileError, which names the file and the row, when it cannot be read.
    """
    path = files("pertcalc") / "data" / folder / name
    try:
        lines = path.read_text(encoding="utf-8").splitlines()
    except (OSError, ValueError) as problem:
        raise DataFileError(path, f"{problem}; reinstall pertcalc") from problem
    rows = []
    for number, cells in enumerate(csv.DictReader(line for line in lines if not line.startswith("#")), start=1):
        try:
            rows.append(make(cells))
        except (KeyError, TypeError, ValueError) as problem:
            raise DataFileError(path, f"row {number}: {problem!r}; reinstall pertcalc") from problem
    return tuple(rows)
