"""Sentences of a verdict: one per level, and how to read the numbers."""

from __future__ import annotations

import math

from pertcalc.report.tables import number
from pertcalc.vapour.excited import COLLISIONS, DECAY, FIELD, RankBalance
from pertcalc.vapour.fill import COMPARABLE
from pertcalc.vapour.ground_balance import PUMPING, GroundBalance
from pertcalc.vapour.verdict import Mixing, Verdict, impact_pressure

# What a crossover pressure is worth where it is no plain number, and its mark in a table.
BEYOND, ROUGH = "beyond the range of the treatment", "order of magnitude only"
MARKS = {BEYOND: "!", ROUGH: "~"}
RANK_WORDS = {1: "orientation", 2: "alignment", 3: "octupole"}
# The rank of each level that one sees: orientation of P1/2, alignment of P3/2.
VISIBLE = {"P1/2": 1, "P3/2": 2}

READING = (
    "Collisions of a P level: n times the total loss of the electronic multipole K, outflow to the other level "
    f"included; COMPUTED. * marks the rank one sees. Effects within a factor {COMPARABLE:g} are called comparable.",
    "Hanle field: equal Larmor frequency and damping, hbar damping/(g mu_B); rank-2 signals have half of it as half "
    "width. g_J holds where the nuclear spin is decoupled or unresolved, g_F where hyperfine structure is resolved; "
    "a range lies between the fields of both, where neither holds.",
    "Crossover: fill pressure at which collisions equal the larger of decay and field; field at which the Larmor "
    "frequency equals the larger of decay and collisions. In the ground level the pressure is that where walls and "
    "transit relax as much as the gas, the field that of equal Larmor frequency and damping.",
    "Ground level: decay of the longitudinal orientation <F_z>; the nucleus slows what acts on the electron only (G/q "
    "at a spin temperature, 2G/(2I+1)^2 without spin exchange). Spin exchange destroys no orientation.",
    "W2: scattering polarisability for broad-band light and an unpolarised ground level; no reabsorption in it.",
    "Gamma_I: outflow to the other level; Gamma_E + Gamma_I: collisional full width; D_K = n (loss_K - loss_0).",
)


def caveats(pressure_torr: float | None, relative_error: float | None, limit_torr: float = math.inf) -> list[str]:
    """What a crossover pressure [Torr] of some relative error [1] is worth: BEYOND ``limit_torr``, ROUGH, or []."""
    if pressure_torr is None:
        return []
    holds = {BEYOND: pressure_torr > limit_torr, ROUGH: relative_error is not None and relative_error > 1}
    return [words for words, true in holds.items() if true]


def impact_limit_torr(found: Verdict) -> float:
    """Fill pressure above which collisions overlap [Torr], inf without a gas."""
    limit = impact_pressure(found)
    return math.inf if limit is None else limit[1]


def field_range(low_G: float, high_G: float) -> str:
    """A field in three digits [G], or "low to high", low in two."""
    high = number(high_G, 3)
    return high if number(low_G, 3) == high else f"{number(low_G, 2)} to {high}"


def level_sentence(balance: RankBalance, limit_torr: float = math.inf) -> str:
    """One sentence on one rank of a P level: who wins, by what factor, and where that changes.

    ``limit_torr`` fill pressure above which collisions overlap [Torr].
    """
    what = f"{balance.level}: "
    rank = f"{RANK_WORDS[balance.rank]} (K={balance.rank})"
    if len(balance.comparable) > 1:
        first = f"{' and '.join(map(_called, balance.comparable))} weigh about equally on the {rank}"
    else:
        beaten = _called(balance.ranking[1][0])
        factor = f"{number(balance.factor, 2)} times {beaten}" if balance.ranking[1][1] > 0 else "alone"
        first = (
            f"{_called(balance.dominant)} {'rule' if balance.dominant == COLLISIONS else 'rules'} the {rank}, {factor}"
        )
    return f"{what}{first}{_changes(balance, limit_torr)}."


def _called(effect: str) -> str:
    """An effect inside a sentence."""
    return f"the {effect}" if effect == FIELD else effect


def _does(effect: str) -> str:
    return f"{_called(effect)} {'do' if effect == COLLISIONS else 'does'}"


