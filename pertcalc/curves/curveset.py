"""A set of curves X, A, B of one pair with its provenance: what a curve file becomes."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

from pertcalc.curves.base import Curve

STATES = ("X", "A", "B")
STATE_NAMES = {"X": "ground 2Sigma+", "A": "excited 2Pi", "B": "excited 2Sigma+"}
# How each status of a source is shown to the user.
STATUS_MARKS = {
    "published": "READ",
    "from-memory": "FROM MEMORY",
    "model": "COMPUTED",
    "combining-rule": "COMPUTED",
}


@dataclass(frozen=True, slots=True)
class Source:
    """Where a curve comes from: citation, one of STATUS_MARKS, the place in it, remarks."""

    cite: str
    status: str
    where: str = ""
    note: str = ""


@dataclass(frozen=True, slots=True)
class StateCurve:
    """One state: its curve (atomic units), source, relative uncertainties (De, Re, C6, C8, C10, wall) and mark.

    ``correlation`` holds the coefficients [1] of pairs of those errors, "De_Re" and so on; absent means independent.
    """

    curve: Curve
    source: Source
    uncertainty: dict[str, float] = field(default_factory=dict)
    form: str = ""
    correlation: dict[str, float] = field(default_factory=dict)

    @property
    def mark(self) -> str:
        """READ, FROM MEMORY or COMPUTED."""
        return STATUS_MARKS[self.source.status]


@dataclass(frozen=True, slots=True)
class CurveSet:
    """Curves X, A and B of one alkali with one perturber, without spin-orbit, zero at infinite separation.

    ``mass_*_u`` [u] and ``splitting_cm1`` [cm^-1] override the species table where they are not None. ``sha256`` is the
    digest of the file (and of the tables it names).
    """

    id: str
    alkali: str
    noble_gas: str
    what: str
    states: dict[str, StateCurve]
    mass_alkali_u: float | None = None
    mass_perturber_u: float | None = None
    splitting_cm1: float | None = None
    sha256: str = ""
    path: Path | None = None

    @property
    def X(self) -> Curve:
        """Ground 2Sigma+ curve."""
        return self.states["X"].curve

    @property
    def A(self) -> Curve:
        """Excited 2Pi curve, no spin-orbit."""
        return self.states["A"].curve

    @property
    def B(self) -> Curve:
        """Excited 2Sigma+ curve, no spin-orbit."""
        return self.states["B"].curve
