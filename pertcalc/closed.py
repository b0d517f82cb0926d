"""The closed-form method as a result: Lindholm-Foley widths and shifts, van der Waals depolarisation, nothing else."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from pertcalc.collisions.closed_form import ClosedFormRates, closed_form_rates
from pertcalc.collisions.pair import CollisionPair
from pertcalc.constants import AU_RATE_CM3_S, KELVIN_HARTREE
from pertcalc.curves.curveset import CurveSet
from pertcalc.results import LEVEL_UNIT, LINE_UNIT, Coefficient, CollisionRates

Array = NDArray[np.float64]

# Everything scales with <v^(3/5)> at fixed density.
EXPONENT = 0.3
WARNING = (
    "closed form: straight paths and the C6 terms alone, no repulsion, no wells; for helium and neon even the sign of "
    "the shift may be wrong. Use --method semiclassical for numbers to rely on."
)


def closed_form_result(curves: CurveSet, pair: CollisionPair, temperatures: Array) -> CollisionRates:
    """Closed-form rates of a curve set at temperatures [K], shape (n,).

    Parameters
    ----------
    curves : CurveSet
    pair : CollisionPair
    temperatures : ndarray, shape (n,)
        [K].

    Returns
    -------
    CollisionRates
        What the method cannot know (P1/2 orientation, transfer) has no value but a reason.
    """
    dC6 = {"D1": pair.isotropic[0], "D2": pair.isotropic[0]}
    found = closed_form_rates(KELVIN_HARTREE * temperatures, pair.reduced_mass, dC6, pair.anisotropy)

    def coefficient(unit: str, rate: Array | None, error: str, reason: str) -> Coefficient:
        if rate is None:
            return Coefficient(unit, None, reason=found.reasons[reason])
        relative = np.full(temperatures.shape, found.numerical_error_relative.get(error, 0.0))
        return Coefficient(unit, rate * AU_RATE_CM3_S, relative, None, np.full(temperatures.shape, EXPONENT))

    return CollisionRates(
        alkali=curves.alkali,
        noble_gas=curves.noble_gas,
        method="closed-form",
        curves_id=curves.id,
        curves_sha256=curves.sha256,
        temperatures=temperatures,
        reduced_mass=pair.reduced_mass,
        fwhm={line: coefficient(LINE_UNIT, found.fwhm[line], f"{line} fwhm", "") for line in dC6},
        shift={line: coefficient(LINE_UNIT, found.shift[line], f"{line} shift", "") for line in dC6},
        multipole_loss=_losses(found, coefficient),
        transfer={level: coefficient(LEVEL_UNIT, rate, "", "transfer") for level, rate in found.transfer.items()},
        multipole_transfer={
            level: {K: coefficient(LEVEL_UNIT, rate, "", "transfer") for K, rate in ranks.items()}
            for level, ranks in found.multipole_transfer.items()
        },
        origin={state: f"{curve.mark}: {curve.source.cite}" for state, curve in curves.states.items()},
        warnings=(WARNING,),
    )


def _losses(
    found: ClosedFormRates, coefficient: Callable[[str, Array | None, str, str], Coefficient]
) -> dict[str, dict[int, Coefficient]]:
    return {
        level: {K: coefficient(LEVEL_UNIT, rate, f"{level} K={K}", f"{level} K={K}") for K, rate in ranks.items()}
        for level, ranks in found.multipole_loss.items()
    }
