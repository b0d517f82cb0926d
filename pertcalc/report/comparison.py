"""Published measurements beside our rates at the measurement's own temperature."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from pertcalc.measured import Measurement, as_rate, measurements
from pertcalc.results import Coefficient, CollisionRates
from pertcalc.species import SPECIES_GASES


@dataclass(frozen=True, slots=True)
class Comparison:
    """One measurement with our value in the same unit at the same temperature.

    ``ours`` [unit of the measurement] and its relative ``numerical_error``, ``model_error`` [1], None when unknown;
    ``ratio`` ours / measured [1], None for a bound or an unknown value.
    """

    measurement: Measurement
    ours: float | None
    numerical_error: float | None
    model_error: float | None

    @property
    def ratio(self) -> float | None:
        """Ours over measured [1]."""
        if self.ours is None or self.measurement.kind == "bound" or self.measurement.value == 0:
            return None
        return self.ours / self.measurement.value


def known_measurements(alkali: str, gas: str) -> tuple[Measurement, ...]:
    """Measurements of the pair; none for a perturber outside the species table."""
    return measurements(alkali, gas) if gas in SPECIES_GASES else ()


def compare(rates: CollisionRates) -> tuple[Comparison, ...]:
    """Set every measurement of the pair beside the rates.

    A measurement whose temperature [K] is not among those of ``rates`` stands without our value. A cross section is
    compared as one: our coefficient over the mean relative speed at that temperature.
    """
    return tuple(_compare(one, rates) for one in known_measurements(rates.alkali, rates.noble_gas))


def _compare(measurement: Measurement, rates: CollisionRates) -> Comparison:
    coefficient = _coefficient(measurement, rates)
    i = int(np.argmin(np.abs(rates.temperatures - measurement.temperature_K)))
    here = np.isclose(rates.temperatures[i], measurement.temperature_K, rtol=1e-6)
    if coefficient is None or coefficient.values is None or not here:
        return Comparison(measurement, None, None, None)
    # as_rate is linear: what turns the published number into a rate also turns our rate into the published unit.
    per_unit = as_rate(measurement, rates.reduced_mass).value / measurement.value
    errors = [
        None if array is None else float(array[i]) for array in (coefficient.numerical_error, coefficient.model_error)
    ]
    return Comparison(measurement, float(coefficient.values[i]) / per_unit, errors[0], errors[1])


def _coefficient(measurement: Measurement, rates: CollisionRates) -> Coefficient | None:
    """Our coefficient for the measured quantity, None when the method has no such entry."""
    where = measurement.line_or_level
    if measurement.quantity == "multipole_loss":
        return rates.multipole_loss.get(where, {}).get(measurement.rank or 0)
    table = {"fwhm": rates.fwhm, "shift": rates.shift, "transfer": rates.transfer}[measurement.quantity]
    return table.get(where)
