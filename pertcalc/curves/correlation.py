"""Correlations between the stated errors of one curve: read from its file, and as a matrix."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from pertcalc.curves.schema import Table

Array = NDArray[np.float64]

# A matrix whose least eigenvalue is below this cannot be drawn from (and a perfect correlation is one parameter).
_LEAST = 1e-9


def read_correlation(table: Table, uncertainty: Mapping[str, float]) -> dict[str, float]:
    """Coefficients [1] by pair, as "De_Re", in the order of the file; problems are noted in the table.

    Parameters
    ----------
    table : Table
        ``correlation = { De_Re = -0.5 }`` of an uncertainty section.
    uncertainty : mapping
        Relative errors of the state [1]; only those above 0 can be correlated.
    """
    names = [name for name, value in uncertainty.items() if value > 0]
    found: dict[str, float] = {}
    for key in table.data:
        value = table.number(key, "correlation coefficient", low=-1.0, high=1.0)
        pair = key.split("_")
        if len(pair) != 2 or pair[0] == pair[1] or not set(pair) <= set(names):
            known = f"two of {', '.join(names)}" if len(names) > 1 else "two parameters, and this state states fewer"
            table.note(key, f"must name {known} with stated uncertainty above 0, joined as De_Re")
        elif f"{pair[1]}_{pair[0]}" in found:
            table.note(key, f"is the same pair as {pair[1]}_{pair[0]}; give it once")
        elif value is not None:
            found[key] = value
    if found and np.linalg.eigvalsh(correlation_matrix(names, found))[0] < _LEAST:
        table.problems.append(
            f"{table.name}: these coefficients contradict each other (their matrix is not positive definite); "
            "make them smaller"
        )
    return found


def correlation_matrix(names: Sequence[str], correlation: Mapping[str, float]) -> Array:
    """Correlation matrix [1], shape (n, n), of the named parameters; pairs that are not stated are independent."""
    matrix = np.eye(len(names))
    for pair, value in correlation.items():
        i, j = (names.index(name) for name in pair.split("_"))
        matrix[i, j] = matrix[j, i] = value
    return matrix
