"""pertcalc: collision rates of polarised alkali vapours in noble buffer gases, from pair potentials."""

from __future__ import annotations

__version__ = "0.1.0"
