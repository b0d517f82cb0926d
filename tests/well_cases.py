"""Curve sets whose ground curve is the Tang-Toennies form through a well: smooth, with the C_n all the way out."""

from __future__ import annotations

from dataclasses import replace

from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.curves.curveset import CurveSet, Source, StateCurve
from pertcalc.curves.files import load_default
from pertcalc.curves.tang_toennies import TangToennies

# De [cm^-1], Re [angstrom], C6, C8, C10 [au] of ground curves. De and Re FROM MEMORY (ab initio and scattering
# literature, low confidence), C_n from second-order sums over states. An independent calculation of levels and
# equilibrium constants rests on just these wells.
WELLS = {
    ("Li", "He"): (1.5, 6.18, 22.6, 1088.0, 73000.0),
    ("Na", "He"): (1.3, 6.4, 25.9, 1327.0, 95400.0),
    ("K", "He"): (1.05, 7.1, 39.7, 2586.0, 239000.0),
    ("Rb", "He"): (0.95, 7.3, 44.7, 3070.0, 301000.0),
    ("Cs", "He"): (0.85, 7.7, 53.9, 4118.0, 451000.0),
    ("K", "Ar"): (42.0, 5.4, 301.4, 22086.0, 2120000.0),
    ("Rb", "Ar"): (39.0, 5.6, 338.0, 26138.0, 2660000.0),
    ("K", "Kr"): (71.0, 5.25, 447.1, 34045.0, 3330000.0),
    ("Rb", "Kr"): (67.0, 5.5, 500.4, 40252.0, 4160000.0),
}


def through_well(alkali: str, gas: str) -> CurveSet:
    """The default set of a pair with the ground curve of WELLS in place of the table; De 10 %, Re 2 %, C6 3 %."""
    De, Re, C6, C8, C10 = WELLS[alkali, gas]
    curve = TangToennies.from_well(De / HARTREE_CM1, Re / BOHR_ANGSTROM, C6, C8, C10)
    X = StateCurve(curve, Source("from memory", "from-memory"), {"De": 0.1, "Re": 0.02, "C6": 0.03})
    base = load_default(alkali, gas)
    return replace(base, states={**base.states, "X": X})
