"""How far the semiclassical method lies from quantum close coupling on the same curves: a summary of the shipped table.

Both are our own output (COMPUTED): this says what the method costs, not whether either is true. The table is
``pertcalc/data/method_differences.json``, made by notes/scripts/compare_methods.py.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Any

import numpy as np

from pertcalc.errors import DataFileError
from pertcalc.species import COMPUTED

TABLE = "method_differences.json"
# Alkalis whose transfer exceeds 1 bohr^2 by far in every gas; in Rb and Cs it is tiny and judged apart, without a goal.
LARGE_TRANSFER = ("li", "na", "k")
ORIGIN = f"{COMPUTED}: both methods on the same curves; our own output, not a validation"


@dataclass(frozen=True, slots=True)
class RateClass:
    """Rates that are judged together: their names in the table, alkalis (None: all) and the goal for the median [1]."""

    name: str
    rates: tuple[str, ...]
    alkalis: tuple[str, ...] | None
    goal: float | None


CLASSES: tuple[RateClass, ...] = (
    RateClass("full width, D1 and D2", ("fwhm D1", "fwhm D2"), None, 0.02),
    RateClass("shift, D1 and D2", ("shift D1", "shift D2"), None, 0.03),
    RateClass("P1/2 loss K=1", ("loss P1/2 1",), None, 0.04),
    RateClass("P3/2 loss K=1", ("loss P3/2 1",), None, 0.03),
    RateClass("P3/2 loss K=2", ("loss P3/2 2",), None, 0.03),
    RateClass("P3/2 loss K=3", ("loss P3/2 3",), None, None),
    RateClass("transfer of Li, Na, K", ("transfer P1/2", "transfer P3/2"), LARGE_TRANSFER, 0.10),
    RateClass("transfer of Rb, Cs", ("transfer P1/2", "transfer P3/2"), ("rb", "cs"), None),
)


@dataclass(frozen=True, slots=True)
class MethodDifference:
    """|semiclassical/quantum - 1| of one class of rates over pairs and temperatures.

    ``median``, ``ninety`` (90 % lie below), ``worst`` [1]; ``worst_where`` pair, rate and temperature of the last;
    ``goal`` for the median [1] or None; ``count`` numbers compared from ``pairs`` pairs.
    """

    name: str
    count: int
    pairs: int
    median: float
    ninety: float
    worst: float
    worst_where: str
    goal: float | None

    @property
    def reached(self) -> bool | None:
        """Whether the median meets its goal; None without one."""
        return None if self.goal is None else self.median <= self.goal


@cache
def shipped_differences() -> dict[str, Any]:
    """The shipped table by sha256 of the curve file; DataFileError if it is not there or damaged."""
    path = resources.files("pertcalc") / "data" / TABLE
    try:
        table = json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError) as problem:
        raise DataFileError(path, f"{problem}; reinstall pertcalc") from problem
    return dict(table)


def method_differences(table: dict[str, Any] | None = None) -> list[MethodDifference]:
    """Median, 90 % and worst deviation of every class of rates in the shipped table, or in another of its form.

    Raises
    ------
    DataFileError
        The shipped table is missing or damaged.
    """
    entries = list((shipped_differences() if table is None else table).values())
    return [found for one in CLASSES if (found := _summary(one, entries)) is not None]


def temperatures_K(table: dict[str, Any] | None = None) -> list[float]:
    """Temperatures of the comparison, rising [K]."""
    entries = (shipped_differences() if table is None else table).values()
    return sorted({float(T) for entry in entries for T in entry["temperatures_K"]})


def _summary(rates: RateClass, entries: list[dict[str, Any]]) -> MethodDifference | None:
    chosen = [one for one in entries if rates.alkalis is None or one["id"].split("-")[0] in rates.alkalis]
    found = [
        (float(value), f"{_pair(entry)} {rate} {T:g} K")
        for entry in chosen
        for rate in rates.rates
        for T, value in zip(entry["temperatures_K"], entry["relative"][rate], strict=True)
    ]
    if not found:
        return None
    values = np.array([value for value, _ in found])
    return MethodDifference(
        rates.name,
        len(found),
        len(chosen),
        float(np.median(values)),
        float(np.percentile(values, 90)),
        *max(found),
        rates.goal,
    )


def _pair(entry: dict[str, Any]) -> str:
    alkali, gas = entry["id"].split("_")[0].split("-")
    return f"{alkali.capitalize()}-{gas.capitalize()}"
