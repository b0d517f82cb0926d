"""Published values the program must reproduce, all in one place, each with its source, mark and stated tolerance.

Only READ values gate. Wells from which a curve file was built (A) check the file and its mathematics (the well of the
curve that is really used), not the physics; those of computed curves (X, B) check the physics; each note says so.
notes/validation-command.md: what gates and why.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from pertcalc.collisions.lindholm_foley import lindholm_foley_constants
from pertcalc.constants import BOHR_ANGSTROM, HARTREE_CM1
from pertcalc.curves.curveset import CurveSet
from pertcalc.curves.files import load_default
from pertcalc.curves.summary import adiabatic_wells
from pertcalc.species import FROM_MEMORY, READ
from pertcalc.validation.check import Check

_BUILT = "the file is built on it: checks the curve in use, not the physics"
_COMPUTED = "the curve is computed without it"
_PRINTED = "the printed error"
_BOTH = "1.5 combined errors: the printed one and the judged one of the computed curve (De {0} %, Re {1} %)"
_LAPATOVICH = "Lapatovich et al., J. Chem. Phys. 73, 5419 (1980), abstract; https://ouci.dntb.gov.ua/en/works/9JBqBgq9"
_THESIS = "Lapatovich, thesis, MIT (1980), abstract; https://studylib.net/doc/11062451/od"
_SCHWARZHANS = (
    "Schwarzhans and Zimmermann, Verhandl. DPG 1997, MO 7.1 (preliminary); "
    "https://dpg-verhandlungen.de/year/1997/conference/mainz/part/mo/session/7/contribution/1"
)
_ZIMMERMANN = (
    "Zimmermann, Braune, Schwarzhans and Bruehl, Verhandl. DPG 1999, A 15.4 (preliminary); "
    "https://dpg-verhandlungen.de/year/1999/conference/heidelberg/part/a/session/15/contribution/4"
)
_LIN = "Lin, thesis, U. New Hampshire (1987), abstract; https://scholars.unh.edu/dissertation/1510"
_ROUNDED = "rounded to 1 meV: half of it"
_NO_ERROR = "no error printed, nor the zero of energy: one fine-structure splitting; position 0.02 A (judged)"
_HALVED = "twice the printed error"
_HALF_TRIMER = "half the depth of alkali-gas2, if energies of pairs add up: an inference, so it does not gate"
_RECALLED = "20 % of the depth, 5 % of the position: recalled, low confidence"


@dataclass(frozen=True, slots=True)
class PublishedWell:
    """A published well: depth [cm^-1] and position [angstrom] with tolerances in the same units (None: not given).

    ``state`` "X" | "A" | "B", or "A1/2" | "A3/2" for the curves with fine structure; ``gates`` only if READ.
    """

    alkali: str
    noble_gas: str
    state: str
    depth: float
    depth_tolerance: float
    position: float | None
    position_tolerance: float | None
    basis: str
    source: str
    mark: str = READ
    gates: bool = True
    note: str = _BUILT


WELLS: tuple[PublishedWell, ...] = (
    PublishedWell("Na", "Ar", "X", 41.9, 9.5, 5.01, 0.15, _BOTH.format(15, 2), _SCHWARZHANS, note=_COMPUTED),
    PublishedWell("Na", "Ar", "A1/2", 585.0, 17.2, 2.938, 0.02, _NO_ERROR, _ZIMMERMANN),
    PublishedWell("Na", "Ar", "A3/2", 579.0, 17.2, 2.932, 0.02, _NO_ERROR, _ZIMMERMANN),
    PublishedWell("Na", "Ne", "X", 8.1, 2.2, 5.29, 0.18, _BOTH.format(15, 2), _LAPATOVICH, note=_COMPUTED),
    PublishedWell("Na", "Ne", "A", 145.0, 5.0, 2.70, 0.05, _PRINTED, _LAPATOVICH),
    PublishedWell(
        "Na", "Ne", "B", 3.0, 1.9, 7.62, 0.52, _BOTH.format(30, 4), _LAPATOVICH,
        note=f"{_COMPUTED}; relation sign lost in print",
    ),
    PublishedWell("Na", "Ar", "X", 40.3, 4.03, None, None, _ROUNDED, _THESIS, note="printed: 5 meV"),
    PublishedWell("Na", "Ne", "X", 8.07, 4.03, None, None, _ROUNDED, _THESIS, note="printed: 1 meV"),
    PublishedWell("Na", "He", "A", 410.0, 110.0, None, None, _HALVED, _LIN, gates=False, note=_HALF_TRIMER),
    PublishedWell("Na", "Ar", "A", 550.0, 150.0, None, None, _HALVED, _LIN, gates=False, note=_HALF_TRIMER),
    PublishedWell("Na", "Kr", "A", 678.0, 180.0, None, None, _HALVED, _LIN, gates=False, note=_HALF_TRIMER),
    PublishedWell(
        "Li", "Ar", "X", 43.0, 8.6, 5.0, 0.25, _RECALLED, "Dehmer and Wharton, J. Chem. Phys. 57, 4821 (1972)",
        FROM_MEMORY, False, _COMPUTED,
    ),
    PublishedWell(
        "Na", "Ar", "B", 30.0, 6.0, 6.8, 0.34, _RECALLED, "Tellinghuisen et al., J. Chem. Phys. 71, 1283 (1979)",
        FROM_MEMORY, False, _COMPUTED,
    ),
    PublishedWell(
        "Cs", "Ar", "X", 45.0, 9.0, None, None, _RECALLED, "Buck and Pauly, Z. Phys. 208, 390 (1968)",
        FROM_MEMORY, False, _COMPUTED,
    ),
)  # fmt: skip


def check_wells(wells: tuple[PublishedWell, ...] | None = None) -> list[Check]:
    """Every published well beside that of the default curve; WELLS unless others are given.

    Raises
    ------
    DataFileError
        A default curve file is missing or damaged.
    """
    found: list[Check] = []
    for one in WELLS if wells is None else wells:
        depth, position = well_of(load_default(one.alkali, one.noble_gas), one.state)
        label = f"{one.alkali}-{one.noble_gas} {one.state}"
        found.append(_check(one, f"{label} De", one.depth, depth, one.depth_tolerance, "cm^-1"))
        if one.position is not None and one.position_tolerance is not None:
            found.append(_check(one, f"{label} Re", one.position, position, one.position_tolerance, "angstrom"))
    return found


def well_of(curves: CurveSet, state: str) -> tuple[float, float]:
    """Depth [cm^-1] and position [angstrom] of the well of a state, "X", "A", "B", "A1/2", "A3/2"; nan without one."""
    if state in curves.states:
        well = curves.states[state].curve.well()
        return (math.nan, math.nan) if well is None else (well.depth * HARTREE_CM1, well.position * BOHR_ANGSTROM)
    return adiabatic_wells(curves)[state] or (math.nan, math.nan)


def _check(one: PublishedWell, name: str, theirs: float, ours: float, tolerance: float, unit: str) -> Check:
    return Check(
        group="well",
        name=name,
        theirs=theirs,
        ours=ours if math.isfinite(ours) else None,
        unit=unit,
        difference=ours - theirs,
        tolerance=tolerance,
        tolerance_unit=unit,
        basis=one.basis,
        source=one.source,
        mark=one.mark,
        gates=one.gates and one.mark == READ,
        note=one.note,
    )


def check_constants() -> list[Check]:
    """Published constants beside ours: the van der Waals width rule of the astronomers, recalled, so it never gates."""
    width, _ = lindholm_foley_constants(6)
    ours = width * (2 * math.pi) ** 0.4
    return [
        Check(
            group="constant",
            name="van der Waals width rule",
            theirs=17.0,
            ours=ours,
            unit="1",
            difference=ours - 17.0,
            tolerance=0.5,
            tolerance_unit="1",
            basis="two printed digits: half of the last",
            source="gamma6 = 17 C6^(2/5) v^(3/5) N with C6 of the cyclic frequency; Unsoeld, Physik der "
            "Sternatmosphaeren (1955)",
            mark=FROM_MEMORY,
            gates=False,
            note="FWHM/(C6^(2/5) v^(3/5) N); ours 8.08 (2 pi)^(2/5)",
        )
    ]
