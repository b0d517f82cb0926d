"""Plain text tables and numbers: no colour, at most WIDTH columns, readable in a pipe or a log."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Sequence

WIDTH = 100
# Beyond these a number is written with an exponent.
_PLAIN_FROM, _PLAIN_TO = 1e-3, 1e4
UNKNOWN = "-"


def number(value: float | None, digits: int = 4, sign: bool = False) -> str:
    """A number with ``digits`` significant digits, an exponent only where needed; "-" for None."""
    if value is None:
        return UNKNOWN
    plus = "+" if sign else ""
    if value == 0:
        return "0"
    if not (_PLAIN_FROM <= abs(value) < _PLAIN_TO):
        return f"{value:{plus}.{digits - 1}e}"
    # Rounding first: 99.996 with four digits is 100.0, not 100.00.
    exponent = math.floor(math.log10(abs(float(f"{value:.{digits - 1}e}"))))
    return f"{value:{plus}.{max(digits - 1 - exponent, 0)}f}"


def percent(relative: float | None) -> str:
    """A relative error as whole or first-digit per cent; "?" when it is not estimated."""
    if relative is None or not math.isfinite(relative):
        return "?"
    if relative < 0.0005:
        return "<0.1%"
    return f"{100 * relative:.1f}%" if relative < 0.0095 else f"{100 * relative:.0f}%"


def with_errors(shown: str, numerical: float | None, model: float | None) -> str:
    """``value +- numerical / model``, both errors in per cent of the value."""
    return shown if shown == UNKNOWN else f"{shown} +- {percent(numerical)} / {percent(model)}"


def with_total(shown: str, numerical: float | None, model: float | None) -> str:
    """``value+-total``: both errors added in quadrature, "?" when the model error is not estimated."""
    if shown == UNKNOWN:
        return shown
    total = None if model is None else math.hypot(numerical or 0.0, model)
    return f"{shown}+-{percent(total)}"


def table(headers: Sequence[str], rows: Sequence[Sequence[str]], left: int = 1, indent: int = 2) -> list[str]:
    """Lines of a table with columns as wide as needed; the first ``left`` columns are aligned left, the rest right.

    A header may have several lines, separated by newlines.
    """
    heads = [header.split("\n") for header in headers]
    height = max(len(head) for head in heads)
    cells = [[([""] * (height - len(head)) + head)[i] for head in heads] for i in range(height)]
    cells += [list(row) for row in rows]
    widths = [max(len(row[i]) for row in cells) for i in range(len(headers))]
    lines = [
        " " * indent
        + "  ".join(
            cell.ljust(width) if i < left else cell.rjust(width)
            for i, (cell, width) in enumerate(zip(row, widths, strict=True))
        ).rstrip()
        for row in cells
    ]
    rule = " " * indent + "-" * (sum(widths) + 2 * (len(widths) - 1))
    return [*lines[:height], rule, *lines[height:]]


def wrapped(text: str, indent: str = "  ", first: str | None = None) -> list[str]:
    """A paragraph within WIDTH columns; ``first`` begins its first line in place of ``indent``."""
    lead = indent if first is None else first
    # A broken address cannot be followed; one longer than a line sticks out.
    return textwrap.wrap(
        text, WIDTH, initial_indent=lead, subsequent_indent=indent, break_on_hyphens=False, break_long_words=False
    )
