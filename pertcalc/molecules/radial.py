"""One electronic state of a pair as a radial problem: potential, reduced mass, well, where wave functions live.

``u'' = [2 mu (V(R) - E) + N(N+1)/R^2] u``. Spin-rotation, Lambda doubling and the coupling between the adiabatic curves
are left out: N is the rotation of the pair. notes/molecules.md.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pertcalc import species
from pertcalc.constants import AMU_AU, HARTREE_CM1
from pertcalc.curves import fine_structure
from pertcalc.curves.base import Curve
from pertcalc.curves.curveset import CurveSet
from pertcalc.curves.deform import PARAMETERS, Deformed
from pertcalc.curves.tabulated import Tabulated
from pertcalc.errors import DataFileError, InputError, UnknownNameError

Array = NDArray[np.float64]
Potential = Callable[[Array], Array]

STATES = ("X", "A1/2", "A3/2", "B")
# Level of the free atom each state tends to, and the curves of the file it is made of.
LIMITS = {"X": "S1/2", "A1/2": "P1/2", "A3/2": "P3/2", "B": "P3/2"}
PARTS = {"X": ("X",), "A1/2": ("A", "B"), "A3/2": ("A",), "B": ("A", "B")}
# Electronic states of the molecule per state of the free atom's level: 2/2, 2/2, 2/4, 2/4.
WEIGHTS = {"X": 1.0, "A1/2": 1.0, "A3/2": 0.5, "B": 0.5}

# Curves are surveyed from here [bohr] to there; further out they are their own r^-6 tail.
R_LOOK = 0.5
R_FAR = 400.0
_SURVEY = 6000
# A wall is looked at up to here [hartree].
_TOP = 1.0
# A wave function has decayed by exp(-DEPTH) where a grid may end.
DEPTH = 36.0
# A wall that stops a wave function less than exp(-THIN_WALL) is no wall.
THIN_WALL = 8.0
# A table ends inside the classically allowed region when its dispersion terms explain less than DISPERSION_SHARE of its
# last value (or more than the inverse); when it stops deeper than DEEP_END of its well and the well holds more than one
# level, they must explain CLOSE_SHARE of it: a shallow, far-out well may end deep and still go on as its tail.
DISPERSION_SHARE = 0.5
DEEP_END = 0.3
CLOSE_SHARE = 0.9


@dataclass(frozen=True, slots=True)
class RadialProblem:
    """A potential with its mass and the numbers every method needs.

    ``potential`` V(R) [hartree], zero at infinity; ``reduced_mass`` [electron masses]; ``C6`` [hartree bohr^6] of its
    tail (0: shorter ranged); ``depth`` [hartree] and ``position`` [bohr] of the deepest point, both 0 for a curve that
    is nowhere negative; ``r_in`` [bohr] where wave functions of negative energy have died out in the wall.
    """

    potential: Potential
    reduced_mass: float
    C6: float
    depth: float
    position: float
    r_in: float

    @property
    def has_well(self) -> bool:
        """Whether the curve is anywhere negative."""
        return self.depth > 0

    @property
    def largest_rotation(self) -> int:
        """A rotation quantum number [1] above which no level of negative energy can exist (classical bound)."""
        if not self.has_well:
            return -1
        R = np.geomspace(self.r_in, R_FAR, _SURVEY)
        return int(np.sqrt(max(float(np.max(-2 * self.reduced_mass * self.potential(R) * R * R)), 0.0))) + 1

    def with_mass(self, reduced_mass: float) -> RadialProblem:
        """The same curve with another reduced mass [electron masses]."""
        return radial_problem(self.potential, reduced_mass, self.C6)

    def effective(self, R: Array, N: Array | float) -> Array:
        """``V + N(N+1)/(2 mu R^2)`` [hartree], broadcast over R [bohr] and N [1]."""
        return self.potential(R) + N * (N + 1) / (2 * self.reduced_mass * R * R)


def radial_problem(potential: Potential, reduced_mass: float, C6: float) -> RadialProblem:
    """Survey a potential: find its well and where the wall has stopped every bound wave function.

    Parameters
    ----------
    potential : callable
        V(R) [hartree] of R [bohr], zero at infinity.
    reduced_mass : float
        [electron masses]; > 0.
    C6 : float
        Dispersion coefficient of the tail [hartree bohr^6].

    Returns
    -------
    RadialProblem

    Raises
    ------
    InputError
        The wall inside the well is too thin to hold a wave function: the curve has no bound levels in any safe sense.
    """
    R = np.geomspace(R_LOOK, R_FAR, _SURVEY)
    V = potential(R)
    # The wall counts from the outermost point at which it is at its highest: nothing further in is real.
    top = int(np.flatnonzero(V >= min(float(V.max()), _TOP))[-1])
    k = top + int(np.argmin(V[top:]))
    if V[k] >= 0:
        return RadialProblem(potential, reduced_mass, C6, 0.0, 0.0, R_LOOK)
    fine = np.linspace(R[max(k - 1, 0)], R[min(k + 1, _SURVEY - 1)], 2001)
    values = potential(fine)
    best = int(np.argmin(values))
    # The innermost well of several bounds the grid, not the deepest.
    zero = max(top + int(np.argmax(V[top:] < 0)) - 1, top)
    wall = slice(top, zero + 1)
    kappa = np.sqrt(2 * reduced_mass * np.clip(V[wall], 0, None))
    stopped = np.cumsum((0.5 * (kappa[1:] + kappa[:-1]) * np.diff(R[wall]))[::-1])
    if stopped.size == 0 or stopped[-1] < THIN_WALL:
        raise InputError(
            f"the wall of the potential rises only to {V[top] * HARTREE_CM1:.4g} cm^-1 at {R[top]:.3g} bohr: it "
            "does not hold a wave function; extend the curve inwards"
        )
    inner = int(np.searchsorted(stopped, DEPTH))
    r_in = float(R[max(zero - inner - 1, top)])
    return RadialProblem(potential, reduced_mass, C6, -float(values[best]), float(fine[best]), r_in)


def state_problem(curves: CurveSet, state: str, reduced_mass: float | None = None) -> RadialProblem:
    """The radial problem of one electronic state of a curve set.

    Parameters
    ----------
    curves : CurveSet
    state : str
        "X", "A1/2" (lower Omega = 1/2, tends to P1/2), "A3/2" (Omega = 3/2) or "B" (upper Omega = 1/2), the latter two
        tend to P3/2; each counts from its own limit.
    reduced_mass : float, optional
        [electron masses]; None takes that of the curve set (natural masses unless it overrides them).

    Returns
    -------
    RadialProblem

    Raises
    ------
    UnknownNameError
        No such state.
    DataFileError
        A table of the set ends inside its well.
    InputError
        The wall does not hold a wave function.
    """
    check_state(state)
    mu = reduced_mass_of(curves) if reduced_mass is None else reduced_mass
    _check_tables(curves, state, mu)
    parts = {name: curves.states[name].curve for name in PARTS[state]}
    a = fine_structure.coupling(fine_structure.splitting_of(curves))
    return radial_problem(_potential(parts, state, a), mu, _dispersion(parts, state, a))


def check_state(state: str) -> None:
    """UnknownNameError unless ``state`` is one of STATES."""
    if state not in STATES:
        raise UnknownNameError("state", state, STATES)


def deformed_potentials(curves: CurveSet, state: str) -> dict[str, tuple[Potential, float]]:
    """The potential of a state with each stated uncertainty of its curves applied, one at a time.

    Parameters
    ----------
    curves : CurveSet
    state : str
        One of STATES.

    Returns
    -------
    dict
        "X De" and so on -> (V(R) [hartree] of R [bohr], changed by + one standard deviation; C6 of its tail [au]).
    """
    a = fine_structure.coupling(fine_structure.splitting_of(curves))
    parts: dict[str, Curve] = {name: curves.states[name].curve for name in PARTS[state]}
    found = {}
    for name in parts:
        for parameter in PARAMETERS:
            size = curves.states[name].uncertainty.get(parameter, 0.0)
            if size:
                changed = Deformed(parts[name], **{parameter: size})
                tails = {key: part.C6 for key, part in parts.items()} | {name: changed.new_c6}
                moved: dict[str, Potential] = {**parts, name: changed}
                found[f"{name} {parameter}"] = (_potential(moved, state, a), _mixed(tails, state, a))
    return found


def _potential(parts: dict[str, Potential] | dict[str, Curve], state: str, a: float) -> Potential:
    """V(R) of a state from its limit; ``a`` is the spin-orbit constant [hartree]."""
    if len(parts) == 1:
        (only,) = parts.values()
        return only
    sigma, pi = parts["B"], parts["A"]
    sign = -1.0 if state == "A1/2" else 1.0

    def potential(R: Array) -> Array:
        S, P = np.asarray(sigma(R)), np.asarray(pi(R))
        half = 0.5 * (S - P)
        # Root of the 2x2 problem minus its value at infinity, without the cancellation of that difference.
        root = np.hypot(half + 0.25 * a, a / np.sqrt(2.0))
        change = half * (half + 0.5 * a) / np.maximum(root + 0.75 * a, 1e-300)
        return 0.5 * (S + P) + sign * change

    return potential


def _dispersion(parts: dict[str, Curve], state: str, a: float) -> float:
    return _mixed({name: curve.C6 for name, curve in parts.items()}, state, a)


def _mixed(C6: dict[str, float], state: str, a: float) -> float:
    """C6 of a state: Omega = 1/2 states hold 1/3 and 2/3 of Sigma (all of the stronger curve without spin-orbit)."""
    if len(C6) == 1:
        (only,) = C6.values()
        return only
    if a == 0:
        return max(C6.values()) if state == "A1/2" else min(C6.values())
    weight = 1 / 3 if state == "A1/2" else 2 / 3
    return weight * C6["B"] + (1 - weight) * C6["A"]


def _check_tables(curves: CurveSet, state: str, mu: float) -> None:
    """DataFileError when a table ends inside the classically allowed region of levels it would have to show."""
    problems = []
    for name in PARTS[state]:
        curve = curves.states[name].curve
        if not isinstance(curve, Tabulated):
            continue
        R, V = float(curve.R[-1]), float(curve.V[-1])
        dispersion = float(replace(curve.tail, C12=0.0, C14=0.0).with_derivative(R)[0])
        well = curve.well()
        if V >= 0 or well is None:
            continue
        deep = -V > DEEP_END * well.depth and _levels_held(curve, mu) > 1
        share = CLOSE_SHARE if deep else DISPERSION_SHARE
        if not share * V >= dispersion >= V / share:
            problems.append(
                f"states.{name}.points end at R = {R:.4g} bohr inside the classically allowed region: V = "
                f"{V * HARTREE_CM1:.4g} cm^-1 there ({-100 * V / well.depth:.0f} % of the well), of which C6, C8 and "
                f"C10 explain {dispersion * HARTREE_CM1:.4g}; add points further out, until the C_n tail continues "
                "the table"
            )
    if problems:
        raise DataFileError(curves.path or curves.id, problems)


def _levels_held(curve: Curve, mu: float) -> float:
    """WKB number of levels of N = 0, before rounding [1]."""
    R = np.geomspace(R_LOOK, R_FAR, _SURVEY)
    wave_number = np.sqrt(2 * mu * np.clip(-curve(R), 0, None))
    return float(np.trapezoid(wave_number, R)) / np.pi + 0.375


def reduced_mass_of(
    curves: CurveSet, alkali_mass_u: float | None = None, perturber_mass_u: float | None = None
) -> float:
    """Reduced mass of a pair [electron masses].

    Parameters
    ----------
    curves : CurveSet
        Its masses count where none is given here; where it has none, the species table's.
    alkali_mass_u, perturber_mass_u : float, optional
        [u]; those of chosen isotopes.

    Returns
    -------
    float
        [electron masses]
    """
    m = alkali_mass_u or curves.mass_alkali_u or species.alkali(curves.alkali).mass_u.value
    p = perturber_mass_u or curves.mass_perturber_u or species.noble_gas(curves.noble_gas).mass_u.value
    return m * p / (m + p) * AMU_AU