def _changes(balance: RankBalance, limit_torr: float) -> str:
    """Where the answer changes: for each effect that does not rule, when it would."""
    parts = []
    p = balance.crossover_pressure_torr
    if p is not None:
        rival = FIELD if balance.larmor > balance.radiative.value else DECAY
        side = "below" if balance.dominant == COLLISIONS else "above"
        taken = _does(rival if side == "below" else COLLISIONS)
        parts.append(f"{side} {_pressure(p, balance.crossover_pressure_error, limit_torr)} {taken}")
    field = f"{field_range(*balance.crossover_range_G)} G"
    if balance.dominant != FIELD:
        parts.append(f"above {field} {_does(FIELD)}")
    else:
        rival = COLLISIONS if balance.collisional.value > balance.radiative.value else DECAY
        parts.append(f"below {field} {_does(rival)}")
    return "; " + ", ".join(parts)


def _pressure(value: float, relative: float | None, limit_torr: float = math.inf) -> str:
    """A crossover pressure with its error [Torr], and what it is worth."""
    doubts = caveats(value, relative, limit_torr)
    shown = number(value, 1 if ROUGH in doubts else 3)
    if relative is not None and ROUGH not in doubts:
        shown += f" +- {number(value * relative, 2)}"
    return f"{shown} Torr" + (f" ({', '.join(doubts)})" if doubts else "")


def ground_sentence(ground: GroundBalance) -> str:
    """One sentence on the orientation of the ground level: along the field, under the light, across the field."""
    top, total = ground.strongest, ground.total
    if top is None or top.rate is None or total is None:
        parts = ["S1/2: no relaxation rate of the orientation is known here"]
    else:
        known = "of the known processes " if ground.unknown else ""
        sizes = f"{number(top.rate.value, 2)} of {number(total.value, 2)} s^-1, lifetime {number(1 / total.value, 2)} s"
        if len(ground.comparable) == 1:
            parts = [f"S1/2: {known}{top.name} relaxes the orientation most ({sizes})"]
        else:
            several = " and ".join(ground.comparable)
            parts = [f"S1/2: {known}{several} weigh about equally on the orientation (largest {top.name}, {sizes})"]
    if ground.unknown:
        parts.append(f"unknown: {', '.join(ground.unknown)}")
    if ground.pumping is not None and total is not None:
        parts.append(f"{PUMPING} acts {number(ground.pumping.value / total.value, 2)} times as fast")
    if (field := ground.crossover_field_G) is not None:
        here = "as here" if ground.dominant == FIELD else "not reached here"
        parts.append(f"a field across it above {number(field, 2)} G ({here}) turns it away first")
    if (meet := ground.crossover_pressure_torr) is not None:
        where = _pressure(meet, ground.crossover_pressure_error)
        if ground.crossover_step is None:
            parts.append(f"walls and gas relax it equally at {where}")
        else:
            parts.append(
                f"the larger of walls and gas changes at {where}, where the rates step ({ground.crossover_step})"
            )
    return "; ".join(parts) + "."


def sentences(found: Verdict) -> dict[str, str]:
    """Level -> its sentence, ground level first."""
    limit = impact_limit_torr(found)
    levels = {level: level_sentence(ranks[VISIBLE[level]], limit) for level, ranks in found.balances.items()}
    return {"S1/2": ground_sentence(found.ground)} | levels


def mixing_sentence(mixing: Mixing) -> str:
    """Whether collisions mix the upper level of a line before it decays, and what pumping on the line then is."""
    if mixing.ratio == 0:
        against = "not at all"
    elif max(mixing.ratio, 1 / mixing.ratio) <= COMPARABLE:
        against = "about as fast as it decays"
    else:
        against = "faster than it decays" if mixing.ratio > 1 else "more slowly than it decays"
    error = "" if mixing.error is None else f" +- {number(mixing.error, 2)}"
    photons = ""
    if mixing.photons_per_atom is not None:
        photons = f", {number(mixing.photons_per_atom, 3)} photons per polarised atom"
    return (
        f"{mixing.line}: collisions mix {mixing.level} {against} (loss of orientation/decay {number(mixing.ratio, 3)}"
        f"{error}), {number(100 * mixing.surviving, 2)} % of its orientation returns by emission: {mixing.pumping} "
        f"pumping{photons}."
    )
