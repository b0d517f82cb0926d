"""What a rate computation returns: frozen records that carry value, numerical error, model error and origin apart."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from pertcalc import __version__

Array = NDArray[np.float64]

LINE_UNIT = "rad s^-1 cm^3"
LEVEL_UNIT = "cm^3 s^-1"


@dataclass(frozen=True, slots=True)
class Coefficient:
    """One rate coefficient at every temperature, per unit perturber density.

    Parameters
    ----------
    unit : str
        "rad s^-1 cm^3" for widths and shifts, "cm^3 s^-1" for the rest.
    values : ndarray, shape (n,), or None
        The coefficient [unit]; None when the method cannot know it, and then `reason` says why.
    numerical_error, model_error : ndarray, shape (n,), or None
        Relative errors [1]: of the computation, and of what it starts from (curves, method). None = not estimated.
    exponent : ndarray, shape (n,), or None
        d ln|k| / d ln T at fixed density [1].
    reason : str or None
        Why there is no value.
    """

    unit: str
    values: Array | None
    numerical_error: Array | None = None
    model_error: Array | None = None
    exponent: Array | None = None
    reason: str | None = None

    def listed(self, name: str) -> list[float] | None:
        """The named array as a list of plain floats, None where it is missing or not finite."""
        array = getattr(self, name)
        if array is None:
            return None
        return [float(x) if np.isfinite(x) else None for x in array]  # type: ignore[misc]


@dataclass(frozen=True, slots=True)
class CollisionRates:
    """Every collision rate of one alkali and one noble gas; see `Coefficient` for units and errors.

    `fwhm`, `shift` by line ("D1", "D2"); `transfer` by level of origin ("P1/2", "P3/2"); `multipole_loss`,
    `multipole_transfer` by level, then rank K. `fwhm` is the full width; `shift` > 0 is blue; `multipole_loss` is the
    total decay of rank K, outflow included; `multipole_transfer` is the gain of rank K in the other level.
    """

    alkali: str
    noble_gas: str
    method: str
    curves_id: str
    curves_sha256: str
    temperatures: Array  # [K]
    reduced_mass: float  # [electron masses]
    fwhm: Mapping[str, Coefficient]
    shift: Mapping[str, Coefficient]
    multipole_loss: Mapping[str, Mapping[int, Coefficient]]
    transfer: Mapping[str, Coefficient]
    multipole_transfer: Mapping[str, Mapping[int, Coefficient]]
    work: Mapping[str, int] = field(default_factory=dict)
    origin: Mapping[str, str] = field(default_factory=dict)
    warnings: tuple[str, ...] = ()
    version: str = __version__

    def _tree(self, name: str) -> dict[str, Any]:
        """The lines/levels part of the contract with the named array of every coefficient."""
        return {
            "lines": {
                line: {
                    "fwhm_rad_s_cm3": self.fwhm[line].listed(name),
                    "shift_rad_s_cm3": self.shift[line].listed(name),
                }
                for line in self.fwhm
            },
            "levels": {
                level: {
                    "multipole_loss_cm3_s": {str(K): c.listed(name) for K, c in self.multipole_loss[level].items()},
                    "transfer_cm3_s": self.transfer[level].listed(name),
                    "multipole_transfer_cm3_s": {
                        str(K): c.listed(name) for K, c in self.multipole_transfer[level].items()
                    },
                }
                for level in self.transfer
            },
        }

    def _reasons(self) -> dict[str, str]:
        """Dotted path of every null value and why it is null."""
        found: dict[str, str | None] = {}
        for line in self.fwhm:
            found[f"lines.{line}.fwhm_rad_s_cm3"] = self.fwhm[line].reason
            found[f"lines.{line}.shift_rad_s_cm3"] = self.shift[line].reason
        for level in self.transfer:
            found[f"levels.{level}.transfer_cm3_s"] = self.transfer[level].reason
            for K, c in self.multipole_loss[level].items():
                found[f"levels.{level}.multipole_loss_cm3_s.{K}"] = c.reason
            for K, c in self.multipole_transfer[level].items():
                found[f"levels.{level}.multipole_transfer_cm3_s.{K}"] = c.reason
        return {path: reason for path, reason in found.items() if reason}

    def to_json(self) -> dict[str, Any]:
        """The object of the JSON contract ``pertcalc.rates/1``: plain types only, no nan; null values have a reason."""
        return {
            "schema": "pertcalc.rates/1",
            "alkali": self.alkali,
            "noble_gas": self.noble_gas,
            "method": self.method,
            "curves": {"id": self.curves_id, "sha256": self.curves_sha256},
            "temperatures_K": [float(T) for T in self.temperatures],
            **self._tree("values"),
            "temperature_exponents": self._tree("exponent"),
            "numerical_error_relative": self._tree("numerical_error"),
            "model_error_relative": self._tree("model_error"),
            "reasons": self._reasons(),
            "work": {key: int(value) for key, value in self.work.items()},
            "origin": dict(self.origin),
            "warnings": list(self.warnings),
            "version": self.version,
        }
