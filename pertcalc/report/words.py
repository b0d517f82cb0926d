"""Sentences of the report: what rules a level, what the numbers mean, cautions for whoever builds the cell."""

from __future__ import annotations

from pertcalc.report.tables import number
from pertcalc.vapour.fill import COMPARABLE, LevelBalance

CAUTIONS = (
    "Alkali metal burns in air and reacts violently with water; open cells and ampoules under dry inert gas only.",
    "Hot or pressurised glass can burst: a sealed cell gains pressure when heated. Shield it, wear eye protection.",
    "Resonance lasers near the D lines are partly invisible and harm eyes at milliwatts; enclose beams.",
    "Noble gases displace air without smell: ventilate where they are released from a supply or a cryostat.",
    "Local codes and licensed practice decide how such a cell may be built, filled and used; this text does not.",
)

READING = (
    "full width: FWHM; shift > 0 is blue. Coefficients are per unit perturber density at the cell temperature: "
    "multiply by n. The exponent is d ln|k| / d ln T at fixed density.",
    "loss K: total decay of the rank-K multipole (1 orientation, 2 alignment), outflow to the other fine-structure "
    "level included. transfer: population outflow to the other level; gain K: rank-K polarisation arriving there.",
    "+- numerical / model: relative errors of the computation, and of the curves and the method it rests on.",
    "Hanle field: B = hbar (decay + n loss_K) / (g_J mu_B), equal Larmor frequency and decay (a rank-2 signal has half "
    "width B/2). It uses g_J: the nuclear spin is taken as decoupled or absent; with resolved hyperfine structure "
    "g_F belongs there. Polarisation that returns through the other level is left out.",
)


def quantity_words(quantity: str, line_or_level: str, rank: int | None) -> str:
    """A quantity of the rate rows in words, without the line or level it belongs to."""
    other = {"P1/2": "P3/2", "P3/2": "P1/2"}.get(line_or_level, "")
    return {
        "fwhm": "full width",
        "shift": "shift",
        "multipole_loss": f"loss K={rank}",
        "transfer": f"transfer to {other}",
        "multipole_transfer": f"gain K={rank} in {other}",
    }[quantity]


def verdict_words(balance: LevelBalance) -> str:
    """What rules a level: one effect, or those within a factor COMPARABLE of each other; else "undecided"."""
    return " ~ ".join(balance.comparable).replace("radiative decay", "decay") or "undecided"


def level_words(balance: LevelBalance) -> str:
    """What rules a level, with the ratio of collisional loss to radiative decay of every rank."""
    ranks = ", ".join(f"K={K} {number(rate / balance.decay, 2)}" for K, rate in balance.losses.items())
    known = f"loss/decay {ranks}" if ranks else "collisional loss unknown by this method"
    return f"{balance.level} {verdict_words(balance)} ({known})"


def field_words(balance: LevelBalance) -> str:
    """The Larmor frequency of a level beside its radiative decay."""
    return f"field/decay {number(balance.larmor / balance.decay, 2)}"


def balance_line(balance: LevelBalance) -> str:
    """One sentence: what rules the level and how every rank of collisional loss compares with radiative decay."""
    return f"{level_words(balance)}; {field_words(balance)}"


def comparable_note() -> str:
    """How to read the verdicts."""
    return f"'a ~ b': within a factor {COMPARABLE:g}. Collisions stand with K=2 in P3/2 and K=1 in P1/2."
