"""Invented rates with the shape of the real ones, for tests of the command line and of the report."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from pertcalc.errors import PertcalcError
from pertcalc.results import LEVEL_UNIT, LINE_UNIT, Coefficient, CollisionRates

INVENTED_ORDER = ("He", "3He", "Ne", "Ar", "Kr", "Xe")


def coefficient(unit: str, scale: float, temperatures: np.ndarray, exponent: float) -> Coefficient:
    """A power law in T with errors of 0.3 % and 20 %."""
    ones = np.ones_like(temperatures)
    values = scale * (temperatures / 300.0) ** exponent
    return Coefficient(unit, values, 0.003 * ones, 0.2 * ones, exponent * ones)


def fake_rates(
    alkali: str, noble_gas: str, temperature: float | Sequence[float], method: str = "semiclassical", **_: Any
) -> CollisionRates:
    """Rates that grow along the gases; the closed form cannot know P1/2 K=1 and the transfers."""
    T = np.atleast_1d(np.asarray(temperature, dtype=float))
    size = 1.0 + (INVENTED_ORDER.index(noble_gas) if noble_gas in INVENTED_ORDER else 3)
    unknown = Coefficient(LEVEL_UNIT, None, reason="a straight path on C6 alone cannot know it")
    closed = method == "closed-form"

    def loss(scale: float) -> Coefficient:
        return coefficient(LEVEL_UNIT, scale * size, T, 0.4)

    return CollisionRates(
        alkali=alkali,
        noble_gas=noble_gas,
        method=method,
        curves_id=f"{alkali}-{noble_gas}_default".lower(),
        curves_sha256="0123456789abcdef" * 4,
        temperatures=T,
        reduced_mass=5e4,
        fwhm={line: coefficient(LINE_UNIT, k * size * 1e-9, T, 0.3) for line, k in (("D1", 1.5), ("D2", 1.6))},
        shift={line: coefficient(LINE_UNIT, k * size * 1e-10, T, 0.2) for line, k in (("D1", -3.0), ("D2", -2.0))},
        multipole_loss={
            "P1/2": {1: unknown if closed else loss(4e-11)},
            "P3/2": {1: loss(2e-10), 2: loss(3e-10), 3: loss(2.2e-10)},
        },
        transfer={level: unknown if closed else loss(k) for level, k in (("P1/2", 1e-17), ("P3/2", 3e-17))},
        multipole_transfer={level: {1: unknown if closed else loss(-1e-17)} for level in ("P1/2", "P3/2")},
        work={"paths": 10},
        warnings=(),
    )


class Broken:
    """fake_rates that fails for some gases."""

    def __init__(self, errors: dict[str, BaseException]):
        self.errors = errors

    def __call__(self, alkali: str, noble_gas: str, *others: Any, **named: Any) -> CollisionRates:
        """Raise for a gas of the list, else answer."""
        if noble_gas in self.errors:
            raise self.errors[noble_gas]
        return fake_rates(alkali, noble_gas, *others, **named)


def pertcalc_error(message: str, exit_code: int) -> PertcalcError:
    """An error of the library with an exit code of its own."""
    error = PertcalcError(message)
    error.exit_code = exit_code
    return error
