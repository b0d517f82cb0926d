"""Make pertcalc/data/one_electron/core_potentials.toml: fit the alkali cores to the term energies in terms.csv.

Usage: python notes/scripts/make_core_potentials.py [OUTPUT_FILE]

The dipole polarisability of the core is that of the species table; the cut-off radius, the quadrupole polarisability
and their sources are listed here. The fit is pertcalc.one_electron.core_fit; notes/one-electron-atom.md explains it.
"""

from __future__ import annotations

import sys
from pathlib import Path

from pertcalc.one_electron.core_fit import fit_core_potential, ionisation_energy, valence_terms
from pertcalc.species import ALKALIS, alkali

# r_c [bohr]: near the radius of the core. 20 % either way moves alpha_d(ns) by at most 0.6 %, f by 0.7 %.
CUTOFFS = {"Li": 0.95, "Na": 1.25, "K": 1.9, "Rb": 2.2, "Cs": 2.6}
QUADRUPOLES = {"Li": 0.114, "Na": 1.52, "K": 16.3, "Rb": 35.4, "Cs": 86.4}
DEFAULT = Path(__file__).parents[2] / "pertcalc" / "data" / "one_electron" / "core_potentials.toml"
HEADER = """\
# Made by notes/scripts/make_core_potentials.py; do not edit by hand. notes/one-electron-atom.md explains it.
# V_l(r) = -1/r - a_c/(2 r^4) [1 - exp(-(r/r_c)^6)] + A_l exp(-b_l r^2), atomic units; A_l = 0 for l > 2.
# core_polarizability_au a_c: FROM MEMORY (RPA literature; the species table). cutoff_bohr r_c: chosen near the core
# radius, no source. core_quadrupole_au: FROM MEMORY (RPA literature), used by the dispersion coefficients only.
# strength_hartree A_l, exponent_per_bohr2 b_l, l = 0, 1, 2: COMPUTED, both terms exact.
"""


def main() -> None:
    """Fit the five cores and write the file."""
    text = HEADER
    for symbol in ALKALIS:
        polarizability = float(alkali(symbol).core_polarizability_au)
        terms, ionisation = valence_terms(symbol), ionisation_energy(symbol)
        core = fit_core_potential(symbol, terms, ionisation, polarizability, CUTOFFS[symbol])
        text += f"""
[{symbol}]
core_polarizability_au = {polarizability}
core_quadrupole_au = {QUADRUPOLES[symbol]}
cutoff_bohr = {CUTOFFS[symbol]}
strength_hartree = [{", ".join(f"{a:.7f}" for a in core.strengths)}]
exponent_per_bohr2 = [{", ".join(f"{b:.5f}" for b in core.exponents)}]
lowest_n = {list(core.lowest_n)}
source = "{core.source} (terms.csv, FROM MEMORY)"
mark = "{core.mark}"
"""
    path = Path(sys.argv[1]) if len(sys.argv) > 1 else DEFAULT
    path.write_text(text, encoding="utf-8")
    print(f"wrote {path}")


if __name__ == "__main__":
    main()
