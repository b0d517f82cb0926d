"""One check: what is expected, what we find, how far they may lie apart, and whether a failure ends in exit code 4."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

# The mark of a value that follows from a law and not from a publication.
EXACT_LAW = "EXACT LAW"


@dataclass(frozen=True, slots=True)
class Check:
    """One expected value beside ours.

    ``group`` "well" | "constant" | "law" | "rate"; ``theirs``, ``ours`` [``unit``]; ``difference`` and ``tolerance``
    [``tolerance_unit``], the tolerance stated before the result was seen and explained in ``basis``; ``mark`` "READ" |
    "FROM MEMORY" | "EXACT LAW"; ``gates``: whether a failure ends in exit code 4.
    """

    group: str
    name: str
    theirs: float
    ours: float | None
    unit: str
    difference: float
    tolerance: float
    tolerance_unit: str
    basis: str
    source: str
    mark: str
    gates: bool
    note: str = ""

    @property
    def passed(self) -> bool:
        """Within the tolerance; a value that is missing or not a number is not."""
        return math.isfinite(self.difference) and abs(self.difference) <= self.tolerance


def failures(checks: Iterable[Check]) -> tuple[Check, ...]:
    """The checks that gate and did not pass."""
    return tuple(check for check in checks if check.gates and not check.passed)


def failure_message(failed: Iterable[Check]) -> str:
    """What went wrong, one line per failed check."""
    lines = [
        f"  - {one.name}: expected {one.theirs:.4g}, found {_shown(one.ours)} {one.unit}; off by "
        f"{abs(one.difference):.3g}, tolerance {one.tolerance:.3g} {one.tolerance_unit} ({one.mark}: {one.source})"
        for one in failed
    ]
    noun = "check" if len(lines) == 1 else "checks"
    return "\n".join([f"{len(lines)} {noun} failed the stated tolerance:", *lines])


def _shown(value: float | None) -> str:
    return "nothing" if value is None else f"{value:.4g}"
