"""Colliding pairs the collision tests share, each made once."""

from __future__ import annotations

import json
from functools import cache
from pathlib import Path

import numpy as np

from pertcalc.collisions.pair import CollisionPair, pair_of
from pertcalc.collisions.paths import PathFamily
from pertcalc.collisions.scattering import Scattering, scatter
from pertcalc.constants import AMU_AU, HARTREE_CM1, KELVIN_HARTREE
from pertcalc.curves import files
from pertcalc.curves.forms import TangToennies
from tests.six_state import SlowPair

CROSS_CHECK = Path(__file__).parent / "published" / "data" / "cross_check_K-Ar.json"


@cache
def cross_check() -> dict:
    """The quantum close-coupling numbers of the K-Ar model curves, with those curves."""
    return json.loads(CROSS_CHECK.read_text(encoding="utf-8"))


@cache
def model_k_ar() -> CollisionPair:
    """K-Ar on the curves of the quantum cross-check."""
    data = cross_check()
    X, A, B = (
        TangToennies(c["A_hartree"], c["b_per_bohr"], c["C6_au"], c["C8_au"], c["C10_au"])
        for c in (data["curves"][name] for name in "XAB")
    )
    m1, m2 = data["masses_u"]
    isotropic = tuple((getattr(B, C) + 2 * getattr(A, C)) / 3 - getattr(X, C) for C in ("C6", "C8", "C10"))
    mu = m1 * m2 / (m1 + m2) * AMU_AU
    return CollisionPair(mu, data["splitting_cm"] / HARTREE_CM1, X, A, B, isotropic, B.C6 - A.C6)


@cache
def default_pair(alkali: str, noble_gas: str) -> CollisionPair:
    return pair_of(files.load_default(alkali, noble_gas))


def slow(pair: CollisionPair) -> SlowPair:
    """The same pair for the slow integration of the whole path."""
    return SlowPair(pair.X, pair.A, pair.B, pair.splitting, pair.reduced_mass)


def dispersion_pair(X: float, A: float, B: float, splitting: float, mass: float = 36_000.0) -> CollisionPair:
    """Pure -C6/R^6 curves with the three C6 [au]; only for straight paths at b > 0.5 bohr."""

    def curve(C6: float):
        return lambda R: -C6 / R**6

    isotropic = ((B + 2 * A) / 3 - X, 0.0, 0.0)
    return CollisionPair(mass, splitting, curve(X), curve(A), curve(B), isotropic, B - A)


def thermal(T: float, x: float = 1.0) -> float:
    """Kinetic energy x kT [hartree] at T [K]."""
    return x * T * KELVIN_HARTREE


def collide(pair: CollisionPair, path: str, energy: float, b, step_factor: float = 1.0) -> Scattering:
    """S-matrices at one energy [hartree] and impact parameters b [bohr]."""
    family = PathFamily(pair, path)
    points = np.atleast_1d(np.asarray(b, dtype=float))
    return scatter(family, np.full(points.size, energy), points, family.turning_points(energy, points), step_factor)
