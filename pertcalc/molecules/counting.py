"""How many levels a well holds, by three independent ways, and the scattering length.

Spectral: `levels`. Nodes: the solution at E = 0 has as many nodes as there are levels below (oscillation theorem).
WKB: n = floor(Phi/pi + 1/2) with the action Phi at E = 0; the r^-6 tail makes it floor(Phi/pi - 5/8) + 1 at N = 0
(Gribakin and Flambaum, Phys. Rev. A 48, 546 (1993), FROM MEMORY, their eq. for n = 6), which is what the Langer term
(N + 1/2)^2 gives for every N: notes/molecules.md.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from pertcalc.molecules.levels import Ints, Levels
from pertcalc.molecules.numerov import zero_energy
from pertcalc.molecules.radial import R_FAR, Array, RadialProblem

# The zero-energy solution is followed to here [bohr].
R_END = 5000.0
# WKB is not asked to place a level better than this [levels].
WKB_UNCERTAINTY = 0.15
# Energies are compared on grids that see levels down to about 1/(2 mu a^2) with a up to this [bohr].
_RESOLVED_LENGTH = 1000.0
_ACTION_POINTS = 40_000


@dataclass(frozen=True, slots=True)
class Counts:
    """Levels for N = 0, 1, ... by each way, shape (n,), N up to the largest any way gives (one entry at least).

    ``spectral``, ``nodes``, ``wkb`` numbers; ``wkb_real`` the WKB number before rounding down [1];
    ``scattering_length`` [bohr] of N = 0 with ``scattering_error`` (numerical) [bohr]; ``remarks`` why ways differ.
    """

    spectral: Ints
    nodes: Ints
    wkb: Ints
    wkb_real: Array
    scattering_length: float
    scattering_error: float
    remarks: tuple[str, ...]

    @property
    def agree(self) -> bool:
        """Whether the three ways give the same number for every N."""
        return bool(np.array_equal(self.spectral, self.nodes) and np.array_equal(self.nodes, self.wkb))


def node_counts(problem: RadialProblem, finer: float = 1.0) -> tuple[Ints, float]:
    """Numbers of levels for N = 0, 1, ... from nodes at E = 0, and the scattering length.

    Parameters
    ----------
    problem : RadialProblem
        With a well.
    finer : float
        Factor on the number of steps [1].

    Returns
    -------
    nodes : ndarray of int, shape (largest_rotation + 1,)
        Levels [1].
    length : float
        [bohr]
    """
    nodes, length = zero_energy(problem, np.arange(problem.largest_rotation + 1.0), R_END, finer)
    # u ~ R - a: a node beyond the end of the integration is a level all the same.
    nodes[0] += length > R_END
    return nodes, length


@dataclass(frozen=True, slots=True)
class WkbCount:
    """WKB numbers for a list of N, shape (n,).

    ``number`` of levels, ``real`` the same before rounding down [1], summed over the classically allowed regions;
    ``margin`` [1] distance to the nearest step of any region; ``regions`` number of such regions.
    """

    number: Ints
    real: Array
    margin: Array
    regions: Ints


def wkb_counts(problem: RadialProblem, rotations: Array) -> WkbCount:
    """WKB number of levels, ``floor(Phi_N/pi + 1/2)`` with Langer's (N + 1/2)^2, of each classically allowed region.

    For N = 0 and C6 > 0 the region that reaches to infinity gives floor(Phi/pi + 3/8), without the Langer term.

    Parameters
    ----------
    problem : RadialProblem
    rotations : ndarray, shape (n,)
        N [1].

    Returns
    -------
    WkbCount
    """
    x = np.linspace(np.log(problem.r_in), np.log(20 * R_FAR), _ACTION_POINTS)
    R = np.exp(x)
    kinetic = -2 * problem.reduced_mass * R * R * problem.potential(R)
    found = [_wkb_one(kinetic, N, problem.C6 > 0, x[1] - x[0]) for N in rotations]
    numbers, real, margin, regions = (np.array(column) for column in zip(*found, strict=True))
    return WkbCount(numbers.astype(np.int64), real, margin, regions.astype(np.int64))


def _wkb_one(kinetic: Array, N: float, dispersion: bool, step: float) -> tuple[int, float, float, int]:
    """Number, real number, margin, regions of one N from R^2 times the squared wave number at E = 0."""
    endless = N == 0 and dispersion
    here = kinetic - (0.0 if endless else (N + 0.5) ** 2)
    edges = np.flatnonzero(np.diff(np.concatenate([[False], here > 0, [False]]).astype(int)))
    starts, ends = edges[::2], edges[1::2]
    if not starts.size:
        return 0, 0.5, 0.5, 0
    actions = np.array([np.sqrt(here[a:b]).sum() * step for a, b in zip(starts, ends, strict=True)])
    real = actions / np.pi + 0.5
    if endless:
        real[-1] -= 0.125
    margin = float(np.min(np.abs(real - np.maximum(np.round(real), 1.0))))
    return int(np.floor(real).sum()), float(real.sum()), margin, len(real)


def count_levels(problem: RadialProblem, levels: Levels) -> Counts:
    """The three counts of one well beside each other, with a remark wherever they differ.

    Parameters
    ----------
    problem : RadialProblem
    levels : Levels
        All N of the same problem.

    Returns
    -------
    Counts
    """
    none = np.zeros(1, dtype=np.int64)
    if not problem.has_well:
        return Counts(none, none, none, np.zeros(1), np.nan, np.nan, ("no well: the curve is nowhere attractive",))
    nodes, length = node_counts(problem)
    again, finer_length = node_counts(problem, 2.0)
    semiclassical = wkb_counts(problem, np.arange(len(nodes), dtype=float))
    wkb = semiclassical.number
    spectral = np.zeros(len(nodes), dtype=np.int64)
    spectral[: len(levels.count_by_rotation)] = levels.count_by_rotation
    used = max((int(np.flatnonzero(n)[-1]) + 1 for n in (nodes, wkb, spectral) if n.any()), default=1)
    spectral, nodes, again, wkb = (one[:used] for one in (spectral, nodes, again, wkb))
    remarks = [*_spectral_remarks(spectral, nodes, finer_length), *_wkb_remarks(nodes, semiclassical)]
    if not np.array_equal(nodes, again):
        N = _listed(np.flatnonzero(nodes != again))
        remarks.append(f"N = {N}: the node count changes with the step; a level lies at the limit to within rounding")
    error = abs(finer_length - length)
    return Counts(spectral, nodes, wkb, semiclassical.real[:used], finer_length, error, tuple(remarks))


def _spectral_remarks(spectral: Ints, nodes: Ints, length: float) -> list[str]:
    remarks = []
    for N in np.flatnonzero(spectral != nodes):
        if N == 0 and abs(length) > _RESOLVED_LENGTH:
            why = f"the scattering length of {length:.3g} bohr puts a level at the limit, out of reach of the spectrum"
        else:
            why = "a level lies so close to the limit that the grid of the spectrum does not resolve it"
        remarks.append(f"N = {N}: {spectral[N]} by the spectrum, {nodes[N]} by nodes; {why}")
    return remarks


def _wkb_remarks(nodes: Ints, found: WkbCount) -> list[str]:
    """Why the WKB number differs: one remark for all N of the same reason."""
    used = len(nodes)
    different = [int(N) for N in np.flatnonzero(found.number[:used] != nodes)]
    near = [N for N in different if found.margin[N] <= WKB_UNCERTAINTY and abs(found.number[N] - nodes[N]) == 1]
    humped = [N for N in different if N not in near and found.regions[N] > 1]
    rest = [N for N in different if N not in near and N not in humped]
    remarks = []
    if near:
        worst = max(found.margin[N] for N in near)
        remarks.append(
            f"N = {_listed(near)}: WKB differs by one level; its number before rounding lies within {worst:.2g} of a "
            f"step, and WKB places a level near the limit or a barrier top no better than {WKB_UNCERTAINTY:g}"
        )
    if humped:
        remarks.append(
            f"N = {_listed(humped)}: WKB differs; the curve has two wells with a hump between them, which share their "
            "levels by tunnelling, and WKB counts each alone"
        )
    if rest:
        numbers = ", ".join(f"{found.real[N]:.2f}" for N in rest)
        remarks.append(
            f"N = {_listed(rest)}: WKB gives {numbers} before rounding, nodes {_listed(nodes[N] for N in rest)}; a "
            "barrier or a hump at the limit is too near for WKB"
        )
    return remarks


def _listed(numbers: Iterable[int]) -> str:
    return ", ".join(str(number) for number in numbers)
