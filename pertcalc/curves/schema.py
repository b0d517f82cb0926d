"""Strict reading of untrusted tables: every bad field is noted, none raises, the caller raises once at the end."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, field
from difflib import get_close_matches
from typing import Any

from pertcalc import constants

MAX_TEXT = 4000
MAX_UNKNOWN = 20
# One of each unit in hartree and in bohr.
ENERGY_UNITS = {
    "hartree": 1.0,
    "cm^-1": 1 / constants.HARTREE_CM1,
    "eV": 1 / constants.HARTREE_EV,
    "meV": 1e-3 / constants.HARTREE_EV,
    "K": constants.KELVIN_HARTREE,
}
LENGTH_UNITS = {"bohr": 1.0, "angstrom": 1 / constants.BOHR_ANGSTROM}
_WORD = re.compile(r"[A-Za-z0-9_-]{1,60}")
_CONTROL = re.compile(r"[\x00-\x08\x0b-\x1f\x7f-\x9f]")


def shown(value: Any) -> str:
    """A value as it may be printed in a message: its repr, control characters escaped, at most 60 characters."""
    if isinstance(value, dict):
        keys = ", ".join(shown(k)[:24] for k in list(value)[:4])
        return f"{{{keys}{', ...' if len(value) > 4 else ''}}}"
    if isinstance(value, list):
        return f"[... {len(value)} items]" if len(value) > 4 else repr(value)[:60]
    try:
        text = repr(value)
    except ValueError:  # an int beyond Python's digit limit
        return "a number with thousands of digits"
    return text if len(text) <= 60 else text[:57] + "..."


def finite(value: Any) -> float | None:
    """A finite float from a TOML number; None for bool, text, nan, inf, or an int no float can hold."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        return None
    try:
        number = float(value)
    except OverflowError:
        return None
    return number if math.isfinite(number) else None


def did_you_mean(word: Any, known: list[str] | tuple[str, ...]) -> str:
    """' did you mean X?' for the nearest of the known words, '' when none is near."""
    lowered = {k.lower(): k for k in known}
    near = get_close_matches(str(word)[:80].lower(), list(lowered), n=1, cutoff=0.5)
    return f" did you mean {lowered[near[0]]!r}?" if near else ""


@dataclass(slots=True)
class Table:
    """One TOML table under examination; problems go to the shared list as 'field = value: rule; next step'."""

    data: dict[str, Any]
    name: str
    problems: list[str]
    known: list[str] = field(default_factory=list)

    def path(self, key: str) -> str:
        """Dotted name of a field; a key that is no plain word is quoted and cut."""
        plain = key if _WORD.fullmatch(key) else shown(key)
        return f"{self.name}.{plain}" if self.name else plain

    def note(self, key: str, rule: str) -> None:
        """Note a problem of one field, with its value when it has one."""
        value = f" = {shown(self.data[key])}" if key in self.data else ""
        self.problems.append(f"{self.path(key)}{value}: {rule}")

    def take(self, key: str, required: str = "") -> Any:
        """The raw value, None when absent (a problem when ``required`` names the next step)."""
        if key not in self.known:
            self.known.append(key)
        if key in self.data:
            return self.data[key]
        if required:
            self.note(key, f"is missing; {required}")
        return None

    def text(self, key: str, required: str = "", choices: tuple[str, ...] = ()) -> str | None:
        """A printable string, one of ``choices`` when there are any."""
        value = self.take(key, required)
        if value is None:
            return None
        if not isinstance(value, str):
            self.note(key, "must be text; put it in quotes")
        elif required and not value.strip():
            self.note(key, f"must not be empty; {required}")
        elif len(value) > MAX_TEXT:
            self.note(key, f"has {len(value)} characters; at most {MAX_TEXT} are allowed")
        elif _CONTROL.search(value):
            self.note(key, "contains control characters; remove them")
        elif choices and value not in choices:
            self.note(key, f"is not known;{did_you_mean(value, choices)} known: {', '.join(choices)}")
        else:
            return value
        return None

    def number(
        self, key: str, unit: str, *, low: float = 0.0, high: float = math.inf, closed: bool = False, required: str = ""
    ) -> float | None:
        """A finite number with low < value < high (low <= value when closed)."""
        value = self.take(key, required)
        if value is None:
            return None
        number = finite(value)
        if number is None:
            wrong = "must be a finite number" if isinstance(value, int | float) else "must be a number without quotes"
            self.note(key, f"{wrong} [{unit}]; correct it")
        elif not (low <= number if closed else low < number) or not number < high:
            top = "" if math.isinf(high) else f" and below {high:g}"
            self.note(key, f"must be {'at least' if closed else 'above'} {low:g}{top} [{unit}]; check value and unit")
        else:
            return number
        return None

    def quantity(
        self, key: str, units: dict[str, float], high: float, required: str = ""
    ) -> tuple[float, float | None] | None:
        """``{value, sd, unit}`` in the base unit (hartree or bohr), below ``high``, and its relative sd, if given."""
        data = self.take(key, required)
        if data is None:
            return None
        example = f'{{ value = 1.0, sd = 0.1, unit = "{list(units)[1]}" }}'
        if not isinstance(data, dict):
            self.note(key, f"must be a table with a unit; write {key} = {example}")
            return None
        inner = Table(data, self.path(key), self.problems)
        value = inner.number("value", "in its unit", required=f"write {key} = {example}")
        sd = inner.number("sd", "in its unit", closed=True)
        unit = inner.text("unit", f"name one of {', '.join(units)}", tuple(units))
        inner.finish()
        if value is None or unit is None:
            return None
        if not value * units[unit] < high:
            inner.note("value", f"must be below {high:g} {list(units)[0]}; check value and unit")
            return None
        return value * units[unit], None if sd is None else sd / value

    def table(self, key: str, required: str = "") -> Table | None:
        """A nested table; None when absent or not a table."""
        data = self.take(key, required)
        if data is None:
            return None
        if not isinstance(data, dict):
            self.note(key, f"must be a table; write a section [{self.path(key)}]")
            return None
        return Table(data, self.path(key), self.problems)

    def finish(self) -> None:
        """Note every key that nothing asked for, with the nearest known one."""
        unknown = [key for key in self.data if key not in self.known]
        for key in unknown[:MAX_UNKNOWN]:
            self.note(key, f"unknown key;{did_you_mean(key, self.known)} known here: {', '.join(self.known)}")
        if len(unknown) > MAX_UNKNOWN:
            self.problems.append(f"{self.name or 'file'}: {len(unknown) - MAX_UNKNOWN} more unknown keys")
