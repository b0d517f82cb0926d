"""Exact laws on real input: what the dynamics must obey whatever the curves are, on a shipped pair, in about a second.

Na-Ar at 350 K kT (fine structure and collision equally fast, so that nothing is trivially small) on the paths of the
semiclassical method and in quantum close coupling; Li-He at 500 K kT for the nearly sudden limit. Losses are
probabilities per collision, so that all tolerances but the last two are absolute numbers beside 1.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pertcalc import species
from pertcalc.angular import multipole_survival
from pertcalc.collisions.close_coupling import Matrices, scattering_matrices
from pertcalc.collisions.multipoles import level_blocks
from pertcalc.collisions.pair import CollisionPair, pair_of
from pertcalc.collisions.partial_waves import multipole_cross_sections
from pertcalc.collisions.paths import PathFamily
from pertcalc.collisions.scattering import Scattering, scatter
from pertcalc.collisions.sudden import sudden_limit
from pertcalc.constants import HARTREE_CM1, KELVIN_HARTREE
from pertcalc.curves.files import load_default
from pertcalc.results import CollisionRates
from pertcalc.validation.check import EXACT_LAW, Check

Array = NDArray[np.float64]

PAIR, ENERGY_K = ("Na", "Ar"), 350.0
# The splitting of Li turns a phase of 0.016 during a collision with He at 500 K; what it changes is of that order.
SUDDEN_PAIR, SUDDEN_ENERGY_K, SUDDEN_TOLERANCE = ("Li", "He"), 500.0, 0.01
ROUNDING = 1e-9
ROUNDING_QUANTUM = 1e-8
BALANCE_TOLERANCE = 1e-6
# Impact parameters [bohr] of the paths, far more than one Weisskopf radius out, and the points per radian and the reach
# [bohr] of the partial waves.
_IMPACT = np.linspace(0.5, 30.0, 60)
_POINTS, _LAST, _MATCH = 3.0, 30.0, 40.0

_PROBABILITY = "conservation of probability"
_GRAWERT = "sudden limit of a spectator spin: Grawert, Z. Phys. 225, 283 (1969), method from memory; algebra exact"


@dataclass(frozen=True, slots=True)
class _Losses:
    """Loss probabilities [1] of rank K of both levels on every path, and the gain of rank 0 from P1/2 in P3/2."""

    half: dict[int, Array]
    three_halves: dict[int, Array]
    gain: Array


def check_laws() -> list[Check]:
    """Unitarity, symmetry, the K = 0 sum rule and the sudden limit on the shipped pairs.

    Raises
    ------
    DataFileError
        A default curve file is missing or damaged.
    """
    pair = pair_of(load_default(*PAIR))
    return [*_semiclassical(pair), *_quantum(pair), _sudden_exact(pair), _sudden_near()]


def check_balance(rates: Iterable[CollisionRates]) -> list[Check]:
    """Detailed balance of the transfer, k(1/2->3/2)/k(3/2->1/2) = 2 exp(-splitting/kT), at every temperature computed.

    The largest relative difference over all pairs stands for them; no check where no transfer is known.
    """
    worst, where = -1.0, ""
    for one in rates:
        up, down = one.transfer["P1/2"].values, one.transfer["P3/2"].values
        if up is None or down is None:
            continue
        splitting = species.alkali(one.alkali).fine_structure_cm1.value / HARTREE_CM1
        expected = 2 * np.exp(-splitting / (KELVIN_HARTREE * one.temperatures))
        off = np.abs(up / (down * expected) - 1)
        size = float(np.max(off)) if np.all(np.isfinite(off)) else math.inf
        if size > worst:
            worst, where = size, f"{one.alkali}-{one.noble_gas}"
    if worst < 0:
        return []
    name = "detailed balance of transfer"
    note = f"worst of the pairs here: {where}"
    return [_law(name, worst, BALANCE_TOLERANCE, "thermal equilibrium is kept by collisions", note)]


def _law(name: str, off: float, tolerance: float, source: str, note: str) -> Check:
    basis = "rounding" if tolerance < SUDDEN_TOLERANCE else "phase of the splitting during a collision, 0.016"
    return Check(
        "law", name, 0.0, off if math.isfinite(off) else None, "1", off, tolerance, "1", basis, source, EXACT_LAW, True,
        note,
    )  # fmt: skip


def _scattered(pair: CollisionPair, path: str, energy_K: float) -> Scattering:
    family = PathFamily(pair, path)
    energy = energy_K * KELVIN_HARTREE
    turning_point = family.turning_points(energy, _IMPACT)
    return scatter(family, np.full(_IMPACT.shape, energy), _IMPACT, turning_point)


def _losses(scattering: Scattering) -> _Losses:
    low, high, cross = level_blocks(scattering)
    return _Losses(
        {K: 1 - multipole_survival(low, 0.5, K) for K in range(2)},
        {K: 1 - multipole_survival(high, 1.5, K) for K in range(4)},
        multipole_survival(cross, 0.5, 0, 1.5),
    )


def _largest(*arrays: Array) -> float:
    """The largest magnitude; nan where anything is."""
    return max((float(np.max(np.abs(array))) for array in arrays), key=lambda x: math.inf if math.isnan(x) else x)


def _semiclassical(pair: CollisionPair) -> list[Check]:
    scattering = _scattered(pair, "lower", ENERGY_K)
    blocks = (scattering.block_a, scattering.block_b)
    unitary = _largest(*(np.abs(S.conj().transpose(0, 2, 1) @ S - np.eye(3)) for S in blocks))
    losses = _losses(scattering)
    out_and_in = 2 * losses.half[0] - 4 * losses.three_halves[0]
    # Orthonormal tensors: a gain of rank 0 is sqrt((2J+1)/(2J'+1)) times the population that arrives.
    arrives = losses.half[0] - math.sqrt(2) * losses.gain
    note = f"{'-'.join(PAIR)}, {_IMPACT.size} paths, {ENERGY_K:g} K"
    return [
        _law("semiclassical S unitary", unitary, ROUNDING, _PROBABILITY, note),
        _law("semiclassical K=0: lost = gained", _largest(out_and_in, arrives), ROUNDING, _PROBABILITY, note),
    ]


def _quantum(pair: CollisionPair) -> list[Check]:
    matrices = scattering_matrices(pair, ENERGY_K * KELVIN_HARTREE, _LAST, _MATCH, _POINTS)
    asymmetric = _largest(*(np.abs(S - S.transpose(0, 2, 1)) for S in matrices.S.values()))
    lost = multipole_cross_sections(matrices, "P1/2", "P1/2", 0)[1]
    gained = math.sqrt(2) * multipole_cross_sections(matrices, "P1/2", "P3/2", 0)[0]
    note = f"{'-'.join(PAIR)}, {matrices.total.size} total J, {ENERGY_K:g} K"
    return [
        _law("quantum S unitary", _not_unitary(matrices), ROUNDING_QUANTUM, _PROBABILITY, note),
        _law("quantum S symmetric", asymmetric, ROUNDING_QUANTUM, "time reversal", note),
        _law("quantum K=0: lost = gained", abs(lost / gained - 1), BALANCE_TOLERANCE, _PROBABILITY, note),
    ]


def _not_unitary(matrices: Matrices) -> float:
    """Largest element of S^+ S - 1 over the open channels; what is closed has a column of zeros."""
    off = []
    for S in matrices.S.values():
        product = S.conj().transpose(0, 2, 1) @ S
        is_open = np.any(S != 0, axis=1)
        off.append(np.abs(product - is_open[:, :, None] * np.eye(3)))
    return _largest(*off)


def _predicted(losses: _Losses) -> tuple[tuple[Array, Array], ...]:
    """(found, predicted) of the ranks that follow from the outflow and the octupole of P3/2 in the sudden limit."""
    limit = sudden_limit(3 * losses.three_halves[0], losses.three_halves[3])
    half, three = limit.multipole_loss["P1/2"], limit.multipole_loss["P3/2"]
    return (
        (losses.half[0], half[0]),
        (losses.half[1], half[1]),
        (losses.three_halves[1], three[1]),
        (losses.three_halves[2], three[2]),
    )


def _sudden_exact(pair: CollisionPair) -> Check:
    losses = _losses(_scattered(replace(pair, splitting=0.0), "pi", ENERGY_K))
    off = _largest(*(found - predicted for found, predicted in _predicted(losses)))
    note = f"{'-'.join(PAIR)} {_IMPACT.size} paths, {ENERGY_K:g} K"
    return _law("no splitting: sudden limit", off, ROUNDING, _GRAWERT, note)


def _sudden_near() -> Check:
    losses = _losses(_scattered(pair_of(load_default(*SUDDEN_PAIR)), "pi", SUDDEN_ENERGY_K))
    sums = [(float(_IMPACT @ found), float(_IMPACT @ predicted)) for found, predicted in _predicted(losses)]
    off = max(abs(found / predicted - 1) for found, predicted in sums)
    note = f"{'-'.join(SUDDEN_PAIR)} cross sections, {SUDDEN_ENERGY_K:g} K"
    return _law("lithium: nearly sudden", off, SUDDEN_TOLERANCE, _GRAWERT, note)
