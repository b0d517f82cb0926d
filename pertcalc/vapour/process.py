"""One process that changes the polarisation of a level: its rate with error and origin, or why there is none."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from pertcalc.species import COMPUTED, FROM_MEMORY, READ, Sourced


@dataclass(frozen=True, slots=True)
class Process:
    """A process and its rate.

    ``name`` in plain words of the trade; ``rate`` [s^-1] with source, mark and absolute error (None = not estimated);
    ``rate`` None means unknown, never zero, and ``reason`` says why; ``destroys`` is False for a process that only
    redistributes or dephases (spin exchange conserves the total spin); ``note`` what a reader must know to use it.
    """

    name: str
    rate: Sourced | None
    reason: str | None = None
    destroys: bool = True
    note: str = ""


def weakest_mark(marks: Iterable[str]) -> str:
    """Mark of a result made from inputs with these marks: FROM MEMORY if any is, else COMPUTED if any is, else READ."""
    found = set(marks)
    return next((mark for mark in (FROM_MEMORY, COMPUTED) if mark in found), READ)
